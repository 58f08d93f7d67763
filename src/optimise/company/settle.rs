//! Owns the exact verdict on one section with each of its devices and sinks, by the audit's functions.

use super::bound::{Bound, Losses, SLACK};
use super::ledger::{Choice, Company};
use super::outlook::Fed;
use super::search::Search;
use super::worth::Spot;
use crate::audit::{
    Check, Corner, Known, NoWave, Raw, SectionHeat, Stage, rectifier, reservoir, total_w, transformer, whole,
};
use crate::physics::raw_section::Waveform;
use crate::physics::winding::WindingLoad;

/// What the junctions of a build hang on.
#[derive(Debug, Clone, Copy)]
struct Heating {
    package_w: Known<f64>,
    pass_w: Known<f64>,
}

/// The steady states of a section under one load, solved when asked for.
struct Solved {
    load_a: Known<f64>,
    low: Known<Waveform>,
    /// With the tightest of the section's own limits.
    high: Option<(Known<Waveform>, Company)>,
    worn: Option<Known<Waveform>>,
}

/// The section collapses.
struct Collapses;

impl Search<'_, '_> {
    /// Settles every build of a section that can better one of its parts.
    ///
    /// Devices come by load. A greater load lowers the raw voltage and raises the currents of source and bank (see
    /// `outlook`), so what a lighter one shows bounds the rest, and a section that has collapsed stays so.
    pub(super) fn settle_section(&mut self, fed: &Fed, rectifier: usize) {
        let aisle = self.aisle;
        let diodes = &aisle.rectifiers[rectifier];
        let raw = aisle.raw(fed.source, fed.bank, diodes.part);
        let enclosure = self.outlooks.section(fed, rectifier);
        let spot = self.spot(fed, rectifier, Some(&enclosure));
        let mut collapsed = enclosure.collapses && diodes.threshold_v.is_some() && aisle.banks[fed.bank].known;
        let mut solved: Option<Solved> = None;
        for (place, device) in aisle.devices.iter().enumerate() {
            let stage = &device.stage;
            let need = self.need_behind(rectifier, place, self.need(&self.parts(fed, rectifier)));
            let behind = aisle.sources[fed.source].behind[place];
            if spot.least(spot.outlook.bound.and(behind)) <= need {
                continue;
            }
            let (mut bound, losses) = self.outlooks.behind(fed, &spot.outlook, place);
            if collapsed && device.known {
                bound = bound.held(Check::collapse(None));
            } else if let Some(lighter) = solved.as_ref().filter(|_| device.known) {
                let headroom = stage.headroom(aisle.site, by_ref(&lighter.low)).tightness() + SLACK;
                let section = lighter
                    .high
                    .map_or(f64::INFINITY, |(_, section)| section.tightness + SLACK);
                bound.held = bound.held.min(headroom).min(section);
            }
            if self.wanted(&spot, place, bound, losses).is_none() {
                continue;
            }
            if !(collapsed && device.known) {
                let judged = (self.solve(&raw, stage, &mut solved))
                    .and_then(|solved| self.judge(&spot, place, &raw, bound, solved));
                match judged {
                    Ok(Some((company, heating))) => {
                        self.settle(&spot, place, company, Some(heating));
                        continue;
                    }
                    Ok(None) => continue,
                    Err(Collapses) => collapsed = true,
                }
            }
            let company = self.without_sinks(&spot, place).and(&Check::collapse(None));
            self.settle(&spot, place, company, None);
        }
    }

    /// The limits that are judged whether or not the section collapses, sinks aside.
    fn without_sinks(&self, spot: &Spot, device: usize) -> Company {
        let (aisle, fed) = (self.aisle, spot.fed);
        let supply = aisle.site.supply;
        let (source, bank) = (&aisle.sources[fed.source], &aisle.banks[fed.bank]);
        let (rectifier, device) = (&aisle.rectifiers[spot.rectifier], &aisle.devices[device]);
        let parts = [
            (&source.transformer.part, 1),
            (&rectifier.part.part, aisle.pieces(fed.source, spot.rectifier)),
            (&bank.can.part, u64::from(bank.cans)),
            (&device.stage.device.part, 1),
        ];
        let cost = aisle.section_price(fed.source, fed.bank, spot.rectifier) + device.price;
        let whole = Company::OPEN
            .and_all(whole::cost(supply, cost))
            .and_all(transformer::by_itself(aisle.site, source.transformer));
        parts.into_iter().fold(whole, |company, (part, pieces)| {
            company
                .and_all(whole::height(supply, part))
                .and_all(whole::stock(supply, part, pieces))
        })
    }

