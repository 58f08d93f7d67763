//! Owns `pick`, `rank` and `front`.

use std::path::PathBuf;

use clap::Args;
use clap::builder::{PossibleValuesParser, TypedValueParser};

use super::asked::{Asked, no_build};
use super::output::{Answer, page};
use super::{Common, Failure, Format};
use crate::catalogue::Slot;
use crate::optimise::{Outcome, Proof, Question, front, optimise};
use crate::report::each::EachReport;
use crate::report::{ProofLine, Report, csv, front as curve, json, price_lines, table};
use crate::study::each::each;
use crate::study::shelf::shelf;
use crate::study::{self, Room, Share};
use crate::units::{Dimension, Measure, Money, Range};

#[derive(Args, Debug)]
pub(super) struct Pick {
    #[command(flatten)]
    asked: Asked,
    /// Save the build, to audit it or to redo it later
    #[arg(long, value_name = "FILE")]
    save: Option<PathBuf>,
    /// Say what each requirement costs: the least useful relaxation of each one and what that saves
    #[arg(long)]
    prices: bool,
    /// Of all builds within this share of the best ("2%") the one whose tightest limit has the most room
    #[arg(long, value_name = "SHARE", value_parser = share, conflicts_with = "prices")]
    room: Option<Share>,
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

/// "2%", "2 %".
fn share(text: &str) -> Result<Share, String> {
    let measure = Measure::new(Dimension::Percentage, "%", Range::from(0.0).to(100.0));
    let share = measure.written(text).and_then(Share::new);
    share.map_err(|wrong| format!("{}; {}", wrong.problem, wrong.allowed))
}

impl Pick {
    pub(super) fn run(&self, common: &Common) -> Result<Answer, Failure> {
        let read = self.asked.read()?;
        let (question, _ticker) = self.asked.question(&read, common)?;
        let mut outcome = optimise(&question).map_err(Failure::Bug)?;
        let answer = match outcome.builds.first() {
            None => no_build(&question, &outcome, common)?,
            Some(found) => {
                let report = Report::found(&question, &outcome, found);
                let (report, more) = self.more(&question, &mut outcome, report)?;
                let shelf = shelf(question.supply, question.catalogue, &report.build, &question.without);
                let report = report.with_shelf(shelf);
                let text = match common.format {
                    Format::Table => table::build(&report, page(common)),
                    Format::Json => json::text(&json::build(&report)),
                    Format::Csv => csv::bill(&report),
                };
                let save = self.save.clone().map(|path| (path, json::text(&json::build(&report))));
                // A CSV file has no room for prices.
                let prices = match common.format {
                    Format::Csv => price_lines(&report),
                    Format::Table | Format::Json => Vec::new(),
                };
                Answer::new(text, code(outcome.proof == Proof::Proved && more.whole))
                    .with_save(save)
                    .with_talk(prices)
                    .with_cautions(&report.cautions, common)
                    .with_talk(more.talk)
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

/// How the rest of the answer came out.
struct More {
    /// Nothing was stopped.
    whole: bool,
    talk: Vec<String>,
}

impl Pick {
    /// Adds prices to the best build, or puts the roomiest one in its place.
    fn more<'c>(
        &self,
        question: &Question<'c>,
        outcome: &mut Outcome<'c>,
        mut report: Report<'c>,
    ) -> Result<(Report<'c>, More), Failure> {
        let done = |whole, talk| More { whole, talk };
        let stopped = |what: &str| done(false, vec![format!("stopped before {what}")]);
        let Some(best) = outcome.builds.first() else {
            return Ok((report, done(true, Vec::new())));
        };
        if !self.prices && self.room.is_none() {
            return Ok((report, done(true, Vec::new())));
        }
        if outcome.proof != Proof::Proved {
            let more = stopped("the best build was proved, which the rest is measured by");
            return Ok((report, more));
        }
        if let Some(share) = self.room {
            let room = study::roomiest(question, best.clone(), share).map_err(Failure::Bug)?;
            outcome.counts.add(&room.counts);
            return Ok((roomy(question, &report, &room, share), done(room.proved, Vec::new())));
        }
        let prices = study::prices(question, best.key.objective(question.objective)).map_err(Failure::Bug)?;
        report.prices = Some(prices.list);
        let more = if prices.complete {
            done(true, Vec::new())
        } else {
            stopped("every requirement was tried: another one may cost something too")
        };
        Ok((report, more))
    }
}

/// The report on the roomiest build instead of the best one.
fn roomy<'c>(question: &Question<'c>, best: &Report<'c>, room: &Room<'c>, share: Share) -> Report<'c> {
    let value = |objective: i64| Money(objective).value();
    let bound = best.proof.map_or(0.0, |(_, proof)| proof.bound);
    let proof = ProofLine {
        status: if room.proved { "proved" } else { "best found" },
        value: Some(value(room.found.key.objective(question.objective))),
        bound,
    };
    let mut report = Report::new(
        question.supply,
        room.found.build.clone(),
        Some((question.objective, proof)),
        best.currency.clone(),
        best.catalogue.clone(),
    );
    report.room = Some((share, bound));
    report
}
