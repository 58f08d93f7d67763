//! Owns the check of a whole build against the rules of assembly, each told where it is broken.

use std::collections::BTreeMap;

use super::{Build, Section, device_serves, hookups, pieces_of_rectifier, sink_takes};
use crate::catalogue::RectifierKind;
use crate::supply::{Path, Supply};

/// One broken rule of assembly.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Misfit {
    /// Transformer, section or rail that it concerns.
    pub of: String,
    /// What does not fit, as a sentence.
    pub message: String,
}

/// Every rule that a build breaks; empty for each build that the search makes.
#[must_use]
pub fn misfits(supply: &Supply, build: &Build) -> Vec<Misfit> {
    let mut found = Found(Vec::new());
    secondaries_serve_once(build, &mut found);
    transformers_serve_one(supply, build, &mut found);
    sections_are_as_named(supply, build, &mut found);
    for section in &build.sections {
        wiring(supply, build, section, &mut found);
        members(supply, section, &mut found);
    }
    pairs(supply, build, &mut found);
    devices(supply, build, &mut found);
    found.0
}

struct Found(Vec<Misfit>);

impl Found {
    fn say(&mut self, of: &str, message: impl Into<String>) {
        self.0.push(Misfit {
            of: of.to_owned(),
            message: message.into(),
        });
    }
}

/// Each secondary serves one section, and so does each tapped winding: its halves meet in the tap, so two outputs with
/// a common ground would short them.
fn secondaries_serve_once(build: &Build, found: &mut Found) {
    for (place, instance) in build.transformers.iter().enumerate() {
        let tap = |secondary: usize| instance.part.secondaries.get(secondary - 1)?.tapped;
        // Which section takes a secondary first.
        let mut taken: BTreeMap<usize, usize> = BTreeMap::new();
        let on_it = build
            .sections
            .iter()
            .enumerate()
            .filter(|(_, s)| s.transformer == place);
        for (section, &secondary) in on_it.flat_map(|(k, s)| s.hookup.secondaries.iter().map(move |x| (k, x))) {
            let elsewhere = |&of: &usize| of != section;
            let mut halves = taken.iter().filter(|&(&half, _)| tap(half) == tap(secondary));
            if taken.get(&secondary).is_some_and(elsewhere) {
                found.say(
                    &instance.id,
                    format!("secondary {secondary} serves two sections; each takes its own"),
                );
            } else if tap(secondary).is_some() && halves.any(|(_, of)| elsewhere(of)) {
                found.say(
                    &instance.id,
                    format!(
                        "secondary {secondary} is half of a tapped winding that serves another section; such a \
                         winding serves one section or one dual pair"
                    ),
                );
            }
            taken.entry(secondary).or_insert(section);
        }
    }
}

fn transformers_serve_one(supply: &Supply, build: &Build, found: &mut Found) {
    for (place, instance) in build.transformers.iter().enumerate() {
        // A dual pair counts once: it has a rule of its own.
        let fed = (build.sections.iter())
            .filter(|s| s.transformer == place && !s.is_negative_half())
            .count();
        if fed > 1 && supply.share_never {
            found.say(
                &instance.id,
                "share = \"never\" gives every section its own transformer",
            );
        }
    }
}

/// Rails that name a section share it with just those that name the same.
fn sections_are_as_named(supply: &Supply, build: &Build, found: &mut Found) {
    for (k, (rail, choice)) in supply.rails.iter().zip(&build.rails).enumerate() {
        for (other, its) in supply.rails[..k].iter().zip(&build.rails) {
            let (Some(name), Some(other_name)) = (&rail.section, &other.section) else {
                continue;
            };
            if (name == other_name) != (choice.section == its.section) {
                let must = if name == other_name {
                    "must share"
                } else {
                    "must not share"
                };
                found.say(
                    &rail.name,
                    format!("{must} a section with rail {}: see their key section", other.name),
                );
            }
        }
    }
}

/// What a section is made of.
fn wiring(supply: &Supply, build: &Build, section: &Section, found: &mut Found) {
    let transformer = build.transformers[section.transformer].part;
    let (hookup, path, rectifier) = (&section.hookup, section.path, section.rectifier);
    let fits = || {
        hookups(transformer).iter().any(|h| {
            h.kind == hookup.kind && h.secondaries.len() == hookup.secondaries.len() && hookup.is_like(h, transformer)
        })
    };
    // The secondaries of a pair stand on its positive half.
    let held_by_other = negative(supply, section) && path == Path::Dual && section.is_negative_half();
    if !held_by_other && !fits() {
        found.say(
            &section.id,
            format!(
                "secondaries {:?} of {} cannot be joined as {}; equal secondaries only, and a tapped winding in \
                 series, by one half, as a centre-tap or dual",
                hookup.secondaries,
                transformer.part.name,
                hookup.kind.word()
            ),
        );
    }
    if !hookup.kind.takes(path) {
        found.say(
            &section.id,
            format!("path {} does not run on hook-up {}", path.word(), hookup.kind.word()),
        );
    }
    if pieces_of_rectifier(rectifier.kind, path) == 0 {
        found.say(
            &section.id,
            format!("{} does not serve path {}", rectifier.part.name, path.word()),
        );
    }
    if let Some(sink) = section.rectifier_sink {
        let module = rectifier.kind == RectifierKind::Bridge;
        if !module || !sink_takes(sink, rectifier.case.as_deref()) {
            found.say(
                &section.id,
                format!("sink {} does not take {}", sink.part.name, rectifier.part.name),
            );
        }
    }
    if section.cans == 0 || section.cans > supply.caps.cans {
        found.say(
            &section.id,
            format!(
                "{} capacitors in parallel; the supply allows 1 to {}",
                section.cans, supply.caps.cans
            ),
        );
    }
}

