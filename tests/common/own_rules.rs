//! Rules of assembly, prices, the text of the key and distances, written once more for the brute force.
#![allow(dead_code)]

use std::collections::BTreeMap;

use binrail::build::{Build, Hookup, HookupKind, Section};
use binrail::catalogue::{Catalogue, Part, PartId, Rectifier, RectifierKind, Sink, Transformer};
use binrail::supply::{Path, Supply};

/// Pieces per unit by part.
pub type Bill = BTreeMap<PartId, u64>;

/// Modules serve bridge and dual with one piece; diodes bridge and dual 4, centre-tap 2, half-wave 1.
pub fn pieces_in(rectifier: &Rectifier, path: Path) -> u64 {
    match (rectifier.kind, path) {
        (RectifierKind::Bridge, Path::Bridge | Path::Dual) => 1,
        (RectifierKind::Diode, Path::Bridge | Path::Dual) => 4,
        (RectifierKind::Diode, Path::CentreTap) => 2,
        (RectifierKind::Diode, Path::HalfWave) => 1,
        _ => 0,
    }
}

/// Equal windings of a transformer: secondaries of one voltage and current, or x-0-x windings of one.
#[derive(Debug, Clone, PartialEq)]
pub struct Group {
    /// Each with its places in secondary_v from 1: one, or the two halves of an x-0-x winding.
    pub windings: Vec<Vec<usize>>,
    pub volts_v: f64,
    pub amps_a: f64,
}

impl Group {
    fn tapped(&self) -> bool {
        self.windings[0].len() == 2
    }
}

/// The windings of a transformer, equal ones together.
pub fn groups(transformer: &Transformer) -> Vec<Group> {
    let mut groups: Vec<Group> = Vec::new();
    let mut place = 0;
    while let Some(s) = transformer.secondaries.get(place) {
        let halves = if s.tapped.is_some() { 2 } else { 1 };
        let winding: Vec<usize> = (place + 1..=place + halves).collect();
        place += halves;
        let same = |g: &&mut Group| {
            (g.volts_v.to_bits(), g.amps_a.to_bits(), g.tapped())
                == (s.volts_v.to_bits(), s.amps_a.to_bits(), halves == 2)
        };
        match groups.iter_mut().find(same) {
            Some(group) => group.windings.push(winding),
            None => groups.push(Group {
                windings: vec![winding],
                volts_v: s.volts_v,
                amps_a: s.amps_a,
            }),
        }
    }
    groups
}

/// What a section, or a dual pair, takes from a transformer: so many windings of a group, and how they are joined.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub struct Take {
    pub group: usize,
    /// Windings, an x-0-x one counting once: it serves one section or pair only.
    pub windings: usize,
    /// Secondaries in use.
    pub secondaries: usize,
    pub kind: HookupKind,
}

/// Every way to serve one section or one pair: k equal secondaries single, in series, in parallel, two of them as halves;
/// the halves of x-0-x only by one, in series, or as halves.
pub fn takes(groups: &[Group]) -> Vec<Take> {
    use HookupKind::{CentreTap, Dual, Parallel, Series, Single};
    let mut takes = Vec::new();
    for (group, windings) in groups.iter().enumerate() {
        let mut add = |windings, secondaries, kinds: &[HookupKind]| {
            takes.extend(kinds.iter().map(|&kind| Take {
                group,
                windings,
                secondaries,
                kind,
            }));
        };
        if windings.tapped() {
            add(1, 1, &[Single]);
            add(1, 2, &[Series, CentreTap, Dual]);
            continue;
        }
        add(1, 1, &[Single]);
        for count in 2..=windings.windings.len() {
            add(count, count, &[Series, Parallel]);
        }
        if windings.windings.len() >= 2 {
            add(2, 2, &[CentreTap, Dual]);
        }
    }
    takes
}

/// The hook-up of a take where the first `taken` windings of its group are in use: the lowest free places.
pub fn hookup(take: Take, group: &Group, taken: usize) -> Hookup {
    let free = &group.windings[taken..taken + take.windings];
    let k = take.secondaries as f64;
    Hookup {
        kind: take.kind,
        secondaries: free.iter().flatten().copied().take(take.secondaries).collect(),
        volts_v: group.volts_v * if take.kind == HookupKind::Series { k } else { 1.0 },
        amps_a: group.amps_a * if take.kind == HookupKind::Parallel { k } else { 1.0 },
    }
}

/// Whether a path runs on a hook-up.
pub fn runs_on(path: Path, kind: HookupKind) -> bool {
    match kind {
        HookupKind::Single | HookupKind::Series | HookupKind::Parallel => matches!(path, Path::HalfWave | Path::Bridge),
        HookupKind::CentreTap => path == Path::CentreTap,
        HookupKind::Dual => path == Path::Dual,
    }
}

