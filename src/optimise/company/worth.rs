//! Owns what is worth a look: whether a build of some bound can better the best company of any part that it may hold.

use super::bound::{Bound, Losses};
use super::outlook::{Fed, Outlook};
use super::search::Search;
use crate::audit::Check;
use crate::catalogue::PartId;

/// The least that a build must exceed to better some part that can still gain.
#[derive(Default)]
pub(super) struct Floors {
    /// Changes of the ledger that they know of.
    changes: Option<u64>,
    pub(super) rectifiers: f64,
    pub(super) devices: f64,
    pub(super) sinks: f64,
    /// By rectifier, by device: of the sinks that take it.
    on_rectifier: Vec<f64>,
    on_device: Vec<f64>,
}

/// A section that is looked at.
pub(super) struct Spot<'f> {
    pub(super) fed: &'f Fed,
    pub(super) rectifier: usize,
    pub(super) outlook: Outlook<'f>,
}

impl Spot<'_> {
    pub(super) fn least(&self, bound: Bound) -> f64 {
        bound.least(self.outlook.enclosure.collapse)
    }
}

impl Search<'_, '_> {
    /// The parts that every build of a section holds, and the rail.
    pub(super) fn parts(&self, fed: &Fed, rectifier: usize) -> [PartId; 4] {
        let aisle = self.aisle;
        [
            aisle.sources[fed.source].transformer.part.id,
            aisle.banks[fed.bank].can.part.id,
            aisle.rectifiers[rectifier].part.part.id,
            self.rail,
        ]
    }

    /// The least that a build must exceed to better one of these.
    pub(super) fn need(&self, parts: &[PartId]) -> f64 {
        let needs = parts.iter().map(|&part| self.ledger.need(part));
        needs.fold(f64::INFINITY, f64::min)
    }

    /// The same for a device, or a sink of it or of the rectifier, or a part of the section, which needs `section`.
    pub(super) fn need_behind(&self, rectifier: usize, device: usize, section: f64) -> f64 {
        let device_id = self.aisle.devices[device].stage.device.part.id;
        section
            .min(self.ledger.need(device_id))
            .min(self.floors.on_rectifier[rectifier])
            .min(self.floors.on_device[device])
    }

    /// What a build of that bound, in which the rectifier has its best sink, can reach at most for a part of it whose
    /// best company it can better; `None`: there is no such part.
    pub(super) fn wanted(&self, spot: &Spot, device: usize, bound: Bound, losses: Losses) -> Option<Bound> {
        let (aisle, rectifier) = (self.aisle, spot.rectifier);
        let section = self.need(&self.parts(spot.fed, rectifier));
        let need = self.need_behind(rectifier, device, section);
        if spot.least(bound) <= need {
            return None;
        }
        let bound = Bound {
            held: bound.held.min(self.cooling.best(device, losses.pass_w)),
            ..bound
        };
        if spot.least(bound) > section.min(self.ledger.need(aisle.devices[device].stage.device.part.id)) {
            return Some(bound);
        }
        if spot.least(bound) <= need {
            return None;
        }
        let mut best: Option<Bound> = None;
        let mut offer = |sink: usize, bears: &dyn Fn(f64) -> bool, junction: &dyn Fn() -> Check| {
            let need = self.ledger.need(aisle.sinks[sink].part.part.id);
            // A collapsed section has no junctions.
            if spot.least(bound) > need && (spot.outlook.enclosure.collapse > need || bears(need)) {
                let on = self.on(sink, bound, junction());
                if spot.least(on) > best.map_or(need, |b| need.max(spot.least(b))) {
                    best = Some(on);
                }
            }
        };
        for (place, &sink) in aisle.rectifiers[rectifier].sinks.all.iter().enumerate() {
            let bears = |need| self.cooling.rectifier_bears(rectifier, place, need, losses.package_w);
            let part = Some(aisle.sinks[sink].part);
            offer(sink, &bears, &|| {
                self.cooling.rectifier(rectifier, losses.package_w, part)
            });
        }
        for (place, &sink) in aisle.devices[device].sinks.all.iter().enumerate() {
            let bears = |need| self.cooling.device_bears(device, place, need, losses.pass_w);
            let part = Some(aisle.sinks[sink].part);
            offer(sink, &bears, &|| self.cooling.device(device, losses.pass_w, part));
        }
        best
    }

    /// With the best sink for a rectifier of which a package loses so much.
    pub(super) fn coolest(&self, spot: &Spot, bound: Bound, package_w: f64) -> Bound {
        if package_w < 0.0 {
            return bound;
        }
        let junction = |part| self.cooling.rectifier(spot.rectifier, package_w, part);
        let mut best = bound.held(junction(None));
        for &sink in &self.aisle.rectifiers[spot.rectifier].sinks.best {
            // Nothing is better than what takes nothing away.
            if spot.least(best) >= spot.least(bound) {
                break;
            }
            let on = self.on(sink, bound, junction(Some(self.aisle.sinks[sink].part)));
            if spot.least(on) > spot.least(best) {
                best = on;
            }
        }
        best
    }

    fn on(&self, sink: usize, bound: Bound, junction: Check) -> Bound {
        let any = bound.any.min(self.aisle.sinks[sink].own.tightness);
        Bound { any, ..bound }.held(junction)
    }

    /// Brings the floors up to date.
    pub(super) fn lower_floors(&mut self) {
        if self.floors.changes == Some(self.ledger.changes()) {
            return;
        }
        let aisle = self.aisle;
        let open = |part: PartId, any: f64| Some(self.ledger.need(part)).filter(|&need| any > need);
        let least = |needs: &mut dyn Iterator<Item = f64>| needs.fold(f64::INFINITY, f64::min);
        let of_sinks = |sinks: &[usize]| {
            let sinks = sinks.iter().map(|&k| &aisle.sinks[k]);
            least(&mut sinks.filter_map(|s| open(s.part.part.id, s.own.tightness)))
        };
        let on_rectifier: Vec<f64> = aisle.rectifiers.iter().map(|d| of_sinks(&d.sinks.all)).collect();
        let on_device: Vec<f64> = aisle.devices.iter().map(|d| of_sinks(&d.sinks.all)).collect();
        let rectifiers = aisle.rectifiers.iter().map(|d| (d.part.part.id, d.bound.any));
        let devices = aisle.devices.iter().map(|d| (d.stage.device.part.id, d.bound.any));
        self.floors = Floors {
            changes: Some(self.ledger.changes()),
            rectifiers: least(&mut rectifiers.filter_map(|(part, any)| open(part, any))),
            devices: least(&mut devices.filter_map(|(part, any)| open(part, any))),
            sinks: least(&mut on_rectifier.iter().chain(&on_device).copied()),
            on_rectifier,
            on_device,
        };
    }
}
