//! Owns the reading of one value: a quantity in its range, money, a count.

use super::quantity::{Decimal, decimal};
use super::{Dimension, Money, Range, Wrong};

/// Highest count of anything: pieces, builds.
const MOST: u64 = 1_000_000_000;

/// A quantity that a column or key takes: dimension, unit of a number alone, range in that unit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Measure {
    /// What it is.
    pub dimension: Dimension,
    /// The unit of a number alone, "" for a plain number.
    pub unit: &'static str,
    /// What is allowed, in that unit.
    pub range: Range,
}

impl Measure {
    /// From its three parts.
    #[must_use]
    pub const fn new(dimension: Dimension, unit: &'static str, range: Range) -> Measure {
        Measure { dimension, unit, range }
    }

    /// A plain number.
    #[must_use]
    pub const fn plain(range: Range) -> Measure {
        Measure::new(Dimension::Number, "", range)
    }

    /// Reads a cell: a number alone is in the column's unit; letter codes stand for capacitance and resistance.
    ///
    /// # Errors
    /// What is wrong with it and what is allowed.
    pub fn cell(&self, text: &str) -> Result<f64, Wrong> {
        let text = text.trim();
        if let Some((digits, power)) = letter_code(text, self.dimension) {
            let number = Decimal {
                mantissa: &digits,
                exponent: 0,
            };
            return self.within(&number, (power, 1.0));
        }
        match self.split(text)? {
            (number, "") => self.within(&number, self.own_scale()),
            (number, unit) => self.with_unit(&number, unit),
        }
    }

    /// Reads a key of a supply file: the unit must be written.
    ///
    /// # Errors
    /// What is wrong with it and what is allowed.
    pub fn written(&self, text: &str) -> Result<f64, Wrong> {
        let text = text.trim();
        match self.split(text)? {
            (number, "") if self.dimension == Dimension::Number => self.within(&number, self.own_scale()),
            (_, "") => Err(Wrong::new("has no unit", format!("write \"{text} {}\"", self.unit))),
            (number, unit) => self.with_unit(&number, unit),
        }
    }

    /// "above 0 up to 300 %".
    #[must_use]
    pub fn words(&self) -> String {
        self.range.words(self.unit)
    }

    fn split<'a>(&self, text: &'a str) -> Result<(Decimal<'a>, &'a str), Wrong> {
        no_comma(text)?;
        let (number, rest) = decimal(text).ok_or_else(|| {
            Wrong::new(
                "is not a number",
                format!("{}: {}", self.dimension.noun(), self.words()),
            )
        })?;
        Ok((number, rest.trim_start()))
    }

    fn with_unit(&self, number: &Decimal<'_>, unit: &str) -> Result<f64, Wrong> {
        let scale = self.dimension.scale(unit).ok_or_else(|| {
            let noun = self.dimension.noun();
            if self.dimension == Dimension::Number {
                return Wrong::new("is not a number", format!("{noun}: {}", self.words()));
            }
            Wrong::new(
                format!("is not {noun}"),
                format!("its unit is one of {}", self.dimension.symbols()),
            )
        })?;
        self.within(number, scale)
    }

    fn within(&self, number: &Decimal<'_>, (power, factor): (i32, f64)) -> Result<f64, Wrong> {
        let (own_power, own_factor) = self.own_scale();
        let si = |end: f64| {
            let text = end.to_string();
            let end = Decimal {
                mantissa: &text,
                exponent: 0,
            };
            end.times_ten_to(own_power).unwrap_or(f64::MAX) * own_factor
        };
        let value = number.times_ten_to(power).map(|x| x * factor);
        value
            .filter(|x| self.range.holds(*x, si))
            .ok_or_else(|| Wrong::new("is out of range", format!("allowed: {}", self.words())))
    }

    fn own_scale(&self) -> (i32, f64) {
        self.dimension.scale(self.unit).unwrap_or((0, 1.0))
    }
}

/// Number and unit of a quantity as it is written, the number in that unit; `None` where no number begins it.
#[must_use]
pub fn number_and_unit(text: &str) -> Option<(f64, &str)> {
    let (number, unit) = decimal(text.trim())?;
    Some((number.times_ten_to(0)?, unit.trim_start()))
}

