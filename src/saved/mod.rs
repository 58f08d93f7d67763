//! Owns saved and hand-written builds: a JSON document in, a supply with the choice of its parts out.
//!
//! A document stands alone: its "parts" carry the cells of every part it names, and are read by the catalogue's own
//! parser. A hand-written one needs supply, transformers, sections and rails, and takes its parts from a catalogue.

mod document;
mod resolve;

use std::path::Path as FilePath;

use serde_json::Value;

use crate::build::{Build, misfits};
use crate::catalogue::{Catalogue, SavedPart, Slot, from_cells};
use crate::fault::Fault;
use crate::supply::{Supply, from_json};
use crate::text;
use document::Document;

/// Schema of the document.
pub const SCHEMA: &str = "binrail.build/1";

/// A saved build whose parts are not looked up yet.
#[derive(Debug)]
pub struct Saved {
    file: String,
    document: Document,
    /// The requirement.
    pub supply: Supply,
    /// Folder of the catalogue that it was made from: absolute when saved, else as the supply names it.
    pub catalogue: Option<String>,
    parts: Option<Vec<SavedPart>>,
    currency: Option<String>,
    objective: Option<String>,
}

/// Reads a build file.
///
/// # Errors
/// Every fault of the file.
pub fn read(path: &FilePath) -> Result<Saved, Vec<Fault>> {
    let file = path.display().to_string();
    let text = text::read(path)?;
    let value: Value = serde_json::from_str(&text).map_err(|e| {
        vec![Fault {
            file: file.clone(),
            line: Some(e.line() as u64),
            problem: format!("is not JSON: {e}"),
            allowed: format!("a {SCHEMA} document, as pick --save writes it"),
            ..Fault::default()
        }]
    })?;
    from_value(&value, &file)
}

/// The same from a parsed document.
///
/// # Errors
/// Every fault of the document.
pub fn from_value(value: &Value, file: &str) -> Result<Saved, Vec<Fault>> {
    let mut faults = Vec::new();
    let document = Document::read(value, file, &mut faults);
    let supply = match value.get("supply") {
        Some(supply) => from_json(supply, file)
            .map_err(|mut more| faults.append(&mut more))
            .ok(),
        None => None,
    };
    let (Some(document), Some(supply)) = (document, supply) else {
        return Err(faults);
    };
    if !faults.is_empty() {
        return Err(faults);
    }
    let parts = value
        .get("parts")
        .and_then(Value::as_object)
        .map(|parts| saved_parts(&document, parts));
    let text = |key: &str| value.get(key).and_then(Value::as_str).map(str::to_owned);
    Ok(Saved {
        file: file.to_owned(),
        catalogue: text("catalogue").or_else(|| supply.catalogue.clone()),
        currency: text("currency"),
        objective: text("objective"),
        document,
        supply,
        parts,
    })
}

/// The rows that the document carries, each under the slot in which the build uses it.
fn saved_parts(document: &Document, parts: &serde_json::Map<String, Value>) -> Vec<SavedPart> {
    let cells = |name: &str| -> Vec<(String, String)> {
        let row = parts.get(name).and_then(Value::as_object);
        let text = |value: &Value| value.as_str().map_or_else(|| value.to_string(), str::to_owned);
        row.map(|row| {
            row.iter()
                .map(|(column, value)| (column.clone(), text(value)))
                .collect()
        })
        .unwrap_or_default()
    };
    let mut used: Vec<(Slot, &str)> = document.used();
    used.sort_unstable();
    used.dedup();
    used.into_iter()
        .filter(|(_, name)| parts.contains_key(*name))
        .map(|(slot, name)| (slot, name.to_owned(), cells(name)))
        .collect()
}

impl Saved {
    /// The word of what the build was chosen by, if it says.
    #[must_use]
    pub fn objective(&self) -> Option<&str> {
        self.objective.as_deref()
    }

    /// The catalogue that the document carries; `None` for a hand-written build without parts.
    ///
    /// # Errors
    /// Every fault of its cells.
    pub fn own_catalogue(&self) -> Option<Result<Catalogue, Vec<Fault>>> {
        let parts = self.parts.as_ref()?;
        Some(from_cells(parts.clone(), &self.file, self.currency.clone()))
    }

    /// The build, its parts looked up in a catalogue.
    ///
    /// # Errors
    /// Parts that are not there, references that lead nowhere, rules of assembly that are broken.
    pub fn build<'c>(&self, catalogue: &'c Catalogue) -> Result<Build<'c>, Vec<Fault>> {
        let build = resolve::resolve(&self.document, &self.supply, catalogue, &self.file)?;
        let broken = misfits(&self.supply, &build);
        if broken.is_empty() {
            return Ok(build);
        }
        let fault = |m: crate::build::Misfit| Fault {
            file: self.file.clone(),
            column: Some(m.of),
            problem: m.message,
            ..Fault::default()
        };
        Err(broken.into_iter().map(fault).collect())
    }

    /// Where today's rows differ from the cells that the document carries: part, column, then and now.
    #[must_use]
    pub fn changed_cells(&self, today: &Catalogue) -> Vec<String> {
        let mut changes = Vec::new();
        for (_, name, cells) in self.parts.iter().flatten() {
            let Some(part) = today.find(name) else { continue };
            let now = |column: &str| {
                part.cells
                    .iter()
                    .find(|(c, _)| *c == column)
                    .map_or("", |(_, text)| text.as_str())
            };
            let then = |column: &str| {
                cells
                    .iter()
                    .find(|(c, _)| c == column)
                    .map_or("", |(_, text)| text.as_str())
            };
            let mut columns: Vec<&str> = cells.iter().map(|(c, _)| c.as_str()).collect();
            columns.extend(part.cells.iter().map(|(c, _)| *c).filter(|c| then(c).is_empty()));
            for column in columns.into_iter().filter(|c| now(c) != then(c)) {
                changes.push(format!(
                    "{name}: {column} was \"{}\", is \"{}\"",
                    then(column),
                    now(column)
                ));
            }
        }
        changes
    }
}
