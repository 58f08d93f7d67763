//! Owns the columns that one round may combine, and the charge on the cap that the objective does not see.
//!
//! With a cap on heat (or on cost, when heat is minimised) the cheapest columns are mostly too hot, and a bound on cost
//! alone cuts nothing. Charging l >= 0 for every unit of the capped quantity keeps a bound: a build with objective at
//! most T and the cap kept has
//!
//! ```text
//! sum over rails of (first + l second) <= T + l cap
//! ```
//!
//! so whatever exceeds that with the least (first + l second) of the other rails can go. l is chosen where the least
//! sum less l cap is greatest (the dual of the cap); any l would be right. Without a cap l is 0.

use super::Question;
use super::columns::Ready;
use crate::screen::Objective;

/// A column that may take part.
#[derive(Debug, Clone, Copy)]
pub(super) struct Kept {
    /// Its place among the ready ones.
    pub(super) place: usize,
    /// Least share of the cost.
    pub(super) floor: i64,
    /// First part of its key plus the charge, in millionths.
    pub(super) score: f64,
}

/// What one round combines.
pub(super) struct Pool {
    /// By rail, scores rising.
    pub(super) by_rail: Vec<Vec<Kept>>,
    /// Charge for each unit of the capped quantity.
    pub(super) charge: f64,
    /// The cap, in millionths.
    pub(super) cap: f64,
}

/// Rounding of sums of scores, in millionths: a bound may let through what fails, never the reverse.
pub(super) const SCORE_SLACK: f64 = 2.0;

impl Pool {
    /// From the columns left by the bound on cost, for builds with an objective of at most `most`.
    pub(super) fn new(question: &Question, ready: &[&[Ready]], kept: Vec<Vec<(usize, i64)>>, most: i64) -> Pool {
        let caps = &question.supply.caps;
        let cap = match question.objective {
            Objective::Cost => caps.heat_w,
            Objective::Heat => caps.cost,
        };
        // The audit lets a cap pass by a rounding error; so must the bound.
        let cap = cap.map(|cap| cap * 1e6 * (1.0 + 1e-8) + SCORE_SLACK);
        let mut by_rail: Vec<Vec<Kept>> = (kept.into_iter())
            .map(|kept| {
                kept.into_iter()
                    .map(|(place, floor)| Kept {
                        place,
                        floor,
                        score: 0.0,
                    })
                    .collect()
            })
            .collect();
        let two = |rail: usize, kept: &Kept| two_parts(question.objective, &ready[rail][kept.place], kept.floor);
        let mut charge = 0.0;
        if let Some(cap) = cap {
            let pairs: Vec<Vec<(f64, f64)>> = (by_rail.iter().enumerate())
                .map(|(rail, kept)| kept.iter().map(|k| two(rail, k)).collect())
                .collect();
            charge = best_charge(&pairs, cap);
        }
        for (rail, kept) in by_rail.iter_mut().enumerate() {
            for k in kept.iter_mut() {
                let (first, second) = two(rail, k);
                k.score = first + charge * second;
            }
            kept.sort_by(|a, b| a.score.total_cmp(&b.score).then(a.place.cmp(&b.place)));
        }
        let mut pool = Pool {
            by_rail,
            charge,
            cap: cap.unwrap_or(0.0),
        };
        let limit = pool.limit(most);
        let least: Vec<f64> = pool
            .by_rail
            .iter()
            .map(|kept| kept.first().map_or(f64::INFINITY, |k| k.score))
            .collect();
        let all: f64 = least.iter().sum();
        for (kept, least) in pool.by_rail.iter_mut().zip(least) {
            let within = kept.partition_point(|k| all - least + k.score <= limit);
            kept.truncate(within);
        }
        pool
    }

    /// Largest sum of scores of a build with an objective of at most `most`.
    #[allow(clippy::cast_precision_loss)]
    pub(super) fn limit(&self, most: i64) -> f64 {
        most as f64 + self.charge * self.cap + SCORE_SLACK
    }

    /// Score of what is decided already.
    #[allow(clippy::cast_precision_loss)]
    pub(super) fn score(&self, objective: Objective, cost: i64, heat_w: f64) -> f64 {
        let (first, second) = match objective {
            Objective::Cost => (cost as f64, heat_w * 1e6),
            Objective::Heat => (heat_w * 1e6, cost as f64),
        };
        first + self.charge * second
    }
}

#[allow(clippy::cast_precision_loss)]
fn two_parts(objective: Objective, ready: &Ready, floor: i64) -> (f64, f64) {
    match objective {
        Objective::Cost => (floor as f64, ready.heat_w * 1e6),
        Objective::Heat => (ready.heat_w * 1e6, floor as f64),
    }
}

/// Where the least charged sum less the charge on the cap is greatest; it is concave in the charge.
fn best_charge(pairs: &[Vec<(f64, f64)>], cap: f64) -> f64 {
    let value = |charge: f64| -> f64 {
        let least = |rail: &Vec<(f64, f64)>| rail.iter().map(|(a, b)| a + charge * b).fold(f64::INFINITY, f64::min);
        pairs.iter().map(least).sum::<f64>() - charge * cap
    };
    let mut high = 1.0;
    // Doubling until the value falls; a cap that nothing meets makes it rise for ever.
    while high < 1e6 && value(2.0 * high) > value(high) {
        high *= 2.0;
    }
    high *= 2.0;
    let mut low = 0.0;
    for _ in 0..40 {
        let (a, b) = (low + (high - low) / 3.0, high - (high - low) / 3.0);
        if value(a) < value(b) {
            low = a;
        } else {
            high = b;
        }
    }
    let middle = 0.5 * (low + high);
    if value(middle) > value(0.0) { middle } else { 0.0 }
}
