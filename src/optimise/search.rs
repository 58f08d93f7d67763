//! Owns the exact search: one column for each rail, with prices, stock and caps over the whole supply.
//!
//! Deepening: every rail's walk is asked for the columns that can take part in a build with an objective of at most T;
//! all their combinations up to T are searched; T rises until it has passed the N-th best build. What T has passed is
//! proved, so a search that is stopped still has a true bound.

use super::Question;
use super::best::Best;
use super::columns::{RailColumns, Ready};
use super::combine::Combine;
use super::tighten::tighten;
use crate::audit::{Site, whole};
use crate::screen::{Counts, Must, Objective};
use crate::units::Money;

/// T starts at the least that any build can have and first rises by this share of it, then by twice as much each time.
const FIRST_STEP: i64 = 64;

/// How a search ended.
pub(super) enum End {
    /// Nothing is left that could enter the list.
    Complete,
    /// Stopped; no build that was not looked at has an objective below the bound.
    Stopped { bound: i64 },
}

/// Searches one placement of the demanded parts.
pub(super) fn search<'c>(
    site: &Site<'c>,
    question: &Question<'c>,
    must: &Must,
    best: &mut Best<'c>,
    counts: &mut Counts,
) -> End {
    let stop = &question.stop;
    let mut rails = RailColumns::start(site, question, must, counts);
    let mut least = Vec::new();
    for rail in &mut rails {
        rail.one_more(i64::MAX, stop, counts);
        match rail.ready.first() {
            Some(first) => least.push(first.key.0),
            // Whoever stopped the walk before its first column has proved nothing.
            None if stop.now() => return End::Stopped { bound: 0 },
            None => return End::Complete,
        }
    }
    let base: i64 = least.iter().sum();
    let parts = question.catalogue.parts().count();
    let mut passed = base - 1;
    let mut reach = base;
    let mut step = (base / FIRST_STEP).max(1);
    loop {
        if let Some(worst) = best.worst() {
            reach = reach.min(worst.0.max(base));
        }
        for (rail, least) in rails.iter_mut().zip(&least) {
            rail.extend(reach - (base - least), stop, counts);
        }
        let ready: Vec<&[Ready]> = rails.iter().map(|rail| rail.ready.as_slice()).collect();
        let kept = match question.objective {
            Objective::Cost => tighten(&ready, parts, question.supply.builds, reach),
            Objective::Heat => ready
                .iter()
                .map(|r| (0..r.len()).map(|i| (i, r[i].key.0)).collect())
                .collect(),
        };
        if stop.now() || !Combine::new(question, &ready, &kept, best, counts, parts, reach).all() {
            return End::Stopped { bound: passed + 1 };
        }
        passed = reach;
        let found = best.worst().is_some_and(|worst| worst.0 <= reach);
        let next = rails
            .iter()
            .zip(&least)
            .filter_map(|(rail, least)| Some(rail.walk.floor()?.0 + base - least))
            .min();
        match next {
            Some(next) if !found && !beyond_cap(question, reach) => reach = (reach + step).max(next),
            _ => return End::Complete,
        }
        step *= 2;
    }
}

/// Whether the supply's cap on the objective rules out everything above this.
#[allow(clippy::cast_precision_loss)]
fn beyond_cap(question: &Question, passed: i64) -> bool {
    let cap = match question.objective {
        Objective::Cost => whole::cost(question.supply, Money(passed)),
        Objective::Heat => whole::heat(question.supply, Ok((passed - 1) as f64 * 1e-6)),
    };
    cap.is_some_and(|c| !c.met())
}
