//! Runs small cases on two threads and holds the optimizer's answers against lists of the brute force.
#![allow(dead_code)]

use std::collections::BTreeMap;
use std::sync::Mutex;
use std::sync::atomic::{AtomicUsize, Ordering};

use binrail::catalogue::Catalogue;
use binrail::optimise::{Found, Outcome, Proof, Question, optimise};
use binrail::screen::Objective;
use binrail::supply::Supply;

use crate::brute_force::Judged;
use crate::own_rules::Bill;
use crate::small_case::{Case, Kind};

pub const OBJECTIVES: [Objective; 2] = [Objective::Cost, Objective::Heat];

/// Works through the cases of so many seeds for one, two and three rails; ORACLE_SEEDS=a..b replaces them.
pub fn over(seeds: [u64; 3], work: impl Fn(&Case) + Sync) {
    over_kind(Kind::Any, seeds, work);
}

/// The same for cases of a kind.
pub fn over_kind(kind: Kind, seeds: [u64; 3], work: impl Fn(&Case) + Sync) {
    let asked = std::env::var("ORACLE_SEEDS").ok().map(|text| {
        let (from, to) = text.split_once("..").unwrap();
        from.parse().unwrap()..to.parse().unwrap()
    });
    let cases: Vec<(usize, u64)> = (1..)
        .zip(seeds)
        .filter(|&(_, seeds)| seeds > 0)
        .flat_map(|(rails, seeds)| asked.clone().unwrap_or(0..seeds).map(move |seed| (rails, seed)))
        .collect();
    let next = AtomicUsize::new(0);
    std::thread::scope(|scope| {
        for _ in 0..2 {
            scope.spawn(|| {
                while let Some(&(rails, seed)) = cases.get(next.fetch_add(1, Ordering::Relaxed)) {
                    work(&Case::new(seed, rails, kind));
                }
            });
        }
    });
}

/// Counts of what happened, by words.
#[derive(Debug, Default)]
pub struct Tally(Mutex<BTreeMap<&'static str, usize>>);

impl Tally {
    pub fn add(&self, what: &'static str, count: usize) {
        *self.0.lock().unwrap().entry(what).or_default() += count;
    }

    pub fn of(&self, what: &str) -> usize {
        self.0.lock().unwrap().get(what).copied().unwrap_or(0)
    }
}

pub fn question<'c>(supply: &'c Supply, catalogue: &'c Catalogue, objective: Objective, top: usize) -> Question<'c> {
    Question {
        top,
        ..Question::new(supply, catalogue, objective)
    }
}

/// Cost, heat and text of builds, in order.
pub type Keys = Vec<(i64, i64, String)>;

pub fn keys(outcome: &Outcome) -> Keys {
    let key = |found: &Found| (found.key.cost, found.key.heat, found.key.text.clone());
    outcome.builds.iter().map(key).collect()
}

/// The same of builds of the brute force.
pub fn keys_of(list: &[&Judged]) -> Keys {
    let key = |j: &&Judged| (j.cost, j.heat, j.fields.join("\0"));
    list.iter().map(key).collect()
}

/// The whole front, cheapest first, which must be proved and equal the one that a ladder of caps finds.
pub fn front(case: &Case, question: &Question) -> Keys {
    let outcome = binrail::optimise::front(question).unwrap_or_else(|bug| panic!("front: {bug:?}\n{case}"));
    assert_eq!(outcome.proof, Proof::Proved, "front\n{case}");
    let found = keys(&outcome);
    assert_eq!(found, ladder(case, question), "front\n{case}");
    found
}

/// The front found from its other end: one cap on cost after the other, each below what the last
/// build costs. (A cap on heat would not do: the audit lets builds pass it by a rounding error.)
fn ladder(case: &Case, question: &Question) -> Keys {
    let mut found = Keys::new();
    let mut supply = question.supply.clone();
    loop {
        let asked = Question {
            supply: &supply,
            objective: Objective::Heat,
            ..question.clone()
        };
        let Some(next) = keys(&solve(case, "front", &asked)).pop() else {
            found.reverse();
            return found;
        };
        // Between two whole millionths.
        supply.caps.cost = Some((next.0 as f64 - 0.5) * 1e-6);
        found.push(next);
    }
}

/// The optimizer's answer, which must be proved.
pub fn solve<'c>(case: &Case, what: &str, question: &Question<'c>) -> Outcome<'c> {
    let what = format!("{what}, by {:?}, top {}", question.objective, question.top);
    let outcome = optimise(question).unwrap_or_else(|bug| panic!("{what}: {bug:?}\n{case}"));
    assert_eq!(outcome.proof, Proof::Proved, "{what}\n{case}");
    outcome
}

/// The optimizer's answer held against the head of a list: keys, order, builds to the part, bills of materials.
pub fn hold(case: &Case, what: &str, question: &Question, list: &[&Judged]) {
    let outcome = solve(case, what, question);
    let what = format!("{what}, by {:?}, top {}", question.objective, question.top);
    let head = &list[..list.len().min(question.top)];
    assert_eq!(keys(&outcome), keys_of(head), "{what}\n{case}");
    for (found, judged) in outcome.builds.iter().zip(head) {
        assert_eq!(found.build, judged.build, "{what}\n{case}");
        let lines = found.build.lines(question.supply);
        let bill: Bill = lines.iter().map(|line| (line.part.id, line.qty)).collect();
        assert_eq!(bill, judged.bill, "{what}\n{case}");
    }
}
