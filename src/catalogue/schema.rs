//! Owns what a column is: its form, range and default, for validation, messages and documentation alike.

use super::Slot;
use super::columns::{COMMON, PASS_DEVICES, RECTIFIERS, RESERVOIRS, SINKS, TRANSFORMERS};
use crate::units::{Measure, Wrong, whole};

/// One column of a catalogue file.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Column {
    /// Header.
    pub name: &'static str,
    /// One line of documentation.
    pub meaning: &'static str,
    /// What a cell holds.
    pub form: Form,
    /// What a blank cell, or no such column, means.
    pub missing: Missing,
}

/// What a cell holds.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Form {
    /// The part's name.
    Name,
    /// Free text.
    Text,
    /// One word of these.
    Word(&'static [&'static str]),
    /// An outline, one word.
    Case,
    /// Outlines, space-separated.
    Cases,
    /// A price.
    Money,
    /// pieces:price, space-separated.
    Breaks,
    /// A whole number from 0.
    Count,
    /// A quantity in the column's unit.
    Quantity(Measure),
    /// The frequency of a rating: the rules know 100 Hz, 120 Hz, and 10 kHz and above.
    RatedAt(Measure),
    /// "230", "115+115", "100/120/230".
    Primary(Measure),
    /// "12", "9+9", "12-0-12+5".
    Windings(Measure),
    /// volts:amps, space-separated.
    Soa(Measure, Measure),
}

/// What it means that a column or key is blank.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Missing {
    /// A fault.
    Required,
    /// Not stated.
    Blank,
    /// As if this text stood there.
    Default(&'static str),
    /// Worked out from others, as described.
    Derived(&'static str),
}

impl Missing {
    /// For the documentation.
    #[must_use]
    pub fn words(self) -> &'static str {
        match self {
            Missing::Required => "required",
            Missing::Blank => "not stated",
            Missing::Default("") => "blank",
            Missing::Default(text) | Missing::Derived(text) => text,
        }
    }
}

/// All columns of a slot's file, common ones first.
pub fn columns(slot: Slot) -> impl Iterator<Item = &'static Column> {
    COMMON.iter().chain(own_columns(slot))
}

/// The column of that header.
pub(super) fn find(slot: Slot, name: &str) -> Option<&'static Column> {
    columns(slot).find(|c| c.name == name)
}

fn own_columns(slot: Slot) -> &'static [Column] {
    match slot {
        Slot::Transformer => TRANSFORMERS,
        Slot::Rectifier => RECTIFIERS,
        Slot::Reservoir => RESERVOIRS,
        Slot::Pass => PASS_DEVICES,
        Slot::Sink => SINKS,
    }
}

/// All columns as a Markdown table; the README holds it, and a test compares.
#[must_use]
pub fn markdown() -> String {
    let mut out = String::from("| file | column | meaning | form | range | default |\n");
    out.push_str("|---|---|---|---|---|---|\n");
    let files = Slot::ALL.map(|slot| (slot.file(), own_columns(slot)));
    for (file, columns) in [("all", COMMON)].into_iter().chain(files) {
        for c in columns {
            let (form, range) = (c.form.words(), c.form.range());
            let default = c.missing.words();
            out.push_str(&format!(
                "| {file} | {} | {} | {form} | {range} | {default} |\n",
                c.name, c.meaning
            ));
        }
    }
    out
}

impl Form {
    /// Unit or form, for the documentation.
    fn words(self) -> String {
        match self {
            Form::Name | Form::Text => "text".into(),
            Form::Word(_) | Form::Case => "word".into(),
            Form::Cases => "words".into(),
            Form::Money => "money".into(),
            Form::Breaks => "pieces:price ...".into(),
            Form::Count => "whole number".into(),
            Form::Quantity(m) if m.unit.is_empty() => "number".into(),
            Form::Quantity(m) | Form::RatedAt(m) => m.unit.into(),
            Form::Primary(m) => format!("{}; x, x+x or x/y/z", m.unit),
            Form::Windings(m) => format!("{}; x or x-0-x, joined by +", m.unit),
            Form::Soa(x, y) => format!("{}:{} ...", x.unit, y.unit),
        }
    }

