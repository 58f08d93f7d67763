//! Owns the bounds on raw sections that are not solved yet.
//!
//! With u = v + drop the circuit is C du_C/dt = i - I_L, i = (v_s - u_C + ESR I_L)+/(R + ESR), u = u_C + ESR (i - I_L):
//! it knows no drop. So a rectifier's threshold shifts the raw voltage and leaves the currents as they are.
//! - u falls at every instant with R and with the load, since the right side does and trajectories keep their order; so
//!   valley and mean fall, the source current rises with the load, and a section collapses if a kinder one does.
//! - The rms source current falls with R. Let g = -du/dR: while current flows (R + ESR) C dg/dt = i - g, else g rests,
//!   and di/dR = -(i - g)/(R + ESR). Then d/dR of half the integral of i^2 is -1/(R + ESR) times the integral of
//!   i (i - g) = (i - g)^2 + (R + ESR) C g dg/dt, and the last term adds up to nothing over a period.
//! - The rms current of the bank rises with the load. Its square is mean(i^2) - I_L^2; with h = di/dI_L, half its slope
//!   is mean(i h) - I_L. While current flows (R + ESR) C dh/dt = 1 - h, and what the bank lost meanwhile makes h fall
//!   over the pulse, so h >= 1 there and mean(i h) >= mean(i) = I_L.
//!
//! So with any rectifier and load a section lies between a few that are solved once for a source and a bank.

use std::collections::BTreeMap;

use super::aisle::Aisle;
use super::bound::{Bound, End, Losses, SLACK, Span};
use crate::audit::{Check, Corner, Limit, Raw, SectionHeat, rectifier, reservoir, transformer, whole};
use crate::build::{diodes_in_path, pieces_of_rectifier};
use crate::catalogue::{Forward, Rectifier};
use crate::physics::raw_section::{RawSection, Waveform, steady_state};
use crate::physics::winding::WindingLoad;
use crate::supply::Path;

/// Threshold and slope of the rectifiers that serve a path, at the low and the high corner.
type Forwards = [[Span; 2]; 2];

/// Between which solved sections all sections of some source, bank and rectifiers lie.
pub(super) struct Enclosure {
    /// Tightness of a collapsed build; minus infinity when none of them collapses.
    pub(super) collapse: f64,
    /// Whether every section that can be solved collapses.
    pub(super) collapses: bool,
    ends: Option<Ends>,
}

struct Ends {
    /// Most valley at the low corner, above the drop.
    valley_v: f64,
    /// By device the least dissipation at the high corner, and the drop that it was solved for.
    loss_w: Option<(Vec<f64>, f64)>,
    /// Least rms currents at the high corner.
    calm: Option<Waveform>,
}

/// A bank behind a source, with any rectifier.
pub(super) struct Fed {
    pub(super) source: usize,
    pub(super) bank: usize,
    /// What both leave, whatever rectifier, device and sinks.
    pub(super) bound: Bound,
    pub(super) enclosure: Enclosure,
}

/// What is known of a section, with any rectifier or one, before it is solved.
#[derive(Clone, Copy)]
pub(super) struct Outlook<'e> {
    pub(super) enclosure: &'e Enclosure,
    pub(super) bound: Bound,
    pub(super) package_w: f64,
    /// Drop of the diodes at the low and the high corner, if it is known.
    drop_v: Option<[f64; 2]>,
    /// Iron and section.
    heat_w: f64,
}

/// Makes [`Outlook`]s.
pub(super) struct Outlooks<'a, 's> {
    aisle: &'a Aisle<'s, 's>,
    forwards: BTreeMap<Path, Forwards>,
    /// Any rectifier, without threshold and slope.
    bare: Rectifier,
}

impl<'a, 's> Outlooks<'a, 's> {
    pub(super) fn new(aisle: &'a Aisle<'s, 's>) -> Outlooks<'a, 's> {
        let of = |path| {
            let serving = aisle.rectifiers.iter().map(|d| d.part);
            forwards(aisle, serving.filter(|r| pieces_of_rectifier(r.kind, path) > 0))
        };
        let bare = Forward::Line {
            threshold_v: 0.0,
            slope_ohm: 0.0,
        };
        Outlooks {
            aisle,
            forwards: (Path::ALL.into_iter())
                .filter_map(|path| Some((path, of(path)?)))
                .collect(),
            bare: Rectifier {
                forward: Ok(bare),
                ..aisle.rectifiers[0].part.clone()
            },
        }
    }

