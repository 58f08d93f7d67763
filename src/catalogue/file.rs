//! Owns the reading of one CSV file: its header, and each row against it.

use std::collections::BTreeMap;

use super::read::Loaded;
use super::row::{Row, clipped};
use super::schema::{self, Column, Missing, columns};
use super::split::{Record, split};
use super::{Slot, build};
use crate::fault::Fault;
use crate::suggest::did_you_mean;
use crate::units::Wrong;

/// One file while it is read.
pub(super) struct File<'a> {
    /// Whose file it is.
    pub(super) slot: Slot,
    /// As the user named it.
    pub(super) name: String,
    /// Where each part name was first seen, over all files.
    pub(super) places: &'a mut BTreeMap<String, String>,
    /// What goes in.
    pub(super) loaded: &'a mut Loaded,
}

/// The header row: the column of each place, and what it lacks.
struct Header {
    names: Vec<String>,
    columns: Vec<Option<&'static Column>>,
    absent: Vec<&'static str>,
}

impl File<'_> {
    /// Reads it all.
    pub(super) fn read(&mut self, text: &str) {
        let (records, wrongs) = split(text);
        let first = self.loaded.faults.len();
        for (line, wrong) in wrongs {
            self.fault(line, None, "", wrong);
        }
        let mut records = records.into_iter();
        match records.next() {
            Some(record) => {
                if let Some(header) = self.header(&record) {
                    for record in records {
                        self.row(&header, &record);
                    }
                }
            }
            None => self.fault(
                1,
                None,
                "",
                Wrong::new("has no header", "the first row names the columns"),
            ),
        }
        self.loaded.faults[first..].sort_by_key(|f| f.line);
    }

    fn header(&mut self, record: &Record) -> Option<Header> {
        let names: Vec<&str> = record.cells.iter().map(|c| c.trim()).collect();
        if let [only] = names[..]
            && let Some(separator) = [';', '\t'].into_iter().find(|s| only.contains(*s))
        {
            let what = if separator == ';' { "semicolons" } else { "tabs" };
            let wrong = Wrong::new(
                format!("is separated by {what}"),
                "save the file with commas, and decimals with a point",
            );
            self.fault(record.line, None, only, wrong);
            return None;
        }
        let slot = self.slot;
        let found: Vec<_> = names.iter().map(|name| schema::find(slot, name)).collect();
        if found.iter().all(Option::is_none) {
            let wrong = Wrong::new(
                "names no column of this file",
                "the first row holds the column names, such as part, price",
            );
            self.fault(record.line, None, names[0], wrong);
            return None;
        }
        for (k, name) in names.iter().enumerate() {
            if !name.is_empty() && names[..k].contains(name) {
                let wrong = Wrong::new("names a column twice", "name each column once");
                self.fault(record.line, Some(name), name, wrong);
            } else if !name.is_empty() && found[k].is_none() {
                self.fault(record.line, Some(name), name, unknown(slot, name));
            }
        }
        let absent: Vec<_> = columns(slot)
            .filter(|c| c.missing == Missing::Required && !names.contains(&c.name))
            .map(|c| c.name)
            .collect();
        for name in &absent {
            let wrong = Wrong::new("the column is missing", "it is required");
            self.fault(record.line, Some(name), "", wrong);
        }
        Some(Header {
            names: names.into_iter().map(str::to_owned).collect(),
            columns: found,
            absent,
        })
    }

    fn row(&mut self, header: &Header, record: &Record) {
        self.loaded.counts[self.slot as usize] += 1;
        let width = header.columns.len();
        let cells: Vec<&str> = record.cells.iter().map(|c| c.trim()).collect();
        let surplus = cells.iter().skip(width).any(|c| !c.is_empty());
        if cells.len() < width || surplus {
            let wrong = Wrong::new(
                format!("the row has {} cells, the header {width}", cells.len()),
                if surplus {
                    "quote a cell that holds a comma; write a decimal comma as a point"
                } else {
                    "a blank cell still needs its comma"
                },
            );
            self.fault(record.line, None, "", wrong);
            return;
        }
        let file = self.name.clone();
        let mut row = Row {
            slot: self.slot,
            file: &file,
            line: Some(record.line),
            prefix: String::new(),
            part: None,
            absent: &header.absent,
            cells: Vec::new(),
            faults: Vec::new(),
            warnings: Vec::new(),
            broken: false,
        };
        for (k, text) in cells.iter().enumerate().filter(|(_, text)| !text.is_empty()) {
            match header.columns.get(k).copied().flatten() {
                // Of a column named twice the first is read; the header has a fault anyway.
                Some(column) if row.cell(column.name).is_none() => {
                    row.cells.push((column, (*text).to_owned()));
                }
                Some(_) => {}
                None if header.names[k].is_empty() => {
                    let wrong = Wrong::new("stands under no column name", "name the column, or empty the cell");
                    row.faults.push(fault(&file, row.line, text, wrong));
                    row.broken = true;
                }
                // A column with an unknown name: the header has a fault.
                None => {}
            }
        }
        row.part = row.cell("part").map(clipped);
        self.unique(&mut row);
        build::add(&mut row, &mut self.loaded.catalogue);
        self.loaded.faults.append(&mut row.faults);
        self.loaded.warnings.append(&mut row.warnings);
    }

    /// Faults a part name that another row of the catalogue has.
    fn unique(&mut self, row: &mut Row<'_>) {
        let Some(name) = row.cell("part").map(str::to_owned) else {
            return;
        };
        if let Some(place) = self.places.get(&name) {
            let wrong = Wrong::new(
                "is listed twice",
                format!("{place} has it too; a part name is unique in the whole catalogue"),
            );
            row.fault("part", wrong);
        } else {
            let line = row.line.unwrap_or(0);
            self.places.insert(name, format!("{}:{line}", self.slot.file()));
        }
    }

    fn fault(&mut self, line: u64, column: Option<&str>, text: &str, wrong: Wrong) {
        self.loaded.faults.push(Fault {
            column: column.map(str::to_owned),
            ..fault(&self.name, Some(line), text, wrong)
        });
    }
}

/// A fault without column or part.
pub(super) fn fault(file: &str, line: Option<u64>, text: &str, wrong: Wrong) -> Fault {
    Fault {
        file: file.to_owned(),
        line,
        text: clipped(text),
        problem: wrong.problem,
        allowed: wrong.allowed,
        ..Fault::default()
    }
}

/// What is wrong with a header that no column has.
pub(super) fn unknown(slot: Slot, header: &str) -> Wrong {
    let guess = did_you_mean(header, columns(slot).map(|c| c.name));
    Wrong::new(format!("is not a column of {}", slot.file()), guess)
}
