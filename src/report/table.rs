//! Owns the tables: what a person reads, orders from and checks.

use comfy_table::presets::NOTHING;
use comfy_table::{CellAlignment, ColumnConstraint, ContentArrangement, ContentLineStyle, LineStyle, Table};

use super::{Report, relaxed};
use super::json::{unit_of, wave_figures};
use super::none::NoBuild;
use super::text::{digits, engineering, printable};
use super::verdict::verdict;
use super::wiring::wiring;
use crate::build::Line;
use crate::fault::Fault;
use crate::physics::raw_section::Waveform;

/// How a page is set.
#[derive(Debug, Clone, Copy, Default)]
pub struct Page {
    /// Columns of the terminal; `None`: lines are not wrapped.
    pub width: Option<u16>,
    /// Whether colour may be used. Nothing is said by colour alone.
    pub colour: bool,
}

/// Pieces left on the shelf after the run; `None`: not limited.
#[must_use]
pub fn left(line: &Line, builds: u64) -> Option<u64> {
    line.part.stock.map(|stock| stock.saturating_sub(line.qty * builds))
}

/// One build: verdict, wiring, bill of materials, margins, heat, cautions.
#[must_use]
pub fn build(report: &Report, page: Page) -> String {
    let mut out = String::new();
    out.push_str(&verdict(report, page));
    out.push_str(&wiring(report, page));
    out.push_str(&format!("\nBill of materials, run of {}\n", report.supply.builds));
    out.push_str(&bill(report, page));
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
        let parts: Vec<String> = report
            .lines
            .iter()
            .map(|l| format!("{} {}", l.qty, printable(&l.part.name)))
            .collect();
        let tightest = report.audit.tightest().map_or(String::new(), |m| {
            format!(
                "{} {} {}",
                printable(&m.of),
                m.check.limit.word(),
                margin_text(m.check.margin(), report.unit(m))
            )
        });
        table.add_row([
            (place + 1).to_string(),
            report.audit.cost.to_string(),
            report.audit.heat_w.map_or("?".into(), digits),
            tightest,
            parts.join(", "),
        ]);
    }
    let mut out = reports.first().map(|r| verdict(r, page)).unwrap_or_default();
    out.push_str(&set(&table));
    // The cautions of the best build, which all builds of the list share in the main.
    out.push_str(&cautions(reports.first().map_or(&[][..], |r| &r.cautions), page));
    out
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
        let check = &margin.check;
        let unit = report.unit(margin);
        let number = |value: Option<f64>| value.map_or("?".into(), |v| engineering(v, unit));
        let corner = check.corner.map_or("", |c| c.word());
        let corner = match (check.missing(), check.met()) {
            (Some(column), _) => format!("{corner} FAILS: {column} is blank"),
            (None, true) => corner.to_owned(),
            (None, false) => format!("{corner} FAILS"),
        };
        table.add_row([
            printable(&margin.of),
            check.limit.word().to_owned(),
            number(check.value.ok()),
            number(check.bound.ok()),
            margin_text(check.margin(), unit),
            corner.trim_start().to_owned(),
        ]);
    }
    set(&table)
}

/// A difference of temperatures is in kelvin.
fn margin_text(margin: Option<f64>, unit: &str) -> String {
    let unit = if unit == "degC" { "K" } else { unit };
    margin.map_or("?".into(), |m| engineering(m, unit))
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

fn cautions(cautions: &[String], page: Page) -> String {
    let mut out = String::from("\nCautions\n");
    for caution in cautions {
        out.push_str(&wrapped(&printable(caution), "- ", "  ", page.width));
    }
    out
}

/// Narrower pages leave out descriptions.
const DESCRIBED: u16 = 72;
/// Pages up to this width have one space between columns, wider ones two.
const NARROW: u16 = 90;

/// A table in the house look: a ruled header, a gap between columns. On a narrow page only the columns of free
/// text in `wraps` give way.
pub(super) fn sheet(header: &[&str], numbers: &[usize], wraps: &[usize], page: Page) -> Table {
    let mut table = Table::new();
    table
        .load_style(
            NOTHING
                .header_separator(LineStyle::none().fill('-').junction(' '))
                .content_lines(ContentLineStyle::none()),
        )
        .set_header(header.iter().copied());
    match page.width {
        Some(width) => table
            .set_content_arrangement(ContentArrangement::Dynamic)
            .set_width(width),
        None => table.set_content_arrangement(ContentArrangement::Disabled),
    };
    let gap = if page.width.is_some_and(|width| width <= NARROW) {
        1
    } else {
        2
    };
    for (place, column) in table.column_iter_mut().enumerate() {
        column.set_padding((0, if place + 1 == header.len() { 0 } else { gap }));
        if !wraps.contains(&place) {
            column.set_constraint(ColumnConstraint::ContentWidth);
        }
    }
    for &place in numbers {
        if let Some(column) = table.column_mut(place) {
            column.set_cell_alignment(CellAlignment::Right);
        }
    }
    table
}

pub(super) fn set(table: &Table) -> String {
    table.lines().map(|line| format!("{}\n", line.trim_end())).collect()
}

/// Words broken at the page's width, later lines indented.
pub(super) fn wrapped(text: &str, first: &str, later: &str, width: Option<u16>) -> String {
    let most = width.map_or(usize::MAX, usize::from).max(20);
    let mut out = String::new();
    let mut line = first.to_owned();
    let mut empty = true;
    for word in text.split(' ') {
        if !empty && line.chars().count() + 1 + word.chars().count() > most {
            out.push_str(&line);
            out.push('\n');
            line = later.to_owned();
            empty = true;
        }
        if !empty {
            line.push(' ');
        }
        line.push_str(word);
        empty = false;
    }
    out + &line + "\n"
}

pub(super) fn strong(text: &str, good: bool, page: Page) -> String {
    match (page.colour, good) {
        (false, _) => text.to_owned(),
        (true, true) => format!("\u{1b}[1;32m{text}\u{1b}[0m"),
        (true, false) => format!("\u{1b}[1;31m{text}\u{1b}[0m"),
    }
}

pub(super) fn counted(n: u64, what: &str) -> String {
    if n == 1 {
        format!("1 {what}")
    } else {
        format!("{n} {what}s")
    }
}
