//! Owns what is said about the shelf under a bill of materials.

use serde_json::{Value, json};

use super::page::{Page, counted, set, sheet, wrapped};
use super::text::{money, printable};
use super::{Report, run_value};
use crate::study::shelf::Shelf;

/// Drop-ins that a table names; the rest are counted.
const NAMED: usize = 4;

/// The shelf as a part of the build's document.
pub(super) fn json(shelf: &Shelf) -> Value {
    let lines: Vec<Value> = (shelf.lines.iter())
        .map(|line| {
            json!({
                "part": line.part,
                "units": line.units,
                "drop_ins": line.drop_ins,
                "buy": line.buy.map(|(pieces, saves)| json!({"pieces": pieces, "saves": run_value(saves)})),
            })
        })
        .collect();
    json!({"units": shelf.units, "first": shelf.first, "lines": lines})
}

/// The shelf under the table of the bill.
pub(super) fn table(shelf: &Shelf, report: &Report, page: Page) -> String {
    let says = match (shelf.units, &shelf.first) {
        (Some(units), Some(first)) => format!(
            "The stock allows {} in all, {} after this run; {} runs out first.",
            counted(units, "unit"),
            units.saturating_sub(report.supply.builds),
            printable(first)
        ),
        _ => "No part of this build is limited by its stock.".to_owned(),
    };
    let mut out = String::from("\nShelf\n") + &wrapped(&says, "", "", page.width);
    let mut header = vec!["Part", "Units", "Drop-ins"];
    let more = shelf.lines.iter().any(|line| line.buy.is_some());
    if more {
        header.push("Cheaper to buy");
    }
    let mut table = sheet(&header, &[1], &[2, 3], page);
    for line in &shelf.lines {
        let mut names: Vec<String> = line.drop_ins.iter().take(NAMED).map(|name| printable(name)).collect();
        if line.drop_ins.len() > NAMED {
            names.push(format!("and {} more", line.drop_ins.len() - NAMED));
        }
        let buy = line.buy.map(|(pieces, saves)| {
            let saves = money(&saves.to_string(), report.currency.as_deref());
            format!("{pieces} pieces: saves {saves}")
        });
        let mut row = vec![
            printable(&line.part),
            line.units.map_or("-".into(), |units| units.to_string()),
            if names.is_empty() {
                "none".into()
            } else {
                names.join(", ")
            },
        ];
        if more {
            row.push(buy.unwrap_or_default());
        }
        table.add_row(row);
    }
    out.push_str(&set(&table));
    out
}
