//! Owns substitutes: the feasible build that differs least from one that was made before, and what losing a part costs.

use std::collections::BTreeSet;

use super::each::side_by_side;
use crate::audit::audit;
use crate::build::{Build, places};
use crate::catalogue::{Catalogue, Part, PartId, Slot, Status};
use crate::optimise::{Disagreement, Found, Near, Outcome, Proof, Question, optimise};
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

    /// What must go because it is gone, withdrawn (unless named) or short of stock, in the order of the parts.
    #[must_use]
    pub fn losses(&self, supply: &Supply, named: &BTreeSet<PartId>) -> Vec<(&'a Part, Loss)> {
        let lines = self.build.lines(supply);
        let loss = |line: &crate::build::Line<'a>, row: Option<&Part>| {
            let Some(row) = row else { return Some(Loss::Gone) };
            if row.status == Status::Withdrawn && !named.contains(&row.id) {
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
/// The plain optimum comes first: where there is none nothing else can be, and its distance bounds what is looked for.
/// Then the distance rises from the number of places that must change until there is a build.
///
/// # Errors
/// When search and audit disagree: a bug to report.
pub fn swap<'c>(question: &Question<'c>, old: &Old, free: bool) -> Result<Swap<'c>, Disagreement> {
    let question = Question {
        top: 1,
        ..question.clone()
    };
    let least = old.least_distance(&question);
    let plain = optimise(&Question {
        stop: if free {
            question.stop.clone()
        } else {
            question.stop.half().unwatched()
        },
        ..question.clone()
    })?;
    let proved = plain.proof == Proof::Proved;
    let most = plain
        .builds
        .first()
        .map(|found| old.distance(question.supply, &found.build));
    if free || (proved && most.is_none_or(|most| most == least)) {
        return Ok(Swap {
            distance: most,
            free: plain.builds.first().cloned(),
            outcome: plain,
        });
    }
    // No build has a lower objective, near or far.
    let bound = match plain.proof {
        Proof::Proved => plain
            .builds
            .first()
            .map_or(0, |found| found.key.objective(question.objective)),
        Proof::Open { bound } => bound,
    };
    let mut counts = plain.counts;
    let far = plain.builds.into_iter().next();
    for reach in least..=most.unwrap_or(old.places.iter().map(|places| places.len()).sum()) {
        let outcome = optimise(&Question {
            near: Some(Near {
                places: old.places.clone(),
                most: reach,
            }),
            ..question.clone()
        })?;
        counts.add(&outcome.counts);
        let stopped = outcome.proof != Proof::Proved;
        let near = outcome.builds.into_iter().next();
        if let Some(found) = near
            .as_ref()
            .filter(|found| old.distance(question.supply, &found.build) > reach)
        {
            return Err(too_far(found, reach));
        }
        if near.is_none() && !stopped {
            continue;
        }
        let builds: Vec<Found> = near.or_else(|| far.clone()).into_iter().collect();
        return Ok(Swap {
            distance: builds.first().map(|found| old.distance(question.supply, &found.build)),
            outcome: Outcome {
                builds,
                proof: if stopped { Proof::Open { bound } } else { Proof::Proved },
                counts,
            },
            free: far,
        });
    }
    match (far, most) {
        // The plain search found one within reach.
        (Some(found), Some(most)) => Err(too_far(&found, most)),
        _ => Ok(Swap {
            distance: None,
            outcome: Outcome {
                builds: Vec::new(),
                proof: Proof::Proved,
                counts,
            },
            free: None,
        }),
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