    /// All sections with that bank behind that source; `bound` is what both leave by themselves.
    pub(super) fn fed(&self, source: usize, bank: usize, bound: Bound) -> Fed {
        let raw = self.aisle.raw(source, bank, &self.bare);
        let enclosure = self.enclosure(&raw, self.forwards.get(&raw.path), false);
        Fed {
            source,
            bank,
            bound: bound.and(self.carried(&raw, &enclosure)),
            enclosure,
        }
    }

    /// All sections with that rectifier, which differ in the load alone.
    pub(super) fn section(&self, fed: &Fed, rectifier: usize) -> Enclosure {
        let raw = self.aisle.raw(fed.source, fed.bank, &self.bare);
        let part = self.aisle.rectifiers[rectifier].part;
        let stands = fed.enclosure.collapse == f64::NEG_INFINITY;
        self.enclosure(&raw, forwards(self.aisle, std::iter::once(part)).as_ref(), stands)
    }

    /// Solves the ends; `raw` has no threshold and slope of its own, and `stands`: none is known to collapse.
    fn enclosure(&self, raw: &Raw, forwards: Option<&Forwards>, stands: bool) -> Enclosure {
        let mut enclosure = Enclosure {
            collapse: Check::collapse(None).tightness(),
            collapses: false,
            ends: None,
        };
        let Some((forwards, load_a)) = forwards.zip(self.aisle.load_a) else {
            return enclosure;
        };
        let diodes = diodes_in_path(raw.path);
        let solve = |corner, load_a, slope: End| {
            let own = [WindingLoad {
                volts_v: raw.hookup.volts_v,
                load_a,
            }];
            let bare = raw.circuit(self.aisle.site, corner, Ok(load_a), Ok(&own)).ok()?;
            let [threshold_v, slope_ohm] = forwards[usize::from(corner != Corner::Low)];
            let section = RawSection {
                series_ohm: bare.series_ohm + diodes * slope_ohm.at(slope),
                drop_v: diodes * threshold_v.least,
                ..bare
            };
            let more_v = diodes * (threshold_v.most - threshold_v.least);
            Some((steady_state(&section), section.drop_v, more_v))
        };
        let Some((kind, drop_v, _)) = solve(Corner::Low, load_a.least, End::Least) else {
            return enclosure;
        };
        let Some(kind) = kind else {
            enclosure.collapses = true;
            return enclosure;
        };
        let hard = |corner| {
            let (wave, drop_v, more_v) = solve(corner, load_a.most, End::Most)?;
            wave.map(|wave| (wave, drop_v, wave.valley_v() * (1.0 - SLACK) - SLACK > more_v))
        };
        let hard_high = hard(Corner::High);
        let holds = |hard: &Option<(_, _, bool)>| hard.as_ref().is_some_and(|&(_, _, holds)| holds);
        // At worn the source is stronger than at low, on the same bank.
        if stands || (holds(&hard_high) && holds(&hard(Corner::Low))) {
            enclosure.collapse = f64::NEG_INFINITY;
        }
        enclosure.ends = Some(Ends {
            valley_v: kind.valley_v() + drop_v,
            loss_w: hard_high.map(|(wave, drop_v, _)| {
                let loss_w = self.aisle.devices.iter().map(|device| device.stage.loss_w(Ok(&wave)));
                (loss_w.map(|w| w.unwrap_or(f64::NEG_INFINITY)).collect(), drop_v)
            }),
            calm: solve(Corner::High, load_a.least, End::Most).and_then(|(wave, _, _)| wave),
        });
        enclosure
    }

    /// What the least rms currents leave of transformer and bank.
    fn carried(&self, raw: &Raw, enclosure: &Enclosure) -> Bound {
        if enclosure.collapses {
            return Bound::NONE.held(Check::collapse(None));
        }
        let Some(calm) = enclosure.calm() else {
            return Bound::NONE;
        };
        let rms_a = calm.source_rms_a() * (1.0 - SLACK);
        let ripple_a = reservoir::ripple_a(raw, Ok(calm)).map(|a| a * (1.0 - SLACK));
        let va = transformer::section_va(raw.hookup, raw.path, rms_a);
        (reservoir::wear(self.aisle.site, raw.reservoir, raw.path, ripple_a).into_iter())
            .fold(Bound::NONE, Bound::held)
            .held(transformer::current(raw.hookup, raw.path, Ok(rms_a)))
            .held(transformer::load(raw.transformer, Ok(va)))
    }

