//! Owns the optimum: the feasible builds with the least keys, and the proof that there is none below.
//!
//! Invariant: knows columns, pieces, integers; no volts. Every build that leaves here has passed the full audit.

mod best;
mod columns;
mod combine;
mod company;
mod milp;
mod pool;
mod search;
mod tighten;

pub use best::{Found, Key};
pub use columns::columns_of;
pub use company::{Companies, Company, Joint, Nearest, Reasons, Rejection, companies, rejections};
pub use milp::{Answer, Solver, least};

use std::collections::BTreeSet;

use crate::audit::{Site, audit};
use crate::build::Build;
use crate::catalogue::{Catalogue, PartId};
use crate::screen::{Counts, Must, Objective, Stop};
use crate::supply::Supply;
use best::Best;
use search::{End, search};

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
    let mut best = Best::new(question.objective, question.top);
    let mut counts = Counts::default();
    if question.top == 1 && capped_elsewhere(question) {
        // The best build by the other objective is the first that the cap can allow: none there, none at all. It may
        // take half of the time; what it finds is a build to start with.
        let other = Question {
            objective: question.objective.other(),
            stop: question.stop.half(),
            ..question.clone()
        };
        let mut first = Best::new(other.objective, 1);
        let open = search_all(&other, &mut first, &mut counts);
        let found = first.into_builds();
        if found.is_empty() && open.is_none() {
            return Ok(Outcome {
                builds: found,
                proof: Proof::Proved,
                counts,
            });
        }
        found.into_iter().for_each(|found| best.offer_found(found));
    }
    let open = search_all(question, &mut best, &mut counts);
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

/// Searches every placement of the demanded parts; the least bound of those that were stopped, if any was.
fn search_all<'c>(question: &Question<'c>, best: &mut Best<'c>, counts: &mut Counts) -> Option<i64> {
    let site = Site::new(question.supply);
    let mut open: Option<i64> = None;
    for in_rail in placements(question) {
        let must = Must {
            without: question.without.clone(),
            named: question.with.iter().map(|&(part, _)| part).collect(),
            in_rail,
        };
        if let End::Stopped { bound } = search(&site, question, &must, best, counts) {
            open = Some(open.map_or(bound, |so_far| so_far.min(bound)));
        }
    }
    open
}

/// Whether a cap binds what the objective does not minimise.
fn capped_elsewhere(question: &Question) -> bool {
    match question.objective {
        Objective::Cost => question.supply.caps.heat_w.is_some(),
        Objective::Heat => question.supply.caps.cost.is_some(),
    }
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
