//! Owns what can be connected at all: which device serves a rail, which sink takes a case, which rectifier a path.
//!
//! These are rules of assembly, not limits: a choice that breaks one is no build. The search lists only what they
//! allow, and a hand-written build is held against them before it is audited.

use std::collections::BTreeSet;

use super::{Build, hookups};
use crate::catalogue::{DeviceKind, PassDevice, Polarity, RectifierKind, Sink};
use crate::supply::{Path, Rail, Supply};

/// How close a fixed output must be to the rail's voltage, volts: only rounding of the two texts.
const SAME_VOLTAGE_V: f64 = 1e-9;

/// Diodes in series in a path.
#[must_use]
pub fn diodes_in_path(path: Path) -> f64 {
    match path {
        Path::Bridge => 2.0,
        Path::HalfWave | Path::CentreTap | Path::Dual => 1.0,
    }
}

/// Pieces of a rectifier that a path takes; 0: it does not serve that path.
#[must_use]
pub fn pieces_of_rectifier(kind: RectifierKind, path: Path) -> u64 {
    match (kind, path) {
        (RectifierKind::Bridge, Path::Bridge | Path::Dual) => 1,
        (RectifierKind::Bridge, Path::HalfWave | Path::CentreTap) => 0,
        (RectifierKind::Diode, Path::Bridge | Path::Dual) => 4,
        (RectifierKind::Diode, Path::CentreTap) => 2,
        (RectifierKind::Diode, Path::HalfWave) => 1,
    }
}

/// Whether a device can give the rail's voltage: right kind, right output, right sign. A negative rail takes a
/// positive device too when its section floats (it is alone on it) and the device's output is grounded.
#[must_use]
pub fn device_serves(device: &PassDevice, rail: &Rail, alone: bool) -> bool {
    let out_v = rail.voltage_v.abs();
    let output = match device.kind {
        DeviceKind::Fixed => device.vout_v.is_some_and(|v| (v - out_v).abs() <= SAME_VOLTAGE_V),
        _ => match (device.vout_min_v, device.vout_max_v) {
            (Some(low), Some(high)) => low <= out_v && out_v <= high,
            _ => false,
        },
    };
    let sign = match device.polarity {
        Polarity::Positive => rail.voltage_v > 0.0 || alone,
        Polarity::Negative => rail.voltage_v < 0.0,
    };
    output && sign && rail.devices.contains(&device.kind)
}

/// Whether a sink takes a part of that outline.
#[must_use]
pub fn sink_takes(sink: &Sink, case: Option<&str>) -> bool {
    case.is_some_and(|case| sink.cases.iter().any(|c| c == case))
}

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
    let mut found = Vec::new();
    let mut say = |of: &str, message: String| {
        found.push(Misfit {
            of: of.to_owned(),
            message,
        })
    };
    for (place, instance) in build.transformers.iter().enumerate() {
        let mut taken = BTreeSet::new();
        for section in build.sections.iter().filter(|s| s.transformer == place) {
            for &secondary in &section.hookup.secondaries {
                if !taken.insert(secondary) {
                    say(
                        &instance.id,
                        format!("secondary {secondary} serves two sections; each takes its own"),
                    );
                }
            }
        }
    }
    for (place, instance) in build.transformers.iter().enumerate() {
        let fed = build.sections.iter().filter(|s| s.transformer == place).count();
        if fed > 1 && supply.share_never {
            say(
                &instance.id,
                "share = \"never\" gives every section its own transformer".into(),
            );
        }
    }
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
                say(
                    &rail.name,
                    format!("{must} a section with rail {}: see their key section", other.name),
                );
            }
        }
    }
    for section in &build.sections {
        let transformer = build.transformers[section.transformer].part;
        let known = hookups(transformer);
        let fits = known.iter().any(|h| {
            h.kind == section.hookup.kind
                && h.secondaries.len() == section.hookup.secondaries.len()
                && section.hookup.is_like(h, transformer)
        });
        if !fits {
            say(
                &section.id,
                format!(
                    "secondaries {:?} of {} cannot be joined as {}; equal secondaries only, and a tapped winding in series, by one half or as a centre-tap",
                    section.hookup.secondaries,
                    transformer.part.name,
                    section.hookup.kind.word()
                ),
            );
        }
        if !section.hookup.kind.takes(section.path) {
            say(
                &section.id,
                format!(
                    "path {} does not run on hook-up {}",
                    section.path.word(),
                    section.hookup.kind.word()
                ),
            );
        }
        if pieces_of_rectifier(section.rectifier.kind, section.path) == 0 {
            say(
                &section.id,
                format!(
                    "{} does not serve path {}",
                    section.rectifier.part.name,
                    section.path.word()
                ),
            );
        }
        if let Some(sink) = section.rectifier_sink {
            let module = section.rectifier.kind == RectifierKind::Bridge;
            if !module || !sink_takes(sink, section.rectifier.case.as_deref()) {
                say(
                    &section.id,
                    format!("sink {} does not take {}", sink.part.name, section.rectifier.part.name),
                );
            }
        }
        if section.cans == 0 || section.cans > supply.caps.cans {
            say(
                &section.id,
                format!(
                    "{} capacitors in parallel; the supply allows 1 to {}",
                    section.cans, supply.caps.cans
                ),
            );
        }
        let negative = |&rail: &usize| supply.rails[rail].voltage_v < 0.0;
        if section.rails.iter().any(negative) && !section.rails.iter().all(negative) {
            say(
                &section.id,
                "feeds rails of both polarities; a section has one polarity".into(),
            );
        }
        if section.rails.len() > 1 && supply.share_never {
            say(&section.id, "share = \"never\" gives every rail its own section".into());
        }
        for &rail in &section.rails {
            let rail = &supply.rails[rail];
            if section.rails.len() > 1 && rail.isolated {
                say(&rail.name, "is isolated and shares its section".into());
            }
            if !rail.paths.contains(&section.path) {
                say(&rail.name, format!("its paths do not name {}", section.path.word()));
            }
        }
    }
    for (rail, choice) in supply.rails.iter().zip(&build.rails) {
        let alone = build.sections[choice.section].rails.len() == 1;
        if !device_serves(choice.pass, rail, alone) {
            say(
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
            say(
                &rail.name,
                format!("sink {} does not take {}", sink.part.name, choice.pass.part.name),
            );
        }
    }
    found
}
