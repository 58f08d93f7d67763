//! Owns one row while it is read: finds a cell, parses it by its column, keeps the faults.
//!
//! A value that cannot be had comes back as a placeholder, so that the cells behind it are checked too; a row that
//! needed one is dropped whole, so no placeholder gets out.

use super::schema::{self, Column, Form, Missing};
use super::{Part, PartId, Slot, Status, lists};
use crate::fault::Fault;
use crate::units::{Wrong, money};

/// One row, from a file of the catalogue or from a saved build.
pub(super) struct Row<'a> {
    /// The file's slot.
    pub(super) slot: Slot,
    /// File for faults.
    pub(super) file: &'a str,
    /// Line of the row, none in a saved build.
    pub(super) line: Option<u64>,
    /// Stands before column names in faults: "parts.NAME." in a saved build.
    pub(super) prefix: String,
    /// The part's name as written, for faults of a catalogue file.
    pub(super) part: Option<String>,
    /// Required columns that the header does not name: told once for the file.
    pub(super) absent: &'a [&'static str],
    /// Cells that are not blank, trimmed, in file order.
    pub(super) cells: Vec<(&'static Column, String)>,
    /// What was found wrong.
    pub(super) faults: Vec<Fault>,
    /// What is odd.
    pub(super) warnings: Vec<Fault>,
    /// A value is missing: the row is dropped.
    pub(super) broken: bool,
}

impl Row<'_> {
    /// The text of a cell that is not blank.
    pub(super) fn cell(&self, name: &str) -> Option<&str> {
        let (_, text) = self.cells.iter().find(|(c, _)| c.name == name)?;
        Some(text)
    }

    /// A fault of this row at a column; what is allowed comes with it.
    pub(super) fn fault(&mut self, column: &str, wrong: Wrong) {
        let fault = self.at(column, wrong);
        self.faults.push(fault);
        self.broken = true;
    }

    /// A warning of this row at a column.
    pub(super) fn warn(&mut self, column: &str, wrong: Wrong) {
        let fault = self.at(column, wrong);
        self.warnings.push(fault);
    }

    /// Faults a column that must not be blank here.
    pub(super) fn demand(&mut self, column: &str, why: &str) {
        if self.cell(column).is_none() {
            self.fault(column, Wrong::new("is blank", why));
        }
    }

    /// A quantity that is required or has a default.
    pub(super) fn number(&mut self, name: &str) -> f64 {
        self.optional(name).unwrap_or_default()
    }

    /// A quantity that may be blank.
    pub(super) fn optional(&mut self, name: &str) -> Option<f64> {
        self.read(name, Form::number)
    }

    /// A word that is required or has a default.
    pub(super) fn word(&mut self, name: &str) -> &'static str {
        self.optional_word(name).unwrap_or_default()
    }

    /// A word that may be blank.
    pub(super) fn optional_word(&mut self, name: &str) -> Option<&'static str> {
        self.read(name, Form::word)
    }

    /// An outline in upper case. With a blank inside it would never match, since sinks list theirs by blanks.
    pub(super) fn case(&mut self, name: &str) -> Option<String> {
        self.read(name, |_, text| {
            if text.contains(char::is_whitespace) {
                return Err(Wrong::new("is not one word", "write one outline, such as TO-220"));
            }
            Ok(text.to_uppercase())
        })
    }

    /// A price that is required or has a default.
    pub(super) fn money(&mut self, name: &str) -> crate::units::Money {
        self.read(name, |_, text| money(text)).unwrap_or_default()
    }

    /// What every part has.
    pub(super) fn common(&mut self) -> Part {
        let name = self.read("part", |_, text| schema::name(text)).unwrap_or_default();
        if looks_mangled(&name) {
            self.warn(
                "part",
                Wrong::new(
                    "looks like a name that a spreadsheet turned into a number",
                    "format the column as text",
                ),
            );
        }
        let price = self.read("price", |_, text| money(text));
        Part {
            id: PartId(0),
            slot: self.slot,
            name,
            description: self.cell("description").unwrap_or_default().to_owned(),
            price: price.unwrap_or_default(),
            breaks: (self.read("breaks", |_, text| lists::breaks(price, text))).unwrap_or_default(),
            stock: self.read("stock", |_, text| schema::count(text)),
            status: match self.word("status") {
                "withdrawn" => Status::Withdrawn,
                "last-buy" => Status::LastBuy,
                _ => Status::Current,
            },
            height_m: self.optional("height_mm"),
            cells: (self.cells.iter())
                .filter(|(column, _)| column.name != "part")
                .map(|(column, text)| (column.name, text.clone()))
                .collect(),
            line: self.line.unwrap_or(0),
        }
    }

    /// Parses a cell or its default by its column's form; a required one must be there.
    pub(super) fn read<T>(&mut self, name: &str, parse: impl FnOnce(Form, &str) -> Result<T, Wrong>) -> Option<T> {
        let column = schema::find(self.slot, name)?;
        let value = match (self.cell(name), column.missing) {
            (Some(text), _) | (None, Missing::Default(text)) => parse(column.form, text),
            (None, Missing::Blank | Missing::Derived(_)) => return None,
            (None, Missing::Required) => {
                self.broken = true;
                if self.absent.contains(&column.name) {
                    return None;
                }
                Err(Wrong::new("is blank", format!("required: {}", column.form.range())))
            }
        };
        value.map_err(|wrong| self.fault(name, wrong)).ok()
    }

    fn at(&self, column: &str, wrong: Wrong) -> Fault {
        Fault {
            file: self.file.to_owned(),
            line: self.line,
            column: Some(format!("{}{column}", self.prefix)),
            part: self.part.clone(),
            text: clipped(self.cell(column).unwrap_or_default()),
            problem: wrong.problem,
            allowed: wrong.allowed,
        }
    }
}

/// Start of a long text: one stray quote can make a cell of half a file.
pub(super) fn clipped(text: &str) -> String {
    const SHOWN: usize = 80;
    match text.char_indices().nth(SHOWN) {
        Some((end, _)) => format!("{}...", &text[..end]),
        None => text.to_owned(),
    }
}

/// "2.20E+02": what a spreadsheet makes of the part name 22E1.
fn looks_mangled(name: &str) -> bool {
    let Some((mantissa, exponent)) = name.split_once("E+") else {
        return false;
    };
    let digits = |s: &str| !s.is_empty() && s.bytes().all(|b| b.is_ascii_digit());
    digits(&mantissa.replacen('.', "", 1)) && digits(exponent)
}