/// The hook-ups of a transformer that feeds one section, or one pair.
pub fn own_hookups(transformer: &Transformer) -> Vec<Hookup> {
    let groups = groups(transformer);
    let takes = takes(&groups).into_iter();
    takes.map(|take| hookup(take, &groups[take.group], 0)).collect()
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

/// Whether a section is the negative half of a dual pair, whose positive one holds what both share.
fn negative_half(section: &Section) -> bool {
    section.pair.is_some() && section.hookup.secondaries.is_empty()
}

/// Pieces of a section's rectifier that are counted on it.
fn rectifier_pieces(section: &Section) -> u64 {
    if negative_half(section) {
        0
    } else {
        pieces_in(section.rectifier, section.path)
    }
}

/// What each section with its rails is made of; an instance is counted on the first section that it feeds.
pub fn shares(build: &Build) -> Vec<Bill> {
    let share = |(place, section): (usize, &Section)| {
        let mut bill = Bill::new();
        let mut add = |part: &Part, pieces: u64| *bill.entry(part.id).or_default() += pieces;
        let first = build.sections.iter().position(|s| s.transformer == section.transformer);
        if first == Some(place) {
            add(&build.transformers[section.transformer].part.part, 1);
        }
        if !negative_half(section) {
            add(&section.rectifier.part, pieces_in(section.rectifier, section.path));
        }
        section.rectifier_sink.iter().for_each(|s| add(&s.part, 1));
        add(&section.reservoir.part, u64::from(section.cans));
        for rail in build.rails.iter().filter(|rail| rail.section == place) {
            add(&rail.pass.part, 1);
            rail.sink.iter().for_each(|s| add(&s.part, 1));
        }
        bill
    };
    build.sections.iter().enumerate().map(share).collect()
}

/// What a build is made of.
pub fn bill(build: &Build) -> Bill {
    let mut bill = Bill::new();
    for (part, pieces) in shares(build).into_iter().flatten() {
        *bill.entry(part).or_default() += pieces;
    }
    bill
}

/// Whether a part is in a rail's section: either half of a dual pair has the shared rectifier, the positive one its sink.
pub fn part_at(build: &Build, rail: usize, id: PartId) -> bool {
    let choice = &build.rails[rail];
    let section = &build.sections[choice.section];
    let mut sinks = section.rectifier_sink.into_iter().chain(choice.sink);
    [
        build.transformers[section.transformer].part.part.id,
        section.rectifier.part.id,
        section.reservoir.part.id,
        choice.pass.part.id,
    ]
    .contains(&id)
        || sinks.any(|sink| sink.part.id == id)
}

fn sink_name(sink: Option<&Sink>) -> String {
    sink.map_or(String::new(), |s| s.part.name.clone())
}

fn secondaries(section: &Section) -> String {
    let places: Vec<String> = section.hookup.secondaries.iter().map(usize::to_string).collect();
    places.join(",")
}

/// The choice written out for the last tie-break.
pub fn fields(build: &Build) -> Vec<String> {
    let mut fields = Vec::new();
    for choice in &build.rails {
        let section = &build.sections[choice.section];
        fields.extend([
            build.transformers[section.transformer].part.part.name.clone(),
            secondaries(section),
            section.hookup.kind.word().to_owned(),
            section.path.word().to_owned(),
            section.rectifier.part.name.clone(),
            sink_name(section.rectifier_sink),
            section.reservoir.part.name.clone(),
            format!("{:03}", section.cans),
            choice.pass.part.name.clone(),
            sink_name(choice.sink),
        ]);
    }
    for choice in &build.rails {
        let section = &build.sections[choice.section];
        fields.push(section.id.clone());
        fields.push(build.transformers[section.transformer].id.clone());
    }
    fields
}

/// How many (rail, place) pairs differ: transformer, wiring (secondaries, hook-up, path, rails of the section), rectifier
/// with its pieces, its sink, reservoir with its pieces, device, sink.
pub fn apart(a: &Build, b: &Build) -> usize {
    let at = |build: &Build, rail: usize| {
        let choice = &build.rails[rail];
        let s = &build.sections[choice.section];
        let mut rails = s.rails.clone();
        rails.sort_unstable();
        [
            build.transformers[s.transformer].part.part.name.clone(),
            format!("{} {:?} {:?} {rails:?}", secondaries(s), s.hookup.kind, s.path),
            format!("{} {}", s.rectifier.part.name, rectifier_pieces(s)),
            sink_name(s.rectifier_sink),
            format!("{} {}", s.reservoir.part.name, s.cans),
            choice.pass.part.name.clone(),
            sink_name(choice.sink),
        ]
    };
    let differing = |rail| at(a, rail).iter().zip(at(b, rail)).filter(|(a, b)| *a != b).count();
    (0..a.rails.len()).map(differing).sum()
}
