//! Rules of assembly, prices and the text of the key, written once more for the brute force.
#![allow(dead_code)]

use std::collections::BTreeMap;

use binrail::build::{Build, Hookup, HookupKind};
use binrail::catalogue::{Catalogue, Part, PartId, Rectifier, RectifierKind, Sink, Transformer};
use binrail::supply::{Path, Supply};

/// Pieces per unit by part.
pub type Bill = BTreeMap<PartId, u64>;

/// Modules serve bridge with one piece; diodes bridge 4, centre-tap 2, half-wave 1.
pub fn pieces_in(rectifier: &Rectifier, path: Path) -> u64 {
    match (rectifier.kind, path) {
        (RectifierKind::Bridge, Path::Bridge) => 1,
        (RectifierKind::Diode, Path::Bridge) => 4,
        (RectifierKind::Diode, Path::CentreTap) => 2,
        (RectifierKind::Diode, Path::HalfWave) => 1,
        _ => 0,
    }
}

/// k equal secondaries, the lowest places; the halves of x-0-x only in series, by one, as a centre-tapped pair or dual.
pub fn own_hookups(transformer: &Transformer) -> Vec<Hookup> {
    let secondaries = &transformer.secondaries;
    let word = |place: usize| {
        let s = &secondaries[place];
        (s.volts_v.to_bits(), s.amps_a.to_bits(), s.tapped)
    };
    let mut found = Vec::new();
    for first in 0..secondaries.len() {
        if (0..first).any(|earlier| word(earlier) == word(first)) {
            continue;
        }
        let equal: Vec<usize> = (first..secondaries.len())
            .filter(|&place| word(place) == word(first))
            .collect();
        for count in 1..=equal.len() {
            let kinds: &[HookupKind] = match (count, secondaries[first].tapped.is_some()) {
                (1, _) => &[HookupKind::Single],
                (2, true) => &[HookupKind::Series, HookupKind::CentreTap, HookupKind::Dual],
                (2, false) => &[
                    HookupKind::Series,
                    HookupKind::Parallel,
                    HookupKind::CentreTap,
                    HookupKind::Dual,
                ],
                _ => &[HookupKind::Series, HookupKind::Parallel],
            };
            let (volts_v, amps_a, k) = (secondaries[first].volts_v, secondaries[first].amps_a, count as f64);
            found.extend(kinds.iter().map(|&kind| Hookup {
                kind,
                secondaries: equal[..count].iter().map(|place| place + 1).collect(),
                volts_v: if kind == HookupKind::Series {
                    volts_v * k
                } else {
                    volts_v
                },
                amps_a: if kind == HookupKind::Parallel {
                    amps_a * k
                } else {
                    amps_a
                },
            }));
        }
    }
    found
}

/// Exact price of a bill of materials, the whole run bought at once.
pub fn price(supply: &Supply, catalogue: &Catalogue, bill: &Bill) -> i64 {
    let parts: Vec<&Part> = catalogue.parts().collect();
    let line = |(id, &count): (&PartId, &u64)| {
        let part = parts[id.0 as usize];
        let reached = part.breaks.iter().filter(|b| b.pieces <= count * supply.builds);
        let unit = reached
            .map(|b| b.price)
            .min()
            .map_or(part.price, |least| least.min(part.price));
        unit.0 * i64::try_from(count).unwrap()
    };
    bill.iter().map(line).sum()
}

/// The parts of one rail's section and device.
pub fn pieces<'c>(build: &Build<'c>, rail: usize) -> Vec<(&'c Part, u64)> {
    let choice = &build.rails[rail];
    let section = &build.sections[choice.section];
    let mut parts = vec![
        (&build.transformers[section.transformer].part.part, 1),
        (&section.rectifier.part, pieces_in(section.rectifier, section.path)),
        (&section.reservoir.part, u64::from(section.cans)),
        (&choice.pass.part, 1),
    ];
    parts.extend(section.rectifier_sink.iter().chain(&choice.sink).map(|s| (&s.part, 1)));
    parts
}

/// The choice written out for the last tie-break.
pub fn fields(build: &Build) -> Vec<String> {
    let mut fields = Vec::new();
    let sink = |sink: Option<&Sink>| sink.map_or(String::new(), |s| s.part.name.clone());
    for choice in &build.rails {
        let section = &build.sections[choice.section];
        let places: Vec<String> = section.hookup.secondaries.iter().map(usize::to_string).collect();
        fields.extend([
            build.transformers[section.transformer].part.part.name.clone(),
            places.join(","),
            section.hookup.kind.word().to_owned(),
            section.path.word().to_owned(),
            section.rectifier.part.name.clone(),
            sink(section.rectifier_sink),
            section.reservoir.part.name.clone(),
            format!("{:03}", section.cans),
            choice.pass.part.name.clone(),
            sink(choice.sink),
        ]);
    }
    for choice in &build.rails {
        let section = &build.sections[choice.section];
        fields.push(section.id.clone());
        fields.push(build.transformers[section.transformer].id.clone());
    }
    fields
}
