//! Owns what is said about an answer: one plain value, and the forms (table, JSON, CSV) as pure functions of it.

pub mod csv;
pub mod each;
pub mod front;
pub mod json;
pub mod none;
mod page;
mod relaxed;
pub mod schema;
mod shelf;
pub mod swap;
pub mod table;
mod text;
mod verdict;
pub mod why;
mod wiring;

use crate::audit::{Audit, Margin, audit, cautions};
use crate::build::{Build, Line};
use crate::optimise::{Found, Outcome, Proof, Question};
use crate::screen::Objective;
use crate::study::shelf::Shelf;
use crate::study::{Price, Share};
use crate::supply::Supply;
use crate::units::{Money, RunCost};

pub use relaxed::price_lines;
pub use text::printable;

/// A whole run's cost in units of the currency, for JSON.
#[allow(clippy::cast_precision_loss)]
fn run_value(cost: RunCost) -> f64 {
    cost.0 as f64 / Money::SCALE as f64
}

/// One amount of money less another, in units of the currency.
fn less(cost: Money, other: Money) -> Money {
    Money(cost.0 - other.0)
}

/// How far the proof of one build goes, in the objective's own unit (currency or watts).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ProofLine {
    /// "proved", "best found" or "open".
    pub status: &'static str,
    /// The build's objective; `None` when there is no build.
    pub value: Option<f64>,
    /// No feasible build has a lower objective than this.
    pub bound: f64,
}

impl ProofLine {
    /// For one build of an outcome, or for none.
    #[must_use]
    #[allow(clippy::cast_precision_loss)]
    pub fn new(outcome: &Outcome, found: Option<&Found>, objective: Objective) -> ProofLine {
        let unit = |millionths: i64| millionths as f64 / 1e6;
        let value = found.map(|f| unit(f.key.objective(objective)));
        match outcome.proof {
            Proof::Proved => ProofLine {
                status: "proved",
                value,
                bound: value.unwrap_or(0.0),
            },
            Proof::Open { bound } => ProofLine {
                status: if found.is_some() { "best found" } else { "open" },
                value,
                bound: unit(bound),
            },
        }
    }
}

/// Everything that is said about one build.
#[derive(Debug, Clone)]
pub struct Report<'c> {
    /// The requirement.
    pub supply: &'c Supply,
    /// The choice.
    pub build: Build<'c>,
    /// The verdict.
    pub audit: Audit,
    /// Bill of materials.
    pub lines: Vec<Line<'c>>,
    /// What was minimised and how far it is proved; `None` for an audited build.
    pub proof: Option<(Objective, ProofLine)>,
    /// The share of the best within which this is the roomiest build, and the best objective (currency or watts).
    pub room: Option<(Share, f64)>,
    /// What each requirement costs, where that was asked.
    pub prices: Option<Vec<Price>>,
    /// What a person must know.
    pub cautions: Vec<String>,
    /// Currency of all prices.
    pub currency: Option<String>,
    /// Folder of the catalogue.
    pub catalogue: String,
    /// What the shelf says about it; `None`: nobody looked.
    pub shelf: Option<Shelf>,
}

impl<'c> Report<'c> {
    /// One build of an outcome.
    #[must_use]
    pub fn found(question: &Question<'c>, outcome: &Outcome<'c>, found: &Found<'c>) -> Report<'c> {
        let proof = ProofLine::new(outcome, Some(found), question.objective);
        Report::new(
            question.supply,
            found.build.clone(),
            Some((question.objective, proof)),
            question.catalogue.currency.clone(),
            question.catalogue.folder.clone(),
        )
    }

    /// All builds of an outcome.
    #[must_use]
    pub fn all(question: &Question<'c>, outcome: &Outcome<'c>) -> Vec<Report<'c>> {
        let report = |found| Report::found(question, outcome, found);
        outcome.builds.iter().map(report).collect()
    }

    /// With what the shelf says.
    #[must_use]
    pub fn with_shelf(mut self, shelf: Shelf) -> Report<'c> {
        self.shelf = Some(shelf);
        self
    }

    /// Audits a build and gathers what is said about it.
    #[must_use]
    pub fn new(
        supply: &'c Supply,
        build: Build<'c>,
        proof: Option<(Objective, ProofLine)>,
        currency: Option<String>,
        catalogue: String,
    ) -> Report<'c> {
        Report {
            audit: audit(supply, &build),
            lines: build.lines(supply),
            cautions: cautions(supply, &build),
            supply,
            build,
            proof,
            room: None,
            prices: None,
            currency,
            catalogue,
            shelf: None,
        }
    }

    /// The bill of materials in one line.
    fn parts(&self) -> String {
        let part = |l: &Line| format!("{} {}", l.qty, printable(&l.part.name));
        self.lines.iter().map(part).collect::<Vec<_>>().join(", ")
    }

    /// What leaves the bill of materials and what comes in, in one line.
    fn against(&self, other: &Report) -> String {
        let of = |lines: &[Line], name: &str| lines.iter().find(|l| l.part.name == name).map_or(0, |l| l.qty);
        let more = |a: &[Line], b: &[Line]| -> Vec<String> {
            (a.iter())
                .map(|l| (l.qty.saturating_sub(of(b, &l.part.name)), &l.part.name))
                .filter(|&(qty, _)| qty > 0)
                .map(|(qty, name)| format!("{qty} {}", printable(name)))
                .collect()
        };
        let (out, new) = (more(&other.lines, &self.lines), more(&self.lines, &other.lines));
        match (out.is_empty(), new.is_empty()) {
            (true, true) => String::new(),
            (true, false) => format!("in {}", new.join(", ")),
            (false, true) => format!("out {}", out.join(", ")),
            (false, false) => format!("out {}; in {}", out.join(", "), new.join(", ")),
        }
    }

    /// Every limit, the tightest first; equally tight ones in the order of the audit.
    #[must_use]
    pub fn by_tightness(&self) -> Vec<&Margin> {
        let mut margins: Vec<&Margin> = self.audit.margins.iter().collect();
        margins.sort_by(|a, b| a.check.tightness().total_cmp(&b.check.tightness()));
        margins
    }

    /// Unit of a limit, with the currency in place.
    #[must_use]
    pub fn unit(&self, margin: &Margin) -> &str {
        match margin.check.limit.unit() {
            "" => self.currency.as_deref().unwrap_or(""),
            unit => unit,
        }
    }
}
