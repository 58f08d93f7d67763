//! Owns the second-source table: for every part of a slot the best build around it.

use std::collections::BTreeSet;
use std::sync::Mutex;
use std::sync::atomic::{AtomicUsize, Ordering};

use super::hopeless;
use crate::catalogue::{Part, PartId, Slot, Status};
use crate::optimise::{Disagreement, Outcome, Proof, Question, optimise};
use crate::screen::Counts;

/// How many parts are worked on at a time.
const HANDS: usize = 2;

/// A part with the best build around it, if there is one.
#[derive(Debug, Clone)]
pub struct Each<'c> {
    /// The part.
    pub part: &'c Part,
    /// At most one build, and how far its proof came.
    pub outcome: Outcome<'c>,
}

/// For every part of the slot that may be picked the best build with at least one piece of it: by key, then those
/// without a build in the order of the catalogue. `best` is the answer to the question itself. Second: the work done.
///
/// # Errors
/// When search and audit disagree: a bug to report.
pub fn each<'c>(
    question: &Question<'c>,
    slot: Slot,
    best: &Outcome<'c>,
) -> Result<(Vec<Each<'c>>, Counts), Disagreement> {
    let named = |id: PartId| question.with.iter().any(|&(part, _)| part == id);
    let parts: Vec<&Part> = (question.catalogue.parts())
        .filter(|p| p.slot == slot && !question.without.contains(&p.id))
        .filter(|p| p.status != Status::Withdrawn || named(p.id))
        .collect();
    // Where the best build of all holds the part, no better one can.
    let in_best: BTreeSet<PartId> = (best.builds.iter().take(1))
        .filter(|_| best.proof == Proof::Proved)
        .flat_map(|found| found.build.uses().map(|(part, _)| part.id))
        .collect();
    let around = |part: &Part| {
        if in_best.contains(&part.id) {
            return Ok(Outcome {
                builds: best.builds[..1].to_vec(),
                proof: best.proof,
                counts: Counts::default(),
            });
        }
        let mut with = question.with.clone();
        with.push((part.id, None));
        let forced = Question {
            top: 1,
            with,
            stop: question.stop.unwatched(),
            ..question.clone()
        };
        if hopeless(&forced, part.id) {
            return Ok(Outcome {
                builds: Vec::new(),
                proof: Proof::Proved,
                counts: Counts::default(),
            });
        }
        optimise(&forced)
    };
    let mut found: Vec<Each<'c>> = Vec::new();
    for (part, outcome) in parts.iter().zip(side_by_side(&parts, |part| around(part), question)) {
        found.push(Each {
            part,
            outcome: outcome?,
        });
    }
    let mut counts = Counts::default();
    found.iter().for_each(|each| counts.add(&each.outcome.counts));
    let by = question.objective;
    found.sort_by(|a, b| match (a.outcome.builds.first(), b.outcome.builds.first()) {
        (Some(a), Some(b)) => a.key.compare(&b.key, by),
        (a, b) => b.is_some().cmp(&a.is_some()),
    });
    Ok((found, counts))
}

/// The answers of `work` in the order of the items, a few worked on at a time.
pub(super) fn side_by_side<T: Sync, A: Send>(
    items: &[T],
    work: impl Fn(&T) -> A + Sync,
    question: &Question,
) -> Vec<A> {
    let next = AtomicUsize::new(0);
    let answers: Mutex<Vec<(usize, A)>> = Mutex::new(Vec::new());
    question.stop.steps(0, items.len());
    std::thread::scope(|scope| {
        for _ in 0..HANDS {
            scope.spawn(|| {
                loop {
                    let place = next.fetch_add(1, Ordering::Relaxed);
                    let Some(item) = items.get(place) else { return };
                    let answer = work(item);
                    // A hand that panicked takes the program with it at the end of the scope.
                    if let Ok(mut answers) = answers.lock() {
                        answers.push((place, answer));
                        question.stop.steps(answers.len(), items.len());
                    }
                }
            });
        }
    });
    let mut answers = answers.into_inner().unwrap_or_default();
    answers.sort_by_key(|&(place, _)| place);
    answers.into_iter().map(|(_, answer)| answer).collect()
}
