//! Owns the questions that are answered by asking the optimizer several times: second sources, substitutes, why a part
//! stays out, what would have to give, what each requirement costs, what a little more would buy; and what the shelf
//! says about a build.
//!
//! Invariant: decides nothing itself. Whether a build passes is the audit's word, which build is best the optimizer's;
//! every answer is a change of the question that was really solved, nothing is extrapolated.

pub mod each;
mod ladder;
mod lever;
mod prices;
mod relax;
mod room;
pub mod shelf;
pub mod swap;
mod which;
pub mod why;
mod wish;

pub use prices::{Price, Prices, prices};
pub use relax::{Relaxation, Relaxed, relax};
pub use room::{Room, Share, roomiest};

use crate::catalogue::PartId;
use crate::optimise::{Question, best_company};
use crate::supply::{Caps, Supply};

/// Whether it is sure that no build passes with a sink, because no rail alone does: soon known, where a search that is
/// forced to use the sink has to look at everything before it gives up (what must hold any other part is a small search).
/// Only where no rail shares anything: a neighbour's load may take heat off a device. Caps on cost and heat are left out,
/// since shared price breaks may bring a whole supply below what one rail alone costs.
fn hopeless(question: &Question, part: PartId) -> bool {
    let supply = question.supply;
    let sink = question.catalogue.sinks.iter().any(|sink| sink.part.id == part);
    if !sink || supply.rails.len() > 1 && !supply.share_never {
        return false;
    }
    let uncapped = Supply {
        caps: Caps {
            cost: None,
            heat_w: None,
            ..supply.caps
        },
        ..supply.clone()
    };
    let asked = Question {
        supply: &uncapped,
        ..question.clone()
    };
    let (best, complete) = best_company(&asked, part);
    complete && best.is_none_or(|alone| !alone.company.met)
}
