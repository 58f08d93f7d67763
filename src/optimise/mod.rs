//! Owns the optimum: the feasible builds with the least keys, and the proof that there is none below.
//!
//! Invariant: knows columns, pieces, integers; no volts. Every build that leaves here has passed the full audit.

mod best;
mod cap;
mod combine;
mod company;
mod frame_build;
mod frames;
mod front;
mod lists;
mod milp;
mod rivals;
mod search;
mod tighten;
mod view;

pub use best::{Found, Key};
pub use company::{
    Alone, Companies, Company, Joint, Nearest, Reasons, Rejection, Together, best_company, companies, joint, rejections,
};
pub use front::front;
pub use milp::{Answer, Choices, Column, PlanChoice, Solver, least};

use std::collections::BTreeSet;

use crate::audit::{Site, audit};
use crate::build::Build;
use crate::catalogue::{Catalogue, PartId};
use crate::screen::{Counts, Must, Objective, Stop, Weights};
use crate::supply::Supply;
use best::Best;
use search::{End, Ground, Search, everything};

/// What is asked of the optimizer.
#[derive(Debug, Clone)]
pub struct Question<'c> {
    /// The requirement.
    pub supply: &'c Supply,
    /// The parts.
    pub catalogue: &'c Catalogue,
    /// What is to be least.
    pub objective: Objective,
    /// How many builds, best first.
    pub top: usize,
    /// Parts that may not be used.
    pub without: BTreeSet<PartId>,
    /// Parts of which the build must hold at least one piece, anywhere or (`Some`) in that rail.
    pub with: Vec<(PartId, Option<usize>)>,
    /// Nothing with an objective above this is of interest (millionths of the currency, or microwatts).
    pub most: Option<i64>,
    /// Builds no farther than so many changes from a given one.
    pub near: Option<Near>,
    /// Every limit of a build must have at least this tightness, besides being met.
    pub tightness: f64,
    /// When to give up.
    pub stop: Stop,
    /// Nodes of one round of the search after which the integer program is asked; [`NODE_BUDGET`].
    pub node_budget: u64,
}

/// A build to stay close to.
#[derive(Debug, Clone)]
pub struct Near {
    /// What stands in its places, rail by rail ([`crate::build::places`]).
    pub places: Vec<[String; 7]>,
    /// Most places that may differ.
    pub most: usize,
}

impl<'c> Question<'c> {
    /// The best build, nothing ruled out or demanded.
    #[must_use]
    pub fn new(supply: &'c Supply, catalogue: &'c Catalogue, objective: Objective) -> Question<'c> {
        Question {
            supply,
            catalogue,
            objective,
            top: 1,
            without: BTreeSet::new(),
            with: Vec::new(),
            most: None,
            near: None,
            tightness: f64::NEG_INFINITY,
            stop: Stop::default(),
            node_budget: NODE_BUDGET,
        }
    }
}

/// A few seconds of search: what is not settled by then is better proved by an integer program.
pub const NODE_BUDGET: u64 = 20_000_000;

/// How far the proof came.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Proof {
    /// No feasible build is missing from the list or has a lower key than its last.
    Proved,
    /// Stopped before: no feasible build has an objective below this (millionths of the currency, or microwatts).
    Open {
        /// Lower bound of the objective.
        bound: i64,
    },
}

/// What came of it.
#[derive(Debug, Clone)]
pub struct Outcome<'c> {
    /// Best first; empty and proved: nothing passes.
    pub builds: Vec<Found<'c>>,
    /// How far the proof came.
    pub proof: Proof,
    /// Work done.
    pub counts: Counts,
}

/// The search and the audit disagree: a bug.
#[derive(Debug, Clone, PartialEq)]
pub struct Disagreement {
    /// The build, written out.
    pub build: String,
    /// What the audit says against it.
    pub verdict: Vec<String>,
}

