//! Owns what the shelf says about a build: how many units it still allows, what could stand in for each part, and where
//! buying more is cheaper.

use std::collections::BTreeSet;

use crate::audit::{audit, cheaper_to_buy_more};
use crate::build::{Build, Hookup, misfits};
use crate::catalogue::{Catalogue, Part, PartId, Slot, Status};
use crate::supply::Supply;
use crate::units::RunCost;

/// The shelf under a bill of materials.
#[derive(Debug, Clone, PartialEq)]
pub struct Shelf {
    /// Units of this build that the stock allows in all; `None`: not limited.
    pub units: Option<u64>,
    /// The part that runs out first.
    pub first: Option<String>,
    /// One for each line of the bill of materials, in its order.
    pub lines: Vec<ShelfLine>,
}

/// The shelf under one line.
#[derive(Debug, Clone, PartialEq)]
pub struct ShelfLine {
    /// The part.
    pub part: String,
    /// Units that its stock allows in all.
    pub units: Option<u64>,
    /// Parts that could replace it one for one in all its uses with everything else as it is; the cheapest build first.
    pub drop_ins: Vec<String>,
    /// Pieces that cost less than those which the run needs, and what that saves over the run.
    pub buy: Option<(u64, RunCost)>,
}

/// Looks along the shelf. Drop-ins are judged by the audit of the changed build; withdrawn parts and those in `without`
/// are none.
#[must_use]
pub fn shelf(supply: &Supply, catalogue: &Catalogue, build: &Build, without: &BTreeSet<PartId>) -> Shelf {
    let lines = build.lines(supply);
    let found: Vec<ShelfLine> = (lines.iter())
        .map(|line| ShelfLine {
            part: line.part.name.clone(),
            units: line.part.stock.map(|stock| stock / line.qty.max(1)),
            drop_ins: drop_ins(supply, catalogue, build, line.part, without),
            buy: cheaper_to_buy_more(line.part, line.qty * supply.builds),
        })
        .collect();
    let first = (found.iter())
        .filter_map(|line| Some((line.units?, &line.part)))
        .reduce(|first, other| if other.0 < first.0 { other } else { first });
    Shelf {
        units: first.map(|(units, _)| units),
        first: first.map(|(_, part)| part.clone()),
        lines: found,
    }
}

fn drop_ins(
    supply: &Supply,
    catalogue: &Catalogue,
    build: &Build,
    part: &Part,
    without: &BTreeSet<PartId>,
) -> Vec<String> {
    let others = (catalogue.parts())
        .filter(|other| other.slot == part.slot && other.id != part.id)
        .filter(|other| other.status != Status::Withdrawn && !without.contains(&other.id));
    let mut found: Vec<_> = others
        .filter_map(|other| {
            let changed = replaced(catalogue, build, part, other)?;
            if !misfits(supply, &changed).is_empty() {
                return None;
            }
            let verdict = audit(supply, &changed);
            (verdict.passes() && verdict.heat_w.is_some()).then_some((verdict.cost, &other.name))
        })
        .collect();
    found.sort();
    found.into_iter().map(|(_, name)| name.clone()).collect()
}

/// The build with one part in the place of another, wherever that is used; `None`: it does not go there.
fn replaced<'c>(catalogue: &'c Catalogue, build: &Build<'c>, old: &Part, new: &Part) -> Option<Build<'c>> {
    let mut build = build.clone();
    match new.slot {
        Slot::Transformer => {
            let new = catalogue.transformers.iter().find(|t| t.part.id == new.id)?;
            for (place, instance) in build.transformers.iter_mut().enumerate() {
                if instance.part.part.id != old.id {
                    continue;
                }
                instance.part = new;
                for section in build.sections.iter_mut().filter(|s| s.transformer == place) {
                    if !section.is_negative_half() {
                        section.hookup = Hookup::of_places(section.hookup.kind, &section.hookup.secondaries, new)?;
                    }
                }
            }
            for place in 0..build.sections.len() {
                let section = &build.sections[place];
                if let Some(pair) = section.pair.filter(|_| section.is_negative_half()) {
                    build.sections[place].hookup = build.sections[pair].hookup.negative_half();
                }
            }
        }
        Slot::Rectifier => {
            let new = catalogue.rectifiers.iter().find(|r| r.part.id == new.id)?;
            for section in build.sections.iter_mut().filter(|s| s.rectifier.part.id == old.id) {
                // One for one: four diodes are no drop-in for a module.
                if section.rectifier.kind != new.kind {
                    return None;
                }
                section.rectifier = new;
            }
        }
        Slot::Reservoir => {
            let new = catalogue.reservoirs.iter().find(|c| c.part.id == new.id)?;
            for section in build.sections.iter_mut().filter(|s| s.reservoir.part.id == old.id) {
                section.reservoir = new;
            }
        }
        Slot::Pass => {
            let new = catalogue.pass_devices.iter().find(|d| d.part.id == new.id)?;
            for rail in build.rails.iter_mut().filter(|r| r.pass.part.id == old.id) {
                rail.pass = new;
            }
        }
        Slot::Sink => {
            let new = catalogue.sinks.iter().find(|s| s.part.id == new.id)?;
            let sinks = (build.sections.iter_mut().map(|s| &mut s.rectifier_sink))
                .chain(build.rails.iter_mut().map(|r| &mut r.sink));
            for sink in sinks.filter(|sink| sink.is_some_and(|s| s.part.id == old.id)) {
                *sink = Some(new);
            }
        }
    }
    Some(build)
}
