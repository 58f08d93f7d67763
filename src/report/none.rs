//! Owns the answer when no build passes: what keeps the parts out, or how far the search came.

use serde_json::Value;

use super::table::Page;
use super::{ProofLine, json};
use crate::optimise::{Outcome, Question};

/// No build, and why.
#[derive(Debug, Clone)]
pub struct None {
    proof: ProofLine,
}

impl None {
    /// For an outcome without builds.
    #[must_use]
    pub fn new(question: &Question, outcome: &Outcome) -> None {
        None {
            proof: ProofLine::new(outcome, Option::None, question.objective),
        }
    }

    /// binrail.none/1
    #[must_use]
    pub fn json(&self) -> Value {
        json::none(self.proof.status, Some(self.proof.bound), &[], &[])
    }

    /// As a page.
    #[must_use]
    pub fn table(&self, _page: Page) -> String {
        format!("no build passes ({})\n", self.proof.status)
    }

    /// As CSV.
    #[must_use]
    pub fn csv(&self) -> String {
        "slot,limit,count,nearest,margin,unit\n".into()
    }
}