    fn solve<'w>(&self, raw: &Raw, stage: &Stage, solved: &'w mut Option<Solved>) -> Result<&'w mut Solved, Collapses> {
        let load_a = stage.load_a();
        if solved.as_ref().is_none_or(|s| s.load_a != load_a) {
            let low = self.wave(raw, Corner::Low, load_a)?;
            *solved = Some(Solved {
                load_a,
                low,
                high: None,
                worn: None,
            });
        }
        solved.as_mut().ok_or(Collapses)
    }

    fn wave(&self, raw: &Raw, corner: Corner, load_a: Known<f64>) -> Result<Known<Waveform>, Collapses> {
        let own = load_a.map(|load_a| {
            [WindingLoad {
                volts_v: raw.hookup.volts_v,
                load_a,
            }]
        });
        let own = own.as_ref().map(<[WindingLoad; 1]>::as_slice).map_err(|&column| column);
        match raw.wave(self.aisle.site, corner, load_a, own) {
            Ok(wave) => Ok(Ok(wave)),
            Err(NoWave::Missing(column)) => Ok(Err(column)),
            Err(NoWave::Collapse(_)) => Err(Collapses),
        }
    }

    /// All limits, sinks aside; `None` as soon as they leave nothing of interest.
    fn judge(
        &self,
        spot: &Spot,
        device: usize,
        raw: &Raw,
        bound: Bound,
        solved: &mut Solved,
    ) -> Result<Option<(Company, Heating)>, Collapses> {
        let site = self.aisle.site;
        let source = &self.aisle.sources[spot.fed.source];
        let stage = &self.aisle.devices[device].stage;
        let need = self.need(&self.parts(spot.fed, spot.rectifier));
        let need = self.need_behind(spot.rectifier, device, need);
        let within = |company: Company| Bound {
            held: bound.held.min(company.tightness),
            ..bound
        };
        let hopeless = |company: Company| spot.least(within(company)) <= need;

        let load_a = solved.load_a;
        let low = by_ref(&solved.low);
        let mut company = (self.without_sinks(spot, device))
            .and(&stage.headroom(site, low))
            .and_all(stage.ride_through(site, raw, load_a, low))
            .and(&stage.current());
        stage.input(source.idle_v, |check| company = company.and(&check));
        if hopeless(company) {
            return Ok(None);
        }

        let (high, section) = match solved.high {
            Some(high) => high,
            None => {
                let high = self.wave(raw, Corner::High, load_a)?;
                let section = self.section(source.idle_v, raw, load_a, by_ref(&high));
                *solved.high.insert((high, section))
            }
        };
        let high = by_ref(&high);
        let heating = Heating {
            package_w: rectifier::package_loss_w(site, raw, high),
            pass_w: stage.loss_w(high),
        };
        let section_w = SectionHeat::new(site, raw, load_a, high).map(|heat| heat.sum_w());
        let heat_w = section_w.and_then(|section_w| {
            let parts_w = [source.core_w, section_w, heating.pass_w?];
            Ok(total_w(parts_w.into_iter()))
        });
        company = company
            .or_tighter(section)
            .and_all(whole::heat(site.supply, heat_w))
            .and_all(stage.accuracy(low, high));
        let losses = Losses {
            package_w: heating.package_w.unwrap_or(f64::NEG_INFINITY),
            pass_w: heating.pass_w.unwrap_or(f64::NEG_INFINITY),
        };
        let cooled = self.coolest(spot, within(company), losses.package_w);
        if self.wanted(spot, device, cooled, losses).is_none() {
            return Ok(None);
        }

        let worn = match solved.worn {
            Some(worn) => worn,
            None => *solved.worn.insert(self.wave(raw, Corner::Worn, load_a)?),
        };
        company = company.and_all(stage.ripple(low, high, by_ref(&worn)));
        Ok((!hopeless(company)).then_some((company, heating)))
    }

    /// The section's own limits.
    fn section(&self, idle_v: f64, raw: &Raw, load_a: Known<f64>, high: Known<&Waveform>) -> Company {
        let site = self.aisle.site;
        let rms_a = high.map(Waveform::source_rms_a);
        let va = rms_a.map(|a| transformer::section_va(raw.hookup, raw.path, a));
        let ripple_a = reservoir::ripple_a(raw, high);
        Company::OPEN
            .and(&transformer::load(raw.transformer, va))
            .and(&transformer::current(raw.hookup, raw.path, rms_a))
            .and_all(transformer::bias(raw.transformer, raw.hookup, raw.path, load_a))
            .and(&rectifier::reverse_voltage(site, raw.rectifier, raw.path, idle_v))
            .and(&rectifier::current(raw, high))
            .and(&rectifier::surge(site, raw))
            .and(&reservoir::voltage(site, raw.reservoir, idle_v))
            .and_all(reservoir::wear(site, raw.reservoir, raw.path, ripple_a))
    }

    /// Offers every choice of sinks that can better a part; `heating`: `None` when the section collapses.
    fn settle(&mut self, spot: &Spot, device: usize, company: Company, heating: Option<Heating>) {
        let (aisle, fed, rectifier) = (self.aisle, spot.fed, spot.rectifier);
        let (site, supply) = (aisle.site, aisle.site.supply);
        let (diodes, behind) = (&aisle.rectifiers[rectifier], &aisle.devices[device]);
        let on = |fitting: &[usize], junction: &dyn Fn(Option<usize>) -> Option<Check>| {
            let places = std::iter::once(None).chain(fitting.iter().map(|&k| Some(k)));
            let own = |sink: Option<usize>| sink.map_or(Company::OPEN, |k| aisle.sinks[k].own);
            let mut all: Vec<_> = places.map(|sink| (sink, own(sink).and_all(junction(sink)))).collect();
            // Best first, so that the rest mostly has nothing to better.
            all.sort_by(|a, b| b.1.tightness.total_cmp(&a.1.tightness));
            all
        };
        let part = |sink: Option<usize>| sink.map(|k| aisle.sinks[k].part);
        let rectifier_sinks = on(&diodes.sinks.all, &|sink| {
            heating.map(|h| rectifier::junction(site, diodes.part, h.package_w, part(sink)))
        });
        let sinks = on(&behind.sinks.all, &|sink| {
            heating.map(|h| behind.stage.junction(site, Corner::High, h.pass_w, part(sink)))
        });
        let cost = aisle.section_price(fed.source, fed.bank, rectifier) + behind.price;
        let [transformer, can, diode, rail] = self.parts(fed, rectifier);
        let parts = [transformer, can, diode, rail, behind.stage.device.part.id];
        let ids = |sink: Option<usize>| sink.map(|k| aisle.sinks[k].part.part.id);
        for &(j, under_rectifier) in &rectifier_sinks {
            for &(k, under_device) in &sinks {
                let build = company.or_tighter(under_rectifier).or_tighter(under_device);
                let used = [j, k].map(ids);
                let need = used
                    .iter()
                    .flatten()
                    .map(|&id| self.ledger.need(id))
                    .fold(self.need(&parts), f64::min);
                if build.tightness <= need {
                    continue;
                }
                let pieces: Vec<(usize, u64)> = match (j, k) {
                    (Some(j), Some(k)) if j == k => vec![(j, 2)],
                    _ => [j, k].into_iter().flatten().map(|k| (k, 1)).collect(),
                };
                let mut cost = cost;
                let mut build = build;
                for &(k, pieces) in &pieces {
                    let sink = &aisle.sinks[k].part.part;
                    cost = cost + aisle.price(sink, pieces);
                    build = build.and_all(whole::stock(supply, sink, pieces));
                }
                build = build.and_all(whole::cost(supply, cost));
                let choice = Choice {
                    source: fed.source,
                    bank: fed.bank,
                    rectifier,
                    device,
                    rectifier_sink: j,
                    sink: k,
                };
                for &id in parts.iter().chain(used.iter().flatten()) {
                    self.ledger.offer(id, build, choice);
                }
            }
        }
        self.lower_floors();
    }
}

fn by_ref(known: &Known<Waveform>) -> Known<&Waveform> {
    known.as_ref().map_err(|&column| column)
}
