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
    /// Highest price that a row may state (currency units): a unit of a million pieces still fits an i64.
    pub const HIGHEST: i64 = 1_000_000;

    /// In units of the currency, for reports and JSON.
    #[must_use]
    #[allow(clippy::cast_precision_loss)]
    pub fn value(self) -> f64 {
        self.0 as f64 / Self::SCALE as f64
    }
}

impl Money {
    /// Cost of so many pieces at once; a whole run may outgrow an i64.
    #[must_use]
    pub fn of_run(self, pieces: u64) -> RunCost {
        RunCost(i128::from(self.0) * i128::from(pieces))
    }
}

/// Cost of a whole run, millionths of the currency.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, PartialOrd, Ord)]
pub struct RunCost(pub i128);

impl Sum for RunCost {
    fn sum<I: Iterator<Item = RunCost>>(iter: I) -> RunCost {
        RunCost(iter.map(|cost| cost.0).sum())
    }
}

impl fmt::Display for RunCost {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.pad(&written(self.0))
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
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.pad(&written(i128::from(self.0)))
    }
}

/// At least two decimals, and as many more as the amount has.
fn written(millionths: i128) -> String {
    let sign = if millionths < 0 { "-" } else { "" };
    let scale = u128::from(Money::SCALE.unsigned_abs());
    let (whole, rest) = (millionths.unsigned_abs() / scale, millionths.unsigned_abs() % scale);
    let decimals = format!("{rest:06}");
    let kept = decimals.trim_end_matches('0').len().max(2);
    format!("{sign}{whole}.{}", &decimals[..kept])
}
