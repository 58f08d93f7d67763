//! Owns the integer program over columns: the second opinion, and the proof where the search runs out of nodes.
//!
//! The only file that knows a solver. Variables: one binary for each column; for each part whose price can move, pieces
//! bought at each of its prices with a binary for the price. Rows: one column for each rail; pieces bought = pieces
//! used; a price needs its pieces; stock; caps. The caller recomputes every choice; that there is none is taken at the
//! solver's word, so the rows are a little wider than the audit.

use std::collections::BTreeMap;

use good_lp::solvers::{SolutionStatus, WithTimeLimit};
use good_lp::{Expression, ProblemVariables, ResolutionError, Solution, SolverModel, Variable, constraint, variable};

use crate::catalogue::{Part, PartId};
use crate::screen::{Column, Objective};
use crate::supply::Supply;

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
    /// One column for each rail, by place: the least objective.
    Least(Vec<usize>),
    /// No choice meets stock and caps.
    Infeasible,
    /// The solver gave up, with its words.
    Undecided(String),
}

/// The choice of one column for each rail with the least objective, stock and caps kept.
#[must_use]
pub fn least(supply: &Supply, objective: Objective, rails: &[Vec<Column>], solver: Solver, seconds: f64) -> Answer {
    if rails.iter().any(Vec::is_empty) {
        return Answer::Infeasible;
    }
    let mut variables = ProblemVariables::new();
    let choice: Vec<Vec<Variable>> = rails
        .iter()
        .map(|columns| columns.iter().map(|_| variables.add(variable().binary())).collect())
        .collect();
    let used = pieces_used(rails, &choice);

    let mut rows = Vec::new();
    let mut cost = Expression::from(0.0);
    for part in used.values() {
        cost += price(supply, part, &mut variables, &mut rows);
        if let Some(stock) = part.part.stock {
            #[allow(clippy::cast_precision_loss)]
            rows.push(constraint!(part.pieces.clone() <= (stock / supply.builds) as f64));
        }
    }
    let mut heat = Expression::from(0.0);
    for (column, &chosen) in rails.iter().flatten().zip(choice.iter().flatten()) {
        heat += column.heat_w() * chosen;
        cost += column.pass.fitted_price.value() * chosen;
    }
    for columns in &choice {
        rows.push(constraint!(columns.iter().sum::<Expression>() == 1.0));
    }
    // As wide as the audit's rounding, and more: what the rows let through is judged again, what they cut is gone.
    let wide = |cap: f64| cap + 1e-8 * cap.max(1.0);
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
        Solver::MicroLp => read(problem.using(good_lp::microlp).with_time_limit(seconds), rows, &choice),
        #[cfg(feature = "highs")]
        Solver::Highs => match problem.using(good_lp::highs).set_mip_rel_gap(0.0) {
            Ok(model) => read(model.with_time_limit(seconds), rows, &choice),
            Err(why) => Answer::Undecided(format!("{why:?}")),
        },
    }
}

/// A part with the pieces that the chosen columns use of it.
struct Used<'c> {
    part: &'c Part,
    pieces: Expression,
    /// Most pieces that any choice uses.
    most: u64,
}

fn pieces_used<'c>(rails: &[Vec<Column<'c>>], choice: &[Vec<Variable>]) -> BTreeMap<PartId, Used<'c>> {
    let mut used: BTreeMap<PartId, Used<'c>> = BTreeMap::new();
    for (columns, chosen) in rails.iter().zip(choice) {
        let mut most: BTreeMap<PartId, u64> = BTreeMap::new();
        for (column, &chosen) in columns.iter().zip(chosen) {
            for (part, pieces) in column.lines() {
                let entry = used.entry(part.id).or_insert_with(|| Used {
                    part,
                    pieces: Expression::from(0.0),
                    most: 0,
                });
                #[allow(clippy::cast_precision_loss)]
                entry.pieces.add_mul(pieces as f64, chosen);
                let most = most.entry(part.id).or_insert(0);
                *most = pieces.max(*most);
            }
        }
        for (id, most) in most {
            if let Some(entry) = used.get_mut(&id) {
                entry.most += most;
            }
        }
    }
    used
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

fn read<M>(model: M, rows: Vec<good_lp::Constraint>, choice: &[Vec<Variable>]) -> Answer
where
    M: SolverModel<Error = ResolutionError>,
{
    let solved = rows.into_iter().fold(model, |model, row| model.with(row)).solve();
    match solved {
        Ok(solution) if matches!(solution.status(), SolutionStatus::TimeLimit) => {
            Answer::Undecided("time limit".into())
        }
        Ok(solution) => {
            let chosen = |columns: &Vec<Variable>| {
                let mut on = (0..columns.len()).filter(|&i| solution.value(columns[i]) > 0.5);
                on.next().filter(|_| on.next().is_none())
            };
            choice.iter().map(chosen).collect::<Option<Vec<usize>>>().map_or_else(
                || Answer::Undecided("not one column for each rail".into()),
                Answer::Least,
            )
        }
        Err(ResolutionError::Infeasible) => Answer::Infeasible,
        Err(why) => Answer::Undecided(why.to_string()),
    }
}