/// Finds the builds with the least keys.
///
/// # Errors
/// When the audit rejects a build that the search found: a bug to report.
pub fn optimise<'c>(question: &Question<'c>) -> Result<Outcome<'c>, Disagreement> {
    let mut best = Best::new(question.objective, question.top, ceiling(question));
    let mut counts = Counts::default();
    let site = Site::new(question.supply).with_tightness(question.tightness);
    let mut open: Option<i64> = None;
    for in_rail in placements(question) {
        let ground = Ground::new(&site, question.catalogue, &must(question, in_rail));
        if let Some(bound) = search(&ground, question, &mut best, &mut counts) {
            open = Some(open.map_or(bound, |so_far| so_far.min(bound)));
        }
    }
    let builds = best.into_builds();
    for found in &builds {
        judge(question.supply, &found.build)?;
    }
    let proof = match open {
        None => Proof::Proved,
        Some(bound) => {
            let value = builds
                .first()
                .map_or(i64::MAX, |found| found.key.objective(question.objective));
            Proof::Open {
                bound: bound.min(value),
            }
        }
    };
    Ok(Outcome { builds, proof, counts })
}

/// Searches one ground for the best builds; the bound of the objective if it was stopped.
fn search<'c>(
    ground: &Ground<'_, 'c>,
    question: &Question<'c>,
    best: &mut Best<'c>,
    counts: &mut Counts,
) -> Option<i64> {
    // No charge: nothing can meet the cap.
    let charge = cap::charge(ground, question, best, counts)?;
    best.set_charge(charge.whole);
    let end = Search::start(ground, question, charge.weights, question.top == 1, counts).run(best, counts);
    #[allow(clippy::cast_possible_truncation)] // saturates
    match end {
        End::Complete => None,
        End::Stopped { bound } => Some((bound - charge.whole - 1.0).floor().max(0.0) as i64),
    }
}

/// Everything that a question may choose from, unpruned, handed to `look`: for the second opinion on small catalogues.
pub fn with_choices<R>(question: &Question, look: impl FnOnce(&Choices) -> R) -> R {
    let site = Site::new(question.supply).with_tightness(question.tightness);
    let ground = Ground::new(&site, question.catalogue, &must(question, Vec::new()));
    let mut counts = Counts::default();
    let mut search = Search::start(&ground, question, Weights::of(question.objective), false, &mut counts);
    look(&everything(&mut search, &mut counts))
}

fn must(question: &Question, in_rail: Vec<BTreeSet<PartId>>) -> Must {
    Must {
        without: question.without.clone(),
        named: question.with.iter().map(|&(part, _)| part).collect(),
        in_rail,
    }
}

/// Nothing with an objective above this passes or is of interest: what is asked, and the supply's cap on it, which the
/// audit lets pass by a rounding error.
#[allow(clippy::cast_possible_truncation)] // saturates
fn ceiling(question: &Question) -> i64 {
    let caps = &question.supply.caps;
    let cap = match question.objective {
        Objective::Cost => caps.cost,
        Objective::Heat => caps.heat_w,
    };
    let cap = cap.map_or(i64::MAX, |cap| (cap * 1e6 * (1.0 + 1e-8) + 2.0) as i64);
    question.most.unwrap_or(i64::MAX).min(cap)
}

/// The full audit of a build that is about to leave.
fn judge(supply: &Supply, build: &Build) -> Result<(), Disagreement> {
    let verdict = audit(supply, build);
    if verdict.passes() && verdict.heat_w.is_some() {
        return Ok(());
    }
    let failing = verdict.margins.iter().filter(|m| !m.check.met());
    Err(Disagreement {
        build: build.text().replace('\0', " "),
        verdict: failing
            .map(|m| format!("{} {}: {:?}", m.of, m.check.limit.word(), m.check))
            .collect(),
    })
}

/// Every way to place the demanded parts on rails: "somewhere" means in this rail or in that one.
fn placements(question: &Question) -> Vec<Vec<BTreeSet<PartId>>> {
    let rails = question.supply.rails.len();
    let mut ways = vec![vec![BTreeSet::new(); rails]];
    for &(part, at) in &question.with {
        let rails: Vec<usize> = at.map_or_else(|| (0..rails).collect(), |rail| vec![rail]);
        ways = ways
            .iter()
            .flat_map(|way| {
                rails.iter().map(|&rail| {
                    let mut way = way.clone();
                    way[rail].insert(part);
                    way
                })
            })
            .collect();
    }
    ways.sort();
    ways.dedup();
    ways
}
