//! Owns what one rail alone may be built of, good or bad, with a first bound on how tight each part leaves a build.

use std::rc::Rc;

use super::bound::{Bound, SLACK, Span};
use super::ledger::Company;
use crate::audit::{Corner, Raw, Site, Stage, core_w, rectifier, reservoir, transformer, whole};
use crate::build::{Hookup, device_serves, hookups, pieces_of_rectifier, sink_takes};
use crate::catalogue::{Part, PartId, Rectifier, RectifierKind, Reservoir, Sink, Status, Transformer};
use crate::optimise::Question;
use crate::supply::Path;
use crate::units::Money;

/// A transformer hook-up with a path.
pub(super) struct Source<'c> {
    pub(super) transformer: &'c Transformer,
    pub(super) hookup: Rc<Hookup>,
    pub(super) path: Path,
    pub(super) idle_v: f64,
    pub(super) core_w: f64,
    pub(super) bound: Bound,
    /// By device: what it leaves behind this source, whatever the rest.
    pub(super) behind: Vec<Bound>,
}

/// A rectifier with the sinks that take it.
pub(super) struct Diodes<'c> {
    pub(super) part: &'c Rectifier,
    /// Threshold at the low and the high corner; `None`: no section with it can be solved.
    pub(super) threshold_v: Option<[f64; 2]>,
    pub(super) sinks: Sinks,
    pub(super) bound: Bound,
}

/// n equal capacitors.
pub(super) struct Bank<'c> {
    pub(super) can: &'c Reservoir,
    pub(super) cans: u32,
    pub(super) known: bool,
    pub(super) price: Money,
    pub(super) bound: Bound,
}

/// A device with the sinks that take it.
pub(super) struct Device<'c> {
    pub(super) stage: Stage<'c>,
    pub(super) known: bool,
    pub(super) sinks: Sinks,
    pub(super) price: Money,
    pub(super) bound: Bound,
}

/// Sinks that take a part, by place; free-standing is not among them.
pub(super) struct Sinks {
    pub(super) all: Vec<usize>,
    /// Those that no other betters whatever the loss, coolest first.
    pub(super) best: Vec<usize>,
}

/// A sink.
pub(super) struct Cooler<'c> {
    pub(super) part: &'c Sink,
    /// Limits of its own.
    pub(super) own: Company,
}

impl Sinks {
    fn new(sinks: &[Cooler], case: Option<&str>) -> Sinks {
        let all: Vec<usize> = (0..sinks.len()).filter(|&k| sink_takes(sinks[k].part, case)).collect();
        let ohmic = |k: usize| sinks[k].part.rth_sa_k_w.unwrap_or(f64::INFINITY);
        let betters = |a: usize, b: usize| {
            let (x, y) = (&sinks[a], &sinks[b]);
            let as_good = x.part.rise_k == y.part.rise_k
                && ohmic(a) <= ohmic(b)
                && x.part.rth_cs_k_w <= y.part.rth_cs_k_w
                && x.own.tightness >= y.own.tightness;
            // Of equal ones the first stays.
            as_good && (a < b || ohmic(a) < ohmic(b) || x.part.rth_cs_k_w < y.part.rth_cs_k_w)
        };
        let mut best: Vec<usize> = (all.iter().copied())
            .filter(|&k| !all.iter().any(|&other| other != k && betters(other, k)))
            .collect();
        best.sort_by(|&a, &b| ohmic(a).total_cmp(&ohmic(b)).then(a.cmp(&b)));
        Sinks { all, best }
    }
}

/// All that one rail alone may be built of; every build is one of each (and sinks that fit).
pub(super) struct Aisle<'s, 'c> {
    pub(super) site: &'s Site<'s>,
    pub(super) sources: Vec<Source<'c>>,
    pub(super) rectifiers: Vec<Diodes<'c>>,
    pub(super) banks: Vec<Bank<'c>>,
    /// By load, least first; those that do not state it last.
    pub(super) devices: Vec<Device<'c>>,
    pub(super) sinks: Vec<Cooler<'c>>,
    /// Loads of the devices that state it.
    pub(super) load_a: Option<Span>,
    /// Least price of a device.
    pub(super) device_price: Money,
}

