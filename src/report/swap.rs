//! Owns what is said about a substitute: what changes, what the change costs, and the new build.

use serde_json::{Value, json};

use super::page::{Page, counted, headline, set, sheet, wrapped};
use super::table::body;
use super::text::{digits, money, printable, signed};
use super::verdict::{figures, run};
use super::{ProofLine, Report, csv, json as document, less, run_value};
use crate::build::{Change, changes};
use crate::catalogue::Part;
use crate::optimise::Question;
use crate::screen::Objective;
use crate::study::shelf::Shelf;
use crate::study::swap::{Loss, Old, Swap};
use crate::units::{Money, RunCost};

/// A substitute for a build that was made before.
#[derive(Debug, Clone)]
pub struct SwapReport<'c> {
    /// The new build.
    pub report: Report<'c>,
    changes: Vec<Change>,
    losses: Vec<(String, Loss)>,
    extra: Money,
    extra_heat_w: Option<f64>,
    /// Whether the number of changes did not matter.
    free: bool,
    /// The old build's parts are priced by their cells of then.
    old_prices: Vec<String>,
}

impl<'c> SwapReport<'c> {
    /// From the old build and its substitute; `None` when there is none.
    #[must_use]
    pub fn new(
        question: &Question<'c>,
        old: &Old,
        losses: &[(&Part, Loss)],
        swap: &Swap<'c>,
        free: bool,
        shelf: impl FnOnce(&Report<'c>) -> Shelf,
    ) -> Option<SwapReport<'c>> {
        let found = swap.outcome.builds.first()?;
        let mut report = Report::found(question, &swap.outcome, found);
        let by = question.objective;
        if let Some(best) = (swap.free.as_ref()).filter(|best| !free && best.key.compare(&found.key, by).is_lt()) {
            let best = Report::found(question, &swap.outcome, best);
            let superlative = match by {
                Objective::Cost => "cheaper",
                Objective::Heat => "cooler",
            };
            report.cautions.insert(
                0,
                format!(
                    "Chosen for the fewest changes to another build; where more may change there is a {superlative} one: {}.",
                    figures(&best)
                ),
            );
        }
        let shelf = shelf(&report);
        let gone = old.parts.iter().filter(|(_, row)| row.is_none());
        Some(SwapReport {
            changes: changes(question.supply, old.build, &found.build),
            losses: losses.iter().map(|&(part, loss)| (part.name.clone(), loss)).collect(),
            extra: less(report.audit.cost, old.cost),
            extra_heat_w: report.audit.heat_w.zip(old.heat_w).map(|(new, old)| new - old),
            report: report.with_shelf(shelf),
            free,
            old_prices: gone.map(|(part, _)| part.name.clone()).collect(),
        })
    }

    fn extra_run(&self) -> RunCost {
        self.extra.of_run(self.report.supply.builds)
    }

    /// binrail.swap/1
    #[must_use]
    pub fn json(&self) -> Value {
        let changes: Vec<Value> = (self.changes.iter())
            .map(|change| {
                json!({
                    "rail": self.report.supply.rails[change.rail].name,
                    "place": change.place.word(),
                    "from": change.from,
                    "to": change.to,
                })
            })
            .collect();
        json!({
            "schema": "binrail.swap/1",
            "build": document::build(&self.report),
            "changes": changes,
            "extra_cost": self.extra.value(),
            "extra_cost_run": run_value(self.extra_run()),
            "extra_heat_w": self.extra_heat_w,
        })
    }

    /// One row for each change.
    #[must_use]
    pub fn csv(&self) -> String {
        csv::table(
            &["rail", "place", "from", "to"],
            self.changes.iter().map(|change| {
                vec![
                    self.report.supply.rails[change.rail].name.clone(),
                    change.place.word().to_owned(),
                    change.from.clone(),
                    change.to.clone(),
                ]
            }),
        )
    }

