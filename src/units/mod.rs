//! Owns numbers with units: money, and quantities as people write them.

mod money;

pub use money::Money;

/// Watts as they are compared: whole microwatts, so that ties are ties.
#[must_use]
#[allow(clippy::cast_possible_truncation)] // below 2^53
pub fn microwatts(watts: f64) -> i64 {
    (watts * 1e6).round() as i64
}
