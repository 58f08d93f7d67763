//! Owns texts that come from files, made safe for a terminal, and numbers as engineers write them.

/// A text from a file with everything that could act on a terminal shown as a replacement character.
#[must_use]
pub fn printable(text: &str) -> String {
    let acts = |c: char| {
        c.is_control() || matches!(c, '\u{200E}' | '\u{200F}' | '\u{202A}'..='\u{202E}' | '\u{2066}'..='\u{2069}')
    };
    text.chars().map(|c| if acts(c) { '\u{FFFD}' } else { c }).collect()
}

/// A value with four significant digits and the SI prefix that keeps it between 1 and 1000.
pub(super) fn engineering(value: f64, unit: &str) -> String {
    let takes_prefix = matches!(unit, "V" | "A" | "W" | "m" | "VA" | "Hz");
    match unit {
        // Fractions read better in per cent.
        "1" => return format!("{} %", digits(value * 100.0)),
        "" => return digits(value),
        "pieces" => return format!("{value:.0} {unit}"),
        _ if !takes_prefix => return format!("{} {unit}", digits(value)),
        _ => {}
    }
    let value = four_digits(value);
    let size = value.abs();
    let (scale, prefix) = if size >= 1e3 {
        (1e-3, "k")
    } else if !(1e-9..1.0).contains(&size) {
        (1.0, "")
    } else if size >= 1e-3 {
        (1e3, "m")
    } else {
        (1e6, "u")
    };
    format!("{} {prefix}{unit}", digits(value * scale))
}

/// A margin. A difference of temperatures is in kelvin.
pub(super) fn margin_text(margin: Option<f64>, unit: &str) -> String {
    let unit = if unit == "degC" { "K" } else { unit };
    margin.map_or("?".into(), |m| engineering(m, unit))
}

/// An amount with its currency, if that is known.
pub(super) fn money(amount: &str, currency: Option<&str>) -> String {
    match currency.filter(|c| !c.is_empty()) {
        Some(currency) => format!("{amount} {currency}"),
        None => amount.to_owned(),
    }
}

/// A change, with its sign.
pub(super) fn signed(text: &str) -> String {
    if text.starts_with('-') {
        text.to_owned()
    } else {
        format!("+{text}")
    }
}

/// Rounded to four significant digits, so that the prefix is chosen for what is printed.
fn four_digits(value: f64) -> f64 {
    format!("{value:.3e}").parse().unwrap_or(value)
}

/// Four significant digits, never in powers of ten; whole numbers of more digits stay whole.
pub(super) fn digits(value: f64) -> String {
    let size = four_digits(value).abs();
    let decimals = if size >= 1000.0 {
        0
    } else if size >= 100.0 {
        1
    } else if size >= 10.0 {
        2
    } else {
        3
    };
    let text = format!("{value:.decimals$}");
    // Not "-0.000".
    if text.trim_start_matches(['-', '0', '.']).is_empty() {
        text.trim_start_matches('-').to_owned()
    } else {
        text
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_keep_four_digits() {
        for (value, unit, text) in [
            (0.004_21, "V", "4.210 mV"),
            (12.3456, "V", "12.35 V"),
            (1234.5, "W", "1.234 kW"),
            (83_456.2, "h", "83456 h"),
            (0.05, "1", "5.000 %"),
            (0.999_999_99, "A", "1.000 A"),
            (9.999_99, "W", "10.00 W"),
            (-0.000_000_000_1, "V", "0.000 V"),
            (45.0, "degC", "45.00 degC"),
            (-2.5, "A", "-2.500 A"),
        ] {
            assert_eq!(engineering(value, unit), text);
        }
    }

    #[test]
    fn nothing_acts_on_a_terminal() {
        assert_eq!(
            printable("a\u{1b}[31mb\r\nc\u{202E}d\u{9b}"),
            "a\u{FFFD}[31mb\u{FFFD}\u{FFFD}c\u{FFFD}d\u{FFFD}"
        );
        assert_eq!(printable("Ω µ °C"), "Ω µ °C");
    }
}