    /// As a page: what must go, what changes, what that costs, then the new build.
    #[must_use]
    pub fn table(&self, page: Page) -> String {
        let mut out = self.verdict(page);
        out.push_str(&run(&self.report));
        out.push('\n');
        for (part, loss) in &self.losses {
            let why = match loss {
                Loss::Gone => "is not in the catalogue any more".to_owned(),
                Loss::Withdrawn => "is withdrawn".to_owned(),
                Loss::Short { needed, stock } => format!("is short: the run needs {needed}, the stock holds {stock}"),
            };
            out.push_str(&wrapped(&format!("{} {why}.", printable(part)), "", "  ", page.width));
        }
        out.push_str(&wrapped(&self.price(), "", "  ", page.width));
        if !self.old_prices.is_empty() {
            let names: Vec<String> = self.old_prices.iter().map(|name| printable(name)).collect();
            let says = format!("Priced as then, since they have no row today: {}.", names.join(", "));
            out.push_str(&wrapped(&says, "", "  ", page.width));
        }
        if !self.changes.is_empty() {
            out.push_str("\nWhat changes\n");
            let mut table = sheet(&["Rail", "Place", "From", "To"], &[], &[2, 3], page);
            for change in &self.changes {
                let text = |text: &str| {
                    if text.is_empty() {
                        "none".to_owned()
                    } else {
                        printable(text)
                    }
                };
                table.add_row([
                    printable(&self.report.supply.rails[change.rail].name),
                    change.place.word().to_owned(),
                    text(&change.from),
                    text(&change.to),
                ]);
            }
            out.push_str(&set(&table));
        }
        out + "\n" + &body(&self.report, page)
    }

    fn verdict(&self, page: Page) -> String {
        let superlative = self.report.proof.map_or("best", |(objective, _)| match objective {
            Objective::Cost => "cheapest",
            Objective::Heat => "coolest",
        });
        let changes = counted(self.changes.len() as u64, "change");
        let proved = self.report.proof.is_some_and(|(_, proof)| proof.status == "proved");
        let words = match (proved, self.free) {
            (true, true) => format!("proved {superlative}, {changes}"),
            (true, false) => format!("proved: fewest changes ({}), then {superlative}", self.changes.len()),
            (false, _) => format!("best found, {changes}"),
        };
        let mut out = headline(&format!("{words}: {}", figures(&self.report)), proved, page);
        if !proved {
            out.push_str("stopped before the proof: fewer changes may do\n");
        }
        out
    }

    fn price(&self) -> String {
        let currency = self.report.currency.as_deref();
        let heat = self
            .extra_heat_w
            .map_or(String::new(), |w| format!(", and {} W", signed(&digits(w))));
        format!(
            "The change costs {} a unit, {} for the run{heat}.",
            money(&signed(&self.extra.to_string()), currency),
            money(&signed(&self.extra_run().to_string()), currency)
        )
    }
}

/// What the loss of each part of a build would cost.
#[derive(Debug, Clone)]
pub struct LossReport<'c> {
    rows: Vec<Row<'c>>,
    builds: u64,
    currency: Option<String>,
}

#[derive(Debug, Clone)]
struct Row<'c> {
    part: String,
    substitute: Option<Substitute<'c>>,
    proof: ProofLine,
}

#[derive(Debug, Clone)]
struct Substitute<'c> {
    report: Report<'c>,
    distance: usize,
    extra: Money,
    extra_heat_w: Option<f64>,
    /// By bill of materials.
    against: String,
}

impl<'c> LossReport<'c> {
    /// From the old build and the substitutes, in the order of its bill of materials.
    #[must_use]
    pub fn new<'a>(question: &Question<'c>, old: &Old<'a>, swaps: &[(&'a Part, Swap<'c>)]) -> LossReport<'c> {
        let before = Report::new(question.supply, old.build.clone(), None, None, String::new());
        let row = |(part, swap): &(&Part, Swap<'c>)| {
            let found = swap.outcome.builds.first();
            let substitute = found.zip(swap.distance).map(|(found, distance)| {
                let report = Report::found(question, &swap.outcome, found);
                Substitute {
                    distance,
                    extra: less(report.audit.cost, old.cost),
                    extra_heat_w: report.audit.heat_w.zip(old.heat_w).map(|(new, old)| new - old),
                    against: report.against(&before),
                    report,
                }
            });
            Row {
                part: part.name.clone(),
                substitute,
                proof: ProofLine::new(&swap.outcome, found, question.objective),
            }
        };
        LossReport {
            rows: swaps.iter().map(row).collect(),
            builds: question.supply.builds,
            currency: question.catalogue.currency.clone(),
        }
    }

