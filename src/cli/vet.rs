//! Owns `vet`.

use std::path::PathBuf;

use clap::Args;

use super::output::Answer;
use super::{Common, Failure, Format};
use crate::catalogue::{Slot, load};
use crate::report::{csv, json, table};

#[derive(Args, Debug)]
pub(super) struct Vet {
    /// Folder of the catalogue
    folder: PathBuf,
    /// Warnings count as faults
    #[arg(long)]
    strict: bool,
}

impl Vet {
    #[allow(clippy::unnecessary_wraps)] // as every command
    pub(super) fn run(&self, common: &Common) -> Result<Answer, Failure> {
        let loaded = load(&self.folder);
        let counts: Vec<(&'static str, usize)> = Slot::ALL.iter().map(|s| s.file()).zip(loaded.counts).collect();
        let (mut faults, mut warnings) = (loaded.faults, loaded.warnings);
        if self.strict {
            faults.append(&mut warnings);
        }
        let text = match common.format {
            Format::Table => table::vet(&faults, &warnings, &counts),
            Format::Json => json::text(&json::vet(&faults, &warnings, &counts)),
            Format::Csv => csv::vet(&faults, &warnings),
        };
        Ok(Answer::new(text, u8::from(!faults.is_empty())))
    }
}
