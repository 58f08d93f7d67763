//! Owns which parts a rail may use: not withdrawn, not ruled out by the user, not ruled out by a limit of their own.

use std::collections::BTreeSet;

use crate::audit::{Check, Site, Stage, reservoir, transformer, whole};
use crate::build::{device_serves, pieces_of_rectifier};
use crate::catalogue::{Catalogue, Part, PartId, Rectifier, Reservoir, Sink, Slot, Status, Transformer};

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
pub struct Bank<'c> {
    /// Which.
    pub can: &'c Reservoir,
    /// How many.
    pub cans: u32,
}

/// The parts that one rail may use, each in catalogue order.
#[derive(Debug, Clone)]
pub struct Shelf<'c> {
    /// Place of the rail.
    pub rail: usize,
    /// Transformers that hold by themselves.
    pub transformers: Vec<&'c Transformer>,
    /// Rectifiers that serve one of the rail's paths.
    pub rectifiers: Vec<&'c Rectifier>,
    /// Every can with every number of them.
    pub banks: Vec<Bank<'c>>,
    /// Devices that serve the rail and carry its current.
    pub stages: Vec<Stage<'c>>,
    /// All sinks.
    pub sinks: Vec<&'c Sink>,
    /// Sinks that a column must hold.
    pub must_sinks: BTreeSet<PartId>,
}

impl<'c> Shelf<'c> {
    /// Fills the shelf of one rail.
    #[must_use]
    pub fn new(site: &Site<'c>, catalogue: &'c Catalogue, rail_place: usize, must: &Must) -> Shelf<'c> {
        let supply = site.supply;
        let rail = &supply.rails[rail_place];
        let none = BTreeSet::new();
        let demanded = must.in_rail.get(rail_place).unwrap_or(&none);
        let demands = |slot: Slot| -> Vec<PartId> {
            catalogue
                .parts()
                .filter(|p| p.slot == slot && demanded.contains(&p.id))
                .map(|p| p.id)
                .collect()
        };
        let met = |check: Option<Check>| check.is_none_or(|c| c.met());
        // Of every slot but sinks a rail holds one part, so what it must hold is all that it may hold.
        let usable = |part: &Part, pieces: u64| {
            let wanted = if part.slot == Slot::Sink {
                Vec::new()
            } else {
                demands(part.slot)
            };
            must.allows(part)
                && wanted.iter().all(|&id| id == part.id)
                && met(whole::height(supply, part))
                && met(whole::stock(supply, part, pieces))
        };
        let least_pieces = |rectifier: &Rectifier| {
            rail.paths
                .iter()
                .map(|&p| pieces_of_rectifier(rectifier.kind, p))
                .filter(|&n| n > 0)
                .min()
        };
        // A can that does not last without ripple does not last with any.
        let lasts = |can: &Reservoir| {
            rail.paths
                .iter()
                .any(|&path| reservoir::wear(site, can, path, Ok(0.0)).iter().all(Check::met))
        };
        Shelf {
            rail: rail_place,
            transformers: catalogue
                .transformers
                .iter()
                .filter(|t| usable(&t.part, 1) && transformer::by_itself(site, t).iter().all(Check::met))
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
            stages: catalogue
                .pass_devices
                .iter()
                .filter(|d| usable(&d.part, 1) && device_serves(d, rail, true))
                .map(|d| Stage::new(rail, d))
                .filter(|stage| stage.current().met())
                .collect(),
            sinks: catalogue.sinks.iter().filter(|s| usable(&s.part, 1)).collect(),
            must_sinks: demands(Slot::Sink).into_iter().collect(),
        }
    }
}
