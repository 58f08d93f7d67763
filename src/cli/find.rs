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
use crate::report::{ProofLine, Report, csv, json, price_lines, table};
use crate::screen::{Counts, Objective, Stop};
use crate::study::{self, Relaxed, Room, Share};
use crate::supply::{Rail, Supply};
use crate::units::{Dimension, Measure, Money, Range};

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

/// "2%", "2 %".
fn share(text: &str) -> Result<Share, String> {
    let measure = Measure::new(Dimension::Percentage, "%", Range::from(0.0).to(100.0));
    let share = measure.written(text).and_then(Share::new);
    share.map_err(|wrong| format!("{}; {}", wrong.problem, wrong.allowed))
}

/// What is wanted besides the best.
#[derive(Default)]
struct Wanted<'a> {
    /// A ranking of so many.
    top: Option<usize>,
    save: Option<&'a PathBuf>,
    prices: bool,
    room: Option<Share>,
}

impl Pick {
    pub(super) fn run(&self, common: &Common) -> Result<Answer, Failure> {
        let wanted = Wanted {
            top: None,
            save: self.save.as_ref(),
            prices: self.prices,
            room: self.room,
        };
        self.asked.run(common, &wanted)
    }
}

impl Rank {
    pub(super) fn run(&self, common: &Common) -> Result<Answer, Failure> {
        let wanted = Wanted {
            top: Some(self.top as usize),
            ..Wanted::default()
        };
        self.asked.run(common, &wanted)
    }
}

impl Asked {
    /// One build, or a ranking.
    fn run(&self, common: &Common, wanted: &Wanted) -> Result<Answer, Failure> {
        let begun = Instant::now();
        let supply = self.settings.read(&self.supply)?;
        let loaded = input::catalogue(&supply, &self.supply, self.catalogue.as_deref())?;
        let question = self.question(&supply, &loaded.catalogue, wanted.top.unwrap_or(1))?;
        let read_in = begun.elapsed();
        let mut outcome = optimise(&question).map_err(Failure::Bug)?;
        let answer = if outcome.builds.is_empty() {
            no_build(&question, &outcome, common)?
        } else {
            let mut reports = reports(&question, &loaded, &outcome);
            let more = more(&question, &mut outcome, wanted, &mut reports)?;
            builds(&reports, wanted, common)
                .with_code(if outcome.proof == Proof::Proved { more.code } else { 3 })
                .with_talk(more.talk)
        };
        let work = work(&outcome.counts, read_in, begun.elapsed());
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

/// What keeps the parts out, and what would have to give.
fn no_build(question: &Question, outcome: &Outcome, common: &Common) -> Result<Answer, Failure> {
    let proved = outcome.proof == Proof::Proved;
    let (reasons, relaxed) = if proved {
        let reasons = rejections(question).map_err(Failure::Bug)?;
        (reasons, study::relax(question).map_err(Failure::Bug)?)
    } else {
        (Reasons::default(), Relaxed::default())
    };
    let none = NoBuild {
        proof: ProofLine::new(outcome, None, question.objective),
        reasons,
        relaxed,
        unserved: unserved(question),
        currency: question.catalogue.currency.clone(),
    };
    let (text, talk) = match common.format {
        Format::Table => (none.table(page(common)), Vec::new()),
        Format::Json => (json::text(&none.json()), Vec::new()),
        // The CSV table is of parts; what would have to give is said beside it.
        Format::Csv => (none.csv(), none.talk()),
    };
    Ok(Answer::new(text, if proved { 1 } else { 3 }).with_talk(talk))
}

/// The pages of builds.
fn builds(reports: &[Report], wanted: &Wanted, common: &Common) -> Answer {
    let first = &reports[0];
    let text = match (common.format, wanted.top.is_some()) {
        (Format::Table, false) => table::build(first, page(common)),
        (Format::Json, false) => json::text(&json::build(first)),
        (Format::Csv, false) => csv::bill(first),
        (Format::Table, true) => table::rank(reports, page(common)),
        (Format::Json, true) => json::text(&json::rank(reports)),
        (Format::Csv, true) => csv::rank(reports),
    };
    let save = (wanted.save).map(|path| (path.clone(), json::text(&json::build(first))));
    // A CSV file has no room for cautions and prices, but no build goes without them.
    let talk = if common.format == Format::Csv {
        [price_lines(first), first.cautions.clone()].concat()
    } else {
        Vec::new()
    };
    Answer::new(text, 0).with_save(save).with_talk(talk)
}

/// How the rest of the answer came out.
#[derive(Default)]
struct More {
    code: u8,
    talk: Vec<String>,
}

/// Adds prices to the best build, or puts the roomiest one in its place.
fn more<'c>(
    question: &Question<'c>,
    outcome: &mut Outcome<'c>,
    wanted: &Wanted,
    reports: &mut [Report<'c>],
) -> Result<More, Failure> {
    let (Some(best), Some(report)) = (outcome.builds.first(), reports.first_mut()) else {
        return Ok(More::default());
    };
    let stopped = |what: &str| More {
        code: 3,
        talk: vec![format!("stopped before {what}")],
    };
    if !wanted.prices && wanted.room.is_none() {
        return Ok(More::default());
    }
    if outcome.proof != Proof::Proved {
        return Ok(stopped("the best build was proved, which the rest is measured by"));
    }
    if let Some(share) = wanted.room {
        let room = study::roomiest(question, best.clone(), share).map_err(Failure::Bug)?;
        outcome.counts.add(&room.counts);
        *report = roomy(question, report, &room, share);
        return Ok(More {
            code: if room.proved { 0 } else { 3 },
            talk: Vec::new(),
        });
    }
    let prices = study::prices(question, best.key.objective(question.objective)).map_err(Failure::Bug)?;
    report.prices = Some(prices.list);
    Ok(if prices.complete {
        More::default()
    } else {
        stopped("every requirement was tried: another one may cost something too")
    })
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
