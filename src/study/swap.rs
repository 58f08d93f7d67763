//! Owns substitutes: the feasible build that differs least from one that was made before, and what losing a part costs.

use std::collections::BTreeSet;

use super::each::side_by_side;
use crate::audit::audit;
use crate::build::{Build, places};
use crate::catalogue::{Catalogue, Part, PartId, Slot, Status};
use crate::optimise::{Disagreement, Found, Near, Outcome, Proof, Question, optimise};
use crate::screen::{Counts, Stop};
use crate::supply::Supply;
use crate::units::Money;

/// Why a part of the old build cannot stay.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Loss {
    /// Not in today's catalogue, or in another slot.
    Gone,
    /// Withdrawn.
    Withdrawn,
    /// The run needs more pieces than there are.
    Short {
        /// Pieces for the run.
        needed: u64,
        /// Pieces on the shelf.
        stock: u64,
    },
}

/// The build that is to be redone, its parts as they were when it was made.
#[derive(Debug)]
pub struct Old<'a> {
    /// The choice.
    pub build: &'a Build<'a>,
    /// What stands in its places.
    places: Vec<[String; 7]>,
    /// Cost of one unit: by today's rows where its parts still exist, else by their cells of then.
    pub cost: Money,
    /// Heat of one unit, by the cells of then.
    pub heat_w: Option<f64>,
    /// Its parts with today's row, if there is one, in the order of the bill of materials.
    pub parts: Vec<(&'a Part, Option<&'a Part>)>,
}

impl<'a> Old<'a> {
    /// A build beside today's catalogue.
    #[must_use]
    pub fn new(supply: &Supply, build: &'a Build<'a>, today: &'a Catalogue) -> Old<'a> {
        let row = |part: &Part| today.find(&part.name).filter(|row| row.slot == part.slot);
        let lines = build.lines(supply);
        let bought = |part: &'a Part, qty: u64| row(part).unwrap_or(part).unit_price(qty * supply.builds) * qty;
        let fitted = |name: &str| today.pass_devices.iter().find(|d| d.part.name == name);
        let cost = lines.iter().map(|l| bought(l.part, l.qty)).sum::<Money>()
            + (build.rails.iter())
                .map(|r| fitted(&r.pass.part.name).unwrap_or(r.pass).fitted_price)
                .sum();
        Old {
            places: places(supply, build),
            cost,
            heat_w: audit(supply, build).heat_w,
            parts: lines.iter().map(|l| (l.part, row(l.part))).collect(),
            build,
        }
    }

    /// What must go because it is gone, or (unless named) withdrawn or short of stock, in the order of the parts.
    #[must_use]
    pub fn losses(&self, supply: &Supply, named: &BTreeSet<PartId>) -> Vec<(&'a Part, Loss)> {
        let lines = self.build.lines(supply);
        let loss = |line: &crate::build::Line<'a>, row: Option<&Part>| {
            let Some(row) = row else { return Some(Loss::Gone) };
            if named.contains(&row.id) {
                return None;
            }
            if row.status == Status::Withdrawn {
                return Some(Loss::Withdrawn);
            }
            let needed = line.qty * supply.builds;
            let stock = row.stock.filter(|&stock| stock < needed)?;
            Some(Loss::Short { needed, stock })
        };
        (lines.iter().zip(&self.parts))
            .filter_map(|(line, &(part, row))| Some((part, loss(line, row)?)))
            .collect()
    }

    /// How many places hold a part that the question does not allow: no build is nearer.
    fn least_distance(&self, question: &Question) -> usize {
        let named = |id: PartId| question.with.iter().any(|&(part, _)| part == id);
        let allowed: BTreeSet<(Slot, &str)> = (question.catalogue.parts())
            .filter(|p| !question.without.contains(&p.id))
            .filter(|p| p.status != Status::Withdrawn || named(p.id))
            .map(|p| (p.slot, p.name.as_str()))
            .collect();
        let lost = |part: &Part| !allowed.contains(&(part.slot, part.name.as_str()));
        let in_rail = |rail: &crate::build::RailChoice| {
            let section = &self.build.sections[rail.section];
            let held = [
                Some(&self.build.transformers[section.transformer].part.part),
                Some(&section.rectifier.part),
                section.rectifier_sink.map(|s| &s.part),
                Some(&section.reservoir.part),
                Some(&rail.pass.part),
                rail.sink.map(|s| &s.part),
            ];
            held.into_iter().flatten().filter(|part| lost(part)).count()
        };
        self.build.rails.iter().map(in_rail).sum()
    }

    /// Places in which a build differs from this one.
    fn distance(&self, supply: &Supply, build: &Build) -> usize {
        let places = places(supply, build);
        let pairs = self.places.iter().flatten().zip(places.iter().flatten());
        pairs.filter(|(old, new)| old != new).count()
    }
}

/// The substitute.
#[derive(Debug, Clone)]
pub struct Swap<'c> {
    /// At most one build; empty and proved: nothing passes.
    pub outcome: Outcome<'c>,
    /// How many places it changes; `None`: there is no build.
    pub distance: Option<usize>,
    /// The best build whatever it changes, if it is known.
    pub free: Option<Found<'c>>,
}

