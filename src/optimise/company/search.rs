//! Owns the search for best companies: combinations of one rail, the most promising first, until none that is left can
//! better any of its parts.
//!
//! Three kinds of entry share one heap, each with an upper bound on the least tightness of all that may come of it: a
//! source; a bank behind it; a rectifier between the two, which settles the section but for device and sinks. As the
//! bounds fall, most parts are settled early, and what holds only settled parts is never solved.

use std::cmp::Ordering;
use std::collections::BinaryHeap;
use std::rc::Rc;

use super::aisle::Aisle;
use super::bound::{Bound, Losses};
use super::cooling::Cooling;
use super::ledger::Ledger;
use super::outlook::{Enclosure, Fed, Outlooks};
use super::worth::{Floors, Spot};
use crate::audit::{Check, whole};
use crate::catalogue::PartId;
use crate::screen::Stop;
use crate::units::Money;

/// Looks at the clock every so many entries.
const STOP_STEPS: u32 = 32;

#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
enum Entry {
    /// By place in the aisle.
    Source(usize),
    /// By place in [`Search::fed`].
    Fed(usize),
    /// The same with a rectifier.
    Section(usize, usize),
    /// The same, its bound looked at more closely.
    Close(usize, usize),
}

/// An entry with its bound. Of equal ones the one nearest to a verdict comes first, since it may settle what the others
/// hold, then that with most room in the limits that are not judged in any case.
#[derive(Debug, Clone, Copy)]
struct Node {
    most: f64,
    room: f64,
    entry: Entry,
}

impl Ord for Node {
    fn cmp(&self, other: &Node) -> Ordering {
        let steps = |entry: Entry| match entry {
            Entry::Source(_) => 0,
            Entry::Fed(_) => 1,
            Entry::Section(..) => 2,
            Entry::Close(..) => 3,
        };
        (self.most.total_cmp(&other.most))
            .then(steps(self.entry).cmp(&steps(other.entry)))
            .then(self.room.total_cmp(&other.room))
            .then(other.entry.cmp(&self.entry))
    }
}

impl PartialOrd for Node {
    fn partial_cmp(&self, other: &Node) -> Option<Ordering> {
        Some(self.cmp(other))
    }
}

impl PartialEq for Node {
    fn eq(&self, other: &Node) -> bool {
        self.cmp(other).is_eq()
    }
}

impl Eq for Node {}

/// The search of one rail.
pub(super) struct Search<'a, 's> {
    pub(super) aisle: &'a Aisle<'s, 's>,
    pub(super) ledger: &'a mut Ledger,
    /// Stands for the rail's best build of all.
    pub(super) rail: PartId,
    pub(super) outlooks: Outlooks<'a, 's>,
    pub(super) cooling: Cooling<'a, 's>,
    pub(super) floors: Floors,
    fed: Vec<Rc<Fed>>,
    heap: BinaryHeap<Node>,
}

impl<'a, 's> Search<'a, 's> {
    pub(super) fn new(aisle: &'a Aisle<'s, 's>, rail: PartId, ledger: &'a mut Ledger) -> Search<'a, 's> {
        let mut search = Search {
            aisle,
            ledger,
            rail,
            outlooks: Outlooks::new(aisle),
            cooling: Cooling::new(aisle),
            floors: Floors::default(),
            fed: Vec::new(),
            heap: BinaryHeap::new(),
        };
        for (place, source) in aisle.sources.iter().enumerate() {
            search.push(source.bound, Check::collapse(None).tightness(), Entry::Source(place));
        }
        search
    }

    /// Runs to the end, or until stopped: the most that what was not looked at can reach (minus infinity: nothing).
    pub(super) fn run(mut self, stop: &Stop) -> f64 {
        let mut steps = 0_u32;
        while let Some(&node) = self.heap.peek() {
            if steps.is_multiple_of(STOP_STEPS) && stop.now() {
                return node.most;
            }
            steps = steps.wrapping_add(1);
            self.heap.pop();
            self.lower_floors();
            match node.entry {
                Entry::Source(source) => self.open_source(source),
                Entry::Fed(fed) => self.open_fed(fed),
                Entry::Section(fed, rectifier) => self.look_closer(fed, rectifier),
                Entry::Close(fed, rectifier) => {
                    let fed = Rc::clone(&self.fed[fed]);
                    self.settle_section(&fed, rectifier);
                }
            }
        }
        f64::NEG_INFINITY
    }

    fn push(&mut self, bound: Bound, collapse: f64, entry: Entry) {
        self.heap.push(Node {
            most: bound.least(collapse),
            room: bound.held,
            entry,
        });
    }

