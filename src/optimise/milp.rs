//! Owns the integer program over plans and feeds: the second opinion, and the proof where the search runs out of nodes.
//!
//! The only file that knows a solver. Variables: one binary for each plan and each feed; for each part whose price can
//! move, pieces bought at each of its prices with a binary for the price. Rows: one plan for each rail; one feed for each
//! outlet of a plan that is taken, none for others; load of a transformer; pieces bought = pieces used; a price needs
//! its pieces; stock; caps. What the sections of a plan must hold together is judged by the caller, who recomputes every
//! choice; that there is none is taken at the solver's word, so the rows are a little wider than the audit.

use std::collections::BTreeMap;

use good_lp::solvers::{SolutionStatus, WithTimeLimit};
use good_lp::{Expression, ProblemVariables, ResolutionError, Solution, SolverModel, Variable, constraint, variable};

use super::view::Ready;
use crate::catalogue::{Part, PartId};
use crate::screen::{Objective, Plan};
use crate::supply::{Path, Supply};
use crate::units::Money;

/// Which solver.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Solver {
    /// The pure-Rust one, always there.
    MicroLp,
    /// HiGHS, with the feature of that name.
    #[cfg(feature = "highs")]
    Highs,
}

/// What a solver said.
#[derive(Debug, Clone, PartialEq)]
pub enum Answer {
    /// The least objective: plans, each with a feed by place for each of its outlets.
    Least(Vec<(usize, Vec<usize>)>),
    /// No choice meets the rows.
    Infeasible,
    /// The solver gave up, with its words.
    Undecided(String),
}

/// A feed as the solver sees it.
#[derive(Debug, Clone)]
pub struct Column<'c> {
    /// Its parts with their pieces.
    pub lines: Vec<(&'c Part, u64)>,
    /// Its heat.
    pub heat_w: f64,
    /// Price of the fitted values of its devices.
    pub fitted: Money,
    /// Apparent power of its windings.
    va: f64,
}

impl<'c> Column<'c> {
    pub(super) fn new(ready: &Ready<'c>) -> Column<'c> {
        Column {
            lines: ready.lines.clone(),
            heat_w: ready.heat_w,
            fitted: ready.fitted,
            va: ready.va,
        }
    }
}

/// A plan with the feeds that each of its outlets may have.
#[derive(Debug)]
pub struct PlanChoice<'g, 'c> {
    /// The plan.
    pub plan: &'g Plan<'c>,
    /// By outlet.
    pub outlets: Vec<Vec<Column<'c>>>,
}

/// All that may be chosen from.
#[derive(Debug)]
pub struct Choices<'g, 'c> {
    /// Plans, of which those taken feed each rail once.
    pub plans: Vec<PlanChoice<'g, 'c>>,
}

/// Variables of one plan.
struct Taken {
    plan: Variable,
    feeds: Vec<Vec<Variable>>,
}

/// The choice with the least objective, stock and caps kept.
#[must_use]
pub fn least(supply: &Supply, objective: Objective, choices: &Choices, solver: Solver, seconds: f64) -> Answer {
    let fed = |rail: usize| choices.plans.iter().any(|p| p.plan.mask & (1 << rail) != 0);
    if !(0..supply.rails.len()).all(fed) {
        return Answer::Infeasible;
    }
    let mut variables = ProblemVariables::new();
    let mut rows = Vec::new();
    let mut taken: Vec<Taken> = Vec::new();
    for choice in &choices.plans {
        let plan = variables.add(variable().binary());
        let mut feeds = Vec::new();
        for columns in &choice.outlets {
            let of: Vec<Variable> = columns.iter().map(|_| variables.add(variable().binary())).collect();
            rows.push(constraint!(of.iter().sum::<Expression>() == plan));
            feeds.push(of);
        }
        taken.push(Taken { plan, feeds });
    }
    for rail in 0..supply.rails.len() {
        let feeding = choices
            .plans
            .iter()
            .zip(&taken)
            .filter(|(p, _)| p.plan.mask & (1 << rail) != 0);
        rows.push(constraint!(feeding.map(|(_, t)| t.plan).sum::<Expression>() == 1.0));
    }
    // As wide as the audit's rounding, and more: what the rows let through is judged again, what they cut is gone.
    let wide = |cap: f64| cap + 1e-8 * cap.max(1.0);
    let mut used = Pieces::default();
    let mut cost = Expression::from(0.0);
    let mut heat = Expression::from(0.0);
    for (choice, taken) in choices.plans.iter().zip(&taken) {
        used.add(&choice.plan.transformer.part, 1, taken.plan);
        heat += choice.plan.core_w * taken.plan;
        let mut va = Expression::from(0.0);
        let mut dual = false;
        for ((columns, feeds), outlet) in choice.outlets.iter().zip(&taken.feeds).zip(&choice.plan.outlets) {
            dual |= outlet.path == Path::Dual;
            for (column, &chosen) in columns.iter().zip(feeds) {
                for &(part, pieces) in &column.lines {
                    used.add(part, pieces, chosen);
                }
                heat += column.heat_w * chosen;
                cost += column.fitted.value() * chosen;
                va += column.va * chosen;
            }
        }
        if choice.outlets.len() > 1 && !dual {
            rows.push(constraint!(va <= wide(choice.plan.transformer.va)));
        }
    }
    let rails = supply.rails.len() as u64;
    for part in used.0.values_mut() {
        part.most *= rails;
        cost += price(supply, part, &mut variables, &mut rows);
        if let Some(stock) = part.part.stock {
            #[allow(clippy::cast_precision_loss)]
            rows.push(constraint!(part.pieces.clone() <= (stock / supply.builds) as f64));
        }
    }
    if let Some(cap) = supply.caps.cost.map(wide) {
        rows.push(constraint!(cost.clone() <= cap));
    }
    if let Some(cap) = supply.caps.heat_w.map(wide) {
        rows.push(constraint!(heat.clone() <= cap));
    }
    let problem = variables.minimise(match objective {
        Objective::Cost => cost,
        Objective::Heat => heat,
    });
    match solver {
        Solver::MicroLp => read(problem.using(good_lp::microlp).with_time_limit(seconds), rows, &taken),
        #[cfg(feature = "highs")]
        Solver::Highs => match problem.using(good_lp::highs).set_mip_rel_gap(0.0) {
            Ok(model) => read(model.with_time_limit(seconds), rows, &taken),
            Err(why) => Answer::Undecided(format!("{why:?}")),
        },
    }
}

/// A part with the pieces that the chosen columns use of it.
struct Used<'c> {
    part: &'c Part,
    pieces: Expression,
    /// Most pieces that any choice uses: of one entry, then of as many as there are rails.
    most: u64,
}

