//! Owns the charge on a cap that the objective does not see.
//!
//! With a cap on heat (or on cost, when heat is minimised) the cheapest builds are mostly too hot, and a bound on cost
//! alone cuts nothing. Charging l >= 0 for every unit of the capped quantity keeps a bound: a build with objective at
//! most T and the cap kept has first + l second <= T + l cap. The search goes by that score. l is chosen where the least
//! score less l cap is greatest (the dual of the cap); any l would be right. Without a cap l is 0.

use super::Question;
use super::best::Best;
use super::search::{Ground, Search};
use crate::screen::{Counts, Objective, Weights};

/// Steps in which the charge is found.
const STEPS: usize = 8;

/// What a search goes by.
#[derive(Debug, Clone, Copy)]
pub(super) struct Charge {
    /// Objective, and the charge on the other.
    pub(super) weights: Weights,
    /// The charge for the whole cap.
    pub(super) whole: f64,
}

/// The charge of a question; `None` when nothing can meet the cap.
pub(super) fn charge<'c>(
    ground: &Ground<'_, 'c>,
    question: &Question<'c>,
    best: &mut Best<'c>,
    counts: &mut Counts,
) -> Option<Charge> {
    let caps = &question.supply.caps;
    let cap = match question.objective {
        Objective::Cost => caps.heat_w,
        Objective::Heat => caps.cost,
    };
    let weights = |charge: f64| match question.objective {
        Objective::Cost => Weights {
            cost: 1.0,
            heat: charge,
        },
        Objective::Heat => Weights {
            cost: charge,
            heat: 1.0,
        },
    };
    let free = Charge {
        weights: weights(0.0),
        whole: 0.0,
    };
    let Some(cap) = cap else { return Some(free) };
    // The audit lets a cap pass by a rounding error; so must the bound.
    let cap = cap * 1e6 * (1.0 + 1e-8) + 2.0;
    // The least score by a weighting, and how much of the capped quantity its build takes.
    let mut look = |by: Weights, best: &mut Best<'c>| {
        let mut search = Search::start(ground, question, by, question.top == 1, counts);
        let cover = search.settle(counts);
        if !cover.is_empty() {
            search.offer_first(&cover, best, counts);
        }
        let second = search.second(&cover, question.objective);
        (search.base(), second)
    };
    let (first, taken) = look(weights(0.0), best);
    if question.stop.now() || taken <= cap || !first.is_finite() {
        return Some(free);
    }
    let (least, _) = look(Weights::of(question.objective.other()), best);
    if question.stop.now() {
        return Some(free);
    }
    if least > cap {
        return None;
    }
    let (mut low, mut high) = (0.0, f64::INFINITY);
    let mut at = first / cap;
    let mut chosen = (first, 0.0);
    for _ in 0..STEPS {
        let (score, taken) = look(weights(at), best);
        if question.stop.now() {
            break;
        }
        if score - at * cap > chosen.0 {
            chosen = (score - at * cap, at);
        }
        if taken > cap {
            low = at;
        } else {
            high = at;
        }
        at = if high.is_finite() { 0.5 * (low + high) } else { 4.0 * at };
    }
    Some(Charge {
        weights: weights(chosen.1),
        whole: chosen.1 * cap,
    })
}
