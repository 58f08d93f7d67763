//! Owns what a page and a document say about relaxed requirements, their prices and the roomiest build.

use serde_json::{Map, Value, json};

use super::Report;
use super::page::{Page, set, sheet};
use super::text::{engineering, printable};
use crate::screen::Objective;
use crate::study::{Price, Relaxation, Relaxed};
use crate::units::Money;

/// One relaxation in a document.
pub(super) fn relaxation(relaxation: &Relaxation) -> Value {
    json!({
        "requirement": relaxation.requirement,
        "from": relaxation.from,
        "to": relaxation.to,
    })
}

/// What a build document has beyond the build: "room" and "prices", where they were asked for.
pub(super) fn of_build(report: &Report) -> Map<String, Value> {
    let mut keys = Map::new();
    if let (Some((share, best)), Some(tightest)) = (report.room, report.audit.tightest()) {
        let room = json!({
            "share": share.value(),
            "best": best,
            "tightness": tightest.check.tightness(),
            "of": tightest.of,
            "limit": tightest.check.limit.word(),
        });
        keys.insert("room".into(), room);
    }
    if let Some(prices) = &report.prices {
        let price = |price: &Price| {
            let mut object = relaxation(&price.relaxation);
            object["saves"] = json!(Money(price.saves).value());
            object
        };
        keys.insert("prices".into(), prices.iter().map(price).collect());
    }
    keys
}

/// What would have to give, any one of it.
pub(super) fn relaxed(relaxed: &Relaxed, page: Page) -> String {
    let mut out = String::new();
    if !relaxed.list.is_empty() {
        out.push_str("\nIt would pass with any one of these\n");
        let mut table = sheet(&["Requirement", "From", "To"], &[1, 2], &[], page);
        for r in &relaxed.list {
            table.add_row([&r.requirement, &r.from, &r.to].map(|text| printable(text)));
        }
        out.push_str(&set(&table));
    } else if relaxed.complete {
        out.push_str("\nNo requirement relaxed alone lets a build pass.\n");
    }
    if !relaxed.complete {
        out.push_str("\nStopped before every requirement was tried: relaxing another one may do too.\n");
    }
    out
}

/// What each requirement costs; nothing where that was not asked.
pub(super) fn prices(report: &Report, page: Page) -> String {
    let Some(prices) = &report.prices else {
        return String::new();
    };
    let mut out = String::from("\nWhat each requirement costs\n");
    if prices.is_empty() {
        return out + "No requirement relaxed alone makes a better build possible.\n";
    }
    let mut table = sheet(&["Requirement", "From", "To", "Saves a unit"], &[1, 2, 3], &[], page);
    for price in prices {
        let Relaxation { requirement, from, to } = &price.relaxation;
        table.add_row([
            printable(requirement),
            printable(from),
            printable(to),
            saved(report, price),
        ]);
    }
    out.push_str(&set(&table));
    out
}

/// The same as lines, for the form that has no room for it.
#[must_use]
pub fn price_lines(report: &Report) -> Vec<String> {
    let line = |price: &Price| {
        let Relaxation { requirement, from, to } = &price.relaxation;
        let saves = saved(report, price);
        format!("{requirement} {from} -> {to} saves {saves} a unit")
    };
    report.prices.iter().flatten().map(line).collect()
}

fn saved(report: &Report, price: &Price) -> String {
    let saves = Money(price.saves);
    match report.proof {
        Some((Objective::Heat, _)) => engineering(saves.value(), "W"),
        _ => report
            .currency
            .as_ref()
            .map_or(saves.to_string(), |currency| format!("{saves} {currency}")),
    }
}
