//! Owns `pick` and `rank`.

use std::path::PathBuf;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};
use std::time::{Duration, Instant};

use clap::{Args, ValueEnum};

use super::output::{Answer, page};
use super::{Common, Failure, Format, call_fault, input};
use crate::build::device_serves;
use crate::catalogue::{Catalogue, Loaded};
use crate::optimise::{Outcome, Proof, Question, Reasons, optimise, rejections};
use crate::report::none::NoBuild;
use crate::report::{ProofLine, Report, csv, json, table};
use crate::screen::{Counts, Objective, Stop};
use crate::supply::{Rail, Supply};

#[derive(ValueEnum, Debug, Clone, Copy)]
enum By {
    /// The cheapest; of equally cheap ones the coolest
    Cost,
    /// The coolest; of equally cool ones the cheapest
    Heat,
}

/// What `pick` and `rank` share.
#[derive(Args, Debug)]
struct Asked {
    /// Supply file
    supply: PathBuf,
    #[command(flatten)]
    settings: input::Settings,
    /// What is to be least
    #[arg(long, value_enum, default_value_t = By::Cost)]
    by: By,
    /// A part that may not be used (repeatable)
    #[arg(long, value_name = "PART")]
    without: Vec<String>,
    /// A part of which at least one piece must be used, anywhere or in that rail's section (repeatable)
    #[arg(long, value_name = "PART[@RAIL]")]
    with: Vec<String>,
    /// Folder of the catalogue, instead of the supply's own
    #[arg(long, value_name = "DIR")]
    catalogue: Option<PathBuf>,
    /// Stop after so many seconds with the best found
    #[arg(long, value_name = "S", value_parser = seconds)]
    seconds: Option<f64>,
}

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
}

/// A year: beyond it nobody waits, and the clock's arithmetic stays safe.
const LONGEST_S: f64 = 31_536_000.0;

fn seconds(text: &str) -> Result<f64, String> {
    let seconds: f64 = text.parse().map_err(|_| "is not a number of seconds".to_owned())?;
    if seconds > 0.0 && seconds <= LONGEST_S {
        Ok(seconds)
    } else {
        Err("is not between 0 and a year".into())
    }
}

impl Pick {
    pub(super) fn run(&self, common: &Common) -> Result<Answer, Failure> {
        self.asked.run(common, None, self.save.as_ref())
    }
}

impl Rank {
    pub(super) fn run(&self, common: &Common) -> Result<Answer, Failure> {
        self.asked.run(common, Some(self.top as usize), None)
    }
}

impl Asked {
    /// One build, or (`top`) a ranking.
    fn run(&self, common: &Common, top: Option<usize>, save: Option<&PathBuf>) -> Result<Answer, Failure> {
        let begun = Instant::now();
        let supply = self.settings.read(&self.supply)?;
        let loaded = input::catalogue(&supply, &self.supply, self.catalogue.as_deref())?;
        let question = self.question(&supply, &loaded.catalogue, top.unwrap_or(1))?;
        let read_in = begun.elapsed();
        let outcome = optimise(&question).map_err(Failure::Bug)?;
        let work = work(&outcome.counts, read_in, begun.elapsed());
        let proved = outcome.proof == Proof::Proved;
        let answer = if outcome.builds.is_empty() {
            let reasons = if proved {
                rejections(&question).map_err(Failure::Bug)?
            } else {
                Reasons::default()
            };
            let none = NoBuild {
                proof: ProofLine::new(&outcome, None, question.objective),
                reasons,
                unserved: unserved(&question),
                currency: loaded.catalogue.currency.clone(),
            };
            let text = match common.format {
                Format::Table => none.table(page(common)),
                Format::Json => json::text(&none.json()),
                Format::Csv => none.csv(),
            };
            Answer::new(text, if proved { 1 } else { 3 })
        } else {
            let reports = reports(&question, &loaded, &outcome);
            let first = &reports[0];
            let text = match (common.format, top.is_some()) {
                (Format::Table, false) => table::build(first, page(common)),
                (Format::Json, false) => json::text(&json::build(first)),
                (Format::Csv, false) => csv::bill(first),
                (Format::Table, true) => table::rank(&reports, page(common)),
                (Format::Json, true) => json::text(&json::rank(&reports)),
                (Format::Csv, true) => csv::rank(&reports),
            };
            let save = save.map(|path| (path.clone(), json::text(&json::build(first))));
            // A CSV file has no room for cautions, but no build goes without them.
            let cautions = if common.format == Format::Csv {
                first.cautions.clone()
            } else {
                Vec::new()
            };
            Answer::new(text, if proved { 0 } else { 3 })
                .with_save(save)
                .with_talk(cautions)
        };
        Ok(answer.with_talk(input::warnings(&loaded)).with_work(work))
    }

