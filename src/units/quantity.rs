//! Owns dimensions, their units and prefixes, and the strict syntax of a number.
//!
//! A number is scaled by its decimal exponent before it becomes binary, so that "4.7 mF", "4700 uF" and "4m7" are the
//! same f64 and ties stay ties.

/// What a quantity is. Values are in SI units; a percentage is a fraction, a life is in hours.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Dimension {
    /// No unit at all.
    Number,
    /// Volts.
    Voltage,
    /// Amperes.
    Current,
    /// Farads.
    Capacitance,
    /// Ohms.
    Resistance,
    /// Watts.
    Power,
    /// Volt-amperes.
    ApparentPower,
    /// Hertz.
    Frequency,
    /// Degrees Celsius.
    Temperature,
    /// Kelvins between two temperatures.
    Rise,
    /// Kelvins per watt.
    ThermalResistance,
    /// Seconds.
    Time,
    /// Hours.
    Life,
    /// Metres.
    Length,
    /// A fraction, written in per cent.
    Percentage,
    /// A fraction per volt, written in per cent per volt.
    PercentagePerVolt,
    /// Decibels.
    Decibels,
}

/// The Greek letter; the ohm sign, another code point, is read as this.
const OHM: &str = "\u{3A9}";

/// A unit: its symbol, power of ten, other factor, and the prefixes that it takes.
type Unit = (&'static str, i32, f64, &'static str);

impl Dimension {
    /// "a voltage", for messages.
    #[must_use]
    pub fn noun(self) -> &'static str {
        match self {
            Dimension::Number => "a plain number",
            Dimension::Voltage => "a voltage",
            Dimension::Current => "a current",
            Dimension::Capacitance => "a capacitance",
            Dimension::Resistance => "a resistance",
            Dimension::Power => "a power",
            Dimension::ApparentPower => "an apparent power",
            Dimension::Frequency => "a frequency",
            Dimension::Temperature => "a temperature",
            Dimension::Rise => "a temperature rise",
            Dimension::ThermalResistance => "a thermal resistance",
            Dimension::Time => "a time",
            Dimension::Life => "a life",
            Dimension::Length => "a length",
            Dimension::Percentage => "a percentage",
            Dimension::PercentagePerVolt => "a percentage per volt",
            Dimension::Decibels => "a ratio in decibels",
        }
    }

    /// Its units; other spellings of one unit follow it.
    fn units(self) -> &'static [Unit] {
        match self {
            Dimension::Number => &[],
            Dimension::Voltage => &[("V", 0, 1.0, "umk")],
            Dimension::Current => &[("A", 0, 1.0, "numk")],
            Dimension::Capacitance => &[("F", 0, 1.0, "pnum")],
            Dimension::Resistance => &[("ohm", 0, 1.0, "umkMG"), (OHM, 0, 1.0, "umkMG")],
            Dimension::Power => &[("W", 0, 1.0, "umk")],
            Dimension::ApparentPower => &[("VA", 0, 1.0, "mk")],
            Dimension::Frequency => &[("Hz", 0, 1.0, "kMG")],
            Dimension::Temperature => &[("degC", 0, 1.0, ""), ("\u{B0}C", 0, 1.0, "")],
            Dimension::Rise => &[("K", 0, 1.0, "m")],
            Dimension::ThermalResistance => &[("K/W", 0, 1.0, ""), ("degC/W", 0, 1.0, ""), ("\u{B0}C/W", 0, 1.0, "")],
            Dimension::Time => &[("s", 0, 1.0, "num"), ("min", 0, 60.0, ""), ("h", 0, 3600.0, "")],
            Dimension::Life => &[("h", 0, 1.0, "k")],
            Dimension::Length => &[("m", 0, 1.0, "um"), ("cm", -2, 1.0, "")],
            Dimension::Percentage => &[("%", -2, 1.0, "")],
            Dimension::PercentagePerVolt => &[("%/V", -2, 1.0, "")],
            Dimension::Decibels => &[("dB", 0, 1.0, "")],
        }
    }

    /// Power of ten and other factor that turn a number in this unit into an SI value; `None`: not a unit of it.
    pub(super) fn scale(self, symbol: &str) -> Option<(i32, f64)> {
        let symbol = symbol.replace('\u{2126}', OHM);
        self.units().iter().find_map(|(base, ten, factor, prefixes)| {
            let prefix = symbol.strip_suffix(base)?;
            let power = prefix_power(prefix, prefixes)?;
            Some((ten + power, *factor))
        })
    }

    /// "V, uV, mV, kV"; of other spellings only the unit itself.
    pub(crate) fn symbols(self) -> String {
        let mut all = Vec::new();
        for (k, (base, _, _, prefixes)) in self.units().iter().enumerate() {
            all.push((*base).to_owned());
            if k == 0 {
                all.extend(prefixes.chars().map(|p| format!("{p}{base}")));
            }
        }
        all.join(", ")
    }
}

