//! Owns `audit`.

use std::path::PathBuf;

use clap::Args;

use super::output::{Answer, page};
use super::{Common, Failure, Format, input};
use crate::catalogue::load;
use crate::report::{Report, csv, json, table};
use crate::saved;

#[derive(Args, Debug)]
pub(super) struct Audit {
    /// A saved or hand-written build (JSON)
    build: PathBuf,
    /// Judge by today's rows in this folder instead of the cells saved with the build
    #[arg(long, value_name = "DIR")]
    catalogue: Option<PathBuf>,
}

impl Audit {
    pub(super) fn run(&self, common: &Common) -> Result<Answer, Failure> {
        let saved = saved::read(&self.build)?;
        let mut talk = Vec::new();
        let catalogue = match saved.own_catalogue() {
            Some(own) if self.catalogue.is_none() => own?,
            _ => {
                let folder = input::build_folder(saved.catalogue.as_deref(), &self.build, self.catalogue.as_deref())?;
                let loaded = load(&folder);
                if !loaded.faults.is_empty() {
                    return Err(Failure::Input(loaded.faults));
                }
                talk.extend(input::warnings(&loaded));
                talk.extend(saved.changed_cells(&loaded.catalogue));
                loaded.catalogue
            }
        };
        let build = saved.build(&catalogue)?;
        let report = Report::new(
            &saved.supply,
            build,
            None,
            catalogue.currency.clone(),
            catalogue.folder.clone(),
        );
        let text = match common.format {
            Format::Table => table::audit(&report, page(common)),
            Format::Json => json::text(&json::audit(&report)),
            Format::Csv => csv::margins(&report),
        };
        if common.format == Format::Csv {
            talk.extend(report.cautions.clone());
        }
        Ok(Answer::new(text, u8::from(!report.audit.passes())).with_talk(talk))
    }
}