    /// What is allowed, for the documentation and for "is blank".
    pub(super) fn range(self) -> String {
        match self {
            Form::Name => format!("up to {LONGEST_NAME} characters"),
            Form::Text => "any".into(),
            Form::Word(words) => words.join(", "),
            Form::Case => "one outline".into(),
            Form::Cases => "one outline or more".into(),
            Form::Money => "0 to 1000000, at most 6 decimals".into(),
            Form::Breaks => "pieces from 2, rising; prices not rising".into(),
            Form::Count => "0 to 1000000000".into(),
            Form::RatedAt(_) => "100, 120, or 10000 and more Hz".into(),
            Form::Quantity(m) | Form::Primary(m) | Form::Windings(m) => m.words(),
            Form::Soa(x, y) => format!("{} and {}; volts rising", x.words(), y.words()),
        }
    }

    /// Reads a plain quantity.
    pub(super) fn number(self, text: &str) -> Result<f64, Wrong> {
        match self {
            Form::Quantity(m) => m.cell(text),
            Form::RatedAt(m) => m.cell(text).and_then(|hz| {
                let known = [100.0, 120.0].iter().any(|f: &f64| (hz - f).abs() < 1e-9);
                if known || hz >= 10_000.0 {
                    return Ok(hz);
                }
                let allowed = format!("allowed: {}", self.range());
                Err(Wrong::new("is a frequency without a rule", allowed))
            }),
            _ => Err(Wrong::new("is not a number", "")),
        }
    }

    /// Reads one word of the list, in any case.
    pub(super) fn word(self, text: &str) -> Result<&'static str, Wrong> {
        let Form::Word(words) = self else {
            return Err(Wrong::new("is not a word", ""));
        };
        (words.iter().find(|w| w.eq_ignore_ascii_case(text)).copied()).ok_or_else(|| unknown_word(text, words))
    }
}

/// Longest part name, in characters: reports stay readable.
const LONGEST_NAME: usize = 80;

/// A word that is not in the list.
pub(crate) fn unknown_word(text: &str, words: &[&'static str]) -> Wrong {
    let guess = crate::suggest::did_you_mean(text, words.iter().copied());
    let space = if guess.is_empty() { "" } else { " " };
    Wrong::new(
        "is not a known word",
        format!("{guess}{space}allowed: {}", words.join(", ")),
    )
}

/// Reads a part name: kept as text, since spreadsheets and number parsers mangle "00470" and "22E1".
pub(super) fn name(text: &str) -> Result<String, Wrong> {
    if text.chars().any(char::is_control) {
        return Err(Wrong::new("has a control character", "a part name is one line of text"));
    }
    if text.chars().count() > LONGEST_NAME {
        return Err(Wrong::new(
            "is too long",
            format!("a part name has up to {LONGEST_NAME} characters"),
        ));
    }
    Ok(text.to_owned())
}

/// Reads a stock count.
pub(super) fn count(text: &str) -> Result<u64, Wrong> {
    whole(text, 0, u64::MAX)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::catalogue::DeviceKind;

    #[test]
    fn names_are_unique_in_a_file() {
        for slot in Slot::ALL {
            let mut names: Vec<_> = columns(slot).map(|c| c.name).collect();
            names.sort_unstable();
            assert!(names.windows(2).all(|w| w[0] != w[1]), "{names:?}");
        }
    }

    #[test]
    fn units_are_units_and_defaults_are_allowed() {
        for column in Slot::ALL.into_iter().flat_map(columns) {
            let measures = match column.form {
                Form::Quantity(m) | Form::RatedAt(m) | Form::Primary(m) | Form::Windings(m) => vec![m],
                Form::Soa(x, y) => vec![x, y],
                _ => vec![],
            };
            for m in measures {
                assert!(m.unit.is_empty() || m.dimension.symbols().contains(m.unit), "{m:?}");
            }
            if let Missing::Default(text) = column.missing {
                let ok = match column.form {
                    Form::Word(_) => column.form.word(text).is_ok(),
                    Form::Money => crate::units::money(text).is_ok(),
                    Form::Quantity(_) | Form::RatedAt(_) => column.form.number(text).is_ok(),
                    _ => false,
                };
                assert!(ok, "{column:?}");
            }
        }
    }

    #[test]
    fn kinds_are_the_words_of_the_column() {
        let words = find(Slot::Pass, "kind").unwrap().form;
        assert_eq!(words.range(), DeviceKind::ALL.map(DeviceKind::word).join(", "));
    }

    #[test]
    fn the_table_names_every_column_once() {
        let table = markdown();
        assert!(
            table.contains(
                "| reservoirs.csv | c_uf | rated capacitance | uF | above 0 up to 100000000 uF | required |\n"
            )
        );
        assert!(
            table.contains("| rectifiers.csv | kind | module or single diode | word | bridge, diode | required |\n")
        );
        assert_eq!(table.matches("| price |").count(), 1);
    }
}
