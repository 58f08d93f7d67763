//! Owns the answer when no build passes: what keeps the parts out, or how far the search came.

use serde_json::{Value, json};

use super::ProofLine;
use super::json::{none, unit_of};
use super::relaxed::relaxation;
use super::table::{Page, none as none_page};
use crate::optimise::{Joint, Reasons};
use crate::study::{Relaxation, Relaxed};

/// No build, and why.
#[derive(Debug, Clone)]
pub struct NoBuild {
    /// How far the search came.
    pub proof: ProofLine,
    /// Why nothing passes; empty when the search was stopped.
    pub reasons: Reasons,
    /// What would have to give; empty when the search was stopped.
    pub relaxed: Relaxed,
    /// Rails that no device of the catalogue serves at all.
    pub unserved: Vec<String>,
    /// Currency of all prices.
    pub currency: Option<String>,
}

impl NoBuild {
    /// binrail.none/1
    #[must_use]
    pub fn json(&self) -> Value {
        let rejected: Vec<Value> = (self.reasons.rejected.iter())
            .map(|r| {
                json!({
                    "slot": r.slot.word(),
                    "limit": r.limit.word(),
                    "count": r.count,
                    "nearest": {
                        "part": r.nearest.part,
                        "margin": r.nearest.margin,
                        "unit": unit_of(r.limit, self.currency.as_deref()),
                    },
                })
            })
            .collect();
        let relax: Vec<Value> = self.relaxed.list.iter().map(relaxation).collect();
        none(
            self.proof.status,
            Some(self.proof.bound),
            &rejected,
            &self.joint(),
            &relax,
        )
    }

    /// As a page.
    #[must_use]
    pub fn table(&self, page: Page) -> String {
        none_page(self, page)
    }

    /// As CSV, one row for each slot and limit.
    #[must_use]
    pub fn csv(&self) -> String {
        let header = ["slot", "limit", "count", "nearest", "margin", "unit"];
        super::csv::table(
            &header,
            self.reasons.rejected.iter().map(|r| {
                vec![
                    r.slot.word().to_owned(),
                    r.limit.word().to_owned(),
                    r.count.to_string(),
                    r.nearest.part.clone(),
                    r.nearest.margin.map(|m| m.to_string()).unwrap_or_default(),
                    unit_of(r.limit, self.currency.as_deref()).to_owned(),
                ]
            }),
        )
    }

    /// What the CSV form has no room for: one line for each requirement that would have to give.
    #[must_use]
    pub fn talk(&self) -> Vec<String> {
        let line = |r: &Relaxation| format!("it would pass with {} {} -> {}", r.requirement, r.from, r.to);
        self.relaxed.list.iter().map(line).collect()
    }

    /// The limits that cannot hold together, stock with its part.
    #[must_use]
    pub fn joint(&self) -> Vec<String> {
        self.reasons.joint.iter().map(Joint::words).collect()
    }
}
