//! Owns the JSON documents: SI units, numbers unrounded, keys in a fixed order.

use serde_json::{Map, Value, json};

use super::{ProofLine, Report, relaxed};
use crate::audit::{Limit, Margin};
use crate::catalogue::{Part, Sink};
use crate::fault::Fault;
use crate::physics::raw_section::Waveform;

/// A document as it is written: indented, with a line break at its end.
#[must_use]
pub fn text(document: &Value) -> String {
    format!("{document:#}\n")
}

/// binrail.build/1
#[must_use]
pub fn build(report: &Report) -> Value {
    let Report {
        supply, build, audit, ..
    } = report;
    let sink = |sink: Option<&Sink>| sink.map(|s| s.part.name.clone());
    let sections: Vec<Value> = build
        .sections
        .iter()
        .map(|s| {
            json!({
                "id": s.id,
                "transformer": build.transformers[s.transformer].id,
                "windings": s.hookup.secondaries.len(),
                "secondaries": s.hookup.secondaries,
                "hookup": s.hookup.kind.word(),
                "path": s.path.word(),
                "pair": s.pair.map(|other| build.sections[other].id.clone()),
                "rectifier": s.rectifier.part.name,
                "rectifier_qty": s.rectifier_pieces(),
                "rectifier_sink": sink(s.rectifier_sink),
                "reservoir": s.reservoir.part.name,
                "reservoir_qty": s.cans,
                "rails": s.rails.iter().map(|&r| supply.rails[r].name.clone()).collect::<Vec<_>>(),
            })
        })
        .collect();
    let rails: Vec<Value> = (supply.rails.iter().zip(&build.rails))
        .map(|(rail, c)| {
            json!({
                "name": rail.name,
                "section": build.sections[c.section].id,
                "pass": c.pass.part.name,
                "sink": sink(c.sink),
            })
        })
        .collect();
    let lines: Vec<Value> = (report.lines.iter())
        .map(|l| {
            json!({
                "part": l.part.name,
                "slot": l.part.slot.word(),
                "qty": l.qty,
                "unit_price": l.unit_price.value(),
                "cost": l.cost().value(),
            })
        })
        .collect();
    let proof = report.proof.map(|(_, p)| proof(p));
    let parts: Map<String, Value> = report
        .lines
        .iter()
        .map(|l| (l.part.name.clone(), cells(l.part)))
        .collect();
    let mut document = json!({
        "schema": crate::saved::SCHEMA,
        "supply": supply.content,
        "catalogue": report.catalogue,
        "objective": report.proof.map(|(objective, _)| objective.word()),
        "proof": proof,
        "cost_per_unit": audit.cost.value(),
        "currency": report.currency,
        "heat_w": audit.heat_w,
        "transformers": build.transformers.iter()
            .map(|t| json!({"id": t.id, "part": t.part.part.name})).collect::<Vec<_>>(),
        "sections": sections,
        "rails": rails,
        "lines": lines,
        "fitted": [],
        "fitted_cost": build.fitted_cost().value(),
        "margins": margins(report),
        "cautions": report.cautions,
        "parts": parts,
    });
    if let Some(object) = document.as_object_mut() {
        object.extend(relaxed::of_build(report));
        object.extend(
            report
                .shelf
                .as_ref()
                .map(|shelf| ("shelf".to_owned(), super::shelf::json(shelf))),
        );
    }
    document
}

fn cells(part: &Part) -> Value {
    Value::Object(
        part.cells
            .iter()
            .map(|(column, text)| ((*column).to_owned(), json!(text)))
            .collect(),
    )
}

fn margins(report: &Report) -> Vec<Value> {
    report.audit.margins.iter().map(|m| margin(m, report.unit(m))).collect()
}

pub(super) fn proof(proof: ProofLine) -> Value {
    json!({"status": proof.status, "value": proof.value, "bound": proof.bound})
}

