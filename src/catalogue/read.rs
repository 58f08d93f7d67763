//! Owns the reading of a catalogue folder, and of the rows that a saved build carries.
//!
//! Every fault is collected. A row with a fault is left out, all others are still checked.

use std::collections::BTreeMap;
use std::path::Path;

use super::file::{File, fault, unknown};
use super::row::Row;
use super::{Catalogue, Part, PartId, Slot, build, schema};
use crate::fault::Fault;
use crate::suggest::did_you_mean;
use crate::text;
use crate::units::Wrong;

/// What a catalogue folder holds.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Loaded {
    /// The parts without fault.
    pub catalogue: Catalogue,
    /// Everything that is wrong, in order of file and line.
    pub faults: Vec<Fault>,
    /// What is odd, but has one reading.
    pub warnings: Vec<Fault>,
    /// Rows with a part, with or without fault, by slot.
    pub counts: [usize; 5],
}

/// Reads the five files and catalogue.toml.
#[must_use]
pub fn load(folder: &Path) -> Loaded {
    let mut loaded = Loaded::default();
    let absolute = match folder.canonicalize() {
        Ok(absolute) if absolute.is_dir() => absolute,
        other => {
            let problem = if other.is_ok() { "is not a folder" } else { "is missing" };
            let wrong = Wrong::new(problem, "name a folder with the catalogue's files");
            loaded
                .faults
                .push(fault(&folder.display().to_string(), None, "", wrong));
            return loaded;
        }
    };
    loaded.catalogue.folder = absolute.display().to_string();
    let mut places = BTreeMap::new();
    for slot in Slot::ALL {
        let path = folder.join(slot.file());
        match text::read(&path) {
            Ok(text) => {
                let mut file = File {
                    slot,
                    name: path.display().to_string(),
                    places: &mut places,
                    loaded: &mut loaded,
                };
                file.read(&text);
            }
            Err(mut faults) => {
                if !path.exists() {
                    let names = Slot::ALL.map(Slot::file).join(", ");
                    faults[0].allowed = format!("a catalogue has {names}");
                }
                loaded.faults.append(&mut faults);
            }
        }
    }
    let settings = folder.join("catalogue.toml");
    if settings.exists() {
        match currency(&settings) {
            Ok(found) => loaded.catalogue.currency = found,
            Err(faults) => loaded.faults.extend(faults),
        }
    }
    settle(&mut loaded.catalogue);
    loaded
}

/// A part as a saved build carries it: slot, name, and cells as (column, text).
pub type SavedPart = (Slot, String, Vec<(String, String)>);

/// The parts that a saved build carries.
///
/// # Errors
/// Every fault, with the column as "parts.NAME.column".
pub fn from_cells(rows: Vec<SavedPart>, file: &str, currency: Option<String>) -> Result<Catalogue, Vec<Fault>> {
    let mut catalogue = Catalogue {
        currency,
        ..Catalogue::default()
    };
    let mut faults = Vec::new();
    let mut names = std::collections::BTreeSet::new();
    for (slot, name, cells) in rows {
        let name = name.trim().to_owned();
        let mut row = Row {
            slot,
            file,
            line: None,
            prefix: format!("parts.{name}."),
            part: None,
            absent: &[],
            cells: Vec::new(),
            faults: Vec::new(),
            warnings: Vec::new(),
            broken: !names.insert(name.clone()),
        };
        if row.broken {
            row.faults.push(Fault {
                column: Some(format!("parts.{name}")),
                ..fault(file, None, "", Wrong::new("is listed twice", "list each part once"))
            });
        }
        for (header, text) in cells {
            match schema::find(slot, &header).filter(|c| c.name != "part") {
                Some(_) if text.trim().is_empty() => {}
                Some(column) => row.cells.push((column, text.trim().to_owned())),
                None => row.faults.push(Fault {
                    column: Some(format!("parts.{name}.{header}")),
                    ..fault(file, None, &header, unknown(slot, &header))
                }),
            }
        }
        row.cells.extend(
            schema::find(slot, "part")
                .filter(|_| !name.is_empty())
                .map(|c| (c, name)),
        );
        build::add(&mut row, &mut catalogue);
        faults.append(&mut row.faults);
    }
    if !faults.is_empty() {
        return Err(faults);
    }
    settle(&mut catalogue);
    Ok(catalogue)
}

/// The currency of catalogue.toml.
fn currency(path: &Path) -> Result<Option<String>, Vec<Fault>> {
    let file = path.display().to_string();
    let text = text::read(path)?;
    let table = toml::de::DeTable::parse(&text).map_err(|e| {
        let line = e.span().map(|s| text::line_at(&text, s.start));
        vec![fault(&file, line, "", Wrong::new(e.message(), ""))]
    })?;
    let mut faults = Vec::new();
    let mut found = None;
    for (key, value) in table.into_inner() {
        let line = Some(text::line_at(&text, key.span().start));
        let key = key.into_inner();
        let (text, wrong) = if key == "currency" {
            let text = value.get_ref().as_str().unwrap_or_default().to_owned();
            if text.len() == 3 && text.bytes().all(|b| b.is_ascii_uppercase()) {
                found = Some(text);
                continue;
            }
            let allowed = "three capital letters, such as \"EUR\" (ISO 4217)";
            (text, Wrong::new("is not a currency", allowed))
        } else {
            let guess = did_you_mean(&key, ["currency"]);
            (key.to_string(), Wrong::new("is not a known key", guess))
        };
        faults.push(Fault {
            column: Some(key.into_owned()),
            ..fault(&file, line, &text, wrong)
        });
    }
    if faults.is_empty() { Ok(found) } else { Err(faults) }
}

/// Sorts by part name and numbers the parts.
fn settle(catalogue: &mut Catalogue) {
    catalogue.transformers.sort_by(|a, b| a.part.name.cmp(&b.part.name));
    catalogue.rectifiers.sort_by(|a, b| a.part.name.cmp(&b.part.name));
    catalogue.reservoirs.sort_by(|a, b| a.part.name.cmp(&b.part.name));
    catalogue.pass_devices.sort_by(|a, b| a.part.name.cmp(&b.part.name));
    catalogue.sinks.sort_by(|a, b| a.part.name.cmp(&b.part.name));
    let parts = (catalogue.transformers.iter_mut().map(|x| &mut x.part))
        .chain(catalogue.rectifiers.iter_mut().map(|x| &mut x.part))
        .chain(catalogue.reservoirs.iter_mut().map(|x| &mut x.part))
        .chain(catalogue.pass_devices.iter_mut().map(|x| &mut x.part))
        .chain(catalogue.sinks.iter_mut().map(|x| &mut x.part));
    for (id, part) in (0..).zip(parts) {
        let part: &mut Part = part;
        part.id = PartId(id);
    }
}