    /// Whatever the rectifier.
    pub(super) fn with_any<'e>(&self, fed: &'e Fed) -> Outlook<'e> {
        let source = &self.aisle.sources[fed.source];
        Outlook {
            enclosure: &fed.enclosure,
            bound: fed.bound,
            package_w: f64::NEG_INFINITY,
            // Least drop for the valley, most for the loss.
            drop_v: (self.forwards.get(&source.path))
                .map(|[low, high]| [low[0].least, high[0].most].map(|v| diodes_in_path(source.path) * v)),
            heat_w: source.core_w,
        }
    }

    /// With a rectifier; `bound` is what it leaves with source and bank, `own` what encloses just its sections.
    pub(super) fn with<'e>(
        &self,
        fed: &'e Fed,
        rectifier: usize,
        bound: Bound,
        own: Option<&'e Enclosure>,
    ) -> Outlook<'e> {
        let aisle = self.aisle;
        let source = &aisle.sources[fed.source];
        let diodes = &aisle.rectifiers[rectifier];
        let raw = aisle.raw(fed.source, fed.bank, diodes.part);
        let enclosure = own.unwrap_or(&fed.enclosure);
        let carried = own.map_or(Bound::NONE, |own| self.carried(&raw, own));
        let mut outlook = Outlook {
            enclosure,
            bound: bound.and(carried).held(rectifier::surge(aisle.site, &raw)),
            package_w: f64::NEG_INFINITY,
            drop_v: diodes.threshold_v.map(|v| v.map(|v| diodes_in_path(source.path) * v)),
            heat_w: source.core_w,
        };
        if let Some((wave, load_a)) = enclosure.calm().zip(aisle.load_a) {
            let current = rectifier::current(&raw, Ok(wave)).tightness() + SLACK;
            outlook.bound.held = outlook.bound.held.min(current);
            if let Ok(package_w) = rectifier::package_loss_w(aisle.site, &raw, Ok(wave)) {
                outlook.package_w = package_w * (1.0 - SLACK);
            }
            if aisle.site.supply.caps.heat_w.is_some()
                && let Ok(heat) = SectionHeat::new(aisle.site, &raw, Ok(load_a.least), Ok(wave))
            {
                outlook.heat_w += heat.sum_w() * (1.0 - SLACK);
            }
        }
        outlook
    }

    /// With a device behind it; and the least losses.
    pub(super) fn behind(&self, fed: &Fed, outlook: &Outlook, device: usize) -> (Bound, Losses) {
        let (site, stage) = (self.aisle.site, &self.aisle.devices[device].stage);
        let mut bound = outlook.bound.and(self.aisle.sources[fed.source].behind[device]);
        let mut losses = Losses {
            package_w: outlook.package_w,
            pass_w: f64::NEG_INFINITY,
        };
        let Some((ends, [low_v, high_v])) = outlook.enclosure.ends.as_ref().zip(outlook.drop_v) else {
            return (bound, losses);
        };
        let valley_v = ends.valley_v - low_v + SLACK * (1.0 + ends.valley_v);
        let wanted_v = stage.valley_wanted_v(site);
        bound = bound.held(Check::new(Limit::Headroom, Corner::Low, Ok(valley_v), wanted_v));
        if let Some((dip_s, load_a)) = stage.rail.dip_s.zip(self.aisle.load_a) {
            // The dip is rounded up, and no device draws less than the least load.
            let bank = &self.aisle.banks[fed.bank];
            let bank_f = site.can_f(bank.can, Corner::Low) * f64::from(bank.cans);
            let left_v = valley_v - load_a.least * dip_s / bank_f * (1.0 - SLACK);
            bound = bound.held(Check::new(Limit::RideThrough, Corner::Low, Ok(left_v), stage.floor_v));
        }
        if let Some((loss_w, drop_v)) = &ends.loss_w
            && let (loss_w, Ok(load_a)) = (loss_w[device], stage.load_a())
        {
            // Loss rises with the raw voltage by the load current.
            losses.pass_w = loss_w + (drop_v - high_v) * load_a - SLACK * (1.0 + loss_w.abs());
            bound = bound.held(whole::heat(site.supply, Ok(outlook.heat_w + losses.pass_w)));
        }
        (bound, losses)
    }
}

impl Enclosure {
    fn calm(&self) -> Option<&Waveform> {
        self.ends.as_ref().and_then(|ends| ends.calm.as_ref())
    }
}

fn forwards<'r>(aisle: &Aisle, rectifiers: impl Iterator<Item = &'r Rectifier> + Clone) -> Option<Forwards> {
    let at = |corner| {
        let stated = || rectifiers.clone().filter_map(|r| aisle.site.forward(r, corner).ok());
        let threshold_v = Span::over(stated().map(|(threshold_v, _)| threshold_v))?;
        Some([threshold_v, Span::over(stated().map(|(_, slope_ohm)| slope_ohm))?])
    };
    at(Corner::Low).zip(at(Corner::High)).map(|(low, high)| [low, high])
}
