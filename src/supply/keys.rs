//! Owns the table of keys of a supply file. Nothing else states a unit, a range or a default of a key.

use super::{Form, Path};
use crate::catalogue::DEVICE_KINDS;
use crate::catalogue::Missing::{self, Blank, Default, Derived, Required};
use crate::units::Dimension as D;
use crate::units::{Measure, Range};

/// One key.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Key {
    /// Table that it stands in, "" at the top.
    pub table: &'static str,
    /// The key.
    pub name: &'static str,
    /// What it takes.
    pub form: Form,
    /// What its absence means.
    pub missing: Missing,
    /// One line of documentation.
    pub meaning: &'static str,
}

/// Words of the key `paths`.
const PATHS: &[&str] = &[
    Path::HalfWave.word(),
    Path::CentreTap.word(),
    Path::Bridge.word(),
    Path::Dual.word(),
];

const fn key(table: &'static str, name: &'static str, form: Form, missing: Missing, meaning: &'static str) -> Key {
    Key {
        table,
        name,
        form,
        missing,
        meaning,
    }
}

const fn of(dimension: D, unit: &'static str, range: Range) -> Form {
    Form::Quantity(Measure::new(dimension, unit, range))
}

const AIR: Form = of(D::Temperature, "degC", Range::from(-60.0).to(150.0));
const MAINS: Form = of(D::Voltage, "V", Range::above(0.0).to(1000.0));
const BELOW_ALL: Form = of(D::Percentage, "%", Range::from(0.0).below(100.0));

const KEYS: &[Key] = &[
    key("", "name", Form::Text, Default(""), "title"),
    key(
        "",
        "builds",
        Form::Count(1, 1_000_000_000),
        Default("1"),
        "units in the run",
    ),
    key(
        "",
        "catalogue",
        Form::Text,
        Blank,
        "folder of the catalogue, from this file's folder",
    ),
    key(
        "",
        "share",
        Form::Word(&["never"]),
        Blank,
        "never: a section and a transformer for every rail",
    ),
    key("", "mains", Form::Table, Required, "the mains, rms"),
    key("", "ambient", Form::Table, Required, "the air outside the box"),
    key("", "margins", Form::Table, Blank, "reserves"),
    key("", "ageing", Form::Table, Blank, "what time does to the reservoir"),
    key("", "caps", Form::Table, Blank, "upper limits on the whole build"),
    key("", "rail", Form::Tables, Required, "the outputs, one [[rail]] each"),
    key("mains", "voltage", MAINS, Required, "nominal voltage"),
    key(
        "mains",
        "tolerance",
        BELOW_ALL,
        Derived("required, or low and high"),
        "of the voltage, both ways",
    ),
    key("mains", "low", MAINS, Derived("from tolerance"), "lowest voltage"),
    key("mains", "high", MAINS, Derived("from tolerance"), "highest voltage"),
    key(
        "mains",
        "frequency",
        of(D::Frequency, "Hz", Range::from(10.0).to(1000.0)),
        Required,
        "the lowest that it must run on",
    ),
    key(
        "mains",
        "flat_top",
        of(D::Percentage, "%", Range::from(0.0).below(50.0)),
        Default("3 %"),
        "by how much the crest falls short of a sine's",
    ),
    key("ambient", "low", AIR, Required, "coldest air"),
    key("ambient", "high", AIR, Required, "hottest air"),
    key(
        "ambient",
        "inside_rise",
        of(D::Rise, "K", Range::from(0.0).to(200.0)),
        Default("0 K"),
        "by how much the air inside the box is warmer",
    ),
    key(
        "margins",
        "headroom",
        of(D::Voltage, "V", Range::from(0.0).to(1000.0)),
        Default("0.25 V"),
        "above dropout",
    ),
    key(
        "margins",
        "reservoir",
        BELOW_ALL,
        Default("10 %"),
        "below the reservoir's rated voltage",
    ),
    key(
        "margins",
        "reverse",
        of(D::Percentage, "%", Range::from(0.0).to(1000.0)),
        Default("50 %"),
        "above the peak inverse voltage",
    ),
    key(
        "margins",
        "junction",
        of(D::Rise, "K", Range::from(0.0).to(500.0)),
        Default("15 K"),
        "below the highest junction temperature",
    ),
    key(
        "ageing",
        "capacitance_loss",
        BELOW_ALL,
        Default("20 %"),
        "capacitance lost at end of life",
    ),
    key(
        "ageing",
        "esr_rise",
        Form::Quantity(Measure::plain(Range::from(1.0).to(1000.0))),
        Default("2"),
        "factor on ESR at end of life",
    ),
    key(
        "ageing",
        "life",
        of(D::Life, "h", Range::above(0.0).to(1e7)),
        Default("20000 h"),
        "wanted life",
    ),
    key(
        "caps",
        "cost",
        Form::Quantity(Measure::plain(Range::above(0.0).to(1e6))),
        Blank,
        "highest cost of a unit, in the catalogue's currency",
    ),
    key(
        "caps",
        "heat",
        of(D::Power, "W", Range::above(0.0).to(1e6)),
        Blank,
        "highest heat of a unit",
    ),
    key(
        "caps",
        "height",
        of(D::Length, "mm", Range::above(0.0).to(100_000.0)),
        Blank,
        "height of the tallest part",
    ),
    key(
        "caps",
        "cans",
        Form::Count(1, 99),
        Default("3"),
        "most capacitors in parallel",
    ),
    key("rail", "name", Form::Text, Required, "unique in the file"),
    key(
        "rail",
        "voltage",
        of(D::Voltage, "V", Range::from(-1000.0).to(1000.0).but_zero()),
        Required,
        "output voltage, negative for a negative rail",
    ),
    key(
        "rail",
        "current",
        of(D::Current, "A", Range::above(0.0).to(1000.0)),
        Required,
        "full-load current",
    ),
    key(
        "rail",
        "idle",
        of(D::Current, "A", Range::from(0.0).to(1000.0)),
        Default("0 A"),
        "current when idle, at most current",
    ),
    key(
        "rail",
        "accuracy",
        of(D::Percentage, "%", Range::above(0.0).to(100.0)),
        Derived("not asked"),
        "allowed error of the output",
    ),
    key(
        "rail",
        "ripple",
        of(D::Voltage, "V", Range::above(0.0).to(1000.0)),
        Derived("not asked"),
        "allowed output ripple, peak to peak",
    ),
    key(
        "rail",
        "dip",
        of(D::Time, "s", Range::above(0.0).to(3600.0)),
        Derived("not asked"),
        "mains dip to ride through",
    ),
    key(
        "rail",
        "paths",
        Form::Words(PATHS),
        Default("centre-tap, bridge, dual"),
        "rectifier circuits allowed",
    ),
    key(
        "rail",
        "devices",
        Form::Words(DEVICE_KINDS),
        Default("fixed, adjustable"),
        "kinds of pass device allowed",
    ),
    key(
        "rail",
        "isolated",
        Form::Flag,
        Default("false"),
        "shares no section with another rail",
    ),
    key(
        "rail",
        "short_circuit",
        Form::Word(&["survive"]),
        Derived("not asked"),
        "discrete devices must survive a shorted output",
    ),
    key(
        "rail",
        "section",
        Form::Text,
        Derived("the optimizer decides"),
        "rails that name the same section share it",
    ),
];

