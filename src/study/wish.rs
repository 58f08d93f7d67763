//! Owns the search along one lever: the nearest place at which there is a wanted build, each probe a solved optimum.

use std::collections::BTreeSet;

use super::lever::{Lever, Moves, Shape, keys, restocked};
use crate::audit::{audit, compared};
use crate::build::Build;
use crate::catalogue::{Catalogue, Part, PartId, Status};
use crate::optimise::{Disagreement, Outcome, Proof, Question, optimise};
use crate::screen::Objective;
use crate::supply::Supply;

/// What there shall be: a build, or one with an objective of at most so much.
pub(super) struct Wish<'q, 'c> {
    pub(super) question: &'q Question<'c>,
    pub(super) most: Option<i64>,
}

/// What a probe says.
pub(super) enum Answer<T> {
    /// There is such a build.
    Holds(T),
    /// There is none.
    Fails,
    /// Stopped before either.
    Open,
}
use Answer::{Fails, Holds, Open};

/// A place that was solved.
#[derive(Clone, Copy)]
pub(super) struct Solved {
    pub(super) place: i64,
    /// The least objective there.
    pub(super) value: i64,
}

/// A probe that holds.
struct Probe {
    solved: Solved,
    /// The nearest place that its build needs.
    enough: i64,
    /// The build, written out.
    text: String,
}

type Parts = BTreeSet<PartId>;

/// The levers that help, each with its nearest place; and whether none was left open.
pub(super) struct Nearest {
    pub(super) levers: Vec<(Lever, Solved)>,
    pub(super) complete: bool,
}

