//! Owns the verdict: the first lines of a page, what a build is and how far that is proved.

use super::Report;
use super::table::{Page, counted, strong};
use super::text::{digits, printable};
use crate::screen::Objective;

/// What it is, what it costs, and how far that is proved.
pub(super) fn verdict(report: &Report, page: Page) -> String {
    let currency = report.currency.as_deref().unwrap_or("");
    let money = |text: String| {
        if currency.is_empty() {
            text
        } else {
            format!("{text} {currency}")
        }
    };
    let heat = report
        .audit
        .heat_w
        .map_or("heat unknown".into(), |w| format!("{} W", digits(w)));
    let cost = money(report.audit.cost.to_string());
    let mut out = match report.proof {
        Some((objective, proof)) => {
            let superlative = match objective {
                Objective::Cost => "cheapest",
                Objective::Heat => "coolest",
            };
            let amount = |value: f64| match objective {
                Objective::Cost => money(format!("{value:.4}")),
                Objective::Heat => format!("{} W", digits(value)),
            };
            let proved = proof.status == "proved";
            let words = match (report.room, proved) {
                (None, true) => format!("proved {superlative}"),
                (None, false) => "best found".into(),
                (Some((share, _)), _) => {
                    let within = format!("within {} % of the {superlative}", share.value() * 100.0);
                    let found = if proved { "proved roomiest" } else { "roomiest found" };
                    format!("{found} {within}")
                }
            };
            let mut line = strong(&format!("{words}: {cost} a unit, {heat}"), proved, page);
            match report.room {
                Some((_, best)) => line.push_str(&room(report, superlative, proof.value, best, amount)),
                None if proved => {}
                None => {
                    let bound = amount(proof.bound);
                    line.push_str(&format!("\nstopped before the proof: no build has less than {bound}"));
                }
            }
            line
        }
        None => strong(&format!("{cost} a unit, {heat}"), report.audit.passes(), page),
    };
    out.push('\n');
    if !report.supply.name.is_empty() {
        let run = report
            .lines
            .iter()
            .map(|l| l.cost().of_run(report.supply.builds))
            .sum::<crate::units::RunCost>();
        let units = counted(report.supply.builds, "unit");
        out.push_str(&format!(
            "{}, {units}: {}\n",
            printable(&report.supply.name),
            money(run.to_string())
        ));
    }
    out.push('\n');
    out
}

/// What the roomiest build costs more than the best one, and how much room it has.
fn room(report: &Report, superlative: &str, value: Option<f64>, best: f64, amount: impl Fn(f64) -> String) -> String {
    let mut out = String::new();
    if let Some(value) = value {
        let (more, best) = (amount(value - best), amount(best));
        out.push_str(&format!("\n{more} more than the {superlative} with {best}"));
    }
    if let Some(tightest) = report.audit.tightest() {
        let (of, limit) = (printable(&tightest.of), tightest.check.limit.word());
        let share = digits(tightest.check.tightness() * 100.0);
        out.push_str(&format!("; its tightest limit, {of} {limit}, has {share} % to spare"));
    }
    if report.proof.is_some_and(|(_, proof)| proof.status != "proved") {
        out.push_str("\nstopped before the proof: another build may have more room");
    }
    out
}