/// All keys of a table ("" = the top of the file).
pub fn keys(table: &str) -> impl Iterator<Item = &'static Key> {
    KEYS.iter().filter(move |k| k.table == table)
}

/// All keys as a Markdown table; the README holds it, and a test compares.
#[must_use]
pub fn markdown() -> String {
    let mut out = String::from("| table | key | meaning | form | range | default |\n");
    out.push_str("|---|---|---|---|---|---|\n");
    for k in KEYS.iter().filter(|k| !matches!(k.form, Form::Table | Form::Tables)) {
        let table = match k.table {
            "" => String::new(),
            "rail" => "[[rail]]".into(),
            table => format!("[{table}]"),
        };
        let (form, range, default) = (k.form.words(), k.form.range(), k.missing.words());
        out.push_str(&format!(
            "| {table} | {} | {} | {form} | {range} | {default} |\n",
            k.name, k.meaning
        ));
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn defaults_are_allowed() {
        for key in KEYS {
            let Default(text) = key.missing else {
                continue;
            };
            let ok = match key.form {
                Form::Text => true,
                Form::Flag => text == "false",
                Form::Quantity(_) => key.form.number(text).is_ok(),
                Form::Count(..) => key.form.count(text).is_ok(),
                Form::Word(_) | Form::Words(_) => text.split(", ").all(|w| key.form.word(w).is_ok()),
                Form::Table | Form::Tables => false,
            };
            assert!(ok, "{key:?}");
        }
    }

    #[test]
    fn units_are_units() {
        for key in KEYS {
            if let Form::Quantity(m) = key.form {
                assert!(m.unit.is_empty() || m.dimension.symbols().contains(m.unit), "{key:?}");
            }
        }
    }

    #[test]
    fn every_table_has_keys_and_is_known() {
        for key in KEYS {
            let nested = matches!(key.form, Form::Table | Form::Tables);
            assert_eq!(nested, keys(key.name).next().is_some(), "{key:?}");
            assert!(key.table.is_empty() || keys("").any(|k| k.name == key.table), "{key:?}");
        }
    }

    #[test]
    fn the_documentation_names_the_default() {
        let line =
            "| [mains] | flat_top | by how much the crest falls short of a sine's | % | 0 to below 50 % | 3 % |\n";
        assert!(markdown().contains(line));
    }
}
