//! Owns how far two builds of the same supply are apart: the (rail, place) pairs in which they differ.

use super::{Build, Hookup};
use crate::catalogue::Sink;
use crate::supply::{Path, Supply};

/// One thing that is chosen for a rail.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Place {
    /// Transformer part.
    Transformer,
    /// Secondaries, hook-up, path and the rails of the section.
    Wiring,
    /// Rectifier with its pieces.
    Rectifier,
    /// The rectifier's sink.
    RectifierSink,
    /// Reservoir with its pieces.
    Reservoir,
    /// Pass device.
    Pass,
    /// Its sink.
    Sink,
}

impl Place {
    /// All places in order.
    pub const ALL: [Place; 7] = [
        Place::Transformer,
        Place::Wiring,
        Place::Rectifier,
        Place::RectifierSink,
        Place::Reservoir,
        Place::Pass,
        Place::Sink,
    ];

    /// The word for it in reports and JSON.
    #[must_use]
    pub fn word(self) -> &'static str {
        match self {
            Place::Transformer => "transformer",
            Place::Wiring => "wiring",
            Place::Rectifier => "rectifier",
            Place::RectifierSink => "rectifier sink",
            Place::Reservoir => "reservoir",
            Place::Pass => "pass",
            Place::Sink => "sink",
        }
    }
}

/// One difference.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Change {
    /// Place of the rail in the supply.
    pub rail: usize,
    /// What differs.
    pub place: Place,
    /// As it was; "" = none.
    pub from: String,
    /// As it is.
    pub to: String,
}

/// What stands in each place of each rail, written out; two builds agree in a place when the texts do.
#[must_use]
pub fn places(supply: &Supply, build: &Build) -> Vec<[String; 7]> {
    let sink = |sink: Option<&Sink>| sink.map_or_else(String::new, |s| s.part.name.clone());
    let pieces = |count: u64, name: &str| format!("{count} x {name}");
    (build.rails.iter())
        .map(|rail| {
            let section = &build.sections[rail.section];
            [
                build.transformers[section.transformer].part.part.name.clone(),
                wiring(supply, &section.hookup, section.path, &section.rails),
                pieces(section.rectifier_pieces(), &section.rectifier.part.name),
                sink(section.rectifier_sink),
                pieces(u64::from(section.cans), &section.reservoir.part.name),
                rail.pass.part.name.clone(),
                sink(rail.sink),
            ]
        })
        .collect()
}

/// Secondaries, hook-up, path and rails of a section, written out.
#[must_use]
pub fn wiring(supply: &Supply, hookup: &Hookup, path: Path, rails: &[usize]) -> String {
    let secondaries: Vec<String> = hookup.secondaries.iter().map(ToString::to_string).collect();
    let rails: Vec<&str> = rails.iter().map(|&r| supply.rails[r].name.as_str()).collect();
    format!(
        "{} {} {} for {}",
        secondaries.join("+"),
        hookup.kind.word(),
        path.word(),
        rails.join(", ")
    )
}

/// Every (rail, place) pair in which two builds of a supply differ, by rail, then place.
#[must_use]
pub fn changes(supply: &Supply, from: &Build, to: &Build) -> Vec<Change> {
    let (from, to) = (places(supply, from), places(supply, to));
    let mut found = Vec::new();
    for (rail, (from, to)) in from.into_iter().zip(to).enumerate() {
        for ((place, from), to) in Place::ALL.into_iter().zip(from).zip(to) {
            if from != to {
                found.push(Change { rail, place, from, to });
            }
        }
    }
    found
}

/// How many pairs differ.
#[must_use]
pub fn distance(supply: &Supply, from: &Build, to: &Build) -> usize {
    changes(supply, from, to).len()
}
