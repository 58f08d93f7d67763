//! Owns the list of the best builds so far: the N least keys, builds with the same lines counting once.

use std::cmp::Ordering;
use std::collections::BTreeMap;

use crate::build::Build;
use crate::catalogue::PartId;
use crate::screen::Objective;

/// What builds are ordered by: objective first, then the other, then the choice written out.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Key {
    /// Cost of one unit, millionths of the currency.
    pub cost: i64,
    /// Heat, microwatts.
    pub heat: i64,
    /// See [`Build::text`].
    pub text: String,
}

impl Key {
    /// The part of the key that the objective minimises.
    #[must_use]
    pub fn objective(&self, objective: Objective) -> i64 {
        objective.order(self.cost, self.heat).0
    }

    /// Order by an objective.
    #[must_use]
    pub fn compare(&self, other: &Key, objective: Objective) -> Ordering {
        (objective
            .order(self.cost, self.heat)
            .cmp(&objective.order(other.cost, other.heat)))
        .then_with(|| self.text.as_bytes().cmp(other.text.as_bytes()))
    }
}

/// A build with its key.
#[derive(Debug, Clone)]
pub struct Found<'c> {
    /// What it is ordered by.
    pub key: Key,
    /// The choice.
    pub build: Build<'c>,
}

/// A bill of materials: parts with their pieces per unit, by part.
pub(super) type Bill = Vec<(PartId, u64)>;

/// What a search collects, and what can still be of interest to it.
pub(super) trait Wanted<'c> {
    /// Nothing with a score above this is of interest.
    fn limit(&self) -> f64;

    /// Nothing whose cost, heat and score are at least these is of interest.
    fn beyond(&self, cost: i64, heat: i64, score: f64) -> bool;

    /// Offers a feasible build.
    fn offer(&mut self, bill: Bill, cost: i64, heat: i64, build: &mut dyn FnMut() -> Build<'c>);
}

/// The N best by an objective, of those with an objective of at most a ceiling.
pub(super) struct Best<'c> {
    objective: Objective,
    most: usize,
    ceiling: i64,
    /// What the score charges for what the objective does not see, and the cap on that: no build has a higher score than
    /// its objective and the charge for the whole cap.
    charge: f64,
    by_bill: BTreeMap<Bill, Found<'c>>,
    /// First two parts of the N-th key once there are N.
    worst: Option<(i64, i64)>,
}

impl<'c> Wanted<'c> for Best<'c> {
    #[allow(clippy::cast_precision_loss)]
    fn limit(&self) -> f64 {
        self.worst.map_or(self.ceiling, |worst| worst.0.min(self.ceiling)) as f64 + self.charge
    }

    fn beyond(&self, cost: i64, heat: i64, _score: f64) -> bool {
        let least = self.objective.order(cost, heat);
        least.0 > self.ceiling || self.worst.is_some_and(|worst| least > worst)
    }

    fn offer(&mut self, bill: Bill, cost: i64, heat: i64, build: &mut dyn FnMut() -> Build<'c>) {
        if self.beyond(cost, heat, 0.0) {
            return;
        }
        let build = build();
        let found = Found {
            key: Key {
                cost,
                heat,
                text: build.text(),
            },
            build,
        };
        match self.by_bill.get(&bill) {
            Some(old) if found.key.compare(&old.key, self.objective) != Ordering::Less => return,
            _ => {}
        }
        self.by_bill.insert(bill, found);
        if self.by_bill.len() > self.most
            && let Some(last) = self.last().map(|(bill, _)| bill.clone())
        {
            self.by_bill.remove(&last);
        }
        if self.by_bill.len() == self.most {
            self.worst = self
                .last()
                .map(|(_, found)| self.objective.order(found.key.cost, found.key.heat));
        }
    }
}

impl<'c> Best<'c> {
    pub(super) fn new(objective: Objective, most: usize, ceiling: i64) -> Best<'c> {
        Best {
            objective,
            most: most.max(1),
            ceiling,
            charge: 0.0,
            by_bill: BTreeMap::new(),
            worst: None,
        }
    }

    /// With a score that charges so much for the whole cap.
    pub(super) fn set_charge(&mut self, charge: f64) {
        self.charge = charge;
    }

    fn last(&self) -> Option<(&Bill, &Found<'c>)> {
        self.by_bill
            .iter()
            .max_by(|a, b| a.1.key.compare(&b.1.key, self.objective))
    }

    pub(super) fn into_builds(self) -> Vec<Found<'c>> {
        let objective = self.objective;
        let mut builds: Vec<Found<'c>> = self.by_bill.into_values().collect();
        builds.sort_by(|a, b| a.key.compare(&b.key, objective));
        builds
    }
}
