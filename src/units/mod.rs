//! Owns numbers with units: money, and quantities as people write them.

mod measure;
mod money;
mod quantity;
mod range;

pub use measure::{Measure, money, number_and_unit, whole};
pub use money::{Money, RunCost};
pub use quantity::Dimension;
pub use range::Range;

/// What is wrong with a text, and what is allowed: the part of a fault that does not depend on where the text stands.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Wrong {
    /// A short clause: "is not a number".
    pub problem: String,
    /// What is allowed or what to do.
    pub allowed: String,
}

impl Wrong {
    /// From both clauses.
    #[must_use]
    pub fn new(problem: impl Into<String>, allowed: impl Into<String>) -> Wrong {
        Wrong {
            problem: problem.into(),
            allowed: allowed.into(),
        }
    }
}

/// Watts as they are compared: whole microwatts, so that ties are ties.
#[must_use]
#[allow(clippy::cast_possible_truncation)] // below 2^53
pub fn microwatts(watts: f64) -> i64 {
    (watts * 1e6).round() as i64
}
