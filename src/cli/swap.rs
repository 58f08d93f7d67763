//! Owns `swap`.

use std::collections::BTreeSet;
use std::path::PathBuf;
use std::time::Instant;

use clap::Args;

use super::asked::{Read, Wishes, no_build};
use super::find::code;
use super::output::{Answer, page};
use super::{Common, Failure, Format, input};
use crate::catalogue::{PartId, load};
use crate::optimise::{Proof, Question, optimise};
use crate::report::json;
use crate::report::swap::{LossReport, SwapReport};
use crate::saved;
use crate::screen::{Counts, Objective};
use crate::study::shelf::shelf;
use crate::study::swap::{Old, swap, swap_each};

#[derive(Args, Debug)]
pub(super) struct Swap {
    /// A saved build (JSON); without --without whatever is gone, withdrawn or short of stock must go
    build: PathBuf,
    #[command(flatten)]
    settings: input::Settings,
    #[command(flatten)]
    wishes: Wishes,
    /// The best build of all, however much it changes
    #[arg(long)]
    free: bool,
    /// Instead, what the loss of each of its parts would cost
    #[arg(long, conflicts_with = "save")]
    each: bool,
    /// Save the new build
    #[arg(long, value_name = "FILE")]
    save: Option<PathBuf>,
}

impl Swap {
    pub(super) fn run(&self, common: &Common) -> Result<Answer, Failure> {
        let begun = Instant::now();
        let saved = saved::read(&self.build)?;
        let folder = input::build_folder(
            saved.catalogue.as_deref(),
            &self.build,
            self.wishes.catalogue.as_deref(),
        )?;
        let loaded = load(&folder);
        if !loaded.faults.is_empty() {
            return Err(Failure::Input(loaded.faults));
        }
        // The parts of then where the file carries them, for what is gone is in no catalogue.
        let then = saved.own_catalogue().transpose()?;
        let read = Read::new(self.settings.change(&saved.supply)?, loaded, begun);
        let catalogue = &read.loaded.catalogue;
        let build = saved.build(then.as_ref().unwrap_or(catalogue))?;
        let old = Old::new(&read.supply, &build, catalogue);

        let gone: BTreeSet<&str> = (old.parts.iter())
            .filter(|(_, row)| row.is_none())
            .map(|(part, _)| part.name.as_str())
            .collect();
        let objective = match saved.objective() {
            Some(word) if word == Objective::Heat.word() => Objective::Heat,
            _ => Objective::Cost,
        };
        let (question, _ticker) = self
            .wishes
            .question(&read.supply, catalogue, objective, &gone, common)?;
        let named: BTreeSet<PartId> = question.with.iter().map(|&(part, _)| part).collect();
        let losses = if self.wishes.without.is_empty() {
            old.losses(&read.supply, &named)
        } else {
            Vec::new()
        };
        let row = |name: &str| {
            old.parts
                .iter()
                .find(|(part, _)| part.name == name)
                .and_then(|&(_, row)| row)
        };
        let lost = losses.iter().filter_map(|(part, _)| row(&part.name)).map(|row| row.id);
        let question = Question {
            without: question.without.iter().copied().chain(lost).collect(),
            ..question
        };
        let (answer, counts) = if self.each {
            let swaps = swap_each(&question, &old, self.free).map_err(Failure::Bug)?;
            let mut counts = Counts::default();
            swaps.iter().for_each(|(_, swap)| counts.add(&swap.outcome.counts));
            let proved = swaps.iter().all(|(_, swap)| swap.outcome.proof == Proof::Proved);
            let report = LossReport::new(&question, &old, &swaps);
            let text = match common.format {
                Format::Table => report.table(page(common)),
                Format::Json => json::text(&report.json()),
                Format::Csv => report.csv(),
            };
            (Answer::new(text, code(proved)), counts)
        } else {
            let mut found = swap(&question, &old, self.free).map_err(Failure::Bug)?;
            if found.free.is_none() && !found.outcome.builds.is_empty() {
                // Only to say what more changes would bring.
                let plain = optimise(&question).map_err(Failure::Bug)?;
                found.outcome.counts.add(&plain.counts);
                found.free = plain.builds.into_iter().next();
            }
            let look = |report: &crate::report::Report| {
                shelf(question.supply, question.catalogue, &report.build, &question.without)
            };
            let answer = match SwapReport::new(&question, &old, &losses, &found, self.free, look) {
                None => no_build(&question, &found.outcome, common)?,
                Some(report) => {
                    let text = match common.format {
                        Format::Table => report.table(page(common)),
                        Format::Json => json::text(&report.json()),
                        Format::Csv => report.csv(),
                    };
                    let save = (self.save.clone()).map(|path| (path, json::text(&json::build(&report.report))));
                    Answer::new(text, code(found.outcome.proof == Proof::Proved))
                        .with_save(save)
                        .with_cautions(&report.report.cautions, common)
                }
            };
            (answer, found.outcome.counts)
        };
        let answer = answer.with_talk(saved.changed_cells(catalogue));
        Ok(read.finish(answer, &counts))
    }
}
