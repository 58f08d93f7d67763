//! Owns the search along one lever: the nearest place at which there is a wanted build, each probe a solved optimum.

use super::lever::{Lever, Moves, restocked};
use crate::audit::{audit, compared};
use crate::build::{Build, misfits};
use crate::catalogue::{Catalogue, PartId};
use crate::optimise::{Disagreement, Found, Outcome, Proof, Question, optimise};
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

/// A place of a lever that was solved.
#[derive(Clone, Copy)]
pub(super) struct Solved {
    pub(super) place: i64,
    /// The least objective there.
    pub(super) value: i64,
}

/// A place at which a build passes the audit, and where it was solved, if the search has been asked there.
pub(super) struct Passing {
    pub(super) place: i64,
    pub(super) solved: Option<Solved>,
    /// The build, written out.
    pub(super) text: String,
}

impl Wish<'_, '_> {
    /// The nearest place of a lever, from one that holds; none before `fails` and there does. The place just before is
    /// asked and the places between are halved by turns: few builds come into question, and each mostly holds nearer
    /// than where it was found.
    pub(super) fn nearest(&self, lever: &Lever, from: Passing, fails: i64) -> Result<Answer<Solved>, Disagreement> {
        let (mut passing, mut fails) = (from, fails);
        let mut beside = true;
        while passing.place - fails > 1 {
            let place = if beside {
                passing.place - 1
            } else {
                fails + (passing.place - fails) / 2
            };
            match self.probe(lever, place, fails)? {
                Holds(nearer) => (passing, beside) = (nearer, !beside),
                Fails => (fails, beside) = (place, true),
                Open => return Ok(Open),
            }
        }
        if let Some(solved) = passing.solved.filter(|solved| solved.place == passing.place) {
            return Ok(Holds(solved));
        }
        // The audit has passed the build there; the search must find one too.
        match self.probe(lever, passing.place, fails)? {
            Holds(Passing {
                solved: Some(solved), ..
            }) => Ok(Holds(solved)),
            Open => Ok(Open),
            Holds(_) | Fails => Err(Disagreement {
                build: passing.text,
                verdict: vec![format!(
                    "passes the audit with {} {}, where the search finds no build",
                    lever.requirement,
                    lever.text(passing.place)
                )],
            }),
        }
    }

    /// Asks at a place of a lever; the answer may pass nearer, but not at `fails` or before.
    pub(super) fn probe(&self, lever: &Lever, place: i64, fails: i64) -> Result<Answer<Passing>, Disagreement> {
        let question = self.question;
        let make = |found: &Found, objective| {
            let value = found.key.objective(objective);
            Passing {
                place: self.passes_from(lever, &found.build, fails, place).unwrap_or(place),
                solved: Some(Solved { place, value }),
                text: written(&found.build),
            }
        };
        match lever.moves {
            Moves::Key(_) => match lever.supply(question.supply, place) {
                Some(supply) => self.ask(&supply, question.catalogue, make),
                None => Ok(Fails),
            },
            Moves::Stock(id) => {
                let catalogue = restocked(question.catalogue, |part| {
                    if part.id == id {
                        Some(lever.count(place))
                    } else {
                        part.stock
                    }
                });
                self.ask(question.supply, &catalogue, make)
            }
        }
    }

    /// The nearest place after `fails` from which on a build is a wanted one with this lever alone; `None`: not even at
    /// `place`.
    pub(super) fn passes_from(&self, lever: &Lever, build: &Build, fails: i64, place: i64) -> Option<i64> {
        let supply = self.question.supply;
        let short = self.short(build);
        let holds = |place: i64| match lever.moves {
            Moves::Key(_) => {
                let changed = lever.supply(supply, place);
                changed.is_some_and(|supply| self.short_in(&supply, build).is_empty() && self.wanted(&supply, build))
            }
            Moves::Stock(id) => short
                .iter()
                .all(|&(part, need)| part == id && lever.count(place) >= need),
        };
        // Of more stock the audit says nothing more.
        if !holds(place) || matches!(lever.moves, Moves::Stock(_)) && !self.wanted(supply, build) {
            return None;
        }
        let (mut low, mut high) = (fails, place);
        while high - low > 1 {
            let middle = low + (high - low) / 2;
            if holds(middle) {
                high = middle;
            } else {
                low = middle;
            }
        }
        Some(high)
    }

    /// Whether a build passes, with the stocks of its own parts, and is as good as wanted.
    fn wanted(&self, supply: &Supply, build: &Build) -> bool {
        let verdict = audit(supply, build);
        let value = match self.question.objective {
            Objective::Cost => Some(verdict.cost.0),
            Objective::Heat => verdict.heat_w.map(compared),
        };
        verdict.passes()
            && misfits(supply, build).is_empty()
            && self.most.is_none_or(|most| value.is_some_and(|value| value <= most))
    }

    /// The parts of which a build takes more than the question's catalogue has, with the pieces that it takes.
    fn short(&self, build: &Build) -> Vec<(PartId, u64)> {
        self.short_in(self.question.supply, build)
    }

    fn short_in(&self, supply: &Supply, build: &Build) -> Vec<(PartId, u64)> {
        let held: Vec<Option<u64>> = self.question.catalogue.parts().map(|p| p.stock).collect();
        (build.lines(supply).iter())
            .map(|line| (line.part.id, line.qty * supply.builds))
            .filter(|&(part, need)| held[part.0 as usize].is_some_and(|held| need > held))
            .collect()
    }

    /// Solves a changed question; `make` is told of a wanted build and what it was chosen by.
    pub(super) fn ask<T>(
        &self,
        supply: &Supply,
        catalogue: &Catalogue,
        make: impl FnOnce(&Found, Objective) -> T,
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
        let good = |found: &&Found| {
            self.most
                .is_none_or(|most| found.key.objective(question.objective) <= most)
        };
        Ok(match (builds.first().filter(good), proof) {
            (Some(found), Proof::Proved) => Holds(make(found, question.objective)),
            // How good the best one is remains open, which matters only where that is asked.
            (Some(found), Proof::Open { .. }) if self.most.is_none() => Holds(make(found, question.objective)),
            (None, Proof::Proved) => Fails,
            (_, Proof::Open { .. }) => Open,
        })
    }
}

/// A build in one line.
pub(super) fn written(build: &Build) -> String {
    build.text().replace('\0', " ")
}
