//! Owns money: exact, so that "cheaper by one millionth" is provable and ties are ties.

use std::fmt;
use std::iter::Sum;
use std::ops::{Add, Mul};

/// Millionths of the catalogue's currency.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Money(pub i64);

impl Money {
    /// Millionths in one unit of the currency.
    pub const SCALE: i64 = 1_000_000;
    /// Highest price that a row may state (currency units): a run of 1e6 units of 1e3 pieces still fits an i64.
    pub const HIGHEST: i64 = 1_000_000;

    /// In units of the currency, for reports and JSON.
    #[must_use]
    #[allow(clippy::cast_precision_loss)]
    pub fn value(self) -> f64 {
        self.0 as f64 / Self::SCALE as f64
    }
}

impl Add for Money {
    type Output = Money;
    fn add(self, other: Money) -> Money {
        Money(self.0 + other.0)
    }
}

impl Mul<u64> for Money {
    type Output = Money;
    fn mul(self, pieces: u64) -> Money {
        Money(self.0 * pieces.cast_signed())
    }
}

impl Sum for Money {
    fn sum<I: Iterator<Item = Money>>(iter: I) -> Money {
        iter.fold(Money(0), Add::add)
    }
}

impl fmt::Display for Money {
    /// At least two decimals, and as many more as the amount has.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let sign = if self.0 < 0 { "-" } else { "" };
        let (whole, rest) = (
            self.0.unsigned_abs() / Self::SCALE.unsigned_abs(),
            self.0.unsigned_abs() % Self::SCALE.unsigned_abs(),
        );
        let decimals = format!("{rest:06}");
        let kept = decimals.trim_end_matches('0').len().max(2);
        f.pad(&format!("{sign}{whole}.{}", &decimals[..kept]))
    }
}
