//! The demo catalogue and the examples hold what they were asked to hold.
#![allow(clippy::unwrap_used, clippy::float_cmp)]

use std::path::Path;

use binrail::catalogue::{Polarity, RectifierKind, load};
use binrail::supply::read;

#[test]
fn the_catalogue_has_what_was_asked() {
    let loaded = load(Path::new("catalog"));
    assert!(loaded.faults.is_empty() && loaded.warnings.is_empty());
    let c = &loaded.catalogue;
    let volts = |t: &binrail::catalogue::Transformer| t.secondaries.iter().map(|s| s.volts_v).collect::<Vec<_>>();
    let unequal = c
        .transformers
        .iter()
        .filter(|t| volts(t).windows(2).any(|w| (w[0] - w[1]).abs() > 1e-9))
        .count();
    let three = c.transformers.iter().filter(|t| t.secondaries.len() == 3).count();
    assert!(
        c.transformers.len() >= 60 && unequal >= 15 && three >= 5,
        "{unequal} {three}"
    );
    let va = |most: bool| {
        c.transformers
            .iter()
            .map(|t| t.va)
            .fold(3.0, if most { f64::max } else { f64::min })
    };
    assert!((va(false) - 3.0).abs() < 1e-9 && (va(true) - 300.0).abs() < 1e-9);
    let diodes = c.rectifiers.iter().filter(|r| r.kind == RectifierKind::Diode).count();
    let cased = c
        .rectifiers
        .iter()
        .filter(|r| r.kind == RectifierKind::Bridge && r.case.is_some())
        .count();
    assert!(c.rectifiers.len() >= 25 && diodes >= 10 && cased >= 5);
    let negative = c
        .pass_devices
        .iter()
        .filter(|d| d.polarity == Polarity::Negative)
        .count();
    assert!(c.reservoirs.len() >= 60 && c.pass_devices.len() >= 40 && negative >= 8 && c.sinks.len() >= 25);

    let runs = ["tide-gauge", "ramp-beacon", "berth-console"].map(|name| supply(name).builds);
    let (least, most) = (runs.into_iter().min().unwrap(), runs.into_iter().max().unwrap());
    let short = c.parts().filter(|p| p.stock.is_some_and(|s| s > 0 && s < most)).count();
    let crossed = c
        .parts()
        .filter(|p| p.breaks.iter().any(|b| b.pieces > least && b.pieces <= 12 * most))
        .count();
    assert!(short >= 5 && crossed >= 30, "{short} {crossed}");
}

fn supply(name: &str) -> binrail::supply::Supply {
    read(Path::new(&format!("examples/{name}/supply.toml"))).unwrap()
}

#[test]
fn the_examples_span_what_was_asked() {
    let all = ["tide-gauge", "ramp-beacon", "berth-console"].map(supply);
    assert_eq!(all.each_ref().map(|s| s.rails.len()), [1, 2, 4]);
    let volts: Vec<f64> = all[2].rails.iter().map(|r| r.voltage_v).collect();
    assert_eq!(volts, [3.3, 5.0, 15.0, -15.0]);
    let currents = || all.iter().flat_map(|s| &s.rails).map(|r| r.current_a);
    assert!((currents().fold(f64::INFINITY, f64::min) - 0.1).abs() < 1e-12);
    assert!((currents().fold(0.0, f64::max) - 5.0).abs() < 1e-12);
    let mains: Vec<(f64, f64)> = all.iter().map(|s| (s.mains.nominal_v, s.mains.frequency_hz)).collect();
    assert!(mains.contains(&(230.0, 50.0)) && mains.contains(&(120.0, 60.0)));
}
