//! Owns what is said about the trade-off between cost and heat.

use serde_json::{Value, json};

use super::page::{Page, counted, headline, set, sheet};
use super::table::{cautions, tightest};
use super::verdict::run;
use super::{Report, csv, json as document};

/// binrail.front/1
#[must_use]
pub fn json(reports: &[Report]) -> Value {
    json!({"schema": "binrail.front/1", "builds": reports.iter().map(document::build).collect::<Vec<_>>()})
}

/// One row for each build, the cheapest first.
#[must_use]
pub fn csv(reports: &[Report]) -> String {
    csv::rank(reports)
}

/// One row for each build, with what differs from the one above.
#[must_use]
pub fn table(reports: &[Report], proved: bool, page: Page) -> String {
    let builds = counted(reports.len() as u64, "build");
    let words = if proved {
        format!("proved: {builds} that no other beats in both cost and heat, and no more")
    } else {
        format!("stopped before the proof: {builds} found so far; others may beat them or stand between them")
    };
    let mut out = headline(&words, proved, page);
    out.push_str(&reports.first().map(run).unwrap_or_default());
    out.push('\n');
    let currency = reports.first().and_then(|r| r.currency.as_deref()).unwrap_or("");
    let mut table = sheet(
        &[
            "",
            &format!("Cost {currency}"),
            "Heat W",
            "Tightest",
            "Parts, then what differs from the row above",
        ],
        &[0, 1, 2],
        &[3, 4],
        page,
    );
    for (place, report) in reports.iter().enumerate() {
        let before = place.checked_sub(1).map(|before| &reports[before]);
        table.add_row([
            (place + 1).to_string(),
            report.audit.cost.to_string(),
            report.audit.heat_w.map_or("?".into(), |w| format!("{w:.3}")),
            tightest(report),
            before.map_or_else(|| report.parts(), |before| report.against(before)),
        ]);
    }
    out.push_str(&set(&table));
    // Those of the cheapest build, which all builds of the list share in the main.
    out + &cautions(reports.first().map_or(&[][..], |r| &r.cautions), page)
}
