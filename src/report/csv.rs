//! Owns the CSV forms: plain (comma, point, LF), one table each.

use super::Report;
use super::json::wave_figures;
use crate::audit::Margin;
use crate::fault::Fault;
use crate::physics::raw_section::Waveform;

pub(super) fn table(header: &[&str], rows: impl IntoIterator<Item = Vec<String>>) -> String {
    let mut writer = csv::Writer::from_writer(Vec::new());
    let rows = std::iter::once(header.iter().map(ToString::to_string).collect()).chain(rows);
    for row in rows {
        // A Vec takes every write.
        let _ = writer.write_record(&row);
    }
    writer
        .into_inner()
        .map(|bytes| String::from_utf8_lossy(&bytes).into_owned())
        .unwrap_or_default()
}

/// The bill of materials: per unit, for the run, on the shelf, left.
#[must_use]
pub fn bill(report: &Report) -> String {
    let header = [
        "part",
        "slot",
        "description",
        "qty_per_unit",
        "qty_for_run",
        "unit_price",
        "cost_per_unit",
        "cost_for_run",
        "stock",
        "left",
    ];
    table(
        &header,
        report.lines.iter().map(|l| {
            let run = l.qty * report.supply.builds;
            vec![
                l.part.name.clone(),
                l.part.slot.word().to_owned(),
                l.part.description.clone(),
                l.qty.to_string(),
                run.to_string(),
                l.unit_price.to_string(),
                l.cost().to_string(),
                l.unit_price.of_run(run).to_string(),
                l.part.stock.map(|s| s.to_string()).unwrap_or_default(),
                super::table::left(l, report.supply.builds)
                    .map(|left| left.to_string())
                    .unwrap_or_default(),
            ]
        }),
    )
}

/// One row for each build of a ranking.
#[must_use]
pub fn rank(reports: &[Report]) -> String {
    table(
        &["place", "cost_per_unit", "heat_w", "parts"],
        reports.iter().enumerate().map(|(place, r)| {
            vec![
                (place + 1).to_string(),
                r.audit.cost.to_string(),
                r.audit.heat_w.map(|w| w.to_string()).unwrap_or_default(),
                parts(r),
            ]
        }),
    )
}

/// The bill of materials in one cell.
pub(super) fn parts(report: &Report) -> String {
    let part = |l: &crate::build::Line| format!("{}x{}", l.qty, l.part.name);
    report.lines.iter().map(part).collect::<Vec<_>>().join(" ")
}

/// A figure that may not be known.
pub(super) fn number(value: Option<f64>) -> String {
    value.map(|value| value.to_string()).unwrap_or_default()
}

/// Columns of a limit, behind what names it.
pub(super) const MARGIN: [&str; 8] = ["of", "limit", "value", "bound", "unit", "margin", "corner", "missing"];

/// One limit.
pub(super) fn margin(m: &Margin, unit: &str) -> Vec<String> {
    let missing = m.check.missing();
    vec![
        m.of.clone(),
        m.check.limit.word().to_owned(),
        number(if missing.is_some() { None } else { m.check.value.ok() }),
        number(m.check.bound.ok()),
        unit.to_owned(),
        number(m.check.margin()),
        m.check.corner.map_or("", |c| c.word()).to_owned(),
        missing.unwrap_or_default().to_owned(),
    ]
}

/// Every limit of an audited build.
#[must_use]
pub fn margins(report: &Report) -> String {
    table(&MARGIN, report.audit.margins.iter().map(|m| margin(m, report.unit(m))))
}

/// The figures of `wave`.
#[must_use]
pub fn wave(wave: Option<&Waveform>) -> String {
    let figures = wave
        .iter()
        .flat_map(|w| wave_figures(w))
        .map(|(key, value, _)| vec![key.to_owned(), value.to_string()]);
    table(
        &["figure", "value"],
        std::iter::once(vec!["collapses".to_owned(), wave.is_none().to_string()]).chain(figures),
    )
}

/// Faults and warnings of a catalogue.
#[must_use]
pub fn vet(faults: &[Fault], warnings: &[Fault]) -> String {
    let rows = faults
        .iter()
        .map(|f| ("fault", f))
        .chain(warnings.iter().map(|f| ("warning", f)));
    table(
        &["kind", "file", "line", "column", "part", "text", "allowed"],
        rows.map(|(kind, f)| {
            vec![
                kind.to_owned(),
                f.file.clone(),
                f.line.map(|l| l.to_string()).unwrap_or_default(),
                f.column.clone().unwrap_or_default(),
                f.part.clone().unwrap_or_default(),
                f.text.clone(),
                f.message(),
            ]
        }),
    )
}
