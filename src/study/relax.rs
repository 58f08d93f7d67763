//! Owns what would have to give so that a build passes: for each requirement alone the least that it must be relaxed.

use super::which::Helping;
use super::wish::Wish;
use crate::optimise::{Disagreement, Question};

/// One requirement, relaxed alone.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Relaxation {
    /// Key path, or "stock.PART".
    pub requirement: String,
    /// As it stands in the supply file.
    pub from: String,
    /// With three significant digits: it holds there, and not one digit nearer.
    pub to: String,
}

/// What would have to give.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct Relaxed {
    /// In the order of the supply file's keys, stock last.
    pub list: Vec<Relaxation>,
    /// `false`: stopped; others may help too.
    pub complete: bool,
}

/// Says which requirements, each alone, could be relaxed to let a build pass, for a question to which
/// [`crate::optimise::optimise`] has proved that none does.
///
/// # Errors
/// When search and audit disagree: a bug to report.
pub fn relax(question: &Question) -> Result<Relaxed, Disagreement> {
    let Helping { levers, complete } = Wish { question, most: None }.helping()?;
    let list = levers.iter().map(|(lever, solved)| Relaxation {
        requirement: lever.requirement.clone(),
        from: lever.from.clone(),
        to: lever.text(solved.place),
    });
    Ok(Relaxed {
        list: list.collect(),
        complete,
    })
}