    /// binrail.swap-each/1
    #[must_use]
    pub fn json(&self) -> Value {
        let parts: Vec<Value> = (self.rows.iter())
            .map(|row| {
                let new = row.substitute.as_ref();
                json!({
                    "part": row.part,
                    "distance": new.map(|s| s.distance),
                    "extra_cost": new.map(|s| s.extra.value()),
                    "extra_heat_w": new.and_then(|s| s.extra_heat_w),
                    "proof": document::proof(row.proof),
                })
            })
            .collect();
        json!({"schema": "binrail.swap-each/1", "parts": parts})
    }

    /// One row for each part.
    #[must_use]
    pub fn csv(&self) -> String {
        let header = [
            "part",
            "status",
            "distance",
            "extra_cost",
            "extra_cost_run",
            "extra_heat_w",
            "parts",
        ];
        csv::table(
            &header,
            self.rows.iter().map(|row| {
                let new = row.substitute.as_ref();
                let text = |cell: &dyn Fn(&Substitute) -> String| new.map(cell).unwrap_or_default();
                vec![
                    row.part.clone(),
                    row.proof.status.to_owned(),
                    text(&|s| s.distance.to_string()),
                    text(&|s| s.extra.to_string()),
                    text(&|s| s.extra.of_run(self.builds).to_string()),
                    csv::number(new.and_then(|s| s.extra_heat_w)),
                    text(&|s| csv::parts(&s.report)),
                ]
            }),
        )
    }

    /// As a page.
    #[must_use]
    pub fn table(&self, page: Page) -> String {
        let bare = self.rows.iter().filter(|row| row.substitute.is_none());
        let (open, lost): (Vec<&Row>, Vec<&Row>) = bare.partition(|row| row.proof.status == "open");
        let words = match lost.len() {
            0 if open.is_empty() => "every part has a substitute".to_owned(),
            0 => "no part is known to have no substitute".to_owned(),
            _ => format!("{} without a substitute", counted(lost.len() as u64, "part")),
        };
        let mut out =
            headline(&words, lost.is_empty() && open.is_empty(), page) + "\nWhat the loss of each part would cost\n";
        let currency = self.currency.as_deref().unwrap_or("");
        let mut table = sheet(
            &[
                "Part",
                "Changes",
                &format!("Extra {currency}"),
                "Run",
                "Heat W",
                "Bill of materials",
            ],
            &[1, 2, 3, 4],
            &[5],
            page,
        );
        let mut unproved = false;
        for row in &self.rows {
            let mark = if row.proof.status == "best found" { "?" } else { "" };
            unproved |= !mark.is_empty();
            let part = printable(&row.part) + mark;
            match &row.substitute {
                Some(new) => table.add_row([
                    part,
                    new.distance.to_string(),
                    signed(&new.extra.to_string()),
                    signed(&new.extra.of_run(self.builds).to_string()),
                    new.extra_heat_w.map_or("?".into(), |w| signed(&digits(w))),
                    new.against.clone(),
                ]),
                None => {
                    let words = if row.proof.status == "open" {
                        "stopped before a build was found"
                    } else {
                        "NO SUBSTITUTE"
                    };
                    let dash = || "-".to_owned();
                    table.add_row([part, dash(), dash(), dash(), dash(), words.to_owned()])
                }
            };
        }
        out.push_str(&set(&table));
        if unproved {
            out.push_str("? stopped before the proof: fewer changes may do.\n");
        }
        out
    }
}
