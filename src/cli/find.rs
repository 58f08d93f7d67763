//! Owns `pick`, `rank` and `front`.

use std::path::PathBuf;

use clap::Args;
use clap::builder::{PossibleValuesParser, TypedValueParser};

use super::asked::{Asked, no_build};
use super::output::{Answer, page};
use super::{Common, Failure, Format};
use crate::catalogue::Slot;
use crate::optimise::{Proof, Question, front, optimise};
use crate::report::each::EachReport;
use crate::report::{Report, csv, front as curve, json, table};
use crate::study::each::each;
use crate::study::shelf::shelf;

#[derive(Args, Debug)]
pub(super) struct Pick {
    #[command(flatten)]
    asked: Asked,
    /// Save the build, to audit it or to redo it later
    #[arg(long, value_name = "FILE")]
    save: Option<PathBuf>,
}

#[derive(Args, Debug)]
pub(super) struct Rank {
    #[command(flatten)]
    asked: Asked,
    /// How many builds
    #[arg(long, value_name = "N", default_value_t = 10, value_parser = clap::value_parser!(u32).range(1..=10_000))]
    top: u32,
    /// Instead, for every part of that slot the best build around it
    #[arg(long, value_name = "SLOT", conflicts_with = "top", value_parser = slots())]
    each: Option<Slot>,
}

#[derive(Args, Debug)]
pub(super) struct Front {
    #[command(flatten)]
    asked: Asked,
}

fn slots() -> impl TypedValueParser<Value = Slot> {
    let slot = |word: String| Slot::ALL.into_iter().find(|slot| slot.word() == word);
    PossibleValuesParser::new(Slot::ALL.map(Slot::word)).try_map(move |word| slot(word).ok_or("is not a slot"))
}

/// 0, or 3 when stopped before the proof.
pub(super) fn code(proved: bool) -> u8 {
    if proved { 0 } else { 3 }
}

impl Pick {
    pub(super) fn run(&self, common: &Common) -> Result<Answer, Failure> {
        let read = self.asked.read()?;
        let (question, _ticker) = self.asked.question(&read, common)?;
        let outcome = optimise(&question).map_err(Failure::Bug)?;
        let answer = match outcome.builds.first() {
            None => no_build(&question, &outcome, common)?,
            Some(found) => {
                let shelf = shelf(question.supply, question.catalogue, &found.build, &question.without);
                let report = Report::found(&question, &outcome, found).with_shelf(shelf);
                let text = match common.format {
                    Format::Table => table::build(&report, page(common)),
                    Format::Json => json::text(&json::build(&report)),
                    Format::Csv => csv::bill(&report),
                };
                let save = self.save.clone().map(|path| (path, json::text(&json::build(&report))));
                Answer::new(text, code(outcome.proof == Proof::Proved))
                    .with_save(save)
                    .with_cautions(&report.cautions, common)
            }
        };
        Ok(read.finish(answer, &outcome.counts))
    }
}

impl Rank {
    pub(super) fn run(&self, common: &Common) -> Result<Answer, Failure> {
        let read = self.asked.read()?;
        let (question, _ticker) = self.asked.question(&read, common)?;
        let top = if self.each.is_some() { 1 } else { self.top as usize };
        let question = Question { top, ..question };
        let outcome = optimise(&question).map_err(Failure::Bug)?;
        let mut counts = outcome.counts;
        let answer = match self.each {
            _ if outcome.builds.is_empty() => no_build(&question, &outcome, common)?,
            None => {
                let reports = Report::all(&question, &outcome);
                let text = match common.format {
                    Format::Table => table::rank(&reports, page(common)),
                    Format::Json => json::text(&json::rank(&reports)),
                    Format::Csv => csv::rank(&reports),
                };
                Answer::new(text, code(outcome.proof == Proof::Proved)).with_cautions(&reports[0].cautions, common)
            }
            Some(slot) => {
                let (found, more) = each(&question, slot, &outcome).map_err(Failure::Bug)?;
                counts.add(&more);
                let all = std::iter::once(&outcome).chain(found.iter().map(|each| &each.outcome));
                let proved = all.into_iter().all(|outcome| outcome.proof == Proof::Proved);
                match EachReport::new(&question, slot, &outcome, &found) {
                    None => no_build(&question, &outcome, common)?,
                    Some(report) => {
                        let text = match common.format {
                            Format::Table => report.table(page(common)),
                            Format::Json => json::text(&report.json()),
                            Format::Csv => report.csv(),
                        };
                        Answer::new(text, code(proved)).with_cautions(report.cautions(), common)
                    }
                }
            }
        };
        Ok(read.finish(answer, &counts))
    }
}

impl Front {
    pub(super) fn run(&self, common: &Common) -> Result<Answer, Failure> {
        let read = self.asked.read()?;
        let (question, _ticker) = self.asked.question(&read, common)?;
        let outcome = front(&question).map_err(Failure::Bug)?;
        let proved = outcome.proof == Proof::Proved;
        let answer = if outcome.builds.is_empty() {
            no_build(&question, &outcome, common)?
        } else {
            let reports = Report::all(&question, &outcome);
            let text = match common.format {
                Format::Table => curve::table(&reports, proved, page(common)),
                Format::Json => json::text(&curve::json(&reports)),
                Format::Csv => curve::csv(&reports),
            };
            Answer::new(text, code(proved)).with_cautions(&reports[0].cautions, common)
        };
        Ok(read.finish(answer, &outcome.counts))
    }
}
