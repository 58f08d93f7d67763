//! Owns the tables: what a person reads, orders from and checks.

use super::json::{unit_of, wave_figures};
use super::none::NoBuild;
use super::page::{DESCRIBED, counted, set, sheet, strong, wrapped};
use super::text::{digits, engineering, margin_text, printable};
use super::verdict::verdict;
use super::wiring::wiring;
use super::{Report, relaxed};
use crate::audit::Margin;
use crate::build::Line;
use crate::fault::Fault;
use crate::physics::raw_section::Waveform;

pub use super::page::Page;

/// Pieces left on the shelf after the run; `None`: not limited.
#[must_use]
pub fn left(line: &Line, builds: u64) -> Option<u64> {
    line.part.stock.map(|stock| stock.saturating_sub(line.qty * builds))
}

/// One build: verdict, wiring, bill of materials, margins, heat, cautions.
#[must_use]
pub fn build(report: &Report, page: Page) -> String {
    verdict(report, page) + &body(report, page)
}

/// What follows the verdict on a build.
pub(super) fn body(report: &Report, page: Page) -> String {
    let mut out = wiring(report, page);
    out.push_str(&format!("\nBill of materials, run of {}\n", report.supply.builds));
    out.push_str(&bill(report, page));
    if let Some(shelf) = &report.shelf {
        out.push_str(&super::shelf::table(shelf, report, page));
    }
    out.push_str(&relaxed::prices(report, page));
    out + &evidence(report, page)
}

/// An audited build: whether it passes, every margin, heat, cautions.
#[must_use]
pub fn audit(report: &Report, page: Page) -> String {
    let failing = report.audit.margins.iter().filter(|m| !m.check.met()).count();
    let all = report.audit.margins.len();
    let words = match failing {
        0 => format!("passes: all {all} limits are met"),
        _ => format!("fails: {failing} of {all} limits are not met"),
    };
    let mut out = strong(&words, failing == 0, page);
    out.push('\n');
    out + &evidence(report, page)
}

/// What backs a build: margins, heat, cautions.
fn evidence(report: &Report, page: Page) -> String {
    let parts = [
        "\nMargins, tightest first\n".to_owned(),
        margins(report, page),
        "\nHeat at the high corner, full load\n".to_owned(),
        heat(report, page),
        cautions(&report.cautions, page),
    ];
    parts.concat()
}

/// A ranking: one row for each build.
#[must_use]
pub fn rank(reports: &[Report], page: Page) -> String {
    let currency = reports.first().and_then(|r| r.currency.as_deref()).unwrap_or("");
    let mut table = sheet(
        &["", &format!("Cost {currency}"), "Heat W", "Tightest", "Parts"],
        &[0, 1, 2],
        &[3, 4],
        page,
    );
    for (place, report) in reports.iter().enumerate() {
        table.add_row([
            (place + 1).to_string(),
            report.audit.cost.to_string(),
            report.audit.heat_w.map_or("?".into(), digits),
            tightest(report),
            report.parts(),
        ]);
    }
    let mut out = reports.first().map(|r| verdict(r, page)).unwrap_or_default();
    out.push_str(&set(&table));
    // The cautions of the best build, which all builds of the list share in the main.
    out.push_str(&cautions(reports.first().map_or(&[][..], |r| &r.cautions), page));
    out
}

/// The tightest limit of a build with its margin.
pub(super) fn tightest(report: &Report) -> String {
    report.audit.tightest().map_or(String::new(), |m| {
        format!(
            "{} {} {}",
            printable(&m.of),
            m.check.limit.word(),
            margin_text(m.check.margin(), report.unit(m))
        )
    })
}

/// No build: what keeps the parts out.
#[must_use]
pub(super) fn none(answer: &NoBuild, page: Page) -> String {
    if answer.proof.status == "open" {
        let words = "stopped before a build was found; whether one passes is open";
        return strong(words, false, page) + "\n";
    }
    let mut out = strong("no build passes (proved)", false, page) + "\n";
    for rail in &answer.unserved {
        let kinds = "no device in the catalogue has its voltage, polarity and kind";
        out.push_str(&format!("\nRail {}: {kinds}\n", printable(rail)));
    }
    let joint = answer.joint();
    if !joint.is_empty() {
        out.push_str(&format!(
            "\nEach rail passes alone, but not together: {}\n",
            printable(&joint.join(", "))
        ));
    }
    if !answer.reasons.rejected.is_empty() {
        out.push_str("\nParts that fail even in their best company, by the limit that is tightest there\n");
        let mut table = sheet(&["Slot", "Limit", "Parts", "Nearest", "Short by"], &[2, 4], &[], page);
        for r in &answer.reasons.rejected {
            let unit = unit_of(r.limit, answer.currency.as_deref());
            table.add_row([
                r.slot.word().to_owned(),
                r.limit.word().to_owned(),
                r.count.to_string(),
                printable(&r.nearest.part),
                r.nearest
                    .margin
                    .map_or("a blank cell".into(), |m| margin_text(Some(-m), unit)),
            ]);
        }
        out.push_str(&set(&table));
    }
    if !answer.reasons.complete {
        out.push_str("\nStopped before every part was looked at: more may fail.\n");
    }
    out + &relaxed::relaxed(&answer.relaxed, page)
}

