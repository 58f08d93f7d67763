//! Owns the verdict: the first lines of a page, what a build is and how far that is proved.

use super::Report;
use super::page::{Page, counted, strong};
use super::text::{digits, money, printable};
use crate::screen::Objective;

/// What it is, what it costs, and how far that is proved.
pub(super) fn verdict(report: &Report, page: Page) -> String {
    let figures = figures(report);
    let out = match report.proof {
        Some((objective, proof)) => {
            let superlative = match objective {
                Objective::Cost => "cheapest",
                Objective::Heat => "coolest",
            };
            let amount = |value: f64| match objective {
                Objective::Cost => money(&format!("{value:.4}"), report.currency.as_deref()),
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
            let mut line = strong(&format!("{words}: {figures}"), proved, page);
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
        None => strong(&figures, report.audit.passes(), page),
    };
    out + "\n" + &run(report) + "\n"
}

/// Cost and heat of one unit.
pub(super) fn figures(report: &Report) -> String {
    let heat = (report.audit.heat_w).map_or("heat unknown".into(), |w| format!("{} W", digits(w)));
    let cost = money(&report.audit.cost.to_string(), report.currency.as_deref());
    format!("{cost} a unit, {heat}")
}

/// What the supply is and what its run costs.
pub(super) fn run(report: &Report) -> String {
    if report.supply.name.is_empty() {
        return String::new();
    }
    let cost = (report.lines.iter())
        .map(|l| l.cost().of_run(report.supply.builds))
        .sum::<crate::units::RunCost>();
    format!(
        "{}, {}: {}\n",
        printable(&report.supply.name),
        counted(report.supply.builds, "unit"),
        money(&cost.to_string(), report.currency.as_deref())
    )
}

/// What the roomiest build costs more than the best one, and how much room it has.
fn room(report: &Report, superlative: &str, value: Option<f64>, best: f64, amount: impl Fn(f64) -> String) -> String {
    let mut out = String::new();
    match value {
        Some(value) if value > best => {
            let (more, best) = (amount(value - best), amount(best));
            out.push_str(&format!("\n{more} more than the {superlative} with {best}"));
        }
        _ => out.push_str(&format!("\nas good as the {superlative}")),
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
