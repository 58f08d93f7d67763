//! The other way to the optimum: every build of a small supply, judged by the audit, sorted by the key.
//!
//! Shares with the program only the audit, the rules of assembly, and which device and sink serves what; who may share
//! with whom, hook-ups, pieces, prices, keys, order and distances are written here once more from the rules (`layouts`,
//! `own_rules`).
#![allow(dead_code)]

use std::cmp::Ordering;
use std::collections::{BTreeMap, BTreeSet};

use binrail::audit::audit;
use binrail::build::{Build, misfits};
use binrail::catalogue::{Catalogue, Part, PartId, Status};
use binrail::screen::Objective;
use binrail::supply::Supply;

use crate::choices::{Choices, assemble};
use crate::own_rules::{Bill, apart, bill, fields, part_at, price};

/// A feasible build with what it is ordered by.
#[derive(Debug, Clone)]
pub struct Judged<'c> {
    pub build: Build<'c>,
    pub bill: Bill,
    /// Millionths of the currency.
    pub cost: i64,
    /// Microwatts.
    pub heat: i64,
    /// Of its tightest limit.
    pub tightness: f64,
    /// The text of the key, field by field.
    pub fields: Vec<String>,
}

impl Judged<'_> {
    pub fn objective(&self, objective: Objective) -> i64 {
        match objective {
            Objective::Cost => self.cost,
            Objective::Heat => self.heat,
        }
    }

    pub fn compare(&self, other: &Self, objective: Objective) -> Ordering {
        let pair = |j: &Self| match objective {
            Objective::Cost => (j.cost, j.heat),
            Objective::Heat => (j.heat, j.cost),
        };
        pair(self)
            .cmp(&pair(other))
            .then_with(|| self.fields.cmp(&other.fields))
    }
}

/// What --with and --without ask for.
#[derive(Debug, Clone, Default)]
pub struct Wish {
    pub without: BTreeSet<PartId>,
    pub with: Vec<(PartId, Option<usize>)>,
}

/// Every feasible build of a case, withdrawn parts included.
#[derive(Default)]
pub struct Brute<'c> {
    pub all: Vec<Judged<'c>>,
    /// Builds that were audited.
    pub audited: usize,
    /// Joint builds that the audit rejected, by limit.
    pub rejected: BTreeMap<&'static str, usize>,
}

impl<'c> Brute<'c> {
    /// Judges every build of every layout.
    pub fn new(supply: &Supply, catalogue: &'c Catalogue) -> Brute<'c> {
        Brute::of(supply, catalogue, &Choices::new(supply, catalogue))
    }

    /// Judges every build of these choices.
    pub fn of(supply: &Supply, catalogue: &Catalogue, choices: &Choices<'c>) -> Brute<'c> {
        let mut brute = Brute {
            audited: choices.audited,
            ..Brute::default()
        };
        let rails: Vec<usize> = (0..supply.rails.len()).collect();
        for layout in &choices.layouts {
            choices.each(layout, &mut |chosen| {
                brute.judge(supply, catalogue, assemble(&rails, chosen))
            });
        }
        brute
    }

    /// Keeps the build with its key if the audit passes.
    fn judge(&mut self, supply: &Supply, catalogue: &Catalogue, build: Build<'c>) {
        let verdict = audit(supply, &build);
        self.audited += 1;
        let failing = || verdict.margins.iter().filter(|m| !m.check.met());
        for limit in failing().map(|m| m.check.limit.word()).collect::<BTreeSet<_>>() {
            *self.rejected.entry(limit).or_default() += 1;
        }
        if failing().next().is_some() {
            return;
        }
        let misfits = misfits(supply, &build);
        assert!(misfits.is_empty(), "{misfits:?} of {build:?}");
        let bill = bill(&build);
        let fitted: i64 = build.rails.iter().map(|r| r.pass.fitted_price.0).sum();
        let cost = price(supply, catalogue, &bill) + fitted;
        assert_eq!(cost, verdict.cost.0, "the audit's cost of {bill:?}");
        self.all.push(Judged {
            cost,
            heat: (verdict.heat_w.unwrap() * 1e6).round() as i64,
            tightness: verdict
                .margins
                .iter()
                .map(|m| m.check.tightness())
                .fold(f64::INFINITY, f64::min),
            fields: fields(&build),
            bill,
            build,
        });
    }

    /// The builds that a wish allows.
    pub fn allowed(&self, catalogue: &Catalogue, wish: &Wish) -> Vec<&Judged<'c>> {
        let named: BTreeSet<PartId> = wish.with.iter().map(|&(id, _)| id).collect();
        let parts: Vec<&Part> = catalogue.parts().collect();
        let usable = |id: &PartId| {
            let part = parts[id.0 as usize];
            !wish.without.contains(id) && (part.status != Status::Withdrawn || named.contains(id))
        };
        let holds = |j: &Judged, id: PartId, at: Option<usize>| match at {
            Some(rail) => part_at(&j.build, rail, id),
            None => j.bill.contains_key(&id),
        };
        let allowed = |j: &&Judged| j.bill.keys().all(usable) && wish.with.iter().all(|&(id, at)| holds(j, id, at));
        self.all.iter().filter(allowed).collect()
    }

    /// The builds that a wish allows, one for each bill of materials, best first.
    pub fn list(&self, catalogue: &Catalogue, objective: Objective, wish: &Wish) -> Vec<&Judged<'c>> {
        one_for_each_bill(self.allowed(catalogue, wish), objective)
    }

    /// Of each (cost, heat) that no build dominates the one with the least text, cheapest first.
    pub fn front(&self, catalogue: &Catalogue, wish: &Wish) -> Vec<&Judged<'c>> {
        let mut by_cost = self.allowed(catalogue, wish);
        by_cost.sort_by(|a, b| a.compare(b, Objective::Cost));
        let mut front: Vec<&Judged> = Vec::new();
        for judged in by_cost {
            if front.last().is_none_or(|coolest| judged.heat < coolest.heat) {
                front.push(judged);
            }
        }
        front
    }

    /// The build with the least (distance to `from`, key), and that distance.
    pub fn nearest(
        &self,
        catalogue: &Catalogue,
        from: &Build,
        objective: Objective,
        wish: &Wish,
    ) -> Option<(usize, &Judged<'c>)> {
        let allowed = self.allowed(catalogue, wish).into_iter();
        allowed
            .map(|judged| (apart(from, &judged.build), judged))
            .min_by(|(m, a), (n, b)| m.cmp(n).then_with(|| a.compare(b, objective)))
    }
}

/// Of the builds with one bill of materials the one with the least key, best first.
pub fn one_for_each_bill<'a, 'c>(builds: Vec<&'a Judged<'c>>, objective: Objective) -> Vec<&'a Judged<'c>> {
    let mut best: BTreeMap<&Bill, &Judged<'c>> = BTreeMap::new();
    for judged in builds {
        let least = best.entry(&judged.bill).or_insert(judged);
        if judged.compare(least, objective).is_lt() {
            *least = judged;
        }
    }
    let mut list: Vec<&Judged> = best.into_values().collect();
    list.sort_by(|a, b| a.compare(b, objective));
    list
}
