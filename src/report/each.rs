//! Owns what is said about second sources: the best build around each part of a slot.

use serde_json::{Value, json};

use super::page::{Page, set, sheet, wrapped};
use super::table::{cautions, tightest};
use super::text::{digits, printable, signed};
use super::verdict::verdict;
use super::{ProofLine, Report, csv, json as document, less};
use crate::catalogue::{Part, Slot};
use crate::optimise::{Outcome, Question};
use crate::study::each::Each;
use crate::units::Money;

/// The second-source table of a slot.
#[derive(Debug, Clone)]
pub struct EachReport<'c> {
    slot: Slot,
    best: Report<'c>,
    rows: Vec<Row<'c>>,
}

#[derive(Debug, Clone)]
struct Row<'c> {
    part: &'c Part,
    report: Option<Report<'c>>,
    proof: ProofLine,
}

impl Row<'_> {
    /// What the part costs more than the best build of all.
    fn extra(&self, best: &Report) -> Option<Money> {
        let own = self.report.as_ref()?;
        Some(less(own.audit.cost, best.audit.cost))
    }
}

impl<'c> EachReport<'c> {
    /// From the best build of all and those around each part; `None` when there is no best build.
    #[must_use]
    pub fn new(question: &Question<'c>, slot: Slot, best: &Outcome<'c>, each: &[Each<'c>]) -> Option<EachReport<'c>> {
        let row = |each: &Each<'c>| {
            let found = each.outcome.builds.first();
            Row {
                part: each.part,
                report: found.map(|found| Report::found(question, &each.outcome, found)),
                proof: ProofLine::new(&each.outcome, found, question.objective),
            }
        };
        Some(EachReport {
            slot,
            best: Report::found(question, best, best.builds.first()?),
            rows: each.iter().map(row).collect(),
        })
    }

    /// Cautions of the best build.
    #[must_use]
    pub fn cautions(&self) -> &[String] {
        &self.best.cautions
    }

    /// binrail.rank-each/1
    #[must_use]
    pub fn json(&self) -> Value {
        let parts: Vec<Value> = (self.rows.iter())
            .map(|row| {
                json!({
                    "part": row.part.name,
                    "build": row.report.as_ref().map(document::build),
                    "extra_cost": row.extra(&self.best).map(Money::value),
                    "proof": document::proof(row.proof),
                })
            })
            .collect();
        json!({"schema": "binrail.rank-each/1", "slot": self.slot.word(), "parts": parts})
    }

    /// One row for each part.
    #[must_use]
    pub fn csv(&self) -> String {
        csv::table(
            &["part", "status", "cost_per_unit", "extra_cost", "heat_w", "parts"],
            self.rows.iter().map(|row| {
                let report = row.report.as_ref();
                vec![
                    row.part.name.clone(),
                    row.proof.status.to_owned(),
                    report.map(|r| r.audit.cost.to_string()).unwrap_or_default(),
                    row.extra(&self.best).map(|extra| extra.to_string()).unwrap_or_default(),
                    csv::number(report.and_then(|r| r.audit.heat_w)),
                    report.map(csv::parts).unwrap_or_default(),
                ]
            }),
        )
    }

    /// As a page: the best build of all, then every part with what it costs more and what else changes.
    #[must_use]
    pub fn table(&self, page: Page) -> String {
        let mut out = verdict(&self.best, page);
        out.push_str(&format!("Best build around each {}\n", self.slot.word()));
        let currency = self.best.currency.as_deref().unwrap_or("");
        let mut table = sheet(
            &[
                "Part",
                &format!("Cost {currency}"),
                "Extra",
                "Heat W",
                "Tightest",
                "Against the best",
            ],
            &[1, 2, 3],
            &[4, 5],
            page,
        );
        let mut open = false;
        for row in &self.rows {
            let Some(report) = &row.report else { continue };
            let unproved = row.proof.status != "proved";
            open |= unproved;
            table.add_row([
                printable(&row.part.name) + if unproved { "?" } else { "" },
                report.audit.cost.to_string(),
                row.extra(&self.best).map_or(String::new(), |e| signed(&e.to_string())),
                report.audit.heat_w.map_or("?".into(), digits),
                tightest(report),
                report.against(&self.best),
            ]);
        }
        out.push_str(&set(&table));
        if open {
            out.push_str("? stopped before the proof: a better build may be there.\n");
        }
        for (status, words) in [
            ("proved", "No build passes with:"),
            ("open", "Stopped before a build was found with:"),
        ] {
            let left = self
                .rows
                .iter()
                .filter(|r| r.report.is_none() && r.proof.status == status);
            let names: Vec<String> = left.map(|row| printable(&row.part.name)).collect();
            if !names.is_empty() {
                out.push('\n');
                out.push_str(&wrapped(&format!("{words} {}", names.join(", ")), "", "", page.width));
            }
        }
        // Those of the best build, which all builds of the list share in the main.
        out + &cautions(&self.best.cautions, page)
    }
}
