//! Owns ranges with open and closed ends: the check and its wording come from one value.

/// Allowed numbers, in the unit of the column or key that has the range.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Range {
    low: f64,
    low_open: bool,
    high: f64,
    high_open: bool,
    zero: bool,
}

impl Range {
    /// `low` and more.
    #[must_use]
    pub const fn from(low: f64) -> Range {
        Range {
            low,
            low_open: false,
            high: f64::MAX,
            high_open: false,
            zero: true,
        }
    }

    /// More than `low`.
    #[must_use]
    pub const fn above(low: f64) -> Range {
        Range {
            low_open: true,
            ..Range::from(low)
        }
    }

    /// No more than `high`.
    #[must_use]
    pub const fn to(self, high: f64) -> Range {
        Range { high, ..self }
    }

    /// Less than `high`.
    #[must_use]
    pub const fn below(self, high: f64) -> Range {
        Range {
            high,
            high_open: true,
            ..self
        }
    }

    /// Anything in it but zero.
    #[must_use]
    pub const fn but_zero(self) -> Range {
        Range { zero: false, ..self }
    }

    /// Whether `value` is allowed; the ends are scaled by `si` as the value was, so that an end as written is inside.
    #[must_use]
    pub fn holds(&self, value: f64, si: impl Fn(f64) -> f64) -> bool {
        let (low, high) = (si(self.low), si(self.high));
        let above = if self.low_open { value > low } else { value >= low };
        let below = if self.high_open { value < high } else { value <= high };
        value.is_finite() && above && below && (self.zero || value.abs() > 0.0)
    }

    /// "above 0 up to 300 %", "0 to 200 dB", "-40 or more degC".
    #[must_use]
    pub fn words(&self, unit: &str) -> String {
        let low = match (self.low_open, self.high < f64::MAX) {
            (true, true) if self.high_open => format!("above {}", self.low),
            (true, true) => format!("above {} up", self.low),
            (true, false) => format!("above {}", self.low),
            (false, true) => format!("{}", self.low),
            (false, false) => format!("{} or more", self.low),
        };
        let high = match (self.high < f64::MAX, self.high_open) {
            (false, _) => String::new(),
            (true, true) if self.low_open => format!(" and below {}", self.high),
            (true, true) => format!(" to below {}", self.high),
            (true, false) => format!(" to {}", self.high),
        };
        let space = if unit.is_empty() { "" } else { " " };
        let zero = if self.zero { "" } else { ", not 0" };
        format!("{low}{high}{space}{unit}{zero}")
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ends_are_open_or_closed_as_worded() {
        let same = |x| x;
        for (range, inside, outside, words) in [
            (Range::from(0.0).to(200.0), [0.0, 200.0], [-0.1, 200.1], "0 to 200 V"),
            (
                Range::above(0.0).to(300.0),
                [0.1, 300.0],
                [0.0, 301.0],
                "above 0 up to 300 V",
            ),
            (
                Range::from(0.0).below(100.0),
                [0.0, 99.9],
                [-1.0, 100.0],
                "0 to below 100 V",
            ),
            (
                Range::above(0.0).below(5.0),
                [0.1, 4.9],
                [0.0, 5.0],
                "above 0 and below 5 V",
            ),
            (Range::from(1.0), [1.0, 1e300], [0.9, f64::INFINITY], "1 or more V"),
            (Range::above(0.0), [0.1, 1e300], [0.0, f64::NAN], "above 0 V"),
            (
                Range::from(-5.0).to(5.0).but_zero(),
                [-5.0, 5.0],
                [0.0, -0.0],
                "-5 to 5 V, not 0",
            ),
        ] {
            assert_eq!(range.words("V"), words);
            assert!(inside.iter().all(|x| range.holds(*x, same)), "{words}");
            assert!(outside.iter().all(|x| !range.holds(*x, same)), "{words}");
        }
    }
}