/// The figures of `wave`.
#[must_use]
pub fn wave(wave: Option<&Waveform>, page: Page) -> String {
    let Some(wave) = wave else {
        return strong(
            "collapses: no periodic state holds a raw voltage above zero",
            false,
            page,
        ) + "\n";
    };
    let mut table = sheet(&["Figure", "Value"], &[1], &[], page);
    for (key, value, unit) in wave_figures(wave) {
        let name = key.rsplit_once('_').map_or(key, |(name, _)| name).replace('_', " ");
        let name = if unit == "deg" {
            "conduction of one pulse".to_owned()
        } else {
            name
        };
        table.add_row([name, engineering(value, unit)]);
    }
    set(&table)
}

/// Faults and warnings of a catalogue, one to a line, then the counts.
#[must_use]
pub fn vet(faults: &[Fault], warnings: &[Fault], counts: &[(&'static str, usize)]) -> String {
    let mut out = String::new();
    for fault in faults {
        out.push_str(&format!("{}\n", printable(&fault.to_string())));
    }
    for warning in warnings {
        out.push_str(&format!("warning: {}\n", printable(&warning.to_string())));
    }
    let rows: Vec<String> = counts.iter().map(|(file, rows)| format!("{file} {rows}")).collect();
    out.push_str(&format!(
        "{}, {} in rows: {}\n",
        counted(faults.len() as u64, "fault"),
        counted(warnings.len() as u64, "warning"),
        rows.join(", ")
    ));
    out
}

fn bill(report: &Report, page: Page) -> String {
    let mut header = vec!["Part", "Per unit", "Run", "Shelf", "Left", "Each", "Run cost"];
    let described = page.width.is_none_or(|width| width >= DESCRIBED);
    if described {
        header.push("Description");
    }
    let mut table = sheet(&header, &[1, 2, 3, 4, 5, 6], &[7], page);
    for line in &report.lines {
        let run = line.qty * report.supply.builds;
        let mut row = vec![
            printable(&line.part.name),
            line.qty.to_string(),
            run.to_string(),
            line.part.stock.map_or("-".into(), |s| s.to_string()),
            left(line, report.supply.builds).map_or("-".into(), |l| l.to_string()),
            line.unit_price.to_string(),
            line.unit_price.of_run(run).to_string(),
        ];
        if described {
            row.push(printable(&line.part.description));
        }
        table.add_row(row);
    }
    set(&table)
}

fn margins(report: &Report, page: Page) -> String {
    let mut table = sheet(
        &["Of", "Limit", "Value", "Bound", "Margin", "Corner"],
        &[2, 3, 4],
        &[5],
        page,
    );
    for margin in report.by_tightness() {
        table.add_row(margin_row(margin, report.unit(margin)));
    }
    set(&table)
}

/// Of, limit, value, bound, margin, corner.
pub(super) fn margin_row(margin: &Margin, unit: &str) -> [String; 6] {
    let check = &margin.check;
    let number = |value: Option<f64>| value.map_or("?".into(), |v| engineering(v, unit));
    let corner = check.corner.map_or("", |c| c.word());
    let corner = match (check.missing(), check.met()) {
        (Some(column), _) => format!("{corner} FAILS: {column} is blank"),
        (None, true) => corner.to_owned(),
        (None, false) => format!("{corner} FAILS"),
    };
    [
        printable(&margin.of),
        check.limit.word().to_owned(),
        number(check.value.ok()),
        number(check.bound.ok()),
        margin_text(check.margin(), unit),
        corner.trim_start().to_owned(),
    ]
}

fn heat(report: &Report, page: Page) -> String {
    let mut table = sheet(&["Of", "Where", "Part", "Heat W"], &[3], &[], page);
    for item in &report.audit.heat {
        table.add_row([
            printable(&item.of),
            item.what.to_owned(),
            printable(&item.part),
            digits(item.heat_w),
        ]);
    }
    if let Some(all) = report.audit.heat_w {
        table.add_row(["all".to_owned(), String::new(), String::new(), digits(all)]);
    }
    set(&table)
}

pub(super) fn cautions(cautions: &[String], page: Page) -> String {
    let mut out = String::from("\nCautions\n");
    for caution in cautions {
        out.push_str(&wrapped(&printable(caution), "- ", "  ", page.width));
    }
    out
}