/// The rails of a section.
fn members(supply: &Supply, section: &Section, found: &mut Found) {
    if negative(supply, section) && section.rails.iter().any(|&r| supply.rails[r].voltage_v > 0.0) {
        found.say(
            &section.id,
            "feeds rails of both polarities; a section has one polarity",
        );
    }
    if section.rails.len() > 1 && supply.share_never {
        found.say(&section.id, "share = \"never\" gives every rail its own section");
    }
    for rail in section.rails.iter().map(|&rail| &supply.rails[rail]) {
        if section.rails.len() > 1 && rail.isolated {
            found.say(&rail.name, "is isolated and shares its section");
        }
        if section.pair.is_some() && rail.isolated {
            found.say(&rail.name, "is isolated and fed by half of a dual pair");
        }
        if !rail.paths.contains(&section.path) {
            found.say(&rail.name, format!("its paths do not name {}", section.path.word()));
        }
    }
}

fn negative(supply: &Supply, section: &Section) -> bool {
    section.rails.iter().any(|&rail| supply.rails[rail].voltage_v < 0.0)
}

/// Path dual makes two sections of opposite polarity from one transformer and one rectifier; what they have in common
/// stands on the positive one.
fn pairs(supply: &Supply, build: &Build, found: &mut Found) {
    for (place, section) in build.sections.iter().enumerate() {
        let Some(other) = section.pair.and_then(|other| build.sections.get(other)) else {
            if section.path == Path::Dual {
                found.say(
                    &section.id,
                    "path dual makes two sections; name the one of the other polarity as its pair",
                );
            }
            continue;
        };
        if section.path != Path::Dual {
            found.say(
                &section.id,
                format!(
                    "has a pair on path {}; only path dual makes two sections",
                    section.path.word()
                ),
            );
            continue;
        }
        if other.pair != Some(place) || section.pair == Some(place) {
            found.say(
                &section.id,
                format!("names {} as its pair, which must name it in turn", other.id),
            );
            continue;
        }
        // The rest is said once for each pair: on its positive half, or where there is none on the first.
        let first = section.pair.is_some_and(|other| place < other);
        match (negative(supply, section), negative(supply, other)) {
            (false, true) => half_and_half(supply, section, other, found),
            (a, b) if a == b && first => found.say(
                &section.id,
                format!(
                    "has the polarity of its pair {}; a dual pair is a positive and a negative section",
                    other.id
                ),
            ),
            _ => {}
        }
    }
}

fn half_and_half(supply: &Supply, positive: &Section, other: &Section, found: &mut Found) {
    if supply.share_never {
        found.say(&positive.id, "share = \"never\" excludes path dual");
    }
    if positive.transformer != other.transformer {
        found.say(
            &positive.id,
            format!("and its pair {} must be fed by the same transformer", other.id),
        );
    }
    if positive.rectifier.part.id != other.rectifier.part.id {
        found.say(
            &positive.id,
            format!("and its pair {} have one rectifier; both must name it", other.id),
        );
    }
    if other.hookup != positive.hookup.negative_half() || other.rectifier_sink.is_some() {
        found.say(
            &other.id,
            format!(
                "is the negative half of a pair: secondaries and the rectifier's sink stand on {} alone",
                positive.id
            ),
        );
    }
}

/// Devices and their sinks.
fn devices(supply: &Supply, build: &Build, found: &mut Found) {
    for (rail, choice) in supply.rails.iter().zip(&build.rails) {
        if !device_serves(choice.pass, rail, build.sections[choice.section].floats()) {
            found.say(
                &rail.name,
                format!(
                    "{} does not serve {} V with the device kinds that the rail names",
                    choice.pass.part.name, rail.voltage_v
                ),
            );
        }
        if let Some(sink) = choice.sink
            && !sink_takes(sink, choice.pass.case.as_deref())
        {
            found.say(
                &rail.name,
                format!("sink {} does not take {}", sink.part.name, choice.pass.part.name),
            );
        }
    }
}