    fn question<'c>(&self, supply: &'c Supply, catalogue: &'c Catalogue, top: usize) -> Result<Question<'c>, Failure> {
        let mut faults = Vec::new();
        let without = self
            .without
            .iter()
            .filter_map(|n| input::part(n, "--without", catalogue, &mut faults))
            .collect();
        let with = (self.with.iter())
            .filter_map(|text| input::part_at(text, "--with", catalogue, supply, &mut faults))
            .collect();
        if !faults.is_empty() {
            return Err(Failure::Input(faults));
        }
        let stop = Stop {
            deadline: self.seconds.map(|s| Instant::now() + Duration::from_secs_f64(s)),
            asked: on_interrupt()?,
        };
        let objective = match self.by {
            By::Cost => Objective::Cost,
            By::Heat => Objective::Heat,
        };
        Ok(Question {
            top,
            without,
            with,
            stop,
            ..Question::new(supply, catalogue, objective)
        })
    }
}

/// Rails that no device serves by the rules of assembly.
fn unserved(question: &Question) -> Vec<String> {
    let served = |rail: &Rail| {
        question
            .catalogue
            .pass_devices
            .iter()
            .any(|d| device_serves(d, rail, true))
    };
    question
        .supply
        .rails
        .iter()
        .filter(|rail| !served(rail))
        .map(|rail| rail.name.clone())
        .collect()
}

/// A flag that the first Ctrl-C sets; the second one ends the program.
fn on_interrupt() -> Result<Arc<AtomicBool>, Failure> {
    let asked = Arc::new(AtomicBool::new(false));
    let flag = Arc::clone(&asked);
    ctrlc::set_handler(move || {
        if flag.swap(true, Ordering::Relaxed) {
            std::process::exit(3);
        }
    })
    .map_err(|e| Failure::Input(vec![call_fault("", "", &format!("Ctrl-C cannot be caught: {e}"), "")]))?;
    Ok(asked)
}

fn reports<'c>(question: &Question<'c>, loaded: &Loaded, outcome: &Outcome<'c>) -> Vec<Report<'c>> {
    let report = |found: &crate::optimise::Found<'c>| {
        let proof = ProofLine::new(outcome, Some(found), question.objective);
        Report::new(
            question.supply,
            found.build.clone(),
            Some((question.objective, proof)),
            loaded.catalogue.currency.clone(),
            loaded.catalogue.folder.clone(),
        )
    };
    outcome.builds.iter().map(report).collect()
}

fn work(counts: &Counts, read_in: Duration, all: Duration) -> String {
    format!(
        "read in {:.1} ms; {} sources, {} sections looked at, {} steady states solved, {} columns, {} nodes, {} solver calls in {:.1} ms",
        read_in.as_secs_f64() * 1e3,
        counts.sources,
        counts.sections,
        counts.solves,
        counts.columns,
        counts.nodes,
        counts.solver_calls,
        (all - read_in).as_secs_f64() * 1e3,
    )
}
