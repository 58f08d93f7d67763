//! Owns the values that a relaxed requirement may take: decimal numbers of three significant digits, in their order.
//!
//! Rungs are counted from zero, so that "one digit nearer" is the next rung, and bisection is over whole numbers. Near
//! zero three significant digits never end; there a ladder goes on in equal steps down to zero.

/// All numbers n times ten to some power with |n| below 1000, no finer than ten to the power `fine`.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Ladder {
    fine: i32,
}

/// Highest and, negated, lowest rung that is ever asked for: more than twenty powers of ten.
const END: i64 = 20_000;
/// Powers of ten between the last digit of a value's own three and the finest step.
const FINER: i32 = 5;

impl Ladder {
    /// Of whole numbers.
    pub(super) const WHOLE: Ladder = Ladder { fine: 0 };

    /// With steps some powers of ten finer than the third digit of `value`.
    pub(super) fn around(value: f64) -> Ladder {
        let written = format!("{:e}", value.abs());
        let power = written.split_once('e').and_then(|(_, power)| power.parse::<i32>().ok());
        Ladder {
            fine: power.unwrap_or(0) - 2 - FINER,
        }
    }

    /// The number on a rung, as people write it.
    pub(super) fn text(self, rung: i64) -> String {
        let size = rung.abs();
        let (digits, decades) = if size < 1000 {
            (size, 0)
        } else {
            (100 + (size - 1000) % 900, 1 + (size - 1000) / 900)
        };
        let sign = if rung < 0 { "-" } else { "" };
        let power = i64::from(self.fine) + decades;
        format!("{sign}{}", plain(digits, power))
    }

    /// The number on a rung.
    pub(super) fn value(self, rung: i64) -> f64 {
        self.text(rung).parse().unwrap_or(f64::NAN)
    }

    /// The lowest rung that is above a value, or (`up` false) the highest one below it.
    pub(super) fn next(self, value: f64, up: bool) -> i64 {
        if up {
            -self.first(|rung| self.value(-rung) <= value) + 1
        } else {
            self.first(|rung| self.value(rung) >= value) - 1
        }
    }

    /// The lowest rung of which something holds that holds of all higher ones.
    fn first(self, holds: impl Fn(i64) -> bool) -> i64 {
        let (mut low, mut high) = (-END, END);
        while low < high {
            let middle = (low + high).div_euclid(2);
            if holds(middle) {
                high = middle;
            } else {
                low = middle + 1;
            }
        }
        low
    }
}

/// A decimal number without exponent and without zeros at the end of its decimals.
fn plain(digits: i64, power: i64) -> String {
    let Ok(power) = usize::try_from(-power) else {
        let zeros = if digits == 0 { 0 } else { power.unsigned_abs() };
        return format!("{digits}{}", "0".repeat(usize::try_from(zeros).unwrap_or(0)));
    };
    if power == 0 {
        return digits.to_string();
    }
    let padded = format!("{digits:0>width$}", width = power + 1);
    let (whole, decimals) = padded.split_at(padded.len() - power);
    let decimals = decimals.trim_end_matches('0');
    if decimals.is_empty() {
        whole.to_owned()
    } else {
        format!("{whole}.{decimals}")
    }
}

#[cfg(test)]
#[allow(clippy::float_cmp)] // Texts of the ladder read back as themselves.
mod tests {
    use super::*;

    #[test]
    fn rungs_rise_and_read_back() {
        for ladder in [Ladder::WHOLE, Ladder::around(50.0), Ladder::around(0.005)] {
            for rung in -6000..6000 {
                assert!(ladder.value(rung) < ladder.value(rung + 1), "{rung}");
                let digits = ladder.text(rung).replace(['-', '.'], "");
                assert!(digits.trim_matches('0').len() <= 3, "{}", ladder.text(rung));
                assert_eq!(ladder.next(ladder.value(rung), true), rung + 1);
                assert_eq!(ladder.next(ladder.value(rung), false), rung - 1);
            }
        }
    }

    #[test]
    fn neighbours_are_one_digit_away() {
        let steps = |value: f64, up: bool| {
            let ladder = Ladder::around(value);
            ladder.text(ladder.next(value, up))
        };
        for (value, up, text) in [
            (50.0, false, "49.9"),
            (50.0, true, "50.1"),
            (10.0, false, "9.99"),
            (5.0, true, "5.01"),
            (1.234, true, "1.24"),
            (1.234, false, "1.23"),
            (-7.0, false, "-7.01"),
            (0.25, false, "0.249"),
            (20_000.0, false, "19900"),
            (0.0, false, "-0.0000001"),
            (999.0, true, "1000"),
        ] {
            assert_eq!(steps(value, up), text);
        }
        assert_eq!(Ladder::WHOLE.text(Ladder::WHOLE.next(1234.0, false)), "1230");
        assert_eq!(Ladder::WHOLE.text(Ladder::WHOLE.next(3.0, true)), "4");
    }
}
