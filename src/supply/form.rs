//! Owns what a key of a supply file takes: how it is read, worded and documented.

use crate::catalogue::unknown_word;
use crate::units::{Measure, Wrong, whole};

/// What a key takes.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Form {
    /// Text of one line.
    Text,
    /// A quantity as text with its unit; a number where it has none.
    Quantity(Measure),
    /// A whole number, from, to.
    Count(u64, u64),
    /// true or false.
    Flag,
    /// One word.
    Word(&'static [&'static str]),
    /// A list of words without repeats.
    Words(&'static [&'static str]),
    /// A table with keys of its own.
    Table,
    /// [[...]]: one table or more.
    Tables,
}

impl Form {
    /// Unit or form, for the documentation.
    pub(super) fn words(self) -> &'static str {
        match self {
            Form::Text => "text",
            Form::Quantity(m) if m.unit.is_empty() => "number",
            Form::Quantity(m) => m.unit,
            Form::Count(..) => "whole number",
            Form::Flag => "flag",
            Form::Word(_) => "word",
            Form::Words(_) => "list of words",
            Form::Table | Form::Tables => "table",
        }
    }

    /// What is allowed, for the documentation.
    pub(super) fn range(self) -> String {
        match self {
            Form::Text => "one line".into(),
            Form::Quantity(m) => m.words(),
            Form::Count(least, most) => format!("{least} to {most}"),
            Form::Flag => "true, false".into(),
            Form::Word(words) | Form::Words(words) => words.join(", "),
            Form::Table | Form::Tables => String::new(),
        }
    }

    /// How to write it, for "is missing" and "is not text".
    pub(super) fn example(self) -> String {
        match self {
            Form::Text => "a text in quotes".into(),
            Form::Quantity(m) if m.unit.is_empty() => format!("a number without quotes, {}", m.words()),
            Form::Quantity(m) => format!("{} in quotes with its unit, {}", m.dimension.noun(), m.words()),
            Form::Count(least, most) => format!("a whole number from {least} to {most}, without quotes"),
            Form::Flag => "true or false, without quotes".into(),
            Form::Word(words) => format!("one of \"{}\"", words.join("\", \"")),
            Form::Words(words) => format!("a list of some of \"{}\"", words.join("\", \"")),
            Form::Table => "a table of keys".into(),
            Form::Tables => "one [[rail]] or more".into(),
        }
    }

    /// Reads a quantity, with its unit where it has one.
    pub(super) fn number(self, text: &str) -> Result<f64, Wrong> {
        match self {
            Form::Quantity(m) => m.written(text),
            _ => Err(Wrong::new("is not a number", "")),
        }
    }

    /// Reads a count.
    pub(super) fn count(self, text: &str) -> Result<u64, Wrong> {
        match self {
            Form::Count(least, most) => whole(text, least, most),
            _ => Err(Wrong::new("is not a whole number", "")),
        }
    }

    /// Reads one word of the list.
    pub(super) fn word(self, text: &str) -> Result<&'static str, Wrong> {
        let (Form::Word(words) | Form::Words(words)) = self else {
            return Err(Wrong::new("is not a word", ""));
        };
        (words.iter().find(|w| **w == text).copied()).ok_or_else(|| unknown_word(text, words))
    }
}
