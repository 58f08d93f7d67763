//! Owns what the commands that search share: flags, the question, the answer when there is no build.

use std::collections::BTreeSet;
use std::path::PathBuf;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};
use std::time::{Duration, Instant};

use clap::{Args, ValueEnum};

use super::output::{Answer, page};
use super::progress::Ticker;
use super::{Common, Failure, Format, call_fault, input};
use crate::build::device_serves;
use crate::catalogue::{Catalogue, Loaded};
use crate::fault::Fault;
use crate::optimise::{Outcome, Proof, Question, Reasons, rejections};
use crate::report::none::NoBuild;
use crate::report::{ProofLine, json};
use crate::screen::{Counts, Objective, Progress, Stop};
use crate::study::{Relaxed, relax};
use crate::supply::{Rail, Supply};

#[derive(ValueEnum, Debug, Clone, Copy)]
pub(super) enum By {
    /// The cheapest; of equally cheap ones the coolest
    Cost,
    /// The coolest; of equally cool ones the cheapest
    Heat,
}

/// What is wished of a build.
#[derive(Args, Debug)]
pub(super) struct Wishes {
    /// What is to be least (default: cost; swap: as the saved build)
    #[arg(long, value_enum)]
    by: Option<By>,
    /// A part that may not be used (repeatable)
    #[arg(long, value_name = "PART")]
    pub(super) without: Vec<String>,
    /// A part of which at least one piece must be used, anywhere or in that rail's section (repeatable)
    #[arg(long, value_name = "PART[@RAIL]")]
    with: Vec<String>,
    /// Folder of the catalogue, instead of the file's own
    #[arg(long, value_name = "DIR")]
    pub(super) catalogue: Option<PathBuf>,
    /// Stop after so many seconds with the best found
    #[arg(long, value_name = "S", value_parser = seconds)]
    seconds: Option<f64>,
}

/// A supply with wishes.
#[derive(Args, Debug)]
pub(super) struct Asked {
    /// Supply file
    supply: PathBuf,
    #[command(flatten)]
    settings: input::Settings,
    #[command(flatten)]
    pub(super) wishes: Wishes,
}

/// What a search is given: supply, catalogue, and when they were read.
pub(super) struct Read {
    pub(super) supply: Supply,
    pub(super) loaded: Loaded,
    begun: Instant,
    read_in: Duration,
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

impl Asked {
    /// Reads supply and catalogue.
    pub(super) fn read(&self) -> Result<Read, Failure> {
        let begun = Instant::now();
        let supply = self.settings.read(&self.supply)?;
        let loaded = input::catalogue(&supply, &self.supply, self.wishes.catalogue.as_deref())?;
        Ok(Read::new(supply, loaded, begun))
    }

    /// The question, and whoever shows how far its search is.
    pub(super) fn question<'c>(&self, read: &'c Read, common: &Common) -> Result<(Question<'c>, Ticker), Failure> {
        self.wishes.question(
            &read.supply,
            &read.loaded.catalogue,
            Objective::Cost,
            &BTreeSet::new(),
            common,
        )
    }
}

impl Read {
    pub(super) fn new(supply: Supply, loaded: Loaded, begun: Instant) -> Read {
        Read {
            supply,
            loaded,
            begun,
            read_in: begun.elapsed(),
        }
    }

    /// The answer with what is said beside it: the catalogue's warnings, the work done.
    pub(super) fn finish(&self, answer: Answer, counts: &Counts) -> Answer {
        let searched = self.begun.elapsed().saturating_sub(self.read_in);
        let work = format!(
            "read in {:.1} ms; {} sources, {} sections looked at, {} steady states solved, {} columns, {} nodes, {} solver calls in {:.1} ms",
            self.read_in.as_secs_f64() * 1e3,
            counts.sources,
            counts.sections,
            counts.solves,
            counts.columns,
            counts.nodes,
            counts.solver_calls,
            searched.as_secs_f64() * 1e3,
        );
        answer.with_talk(input::warnings(&self.loaded)).with_work(work)
    }
}

impl Wishes {
    /// The question for one best build. Parts in `gone` may be ruled out though they are not in the catalogue.
    pub(super) fn question<'c>(
        &self,
        supply: &'c Supply,
        catalogue: &'c Catalogue,
        default: Objective,
        gone: &BTreeSet<&str>,
        common: &Common,
    ) -> Result<(Question<'c>, Ticker), Failure> {
        let mut faults: Vec<Fault> = Vec::new();
        let without = (self.without.iter())
            .filter(|name| !gone.contains(name.as_str()))
            .filter_map(|name| input::part(name, "--without", catalogue, &mut faults))
            .collect();
        let with = (self.with.iter())
            .filter_map(|text| input::part_at(text, "--with", catalogue, supply, &mut faults))
            .collect();
        if !faults.is_empty() {
            return Err(Failure::Input(faults));
        }
        let objective = match self.by {
            Some(By::Cost) => Objective::Cost,
            Some(By::Heat) => Objective::Heat,
            None => default,
        };
        let progress = Arc::new(Progress::default());
        let ticker = Ticker::start(Arc::clone(&progress), objective, catalogue.currency.as_deref(), common);
        let stop = Stop {
            deadline: self.seconds.map(|s| Instant::now() + Duration::from_secs_f64(s)),
            asked: on_interrupt()?,
            progress: ticker.watches().then_some(progress),
        };
        let question = Question {
            without,
            with,
            stop,
            ..Question::new(supply, catalogue, objective)
        };
        Ok((question, ticker))
    }
}

/// The answer when no build was found: exit 1 with the reasons when that is proved, else 3.
pub(super) fn no_build(question: &Question, outcome: &Outcome, common: &Common) -> Result<Answer, Failure> {
    let proved = outcome.proof == Proof::Proved;
    let (reasons, relaxed) = if proved {
        let reasons = rejections(question).map_err(Failure::Bug)?;
        (reasons, relax(question).map_err(Failure::Bug)?)
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

/// Rails that no device serves by the rules of assembly.
fn unserved(question: &Question) -> Vec<String> {
    let devices = &question.catalogue.pass_devices;
    let served = |rail: &Rail| devices.iter().any(|d| device_serves(d, rail, true));
    (question.supply.rails.iter())
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