/// The power of ten of a prefix that is among `allowed`, or of none.
fn prefix_power(prefix: &str, allowed: &str) -> Option<i32> {
    let mut letters = prefix.chars();
    let Some(letter) = letters.next() else {
        return Some(0);
    };
    // Two code points look like micro: the sign and the Greek letter.
    let letter = if matches!(letter, '\u{B5}' | '\u{3BC}') {
        'u'
    } else {
        letter
    };
    if letters.next().is_some() || !allowed.contains(letter) {
        return None;
    }
    match letter {
        'p' => Some(-12),
        'n' => Some(-9),
        'u' => Some(-6),
        'm' => Some(-3),
        'k' => Some(3),
        'M' => Some(6),
        'G' => Some(9),
        _ => None,
    }
}

/// A decimal number not yet made binary.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Decimal<'a> {
    /// Sign, digits, point.
    pub(super) mantissa: &'a str,
    /// Power of ten.
    pub(super) exponent: i32,
}

impl Decimal<'_> {
    /// The nearest f64 to the number times a power of ten; `None` where it is too large, or too small and not zero.
    pub(super) fn times_ten_to(&self, power: i32) -> Option<f64> {
        let exponent = self.exponent.saturating_add(power);
        let value: f64 = format!("{}e{exponent}", self.mantissa).parse().ok()?;
        let zero = !self.mantissa.contains(|c: char| ('1'..='9').contains(&c));
        (value.is_finite() && (value.abs() > 0.0 || zero)).then_some(value)
    }
}

/// Splits the number off the front: optional sign, digits with an optional point, optional exponent.
pub(super) fn decimal(text: &str) -> Option<(Decimal<'_>, &str)> {
    let bytes = text.as_bytes();
    let digits = |from: usize| bytes[from..].iter().take_while(|b| b.is_ascii_digit()).count();
    let sign = usize::from(matches!(bytes.first(), Some(b'+' | b'-')));
    let whole = digits(sign);
    let mut end = sign + whole;
    let mut decimals = 0;
    if bytes.get(end) == Some(&b'.') {
        decimals = digits(end + 1);
        end += 1 + decimals;
    }
    if whole + decimals == 0 {
        return None;
    }
    let mantissa = &text[..end];
    let mut exponent = 0;
    if matches!(bytes.get(end), Some(b'e' | b'E')) {
        let sign = usize::from(matches!(bytes.get(end + 1), Some(b'+' | b'-')));
        let count = digits((end + 1 + sign).min(bytes.len()));
        if count > 0 {
            let written = &text[end + 1..end + 1 + sign + count];
            // More digits than an i32 holds are as good as the largest: both ends are out of any range.
            let limit = if written.starts_with('-') {
                i32::MIN / 2
            } else {
                i32::MAX / 2
            };
            exponent = written.parse().unwrap_or(limit);
            end += 1 + sign + count;
        }
    }
    Some((Decimal { mantissa, exponent }, &text[end..]))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_are_strict() {
        for (text, mantissa, exponent, rest) in [
            ("230 V", "230", 0, " V"),
            ("-1.5e-3A", "-1.5", -3, "A"),
            (".5", ".5", 0, ""),
            ("5.", "5.", 0, ""),
            ("2E+4x", "2", 4, "x"),
            ("2e", "2", 0, "e"),
            ("2e-", "2", 0, "e-"),
            ("1e99999999999", "1", i32::MAX / 2, ""),
        ] {
            assert_eq!(decimal(text), Some((Decimal { mantissa, exponent }, rest)), "{text}");
        }
        for text in ["", "-", ".", "e5", "NaN", "inf", "+-1", " 1", "\u{663}"] {
            assert_eq!(decimal(text), None, "{text}");
        }
    }

    #[test]
    fn units_and_prefixes() {
        let scale = |d: Dimension, s| d.scale(s);
        assert_eq!(scale(Dimension::Capacitance, "uF"), Some((-6, 1.0)));
        assert_eq!(scale(Dimension::Capacitance, "\u{B5}F"), Some((-6, 1.0)));
        assert_eq!(scale(Dimension::Capacitance, "\u{3BC}F"), Some((-6, 1.0)));
        assert_eq!(scale(Dimension::Capacitance, "kF"), None);
        assert_eq!(scale(Dimension::Resistance, "m\u{3A9}"), Some((-3, 1.0)));
        assert_eq!(scale(Dimension::Resistance, "\u{2126}"), Some((0, 1.0)));
        assert_eq!(scale(Dimension::Time, "min"), Some((0, 60.0)));
        assert_eq!(scale(Dimension::Time, "ms"), Some((-3, 1.0)));
        assert_eq!(scale(Dimension::Length, "mm"), Some((-3, 1.0)));
        assert_eq!(scale(Dimension::Percentage, "%"), Some((-2, 1.0)));
        assert_eq!(scale(Dimension::Voltage, "A"), None);
        assert_eq!(scale(Dimension::Voltage, "mmV"), None);
        assert_eq!(scale(Dimension::Number, ""), None);
        assert_eq!(Dimension::Voltage.symbols(), "V, uV, mV, kV");
    }
}