pub(super) fn margin(margin: &Margin, unit: &str) -> Value {
    let check = &margin.check;
    // What is missing leaves value and margin open; the bound may still be known.
    let value = if check.missing().is_some() {
        None
    } else {
        check.value.ok()
    };
    let mut object = json!({
        "of": margin.of,
        "limit": check.limit.word(),
        "value": value,
        "bound": check.bound.ok(),
        "unit": unit,
        "margin": check.margin(),
        "corner": check.corner.map_or("", |c| c.word()),
    });
    if let (Some(column), Some(object)) = (check.missing(), object.as_object_mut()) {
        object.insert("missing".into(), json!(column));
    }
    object
}

/// binrail.rank/1
#[must_use]
pub fn rank(reports: &[Report]) -> Value {
    json!({"schema": "binrail.rank/1", "builds": reports.iter().map(build).collect::<Vec<_>>()})
}

/// binrail.audit/1
#[must_use]
pub fn audit(report: &Report) -> Value {
    json!({
        "schema": "binrail.audit/1",
        "passes": report.audit.passes(),
        "margins": margins(report),
        "rails": report.supply.rails.iter().map(|r| json!({"name": r.name})).collect::<Vec<_>>(),
        "cautions": report.cautions,
    })
}

/// The figures of `wave` in their order, as (key, value, unit); a section that collapses has none.
#[must_use]
pub fn wave_figures(wave: &Waveform) -> [(&'static str, f64, &'static str); 9] {
    [
        ("valley_v", wave.valley_v(), "V"),
        ("peak_v", wave.peak_v(), "V"),
        ("mean_v", wave.mean_v(), "V"),
        ("ripple_v", wave.ripple_v(), "V"),
        ("source_mean_a", wave.source_mean_a(), "A"),
        ("source_rms_a", wave.source_rms_a(), "A"),
        ("source_peak_a", wave.source_peak_a(), "A"),
        ("reservoir_rms_a", wave.reservoir_rms_a(), "A"),
        ("conduction_deg", wave.conduction_rad().to_degrees(), "deg"),
    ]
}

/// binrail.wave/1
#[must_use]
pub fn wave(wave: Option<&Waveform>) -> Value {
    let mut object = Map::new();
    object.insert("schema".into(), json!("binrail.wave/1"));
    object.insert("collapses".into(), json!(wave.is_none()));
    for (key, value, _) in wave.iter().flat_map(|w| wave_figures(w)) {
        object.insert(key.into(), json!(value));
    }
    Value::Object(object)
}

/// binrail.error/1
#[must_use]
pub fn errors(faults: &[Fault]) -> Value {
    let one = |f: &Fault| {
        json!({
            "file": f.file,
            "line": f.line,
            "column": f.column,
            "text": f.text,
            "message": f.message(),
        })
    };
    json!({"schema": "binrail.error/1", "errors": faults.iter().map(one).collect::<Vec<_>>()})
}

/// binrail.vet/1
#[must_use]
pub fn vet(faults: &[Fault], warnings: &[Fault], counts: &[(&'static str, usize)]) -> Value {
    let one = |f: &Fault| {
        json!({
            "file": f.file,
            "line": f.line,
            "column": f.column,
            "part": f.part,
            "text": f.text,
            "allowed": f.allowed,
            "message": f.message(),
        })
    };
    json!({
        "schema": "binrail.vet/1",
        "faults": faults.iter().map(one).collect::<Vec<_>>(),
        "warnings": warnings.iter().map(one).collect::<Vec<_>>(),
        "counts": counts.iter().map(|&(file, rows)| (file.to_owned(), json!(rows))).collect::<Map<_, _>>(),
    })
}

/// binrail.none/1 for a search that ended without a build.
#[must_use]
pub fn none(status: &str, bound: Option<f64>, rejected: &[Value], joint: &[String], relax: &[Value]) -> Value {
    json!({
        "schema": "binrail.none/1",
        "proof": {"status": status, "value": null, "bound": bound},
        "rejected": rejected,
        "joint": joint,
        "relax": relax,
    })
}

/// Unit of a limit when there is no build to take the currency from.
#[must_use]
pub fn unit_of(limit: Limit, currency: Option<&str>) -> &str {
    match limit.unit() {
        "" => currency.unwrap_or(""),
        unit => unit,
    }
}
