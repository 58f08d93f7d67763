//! Owns what commands read: supply, catalogue, parts named on the command line.

use std::path::{Path, PathBuf};

use clap::Args;

use super::{Failure, call_fault};
use crate::catalogue::{Catalogue, Loaded, PartId, load};
use crate::fault::Fault;
use crate::suggest::did_you_mean;
use crate::supply::{Supply, changed, read_with};

/// `--set`, for every command that reads a supply.
#[derive(Args, Debug)]
pub(super) struct Settings {
    /// A key of the supply and the value it shall have, as ambient.high="43 degC" or rail.NAME.ripple="6 mV" (repeatable)
    #[arg(long = "set", value_name = "KEY=VALUE")]
    settings: Vec<String>,
}

impl Settings {
    /// A supply file with the settings in it.
    pub(super) fn read(&self, file: &Path) -> Result<Supply, Failure> {
        Ok(read_with(file, &self.settings)?)
    }

    /// A supply read before, with the settings in it.
    pub(super) fn change(&self, supply: &Supply) -> Result<Supply, Failure> {
        Ok(changed(supply, &self.settings)?)
    }
}

/// The catalogue of a supply: the one named on the command line, else the one in the file, relative to it.
pub(super) fn catalogue(supply: &Supply, file: &Path, flag: Option<&Path>) -> Result<Loaded, Failure> {
    let folder = folder(supply.catalogue.as_deref(), file, flag)?;
    let loaded = load(&folder);
    if loaded.faults.is_empty() {
        Ok(loaded)
    } else {
        Err(Failure::Input(loaded.faults))
    }
}

fn folder(named: Option<&str>, file: &Path, flag: Option<&Path>) -> Result<PathBuf, Vec<Fault>> {
    match (flag, named) {
        (Some(folder), _) => Ok(folder.to_owned()),
        (None, Some(named)) => Ok(file.parent().unwrap_or(Path::new("")).join(named)),
        (None, None) => Err(vec![Fault {
            file: file.display().to_string(),
            column: Some("catalogue".into()),
            problem: "is missing".into(),
            allowed: "name the catalogue's folder in the file or with --catalogue".into(),
            ..Fault::default()
        }]),
    }
}

/// The folder of a build's catalogue.
pub(super) fn build_folder(named: Option<&str>, file: &Path, flag: Option<&Path>) -> Result<PathBuf, Vec<Fault>> {
    folder(named, file, flag)
}

/// Warnings of a catalogue as lines.
pub(super) fn warnings(loaded: &Loaded) -> Vec<String> {
    loaded.warnings.iter().map(|w| format!("warning: {w}")).collect()
}

/// A part by name.
pub(super) fn part(name: &str, flag: &str, catalogue: &Catalogue, faults: &mut Vec<Fault>) -> Option<PartId> {
    let found = catalogue.find(name).map(|p| p.id);
    if found.is_none() {
        let hint = did_you_mean(name, catalogue.parts().map(|p| p.name.as_str()));
        faults.push(call_fault(flag, name, "is not in the catalogue", &hint));
    }
    found
}

/// `PART` or `PART@RAIL`.
pub(super) fn part_at(
    text: &str,
    flag: &str,
    catalogue: &Catalogue,
    supply: &Supply,
    faults: &mut Vec<Fault>,
) -> Option<(PartId, Option<usize>)> {
    // A part's own name may hold an "@".
    if let Some((name, rail)) = text.rsplit_once('@').filter(|_| catalogue.find(text).is_none()) {
        let place = supply.rails.iter().position(|r| r.name == rail);
        if place.is_none() {
            let hint = did_you_mean(rail, supply.rails.iter().map(|r| r.name.as_str()));
            let rails: Vec<&str> = supply.rails.iter().map(|r| r.name.as_str()).collect();
            let hint = if hint.is_empty() {
                format!("the rails are {}", rails.join(", "))
            } else {
                hint
            };
            faults.push(call_fault(flag, rail, "is no rail of the supply", &hint));
        }
        return part(name, flag, catalogue, faults)
            .zip(place)
            .map(|(part, rail)| (part, Some(rail)));
    }
    part(text, flag, catalogue, faults).map(|part| (part, None))
}