/// Parts in use.
#[derive(Default)]
struct Pieces<'c>(BTreeMap<PartId, Used<'c>>);

impl<'c> Pieces<'c> {
    fn add(&mut self, part: &'c Part, pieces: u64, chosen: Variable) {
        let used = self.0.entry(part.id).or_insert_with(|| Used {
            part,
            pieces: Expression::from(0.0),
            most: 0,
        });
        #[allow(clippy::cast_precision_loss)]
        used.pieces.add_mul(pieces as f64, chosen);
        used.most = used.most.max(pieces);
    }
}

/// What the pieces of a part cost, with the rows that tie a price to its break.
#[allow(clippy::cast_precision_loss)] // pieces are far below 2^53
fn price(
    supply: &Supply,
    used: &Used,
    variables: &mut ProblemVariables,
    rows: &mut Vec<good_lp::Constraint>,
) -> Expression {
    let part = used.part;
    let reached: Vec<_> = part
        .breaks
        .iter()
        .filter(|b| b.pieces <= used.most * supply.builds)
        .collect();
    if reached.last().is_none_or(|b| b.pieces <= supply.builds) {
        // One price at every number of pieces that can be chosen.
        return used.pieces.clone() * part.unit_price(supply.builds).value();
    }
    // Prices never rise, so the solver takes the best one that the pieces reach; only the lower end needs a row.
    let tiers = std::iter::once((0, part.price)).chain(reached.iter().map(|b| (b.pieces, b.price)));
    let mut cost = Expression::from(0.0);
    let mut bought = Expression::from(0.0);
    let mut taken = Expression::from(0.0);
    for (from, price) in tiers {
        let here = variables.add(variable().min(0.0).max(used.most as f64));
        let taken_here = variables.add(variable().binary());
        rows.push(constraint!(here <= used.most as f64 * taken_here));
        if from > 0 {
            rows.push(constraint!(here >= from as f64 / supply.builds as f64 * taken_here));
        }
        cost += price.value() * here;
        bought += here;
        taken += taken_here;
    }
    rows.push(constraint!(bought == used.pieces.clone()));
    rows.push(constraint!(taken <= 1.0));
    cost
}

fn read<M>(model: M, rows: Vec<good_lp::Constraint>, taken: &[Taken]) -> Answer
where
    M: SolverModel<Error = ResolutionError>,
{
    let solved = rows.into_iter().fold(model, |model, row| model.with(row)).solve();
    match solved {
        Ok(solution) if matches!(solution.status(), SolutionStatus::TimeLimit) => {
            Answer::Undecided("time limit".into())
        }
        Ok(solution) => {
            let on = |&variable: &Variable| solution.value(variable) > 0.5;
            let one = |feeds: &Vec<Variable>| {
                let mut chosen = (0..feeds.len()).filter(|&i| on(&feeds[i]));
                chosen.next().filter(|_| chosen.next().is_none())
            };
            let plans = taken.iter().enumerate().filter(|(_, t)| on(&t.plan));
            let chosen = plans.map(|(at, t)| Some((at, t.feeds.iter().map(one).collect::<Option<Vec<usize>>>()?)));
            chosen.collect::<Option<Vec<_>>>().map_or_else(
                || Answer::Undecided("not one feed for each outlet".into()),
                Answer::Least,
            )
        }
        Err(ResolutionError::Infeasible) => Answer::Infeasible,
        Err(why) => Answer::Undecided(why.to_string()),
    }
}