impl<'c> Wish<'_, 'c> {
    /// Every lever that alone makes the wish come true, in the order of the table, stock last by part.
    pub(super) fn nearest(&self) -> Result<Nearest, Disagreement> {
        let mut found = Vec::new();
        let mut complete = true;
        let stock = self.overdrawn()?;
        let levers = keys(self.question.supply).into_iter().filter(|lever| {
            // What more stock cannot give, fewer units cannot either.
            lever.shape != Shape::Run || !matches!(stock, Fails)
        });
        for lever in levers {
            let nearest = match lever.shape {
                Shape::Run => self.fewest_less(&lever)?,
                Shape::Straight | Shape::Wavy => self.along(&lever)?,
            };
            match nearest {
                Holds(solved) => found.push((lever, solved)),
                Fails => {}
                Open => complete = false,
            }
        }
        match stock {
            Fails => {}
            Open => complete = false,
            Holds((among, short)) => {
                let mut parts = BTreeSet::new();
                complete &= self.short_parts(among, &short, &mut parts)?;
                for part in self.question.catalogue.parts().filter(|p| parts.contains(&p.id)) {
                    let lever = Lever::of_stock(part, part.stock.unwrap_or(0), self.most_pieces());
                    match self.along(&lever)? {
                        Holds(solved) => found.push((lever, solved)),
                        Fails => {}
                        Open => complete = false,
                    }
                }
            }
        }
        Ok(Nearest {
            levers: found,
            complete,
        })
    }

    /// The nearest place of a lever: one is found to hold, then the places between it and those that do not are
    /// halved. A build mostly holds nearer than where it was found, so the place just before it is asked in turn.
    fn along(&self, lever: &Lever) -> Result<Answer<Solved>, Disagreement> {
        let mut fails = 0;
        let mut probe = match self.somewhere(lever, &mut fails)? {
            Holds(probe) => probe,
            Fails => return Ok(Fails),
            Open => return Ok(Open),
        };
        let mut beside = true;
        while probe.enough - fails > 1 {
            let place = if beside {
                probe.enough - 1
            } else {
                fails + (probe.enough - fails) / 2
            };
            match self.probe(lever, place, fails)? {
                Holds(nearer) => (probe, beside) = (nearer, !beside),
                Fails => (fails, beside) = (place, false),
                Open => return Ok(Open),
            }
        }
        if probe.solved.place == probe.enough {
            return Ok(Holds(probe.solved));
        }
        // The audit has passed the build there; the search must find one too.
        match self.probe(lever, probe.enough, fails)? {
            Holds(nearer) => Ok(Holds(nearer.solved)),
            Open => Ok(Open),
            Fails => Err(Disagreement {
                build: probe.text,
                verdict: vec![format!(
                    "passes the audit with {} {}, where the search finds no build",
                    lever.requirement,
                    lever.text(probe.enough)
                )],
            }),
        }
    }

    /// A place that holds: the far end, or where that asks for too much of something else, one on the way to it.
    /// `fails` ends as the farthest place known not to hold before it.
    fn somewhere(&self, lever: &Lever, fails: &mut i64) -> Result<Answer<Probe>, Disagreement> {
        match self.probe(lever, lever.last, 0)? {
            Fails if lever.shape == Shape::Wavy => {}
            answer => return Ok(answer),
        }
        let mut place = 1;
        while place < lever.last {
            match self.probe(lever, place, *fails)? {
                Fails => *fails = place,
                answer => return Ok(answer),
            }
            place *= 4;
        }
        Ok(Fails)
    }

    /// Asks at a place of a lever. Builds are known to fail at `fails`.
    fn probe(&self, lever: &Lever, place: i64, fails: i64) -> Result<Answer<Probe>, Disagreement> {
        let (question, most) = (self.question, self.most);
        let solved = |value| Solved { place, value };
        match &lever.moves {
            Moves::Key(_) => {
                let Some(supply) = lever.supply(question.supply, place) else {
                    return Ok(Fails);
                };
                self.ask(&supply, question.catalogue, |value, build| {
                    let enough = nearest_of(fails, place, |nearer| {
                        let Some(supply) = lever.supply(question.supply, nearer) else {
                            return false;
                        };
                        let verdict = audit(&supply, build);
                        let value = match question.objective {
                            Objective::Cost => Some(verdict.cost.0),
                            Objective::Heat => verdict.heat_w.map(compared),
                        };
                        verdict.passes() && most.is_none_or(|most| value.is_some_and(|value| value <= most))
                    });
                    Probe {
                        solved: solved(value),
                        enough,
                        text: build.text().replace('\0', " "),
                    }
                })
            }
            Moves::Stock(id) => {
                #[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)] // whole numbers of the ladder
                let pieces = lever.value(place) as u64;
                let catalogue = restocked(question.catalogue, |p| if p.id == *id { Some(pieces) } else { p.stock });
                self.ask(question.supply, &catalogue, |value, build| {
                    let lines = build.lines(question.supply);
                    let qty: u64 = lines.iter().filter(|l| l.part.id == *id).map(|l| l.qty).sum();
                    #[allow(clippy::cast_precision_loss)] // both below 2^53
                    let need = (qty * question.supply.builds) as f64;
                    Probe {
                        solved: solved(value),
                        enough: nearest_of(fails, place, |nearer| lever.value(nearer) >= need),
                        text: build.text().replace('\0', " "),
                    }
                })
            }
        }
    }

    /// Solves a changed question; of a wanted build `make` is told the objective.
    fn ask<T>(
        &self,
        supply: &Supply,
        catalogue: &Catalogue,
        make: impl FnOnce(i64, &Build) -> T,
    ) -> Result<Answer<T>, Disagreement> {
        let question = Question {
            supply,
            catalogue,
            top: 1,
            most: self.most,
            objective: match (self.most, supply.caps.cost, supply.caps.heat_w) {
                (Some(_), ..) | (None, None, None) => self.question.objective,
                // Any build will do: the search ends where the cap on what it minimises is passed.
                (None, Some(_), _) => Objective::Cost,
                (None, None, Some(_)) => Objective::Heat,
            },
            ..self.question.clone()
        };
        if question.stop.now() {
            return Ok(Open);
        }
        let Outcome { builds, proof, .. } = optimise(&question)?;
        let value = |found: &crate::optimise::Found| found.key.objective(question.objective);
        Ok(match (builds.first(), proof, self.most) {
            // Its objective is the least only when proved.
            (Some(found), Proof::Proved, None) => Holds(make(value(found), &found.build)),
            (Some(found), Proof::Proved, Some(most)) if value(found) <= most => Holds(make(value(found), &found.build)),
            (_, Proof::Proved, _) => Fails,
            (Some(found), Proof::Open { .. }, None) => Holds(make(value(found), &found.build)),
            (_, Proof::Open { .. }, _) => Open,
        })
    }

    /// With unlimited stock of everything: all parts whose stock may stand in the way, and those of which one wanted
    /// build takes too many. `Fails`: stock is not what stands in the way.
    fn overdrawn(&self) -> Result<Answer<(Parts, Vec<PartId>)>, Disagreement> {
        let (question, most) = (self.question, self.most_pieces());
        let named = |part: &Part| question.with.iter().any(|&(id, _)| id == part.id);
        let limited = |p: &&Part| {
            p.stock.is_some_and(|stock| stock < most)
                && !question.without.contains(&p.id)
                && (p.status != Status::Withdrawn || named(p))
        };
        let limited: Parts = (question.catalogue.parts().filter(limited)).map(|p| p.id).collect();
        if limited.is_empty() {
            return Ok(Fails);
        }
        Ok(match self.without_limit(&limited)? {
            Holds(short) => Holds((limited, short)),
            Fails => Fails,
            Open => Open,
        })
    }

    /// Adds to `found` those of the parts of which more stock alone is enough; whether none was left open. Without limit
    /// on all of them there is a build, which takes too many of `short`. Parts are tried together: where no limit on any
    /// does not help, none alone does.
    fn short_parts(&self, mut among: Parts, short: &[PartId], found: &mut Parts) -> Result<bool, Disagreement> {
        let alone = match (short, among.first()) {
            (&[part], _) => Some(part),
            (_, Some(&part)) if among.len() == 1 => Some(part),
            _ => None,
        };
        let left = if let Some(part) = alone {
            found.insert(part);
            among.remove(&part);
            vec![among]
        } else {
            let middle = among.iter().nth(among.len() / 2).copied();
            let upper = middle.map(|middle| among.split_off(&middle));
            std::iter::once(among).chain(upper).collect()
        };
        let mut complete = true;
        for among in left.into_iter().filter(|among| !among.is_empty()) {
            match self.without_limit(&among)? {
                Holds(short) => complete &= self.short_parts(among, &short, found)?,
                Fails => {}
                Open => complete = false,
            }
        }
        Ok(complete)
    }

    /// With unlimited stock of these parts: those of them that the build takes too many of.
    fn without_limit(&self, parts: &Parts) -> Result<Answer<Vec<PartId>>, Disagreement> {
        let question = self.question;
        let stock = |p: &Part| if parts.contains(&p.id) { None } else { p.stock };
        let catalogue = restocked(question.catalogue, stock);
        let held: Vec<Option<u64>> = question.catalogue.parts().map(|p| p.stock).collect();
        self.ask(question.supply, &catalogue, |_, build| {
            (build.lines(question.supply).iter())
                .filter(|l| held[l.part.id.0 as usize].is_some_and(|held| l.qty * question.supply.builds > held))
                .map(|l| l.part.id)
                .collect()
        })
    }

    /// No run takes more pieces of one part: of a section four diodes or all cans, of a rail its two sinks.
    fn most_pieces(&self) -> u64 {
        self.most_of_a_unit() * self.question.supply.builds
    }

    fn most_of_a_unit(&self) -> u64 {
        let supply = self.question.supply;
        supply.rails.len() as u64 * u64::from(supply.caps.cans).max(4)
    }

    /// The largest run that is small enough. Between two sizes at which some stock suffices for one piece more in each
    /// unit, a smaller run is never better: prices per unit only rise. So only those sizes come into question, and a
    /// stretch of them can be ruled out at once by the stocks of its smallest at the prices of its largest.
    fn fewest_less(&self, lever: &Lever) -> Result<Answer<Solved>, Disagreement> {
        let builds = self.question.supply.builds;
        let mut places: BTreeSet<i64> = BTreeSet::new();
        for stock in self.question.catalogue.parts().filter_map(|p| p.stock) {
            let enough = (1..=self.most_of_a_unit()).map(|qty| stock / qty);
            places.extend(enough.filter(|&n| (1..builds).contains(&n)).map(|n| lever.place_below(n)));
        }
        let places: Vec<i64> = places.into_iter().filter(|&p| (1..=lever.last).contains(&p)).collect();
        let found = match self.among(lever, &places)? {
            Holds(solved) => solved,
            other => return Ok(other),
        };
        // One digit nearer must not hold: the proof says so, and it is solved all the same.
        match found.place {
            1 => Ok(Holds(found)),
            place => Ok(match self.probe(lever, place - 1, 0)? {
                Fails => Holds(found),
                Holds(probe) => Holds(probe.solved),
                Open => Open,
            }),
        }
    }

    /// The nearest of some places of a run that holds.
    #[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)] // whole numbers of the ladder
    fn among(&self, lever: &Lever, places: &[i64]) -> Result<Answer<Solved>, Disagreement> {
        let (Some(&near), Some(&far)) = (places.first(), places.last()) else {
            return Ok(Fails);
        };
        if near == far {
            return Ok(match self.probe(lever, near, 0)? {
                Holds(probe) => Holds(probe.solved),
                Fails => Fails,
                Open => Open,
            });
        }
        let (most, least) = (lever.value(near) as u64, lever.value(far) as u64);
        let Some(supply) = lever.supply(self.question.supply, near) else {
            return Ok(Fails);
        };
        let catalogue = restocked(self.question.catalogue, |p| Some((p.stock? / least.max(1)) * most));
        match self.ask(&supply, &catalogue, |_, _| ())? {
            Holds(()) => {}
            Fails => return Ok(Fails),
            Open => return Ok(Open),
        }
        let (nearer, farther) = places.split_at(places.len() / 2);
        match self.among(lever, nearer)? {
            Fails => self.among(lever, farther),
            answer => Ok(answer),
        }
    }
}

/// The nearest place after `fails` that holds, where `place` does; holding is taken to go on from there.
fn nearest_of(fails: i64, place: i64, holds: impl Fn(i64) -> bool) -> i64 {
    let (mut low, mut high) = (fails, place);
    while high - low > 1 {
        let middle = low + (high - low) / 2;
        if holds(middle) {
            high = middle;
        } else {
            low = middle;
        }
    }
    high
}
