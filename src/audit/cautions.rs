//! Owns the cautions: what no limit can settle and a person must know.

use crate::build::Build;
use crate::catalogue::{DeviceKind, Part, Polarity, Status};
use crate::physics::constants::HIGH_FREQUENCY_HZ;
use crate::supply::{Path, Supply};
use crate::units::RunCost;

/// Said with every build.
pub const SAFETY: [&str; 4] = [
    "Mains voltage kills: work on it only de-energised, locked off and proved dead, by a licensed person where the law asks for one.",
    "Reservoirs stay charged after switch-off: discharge and measure before touching.",
    "Heat sinks run hot and may be live: guard them.",
    "Choose transformer, fuse, insulation and earthing by the safety standard that applies to the product and by local codes; this tool checks none of them.",
];

/// The cautions that this build calls for, [`SAFETY`] last.
#[must_use]
pub fn cautions(supply: &Supply, build: &Build) -> Vec<String> {
    let mut found: Vec<String> = Vec::new();
    if supply.ambient.inside_rise_k <= 0.0 {
        found.push(
            "inside_rise is 0: the air inside a closed box is warmer than outside; measure or estimate it.".into(),
        );
    }
    for instance in &build.transformers {
        if instance.part.core_loss_w.is_none() {
            found.push(format!(
                "{}: core_loss_w is blank; its iron loss is estimated from VA.",
                instance.part.part.name
            ));
        }
    }
    for section in &build.sections {
        let can = section.reservoir;
        if can.esr_hz >= HIGH_FREQUENCY_HZ || can.ripple_hz >= HIGH_FREQUENCY_HZ {
            found.push(format!(
                "{}: ESR or ripple is stated at 10 kHz or more; taken as twice the ESR, half the ripple at mains frequencies.",
                can.part.name
            ));
        }
        if section.path == Path::HalfWave {
            found.push(format!(
                "section {}: half-wave rectification puts direct current into the transformer's core; ask its maker.",
                section.id
            ));
        }
        if matches!(section.path, Path::CentreTap | Path::Dual) && !section.is_negative_half() {
            found.push(format!(
                "section {}: {} halves must be wound alike, or the core takes direct current.",
                section.id,
                section.path.word()
            ));
        }
    }
    for (rail, choice) in supply.rails.iter().zip(&build.rails) {
        let name = &choice.pass.part.name;
        let transformer = build.sections[choice.section].transformer;
        if rail.isolated && build.sections.iter().filter(|s| s.transformer == transformer).count() > 1 {
            found.push(format!(
                "rail {}: is isolated from rails on the same transformer by the insulation between its secondaries alone; ask its maker what that holds.",
                rail.name
            ));
        }
        if choice.pass.vdiff_max_v.is_some() {
            found.push(format!(
                "rail {}: {name} is rated by input to output voltage; a shorted output puts the whole raw voltage across it.",
                rail.name
            ));
        }
        if rail.voltage_v < 0.0 && choice.pass.polarity == Polarity::Positive {
            found.push(format!(
                "rail {}: {name} is a positive device; its section must float and its output is grounded.",
                rail.name
            ));
        }
        if choice.pass.kind == DeviceKind::Adjustable {
            found.push(format!(
                "rail {}: the output divider of {name} is not in the bill of materials.",
                rail.name
            ));
        }
    }
    for line in build.lines(supply) {
        match line.part.status {
            Status::Current => {}
            Status::LastBuy => found.push(format!("{}: last buy; ask how long it can be had.", line.part.name)),
            Status::Withdrawn => found.push(format!("{}: withdrawn.", line.part.name)),
        }
        if let Some((pieces, saved)) = cheaper_to_buy_more(line.part, line.qty * supply.builds) {
            found.push(format!(
                "{}: {pieces} pieces cost {saved} less than the {} that the run needs; buy up to the break.",
                line.part.name,
                line.qty * supply.builds
            ));
        }
    }
    found.dedup();
    found.extend(SAFETY.map(String::from));
    found
}

/// The break up to which it pays to buy, and what it saves over the whole run.
#[must_use]
pub fn cheaper_to_buy_more(part: &Part, pieces: u64) -> Option<(u64, RunCost)> {
    let now = part.unit_price(pieces).of_run(pieces);
    (part.breaks.iter())
        .filter(|b| b.pieces > pieces && part.stock.is_none_or(|stock| b.pieces <= stock))
        .map(|b| (b.price.of_run(b.pieces), b.pieces))
        .filter(|&(total, _)| total < now)
        .min()
        .map(|(total, pieces)| (pieces, RunCost(now.0 - total.0)))
}