/// The build with the least (distance, key), or (`free`) the least key alone.
///
/// The number of places that must change in any case is tried first: mostly there is such a build, and what lies near is
/// soon searched. Else the plain optimum shows whether there is any build, and its distance bounds what is looked for as
/// the distance rises until there is one.
///
/// # Errors
/// When search and audit disagree: a bug to report.
pub fn swap<'c>(question: &Question<'c>, old: &Old, free: bool) -> Result<Swap<'c>, Disagreement> {
    let mut search = Search {
        question: Question {
            top: 1,
            ..question.clone()
        },
        old,
        counts: Counts::default(),
    };
    if free {
        let plain = search.plain(question.stop.clone())?;
        return Ok(search.done(
            plain.builds.first().cloned(),
            plain.proof,
            plain.builds.into_iter().next(),
        ));
    }
    let least = old.least_distance(question);
    let hasty = search.near(least, question.stop.half().unwatched())?;
    if hasty.proof == Proof::Proved && !hasty.builds.is_empty() {
        return Ok(search.done(hasty.builds.into_iter().next(), Proof::Proved, None));
    }
    let plain = search.plain(question.stop.half().unwatched())?;
    let proved = plain.proof == Proof::Proved;
    let far = plain.builds.into_iter().next();
    let most = far.as_ref().map(|found| old.distance(question.supply, &found.build));
    if proved && far.is_none() {
        return Ok(search.done(None, Proof::Proved, None));
    }
    // No build has a lower objective, near or far.
    let bound = match (plain.proof, &far) {
        (Proof::Open { bound }, _) => bound,
        (Proof::Proved, far) => far.as_ref().map_or(0, |found| found.key.objective(question.objective)),
    };
    let first = least + usize::from(hasty.proof == Proof::Proved);
    for reach in first..=most.unwrap_or(old.places.iter().map(|places| places.len()).sum()) {
        if proved && most == Some(reach) {
            // Nothing is nearer, and nothing has a lower key.
            return Ok(search.done(far.clone(), Proof::Proved, far));
        }
        let outcome = search.near(reach, question.stop.clone())?;
        let found = outcome.builds.into_iter().next();
        if outcome.proof != Proof::Proved {
            return Ok(search.done(found.or_else(|| far.clone()), Proof::Open { bound }, far));
        }
        if found.is_some() {
            return Ok(search.done(found, Proof::Proved, far));
        }
    }
    match (far, most) {
        // The plain search found one within reach.
        (Some(found), Some(most)) => Err(too_far(&found, most)),
        _ => Ok(search.done(None, Proof::Proved, None)),
    }
}

/// The searches for one substitute.
struct Search<'s, 'c> {
    question: Question<'c>,
    old: &'s Old<'s>,
    counts: Counts,
}

impl<'c> Search<'_, 'c> {
    fn plain(&mut self, stop: Stop) -> Result<Outcome<'c>, Disagreement> {
        let outcome = optimise(&Question {
            stop,
            ..self.question.clone()
        })?;
        self.counts.add(&outcome.counts);
        Ok(outcome)
    }

    /// The best build with at most so many changes.
    fn near(&mut self, most: usize, stop: Stop) -> Result<Outcome<'c>, Disagreement> {
        let places = self.old.places.clone();
        let outcome = optimise(&Question {
            near: Some(Near { places, most }),
            stop,
            ..self.question.clone()
        })?;
        self.counts.add(&outcome.counts);
        let farther = |found: &&Found| self.old.distance(self.question.supply, &found.build) > most;
        match outcome.builds.iter().find(farther) {
            Some(found) => Err(too_far(found, most)),
            None => Ok(outcome),
        }
    }

    fn done(&self, found: Option<Found<'c>>, proof: Proof, free: Option<Found<'c>>) -> Swap<'c> {
        Swap {
            distance: (found.as_ref()).map(|found| self.old.distance(self.question.supply, &found.build)),
            outcome: Outcome {
                builds: found.into_iter().collect(),
                proof,
                counts: self.counts,
            },
            free,
        }
    }
}

/// Two searches that contradict each other.
fn too_far(found: &Found, reach: usize) -> Disagreement {
    Disagreement {
        build: found.build.text().replace('\0', " "),
        verdict: vec![format!("searches disagree about builds with at most {reach} changes")],
    }
}

/// For every part of the old build, in the order of its bill of materials, the substitute when that part is lost.
///
/// # Errors
/// When search and audit disagree: a bug to report.
pub fn swap_each<'a, 'c>(
    question: &Question<'c>,
    old: &Old<'a>,
    free: bool,
) -> Result<Vec<(&'a Part, Swap<'c>)>, Disagreement> {
    let lost = |&(_, row): &(&Part, Option<&Part>)| {
        let mut without = question.without.clone();
        without.extend(row.map(|row| row.id));
        swap(
            &Question {
                without,
                stop: question.stop.unwatched(),
                ..question.clone()
            },
            old,
            free,
        )
    };
    let answers = side_by_side(&old.parts, lost, question);
    (old.parts.iter().zip(answers))
        .map(|(&(part, _), answer)| Ok((part, answer?)))
        .collect()
}
