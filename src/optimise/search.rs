//! Owns the exact search: one column for each rail, with prices, stock and caps over the whole supply.
//!
//! Deepening: every rail's walk is asked for the columns that can take part in a build with an objective of at most T;
//! all their combinations up to T are searched; T rises until it has passed the N-th best build. What T has passed is
//! proved, so a search that is stopped still has a true bound.

use super::Question;
use super::best::Best;
use super::columns::{RailColumns, Ready};
use super::combine::{Combine, Run};
use super::milp::{Answer, Solver, least as least_by_solver};
use super::pool::Pool;
use super::tighten::tighten;
use crate::audit::{Site, compared, whole};
use crate::catalogue::Part;
use crate::screen::{Column, Counts, Must, Objective};
use crate::units::Money;

/// T starts at the least that any build can have and first rises by this share of it, then by twice as much each time.
const FIRST_STEP: i64 = 64;

/// Columns beyond which the solver's memory grows past reason.
const MOST_SOLVER_COLUMNS: usize = 5_000;
/// Longest time for one solver call.
const SOLVER_SECONDS: f64 = 30.0;

/// How a search ended.
pub(super) enum End {
    /// Nothing is left that could enter the list.
    Complete,
    /// Stopped; no build that was not looked at has an objective below the bound.
    Stopped { bound: i64 },
}

/// Searches one placement of the demanded parts.
pub(super) fn search<'c>(
    site: &Site<'c>,
    question: &Question<'c>,
    must: &Must,
    best: &mut Best<'c>,
    counts: &mut Counts,
) -> End {
    let stop = &question.stop;
    let mut rails = RailColumns::start(site, question, must, counts);
    on_every_rail(&mut rails, counts, |_, rail, counts| {
        rail.one_more(i64::MAX, stop, counts);
    });
    let mut least = Vec::new();
    for rail in &rails {
        match rail.ready.first() {
            Some(first) => least.push(first.key.0),
            // Whoever stopped the walk before its first column has proved nothing.
            None if stop.now() => return End::Stopped { bound: 0 },
            None => return End::Complete,
        }
    }
    let base: i64 = least.iter().sum();
    let parts = question.catalogue.parts().count();
    offer_first(question, &rails, best, counts, parts);
    let mut passed = base - 1;
    // Heats are floored rail by rail and rounded in the sum: the first reach covers the difference.
    let mut reach = base + i64::try_from(rails.len()).unwrap_or(0);
    let mut step = (base / FIRST_STEP).max(1);
    loop {
        if let Some(worst) = best.worst() {
            reach = reach.min(worst.0.max(base));
        }
        on_every_rail(&mut rails, counts, |place, rail, counts| {
            rail.extend(reach - (base - least[place]), stop, counts);
        });
        let ready: Vec<&[Ready]> = rails.iter().map(|rail| rail.ready.as_slice()).collect();
        let kept = match question.objective {
            Objective::Cost => tighten(&ready, parts, question.supply.builds, reach),
            Objective::Heat => ready
                .iter()
                .map(|r| (0..r.len()).map(|i| (i, r[i].column.floor_cost.0)).collect())
                .collect(),
        };
        let pool = Pool::new(question, &ready, kept, reach);
        if stop.now() {
            return End::Stopped { bound: passed + 1 };
        }
        // Only the single best can be asked of the solver, and not of too many columns.
        let columns: usize = pool.by_rail.iter().map(Vec::len).sum();
        let may_ask = question.top == 1 && columns <= MOST_SOLVER_COLUMNS;
        let budget = if may_ask { question.node_budget } else { u64::MAX };
        let mut run = Combine::new(question, &ready, &pool, best, counts, parts, reach).run(budget);
        if run == Run::OutOfNodes {
            run = match ask_solver(question, &ready, &pool, best, counts, parts, reach) {
                // What remains is to settle ties up to that build, or the solver has shown that there is none.
                Said::Least(value) => {
                    passed = passed.max(value - 1);
                    Combine::new(question, &ready, &pool, best, counts, parts, value).run(u64::MAX)
                }
                Said::NothingWithinReach => Run::Whole,
                Said::Nothing => Combine::new(question, &ready, &pool, best, counts, parts, reach).run(u64::MAX),
            };
        }
        if run != Run::Whole {
            return End::Stopped { bound: passed + 1 };
        }
        passed = reach;
        let found = best.worst().is_some_and(|worst| worst.0 <= reach);
        let next = rails
            .iter()
            .zip(&least)
            .filter_map(|(rail, least)| Some(rail.walk.floor()?.0 + base - least))
            .min();
        if found || beyond_cap(question, reach) {
            return End::Complete;
        }
        reach = match next {
            Some(next) => (reach + step).max(next),
            // All columns are here, but a build may cost more than the least shares that they were let in by.
            None if reach < dearest(question, &ready) => reach + step,
            None => return End::Complete,
        };
        step *= 2;
    }
}

