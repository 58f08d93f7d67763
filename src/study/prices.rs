//! Owns what each requirement costs: the least relaxation of it alone that makes a better build possible, and by how
//! much that one is better.

use super::Relaxation;
use super::which::Helping;
use super::wish::Wish;
use crate::optimise::{Disagreement, Question};

/// What one requirement costs.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Price {
    /// The least relaxation that is of use.
    pub relaxation: Relaxation,
    /// The best objective less the one there: millionths of the currency, or microwatts.
    pub saves: i64,
}

/// What the requirements cost.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct Prices {
    /// In the order of the supply file's keys, stock last; what is not listed costs nothing.
    pub list: Vec<Price>,
    /// `false`: stopped; others may cost something too.
    pub complete: bool,
}

/// Says what each requirement costs, for a question whose best objective is proved.
///
/// # Errors
/// When search and audit disagree: a bug to report.
pub fn prices(question: &Question, best: i64) -> Result<Prices, Disagreement> {
    let wish = Wish {
        question,
        most: Some(best - 1),
    };
    let Helping { levers, complete } = wish.helping()?;
    let list = levers.iter().map(|(lever, solved)| Price {
        relaxation: Relaxation {
            requirement: lever.requirement.clone(),
            from: lever.from.clone(),
            to: lever.text(solved.place),
        },
        saves: best - solved.value,
    });
    Ok(Prices {
        list: list.collect(),
        complete,
    })
}
