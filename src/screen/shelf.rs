//! Owns which parts a section may use: not withdrawn, not ruled out by the user, not ruled out by a limit of their own.

use std::collections::BTreeSet;

use crate::audit::{Site, Stage, reservoir, transformer, whole};
use crate::build::{device_serves, may_pair, pieces_of_rectifier};
use crate::catalogue::{Catalogue, Part, PartId, Rectifier, Reservoir, Sink, Slot, Status, Transformer};
use crate::supply::Path;

/// What the user rules out or demands, by part.
#[derive(Debug, Clone, Default)]
pub struct Must {
    /// --without
    pub without: BTreeSet<PartId>,
    /// Named by --with: withdrawn parts among them may be picked.
    pub named: BTreeSet<PartId>,
    /// For each rail the parts that its section or device must hold.
    pub in_rail: Vec<BTreeSet<PartId>>,
}

impl Must {
    fn allows(&self, part: &Part) -> bool {
        !self.without.contains(&part.id) && (part.status != Status::Withdrawn || self.named.contains(&part.id))
    }
}

/// n equal capacitors.
#[derive(Debug, Clone, Copy)]
pub(super) struct Bank<'c> {
    /// Which.
    pub can: &'c Reservoir,
    /// How many.
    pub cans: u32,
}

/// The parts that one section and the devices behind it may use, each in catalogue order.
#[derive(Debug, Clone)]
pub(super) struct Shelf<'c> {
    /// Places of the rails that the section feeds, rising.
    pub rails: Vec<usize>,
    /// Rectifier circuits that all of them allow.
    pub paths: Vec<Path>,
    /// Transformers that hold by themselves.
    pub transformers: Vec<&'c Transformer>,
    /// Rectifiers that serve one of the paths.
    pub rectifiers: Vec<&'c Rectifier>,
    /// Every can with every number of them.
    pub banks: Vec<Bank<'c>>,
    /// By rail, devices that serve it and carry its current.
    pub stages: Vec<Vec<Stage<'c>>>,
    /// All sinks.
    pub sinks: Vec<&'c Sink>,
    /// By rail, sinks that must stand in its section or on its device.
    pub must_sinks: Vec<BTreeSet<PartId>>,
}

impl<'c> Shelf<'c> {
    /// Fills the shelf of a section that feeds these rails.
    #[must_use]
    pub(super) fn new(site: &Site<'c>, catalogue: &'c Catalogue, rails: &[usize], must: &Must) -> Shelf<'c> {
        let supply = site.supply;
        let none = BTreeSet::new();
        let demanded = |rail: usize| must.in_rail.get(rail).unwrap_or(&none);
        let demands = |rail: usize, slot: Slot| -> BTreeSet<PartId> {
            let of_slot = catalogue.parts().filter(|p| p.slot == slot);
            of_slot.map(|p| p.id).filter(|id| demanded(rail).contains(id)).collect()
        };
        let stocked = |part: &Part, pieces: u64| {
            must.allows(part)
                && site.holds(whole::height(supply, part))
                && site.holds(whole::stock(supply, part, pieces))
        };
        // Of every slot but sinks a rail has one part, so what it must hold is all that it may hold.
        let only = |rail: usize, slot: Slot, part: &Part| demands(rail, slot).iter().all(|&id| id == part.id);
        let wanted: Vec<[BTreeSet<PartId>; 3]> = rails
            .iter()
            .map(|&rail| [Slot::Transformer, Slot::Rectifier, Slot::Reservoir].map(|slot| demands(rail, slot)))
            .collect();
        let usable = |part: &Part, pieces: u64| {
            let place = part.slot as usize;
            stocked(part, pieces) && wanted.iter().all(|of| of[place].iter().all(|&id| id == part.id))
        };
        let paths: Vec<Path> = Path::ALL
            .into_iter()
            .filter(|path| rails.iter().all(|&r| supply.rails[r].paths.contains(path)))
            .filter(|&path| path != Path::Dual || may_pair(supply, rails))
            .collect();
        let least_pieces = |rectifier: &Rectifier| {
            let pieces = paths.iter().map(|&p| pieces_of_rectifier(rectifier.kind, p));
            pieces.filter(|&n| n > 0).min()
        };
        // A can that does not last without ripple does not last with any.
        let lasts = |can: &Reservoir| {
            paths.iter().any(|&path| {
                let wear = reservoir::wear(site, can, path, Ok(0.0));
                wear.into_iter().all(|check| site.holds(check))
            })
        };
        let stages = |&rail: &usize| -> Vec<Stage<'c>> {
            let fitting = catalogue.pass_devices.iter().filter(|d| {
                stocked(&d.part, 1)
                    && only(rail, Slot::Pass, &d.part)
                    && device_serves(d, &supply.rails[rail], rails.len() == 1)
            });
            fitting
                .map(|d| Stage::new(&supply.rails[rail], d))
                .filter(|stage| site.holds(stage.current()))
                .collect()
        };
        Shelf {
            transformers: catalogue
                .transformers
                .iter()
                .filter(|t| usable(&t.part, 1))
                .filter(|t| {
                    transformer::by_itself(site, t)
                        .into_iter()
                        .all(|check| site.holds(check))
                })
                .collect(),
            rectifiers: catalogue
                .rectifiers
                .iter()
                .filter(|r| least_pieces(r).is_some_and(|pieces| usable(&r.part, pieces)))
                .collect(),
            banks: catalogue
                .reservoirs
                .iter()
                .flat_map(|can| (1..=supply.caps.cans).map(move |cans| Bank { can, cans }))
                .filter(|bank| usable(&bank.can.part, u64::from(bank.cans)) && lasts(bank.can))
                .collect(),
            stages: rails.iter().map(stages).collect(),
            sinks: catalogue.sinks.iter().filter(|s| stocked(&s.part, 1)).collect(),
            must_sinks: rails.iter().map(|&rail| demands(rail, Slot::Sink)).collect(),
            rails: rails.to_vec(),
            paths,
        }
    }
}
