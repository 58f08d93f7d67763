//! Owns the reasons when no build passes: which limit keeps each part out even in its best company, and which limits
//! cannot hold together although each rail passes alone.
//!
//! Best company of a part: of all builds of one rail alone with at least one piece of it, feasible or not, the one whose
//! least tightness is greatest. Invariant: exact, by the audit's own functions; bounds only say what need not be solved.

mod aisle;
mod alone;
mod bound;
mod cooling;
mod joint;
mod ledger;
mod outlook;
mod search;
mod settle;
mod worth;

pub use alone::{Alone, best_company};
pub use joint::{Joint, Together, joint};
pub use ledger::Company;

use std::collections::BTreeMap;

use super::{Disagreement, Question};
use crate::audit::{Limit, Site};
use crate::catalogue::{Part, Slot};
use crate::supply::Supply;
use aisle::Aisle;
use ledger::Ledger;
use search::Search;

/// Parts of one slot that one limit keeps out.
#[derive(Debug, Clone, PartialEq)]
pub struct Rejection {
    /// Where they would go.
    pub slot: Slot,
    /// Tightest limit of their best company.
    pub limit: Limit,
    /// How many parts.
    pub count: usize,
    /// The one that comes closest.
    pub nearest: Nearest,
}

/// The part that comes closest to a limit which it fails.
#[derive(Debug, Clone, PartialEq)]
pub struct Nearest {
    /// Its name.
    pub part: String,
    /// By how much it fails; `None`: a cell is missing.
    pub margin: Option<f64>,
    /// Of the margin; "" stands for the catalogue's currency.
    pub unit: &'static str,
}

/// Why no build passes.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Reasons {
    /// By slot, then most parts first, then in the order of the limits.
    pub rejected: Vec<Rejection>,
    /// What cannot hold together.
    pub joint: Vec<Joint>,
    /// `false`: stopped; more may be rejected or joint, but nothing said here is wrong.
    pub complete: bool,
}

/// Best company by part.
#[derive(Debug, Clone, PartialEq)]
pub struct Companies {
    /// By [`crate::catalogue::PartId`]. A met one stands for "some build passes", not for the best of them. `None`: the
    /// part is in no build at all, or (stopped) its best company is not known.
    pub of: Vec<Option<Company>>,
    /// For each rail whether some build of it alone passes.
    pub passes: Vec<bool>,
    /// `false`: stopped.
    pub complete: bool,
}

/// Says why no build passes, for a question to which [`super::optimise`] has proved that there is none.
///
/// # Errors
/// When the audit rejects a build that the search found with a limit dropped: a bug to report.
pub fn rejections(question: &Question) -> Result<Reasons, Disagreement> {
    let companies = companies(question);
    let mut groups: BTreeMap<(Slot, Limit), Vec<(&Part, Company)>> = BTreeMap::new();
    for part in question.catalogue.parts() {
        if let Some(company) = companies.of[part.id.0 as usize].filter(|c| !c.met) {
            groups
                .entry((part.slot, company.limit))
                .or_default()
                .push((part, company));
        }
    }
    let mut rejected: Vec<Rejection> = (groups.into_iter())
        .filter_map(|((slot, limit), parts)| {
            let closest = |a: &&(&Part, Company), b: &&(&Part, Company)| {
                (b.1.tightness.total_cmp(&a.1.tightness)).then_with(|| a.0.name.cmp(&b.0.name))
            };
            let (part, company) = parts.iter().min_by(closest)?;
            let nearest = Nearest {
                part: part.name.clone(),
                margin: company.margin,
                unit: limit.unit(),
            };
            Some(Rejection {
                slot,
                limit,
                count: parts.len(),
                nearest,
            })
        })
        .collect();
    rejected.sort_by(|a, b| (a.slot, b.count, a.limit).cmp(&(b.slot, a.count, b.limit)));
    // A rail that does not pass alone is reason enough.
    let together = if companies.passes.iter().all(|&passes| passes) {
        joint(question)?
    } else {
        Together {
            proved: true,
            ..Together::default()
        }
    };
    Ok(Reasons {
        rejected,
        joint: together.joint,
        complete: companies.complete && together.proved,
    })
}

/// The best company of every part.
#[must_use]
pub fn companies(question: &Question) -> Companies {
    let rails = &question.supply.rails;
    let mut ledger = Ledger::new(question.catalogue.parts().count(), rails.len());
    // The most that a build can reach which was not looked at.
    let mut open = f64::NEG_INFINITY;
    for (rail, alone) in rails.iter().enumerate() {
        let supply = Supply {
            rails: vec![alone.clone()],
            ..question.supply.clone()
        };
        let site = Site::new(&supply);
        if let Some(aisle) = Aisle::new(&site, question) {
            let rail = ledger.rail(rail);
            open = open.max(Search::new(&aisle, rail, &mut ledger).run(&question.stop));
        }
    }
    Companies {
        passes: (0..rails.len()).map(|rail| ledger.passes(rail)).collect(),
        of: ledger.settled(open),
        complete: open == f64::NEG_INFINITY,
    }
}