/// An IEC 60062 code: the letter stands for the point and for the power of ten. Gives the digits with a point.
fn letter_code(text: &str, dimension: Dimension) -> Option<(String, i32)> {
    let (at, letter) = text.char_indices().find(|(_, c)| !c.is_ascii_digit())?;
    let power = match (dimension, letter) {
        (Dimension::Capacitance, 'p') => -12,
        (Dimension::Capacitance, 'n') => -9,
        (Dimension::Capacitance, 'u' | '\u{B5}' | '\u{3BC}') => -6,
        (Dimension::Capacitance, 'm') => -3,
        (Dimension::Resistance, 'R') => 0,
        (Dimension::Resistance, 'K' | 'k') => 3,
        (Dimension::Resistance, 'M') => 6,
        _ => return None,
    };
    let (whole, decimals) = (&text[..at], &text[at + letter.len_utf8()..]);
    let digits = decimals.bytes().all(|b| b.is_ascii_digit()) && whole.len() + decimals.len() > 0;
    digits.then(|| (format!("{whole}.{decimals}"), power))
}

/// Reads a price or a cost: exact, so no exponent and no more decimals than money has.
///
/// # Errors
/// What is wrong with it and what is allowed.
pub fn money(text: &str) -> Result<Money, Wrong> {
    let text = text.trim();
    no_comma(text)?;
    let allowed = || {
        format!(
            "an amount from 0 to {}, at most 6 decimals, without a currency sign",
            Money::HIGHEST
        )
    };
    let (whole, decimals) = text.split_once('.').unwrap_or((text, ""));
    let digits = |s: &str| s.bytes().all(|b| b.is_ascii_digit());
    let unsigned = whole.strip_prefix(['-', '+']).unwrap_or(whole);
    if !digits(unsigned) || !digits(decimals) || unsigned.len() + decimals.len() == 0 {
        return Err(Wrong::new("is not an amount", allowed()));
    }
    if decimals.len() > 6 {
        return Err(Wrong::new("has more than 6 decimals", allowed()));
    }
    let millionths: Option<i64> = format!("{unsigned}{decimals:0<6}").parse().ok();
    let sign = if whole.starts_with('-') { -1 } else { 1 };
    millionths
        .map(|m| Money(m * sign))
        .filter(|m| (0..=Money::HIGHEST * Money::SCALE).contains(&m.0))
        .ok_or_else(|| Wrong::new("is out of range", allowed()))
}

/// Reads a count from `least` to `most` (at most a thousand million).
///
/// # Errors
/// What is wrong with it and what is allowed.
pub fn whole(text: &str, least: u64, most: u64) -> Result<u64, Wrong> {
    let text = text.trim();
    let most = most.min(MOST);
    let allowed = format!("a whole number from {least} to {most}");
    let unsigned = text.strip_prefix(['-', '+']).unwrap_or(text);
    if unsigned.is_empty() || !unsigned.bytes().all(|b| b.is_ascii_digit()) {
        return Err(Wrong::new("is not a whole number", allowed));
    }
    (text.parse().ok())
        .filter(|n| (least..=most).contains(n))
        .ok_or_else(|| Wrong::new("is out of range", allowed))
}

/// A comma is never stripped: "9,99" would become 999, and "1,355" has two meanings.
fn no_comma(text: &str) -> Result<(), Wrong> {
    if text.contains(',') {
        return Err(Wrong::new(
            "has a comma",
            "write a decimal comma as a point, thousands without separator",
        ));
    }
    Ok(())
}

#[cfg(test)]
#[allow(clippy::float_cmp)] // Scaling is exact by design: equal quantities are equal bits.
mod tests {
    use super::*;

    const UF: Measure = Measure::new(Dimension::Capacitance, "uF", Range::above(0.0).to(1e8));
    const MOHM: Measure = Measure::new(Dimension::Resistance, "mohm", Range::from(0.0).to(1e6));
    const V: Measure = Measure::new(Dimension::Voltage, "V", Range::from(-1000.0).to(1000.0));
    const PCT: Measure = Measure::new(Dimension::Percentage, "%", Range::from(0.0).below(100.0));
    const DIP: Measure = Measure::new(Dimension::Time, "ms", Range::above(0.0).to(1e4));