/// Works on every rail in a thread of its own: rails know nothing of each other, and the counts add up to the same
/// whatever the machine. A thread that panics takes the program with it, since its columns would be missing.
fn on_every_rail<'s, 'c>(
    rails: &mut [RailColumns<'s, 'c>],
    counts: &mut Counts,
    work: impl Fn(usize, &mut RailColumns<'s, 'c>, &mut Counts) + Sync,
) {
    let work = &work;
    std::thread::scope(|scope| {
        let spawn = |(place, rail)| {
            scope.spawn(move || {
                let mut counts = Counts::default();
                work(place, rail, &mut counts);
                counts
            })
        };
        let threads: Vec<_> = rails.iter_mut().enumerate().map(spawn).collect();
        for thread in threads {
            match thread.join() {
                Ok(done) => counts.add(&done),
                Err(panic) => std::panic::resume_unwind(panic),
            }
        }
    });
}

/// What the integer program says about one round.
enum Said {
    /// The least objective, within reach.
    Least(i64),
    /// No build within reach.
    NothingWithinReach,
    /// It could not tell.
    Nothing,
}

/// Asks the solver for the best combination of the kept columns. A choice is judged again here; that there is none
/// within reach is taken at the solver's word.
fn ask_solver<'c>(
    question: &Question<'c>,
    ready: &[&[Ready<'c>]],
    pool: &Pool,
    best: &mut Best<'c>,
    counts: &mut Counts,
    parts: usize,
    reach: i64,
) -> Said {
    let columns: Vec<Vec<Column<'c>>> = (ready.iter().zip(&pool.by_rail))
        .map(|(ready, kept)| kept.iter().map(|k| ready[k.place].column.clone()).collect())
        .collect();
    let left = question.stop.deadline.map_or(SOLVER_SECONDS, |at| {
        at.saturating_duration_since(std::time::Instant::now())
            .as_secs_f64()
            .min(SOLVER_SECONDS)
    });
    counts.solver_calls += 1;
    match least_by_solver(question.supply, question.objective, &columns, Solver::MicroLp, left) {
        Answer::Least(choice) => {
            match Combine::new(question, ready, pool, best, counts, parts, reach).offer_choice(&choice) {
                Some(value) if value <= reach => Said::Least(value),
                Some(_) => Said::NothingWithinReach,
                None => Said::Nothing,
            }
        }
        Answer::Infeasible => Said::NothingWithinReach,
        Answer::Undecided(_) => Said::Nothing,
    }
}

/// Offers the combination of every rail's first column: a build to start with, mostly within a few per cent of the
/// best, beyond which no column need be looked for.
fn offer_first<'c>(
    question: &Question<'c>,
    rails: &[RailColumns<'_, 'c>],
    best: &mut Best<'c>,
    counts: &mut Counts,
    parts: usize,
) {
    let ready: Vec<&[Ready]> = rails.iter().map(|rail| rail.ready.as_slice()).collect();
    let most = dearest(question, &ready);
    let first = ready
        .iter()
        .map(|ready| vec![(0, ready[0].column.floor_cost.0)])
        .collect();
    let pool = Pool::new(question, &ready, first, most);
    if pool.by_rail.iter().all(|kept| !kept.is_empty()) {
        let choice = vec![0; rails.len()];
        Combine::new(question, &ready, &pool, best, counts, parts, most).offer_choice(&choice);
    }
}

/// No combination has an objective above this: a price never rises with the pieces that others add.
fn dearest(question: &Question, ready: &[&[Ready]]) -> i64 {
    let most = |ready: &Ready| match question.objective {
        Objective::Cost => {
            let price = |&(part, pieces): &(&Part, u64)| part.unit_price(pieces * question.supply.builds) * pieces;
            (ready.lines.iter().map(price).sum::<Money>() + ready.column.pass.fitted_price).0
        }
        Objective::Heat => compared(ready.heat_w) + 1,
    };
    ready.iter().filter_map(|rail| rail.iter().map(most).max()).sum()
}

/// Whether the supply's cap on the objective rules out everything above this.
#[allow(clippy::cast_precision_loss)]
fn beyond_cap(question: &Question, passed: i64) -> bool {
    let cap = match question.objective {
        Objective::Cost => whole::cost(question.supply, Money(passed)),
        Objective::Heat => whole::heat(question.supply, Ok((passed - 1) as f64 * 1e-6)),
    };
    cap.is_some_and(|c| !c.met())
}