impl<'s, 'c: 's> Aisle<'s, 'c> {
    /// Fills the aisle for a supply of one rail; `None` when it can have no build at all.
    pub(super) fn new(site: &'s Site<'s>, question: &Question<'c>) -> Option<Aisle<'s, 's>> {
        let (supply, catalogue) = (site.supply, question.catalogue);
        let rail = supply.rails.first()?;
        let named: Vec<PartId> = question.with.iter().map(|&(part, _)| part).collect();
        let usable = |part: &Part| {
            let kept = part.status != Status::Withdrawn || named.contains(&part.id);
            kept && !question.without.contains(&part.id)
        };
        let own = |part: &Part, pieces: u64| {
            Bound::NONE
                .any(whole::height(supply, part))
                .any(whole::stock(supply, part, pieces))
        };
        let cost = |part: &Part, pieces: u64| part.unit_price(pieces * supply.builds) * pieces;

        let sinks: Vec<Cooler> = (catalogue.sinks.iter().filter(|s| usable(&s.part)))
            .map(|sink| Cooler {
                part: sink,
                own: Company::OPEN
                    .and_all(whole::height(supply, &sink.part))
                    .and_all(whole::stock(supply, &sink.part, 1)),
            })
            .collect();
        let fitting = |case: Option<&str>| Sinks::new(&sinks, case);

        let mut devices: Vec<Device> = (catalogue.pass_devices.iter())
            .filter(|d| usable(&d.part) && device_serves(d, rail, true))
            .map(|device| {
                let stage = Stage::new(rail, device);
                Device {
                    stage,
                    known: stage.load_a().is_ok(),
                    sinks: fitting(device.case.as_deref()),
                    price: cost(&device.part, 1) + device.fitted_price,
                    bound: own(&device.part, 1).knows(stage.load_a()).held(stage.current()),
                }
            })
            .collect();
        devices.sort_by(|a, b| {
            let load = |d: &Device| d.stage.load_a().unwrap_or(f64::INFINITY);
            load(a)
                .total_cmp(&load(b))
                .then(a.stage.device.part.id.cmp(&b.stage.device.part.id))
        });
        let load_a = Span::over(devices.iter().filter_map(|d| d.stage.load_a().ok()));

        // A pair shares its rectifier with another rail, so it is nothing for a rail alone.
        let paths = || rail.paths.iter().copied().filter(|&path| path != Path::Dual);
        let rectifiers: Vec<Diodes> = (catalogue.rectifiers.iter().filter(|r| usable(&r.part)))
            .filter_map(|rectifier| {
                let pieces = paths().map(|path| pieces_of_rectifier(rectifier.kind, path));
                let pieces = pieces.filter(|&n| n > 0).min()?;
                let module = rectifier.kind == RectifierKind::Bridge;
                let forward = [Corner::Low, Corner::High].map(|corner| site.forward(rectifier, corner));
                let [low, high] = forward.map(|known| known.map(|(threshold_v, _)| threshold_v));
                Some(Diodes {
                    part: rectifier,
                    threshold_v: low.ok().zip(high.ok()).map(|(low, high)| [low, high]),
                    sinks: fitting(rectifier.case.as_deref().filter(|_| module)),
                    bound: own(&rectifier.part, pieces).knows(high),
                })
            })
            .collect();
        let banks: Vec<Bank> = (catalogue.reservoirs.iter().filter(|c| usable(&c.part)))
            .flat_map(|can| (1..=supply.caps.cans).map(move |cans| (can, cans)))
            .map(|(can, cans)| {
                let esr = site.can_esr_ohm(can, Corner::High);
                Bank {
                    can,
                    cans,
                    known: esr.is_ok(),
                    price: cost(&can.part, u64::from(cans)),
                    bound: own(&can.part, u64::from(cans)).knows(esr),
                }
            })
            .collect();

        let least_rms_a = load_a.map(|span| span.least * (1.0 - SLACK));
        let mut sources = Vec::new();
        for transformer in catalogue.transformers.iter().filter(|t| usable(&t.part)) {
            let by_itself = transformer::by_itself(site, transformer);
            let own = by_itself.into_iter().fold(own(&transformer.part, 1), Bound::any);
            for hookup in hookups(transformer).into_iter().map(Rc::new) {
                for path in paths().filter(|&path| hookup.kind.takes(path)) {
                    let mut bound = own;
                    if let Some(rms_a) = least_rms_a {
                        // The source's mean current is the load's, and rms is never below the mean.
                        bound = bound
                            .held(transformer::current(&hookup, path, Ok(rms_a)))
                            .held(transformer::load(
                                transformer,
                                Ok(transformer::section_va(&hookup, path, rms_a)),
                            ))
                            .held(transformer::bias(transformer, &hookup, path, Ok(rms_a)));
                    }
                    let idle_v = site.idle_v(transformer, &hookup);
                    let behind = |device: &Device| {
                        let mut bound = device.bound;
                        device.stage.input(idle_v, |check| bound = bound.held(check));
                        bound
                    };
                    sources.push(Source {
                        transformer,
                        hookup: Rc::clone(&hookup),
                        path,
                        idle_v,
                        core_w: core_w(site, transformer),
                        bound,
                        behind: devices.iter().map(behind).collect(),
                    });
                }
            }
        }
        let device_price = devices.iter().map(|d| d.price).min()?;
        let any = !sources.is_empty() && !rectifiers.is_empty() && !banks.is_empty();
        any.then_some(Aisle {
            site,
            sources,
            rectifiers,
            banks,
            devices,
            sinks,
            load_a,
            device_price,
        })
    }

    /// A section.
    pub(super) fn raw<'r>(&'r self, source: usize, bank: usize, rectifier: &'r Rectifier) -> Raw<'r> {
        let (source, bank) = (&self.sources[source], &self.banks[bank]);
        Raw {
            transformer: source.transformer,
            hookup: &source.hookup,
            path: source.path,
            rectifier,
            reservoir: bank.can,
            cans: bank.cans,
        }
    }

    /// Price of so many pieces in one unit, for the whole run.
    pub(super) fn price(&self, part: &Part, pieces: u64) -> Money {
        part.unit_price(pieces * self.site.supply.builds) * pieces
    }

    /// Price of transformer, bank and rectifiers.
    pub(super) fn section_price(&self, source: usize, bank: usize, rectifier: usize) -> Money {
        self.price(&self.sources[source].transformer.part, 1)
            + self.price(&self.rectifiers[rectifier].part.part, self.pieces(source, rectifier))
            + self.banks[bank].price
    }

    /// Pieces of a rectifier behind a source; 0: it does not serve its path.
    pub(super) fn pieces(&self, source: usize, rectifier: usize) -> u64 {
        pieces_of_rectifier(self.rectifiers[rectifier].part.kind, self.sources[source].path)
    }

    /// What a rectifier leaves behind a source, whatever the rest.
    pub(super) fn behind(&self, source: usize, rectifier: usize) -> Bound {
        let (source, diodes) = (&self.sources[source], &self.rectifiers[rectifier]);
        let pieces = pieces_of_rectifier(diodes.part.kind, source.path);
        diodes
            .bound
            .any(whole::stock(self.site.supply, &diodes.part.part, pieces))
            .held(rectifier::reverse_voltage(
                self.site,
                diodes.part,
                source.path,
                source.idle_v,
            ))
    }

    /// What a bank leaves behind a source, whatever the rest.
    pub(super) fn fed_by(&self, source: usize, bank: usize) -> Bound {
        let (source, bank) = (&self.sources[source], &self.banks[bank]);
        let wear = reservoir::wear(self.site, bank.can, source.path, Ok(0.0));
        wear.into_iter()
            .fold(source.bound.and(bank.bound), Bound::held)
            .held(reservoir::voltage(self.site, bank.can, source.idle_v))
    }
}