    /// Lists the banks behind a source.
    fn open_source(&mut self, place: usize) {
        let aisle = self.aisle;
        let transformer = &aisle.sources[place].transformer.part;
        let others = self.floors.rectifiers.min(self.floors.devices).min(self.floors.sinks);
        let need = others.min(self.need(&[transformer.id, self.rail]));
        let cheapest = (0..aisle.rectifiers.len())
            .filter_map(|r| {
                let pieces = aisle.pieces(place, r);
                (pieces > 0).then(|| aisle.price(&aisle.rectifiers[r].part.part, pieces))
            })
            .min()
            .unwrap_or(Money(0));
        let base = aisle.price(transformer, 1) + cheapest + aisle.device_price;
        for (bank, part) in aisle.banks.iter().enumerate() {
            let need = need.min(self.ledger.need(part.can.part.id));
            let cost = whole::cost(aisle.site.supply, base + part.price);
            let bound = aisle.fed_by(place, bank).any(cost);
            if bound.least(Check::collapse(None).tightness()) <= need {
                continue;
            }
            let fed = self.outlooks.fed(place, bank, bound);
            let outlook = self.outlooks.with_any(&fed);
            let bounds = (0..aisle.devices.len()).map(|device| self.outlooks.behind(&fed, &outlook, device).0);
            let collapse = fed.enclosure.collapse;
            if let Some(bound) = highest(bounds, collapse).filter(|b| b.least(collapse) > need) {
                self.push(bound, collapse, Entry::Fed(self.fed.len()));
                self.fed.push(Rc::new(fed));
            }
        }
    }

    /// Lists the rectifiers between a source and a bank.
    fn open_fed(&mut self, place: usize) {
        let fed = Rc::clone(&self.fed[place]);
        let collapse = fed.enclosure.collapse;
        let any = self.outlooks.with_any(&fed);
        let behind: Vec<Bound> = (0..self.aisle.devices.len())
            .map(|device| {
                let (bound, losses) = self.outlooks.behind(&fed, &any, device);
                let held = bound.held.min(self.cooling.best(device, losses.pass_w));
                Bound { held, ..bound }
            })
            .collect();
        for rectifier in 0..self.aisle.rectifiers.len() {
            if self.aisle.pieces(fed.source, rectifier) == 0 {
                continue;
            }
            let need = self.need(&self.parts(&fed, rectifier));
            let section = self.section_bound(&fed, rectifier);
            if section.least(collapse) <= need.min(self.floors.devices).min(self.floors.sinks) {
                continue;
            }
            let bounds = behind.iter().enumerate().filter_map(|(device, &behind)| {
                let bound = section.and(behind);
                (bound.least(collapse) > self.need_behind(rectifier, device, need)).then_some(bound)
            });
            if let Some(bound) = highest(bounds, collapse) {
                self.push(bound, collapse, Entry::Section(place, rectifier));
            }
        }
    }

    /// Lowers the bound of a section by what its rectifier shows before anything of it is solved.
    fn look_closer(&mut self, place: usize, rectifier: usize) {
        let fed = Rc::clone(&self.fed[place]);
        let section = self.section_bound(&fed, rectifier);
        let need = self.need(&self.parts(&fed, rectifier));
        if section.least(fed.enclosure.collapse) <= need.min(self.floors.devices).min(self.floors.sinks) {
            return;
        }
        let spot = self.spot(&fed, rectifier, None);
        let mut hopeful: Vec<(Bound, Losses, usize)> = (0..self.aisle.devices.len())
            .map(|device| {
                let (bound, losses) = self.outlooks.behind(&fed, &spot.outlook, device);
                (bound, losses, device)
            })
            .filter(|&(bound, _, device)| spot.least(bound) > self.need_behind(rectifier, device, need))
            .collect();
        hopeful.sort_by(|a, b| spot.least(b.0).total_cmp(&spot.least(a.0)));
        let mut most: Option<Bound> = None;
        for (bound, losses, device) in hopeful {
            if most.is_some_and(|most| spot.least(most) >= spot.least(bound)) {
                break;
            }
            let wanted = self.wanted(&spot, device, bound, losses);
            most = highest(most.into_iter().chain(wanted), spot.outlook.enclosure.collapse);
        }
        if let Some(most) = most {
            self.push(most, fed.enclosure.collapse, Entry::Close(place, rectifier));
        }
    }

    /// A section to look at; `own`: what encloses just its sections.
    pub(super) fn spot<'f>(&self, fed: &'f Fed, rectifier: usize, own: Option<&'f Enclosure>) -> Spot<'f> {
        let section = self.section_bound(fed, rectifier);
        let mut spot = Spot {
            fed,
            rectifier,
            outlook: self.outlooks.with(fed, rectifier, section, own),
        };
        spot.outlook.bound = self.coolest(&spot, spot.outlook.bound, spot.outlook.package_w);
        spot
    }

    /// What source, bank and rectifier leave by themselves.
    fn section_bound(&self, fed: &Fed, rectifier: usize) -> Bound {
        let aisle = self.aisle;
        let cost = aisle.section_price(fed.source, fed.bank, rectifier) + aisle.device_price;
        fed.bound
            .and(aisle.behind(fed.source, rectifier))
            .any(whole::cost(aisle.site.supply, cost))
    }
}

fn highest(bounds: impl Iterator<Item = Bound>, collapse: f64) -> Option<Bound> {
    bounds.max_by(|a, b| a.least(collapse).total_cmp(&b.least(collapse)))
}
