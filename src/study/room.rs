//! Owns the roomiest build: of all whose objective is within a share of the best, the one whose tightest limit has the
//! most room.

use crate::audit::audit;
use crate::optimise::{Disagreement, Found, Proof, Question, optimise};
use crate::screen::Counts;
use crate::units::Wrong;

/// A share of the best objective, exact to a thousand-millionth.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Share(i64);

/// Parts of a [`Share`] in one.
const ONE: i64 = 1_000_000_000;

impl Share {
    /// From a fraction.
    ///
    /// # Errors
    /// When it is not from 0 to 1.
    #[allow(clippy::cast_possible_truncation, clippy::cast_precision_loss)] // at most 1e9
    pub fn new(fraction: f64) -> Result<Share, Wrong> {
        if (0.0..=1.0).contains(&fraction) {
            Ok(Share((fraction * ONE as f64).round() as i64))
        } else {
            Err(Wrong::new("is out of range", "allowed: 0 to 100 %"))
        }
    }

    /// As a fraction.
    #[must_use]
    #[allow(clippy::cast_precision_loss)] // at most 1e9
    pub fn value(self) -> f64 {
        self.0 as f64 / ONE as f64
    }

    /// The highest objective within this share of the best.
    #[must_use]
    pub fn above(self, best: i64) -> i64 {
        let more = i128::from(best) * i128::from(self.0) / i128::from(ONE);
        best.saturating_add(i64::try_from(more).unwrap_or(i64::MAX))
    }
}

/// The roomiest build.
#[derive(Debug, Clone)]
pub struct Room<'c> {
    /// It.
    pub found: Found<'c>,
    /// Its least tightness.
    pub tightness: f64,
    /// Whether it is proved that none has more room.
    pub proved: bool,
    /// Work done.
    pub counts: Counts,
}

/// Looks for room from the best build on, whose key is proved to be the least: the best build with more room than the
/// last one is asked for until there is none. Of builds with equal room that gives the one with the least key.
///
/// # Errors
/// When search and audit disagree: a bug to report.
pub fn roomiest<'c>(question: &Question<'c>, best: Found<'c>, share: Share) -> Result<Room<'c>, Disagreement> {
    let most = share.above(best.key.objective(question.objective));
    let room_of = |found: &Found| {
        let tightest = audit(question.supply, &found.build)
            .tightest()
            .map(|m| m.check.tightness());
        tightest.unwrap_or(f64::INFINITY)
    };
    let mut room = Room {
        tightness: room_of(&best),
        found: best,
        proved: true,
        counts: Counts::default(),
    };
    // No build has so much; the steps grow until there is such a figure, then shrink again.
    let mut none_at = f64::INFINITY;
    let mut step = FIRST_STEP;
    while room.tightness < f64::INFINITY {
        let beside = room.tightness.next_up();
        let asked = if step < LAST_STEP || none_at <= beside {
            beside
        } else {
            beside.max((room.tightness + step).min(0.5 * (room.tightness + none_at)))
        };
        let outcome = optimise(&Question {
            top: 1,
            most: Some(most),
            tightness: asked,
            ..question.clone()
        })?;
        room.counts.add(&outcome.counts);
        match (outcome.builds.into_iter().next(), outcome.proof) {
            (Some(found), Proof::Proved) => {
                room.tightness = room_of(&found);
                if room.tightness < asked {
                    return Err(Disagreement {
                        build: found.build.text().replace('\0', " "),
                        verdict: vec![format!("tightness {} where {asked} was asked for", room.tightness)],
                    });
                }
                room.found = found;
                step *= 2.0;
            }
            (None, Proof::Proved) if asked <= beside => break,
            (None, Proof::Proved) => {
                none_at = asked;
                step = 0.5 * (none_at - room.tightness);
            }
            (_, Proof::Open { .. }) => {
                room.proved = false;
                break;
            }
        }
    }
    Ok(room)
}

/// By how much more room is asked for at first, and below which steps the next build is asked for whatever it has.
const FIRST_STEP: f64 = 0.01;
const LAST_STEP: f64 = 1e-3;

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_share_is_exact() {
        let above = |per_cent: f64, best| Share::new(per_cent / 100.0).unwrap().above(best);
        assert_eq!(above(2.0, 11_840_000), 12_076_800);
        assert_eq!(above(29.0, 100), 129);
        assert_eq!(above(0.0, 7), 7);
        assert_eq!(above(0.5, 199), 199);
        assert_eq!(above(100.0, 5_000_000_000_000), 10_000_000_000_000);
        assert!(Share::new(-0.01).is_err() && Share::new(1.01).is_err() && Share::new(f64::NAN).is_err());
    }
}