    #[track_caller]
    fn wrong<T: std::fmt::Debug>(result: Result<T, Wrong>, problem: &str, allowed: &str) {
        assert_eq!(result.unwrap_err(), Wrong::new(problem, allowed));
    }

    #[test]
    fn the_same_quantity_is_the_same_bits() {
        for text in [
            "4700",
            "4.7 mF",
            "4700uF",
            "4700 \u{B5}F",
            "4m7",
            "4700u",
            "0.0047 F",
            "4.7e3",
        ] {
            assert_eq!(UF.cell(text), Ok(0.0047), "{text}");
        }
        for text in ["33", "33 mohm", "0.033 ohm", "33 m\u{3A9}", "33m\u{2126}", "R033"] {
            assert_eq!(MOHM.cell(text), Ok(0.033), "{text}");
        }
        assert_eq!(MOHM.cell("2R2"), Ok(2.2));
        assert_eq!(MOHM.cell("470R"), Ok(470.0));
        assert_eq!(MOHM.cell("R47"), Ok(0.47));
        assert_eq!(V.written("230 V"), Ok(230.0));
        assert_eq!(V.written("-15V"), Ok(-15.0));
        assert_eq!(V.written("250\u{A0}mV"), Ok(0.25));
        assert_eq!(PCT.written("10 %"), Ok(0.1));
        assert_eq!(PCT.cell("99.9"), Ok(0.999));
        assert_eq!(DIP.written("10 ms"), Ok(0.01));
        assert_eq!(DIP.written("0.1 min"), Ok(6.0));
    }

    #[test]
    fn ends_of_a_range_are_inside_in_any_unit() {
        assert_eq!(UF.cell("100 F").map_err(|_| ()), Ok(100.0));
        assert!(UF.cell("100000001").is_err());
        assert!(UF.cell("0").is_err());
        assert!(PCT.cell("100").is_err());
    }

    #[test]
    fn bad_quantities() {
        let not = "a capacitance: above 0 up to 100000000 uF";
        for text in ["", "NaN", "inf", "-inf", "abc", "--5", "uF"] {
            wrong(UF.cell(text), "is not a number", not);
        }
        let range = "allowed: above 0 up to 100000000 uF";
        for text in ["-5", "0", "1e400", "1e-400", "-0", "1e999999999999"] {
            wrong(UF.cell(text), "is out of range", range);
        }
        let units = "its unit is one of F, pF, nF, uF, mF";
        for text in ["5 V", "5 uf", "4.7u", "4 7", "1.2.3", "4m7x", "5 kF"] {
            wrong(UF.cell(text), "is not a capacitance", units);
        }
        wrong(
            V.cell("4,7"),
            "has a comma",
            "write a decimal comma as a point, thousands without separator",
        );
        wrong(V.written("5"), "has no unit", "write \"5 V\"");
        wrong(V.written("4V7"), "is not a voltage", "its unit is one of V, uV, mV, kV");
    }

    #[test]
    fn money_is_exact() {
        for (text, millionths) in [
            ("0", 0),
            ("0.38", 380_000),
            ("11.840001", 11_840_001),
            ("1000000", 1_000_000_000_000),
            (".5", 500_000),
            ("5.", 5_000_000),
            ("-0", 0),
        ] {
            assert_eq!(money(text), Ok(Money(millionths)), "{text}");
        }
        let allowed = "an amount from 0 to 1000000, at most 6 decimals, without a currency sign";
        wrong(money("0.0000001"), "has more than 6 decimals", allowed);
        wrong(money("-1"), "is out of range", allowed);
        wrong(money("1000000.000001"), "is out of range", allowed);
        wrong(money("99999999999999999999"), "is out of range", allowed);
        for text in ["", ".", "NaN", "1e3", "0.38 EUR", "\u{20AC}1", "--1", "1.2.3"] {
            wrong(money(text), "is not an amount", allowed);
        }
    }

    #[test]
    fn counts_are_whole() {
        assert_eq!(whole("250", 1, MOST), Ok(250));
        let allowed = "a whole number from 1 to 99";
        for text in ["0", "100", "-1", "99999999999999999999999"] {
            wrong(whole(text, 1, 99), "is out of range", allowed);
        }
        for text in ["", "1.5", "2.0", "1e3", "NaN", "x", "1 000"] {
            wrong(whole(text, 1, 99), "is not a whole number", allowed);
        }
    }
}
