//! Owns a feed: the parts of one section with the devices behind it, complete with sinks.

use super::plan::Outlet;
use super::reach::{Group, loads};
use crate::audit::{Corner, Known, Raw, Site, Stage};
use crate::build::pieces_of_rectifier;
use crate::catalogue::{Part, PassDevice, Rectifier, Reservoir, Sink};
use crate::supply::Path;
use crate::units::Money;

/// A choice for one outlet of a plan that meets every limit of its own; what the sections of a plan must meet together
/// is for the audit to say.
#[derive(Debug, Clone)]
pub struct Feed<'c> {
    /// Rectifier.
    pub rectifier: &'c Rectifier,
    /// Its pieces: none on the negative half of a dual pair.
    pub rectifier_pieces: u64,
    /// Its sink.
    pub rectifier_sink: Option<&'c Sink>,
    /// Capacitor.
    pub reservoir: &'c Reservoir,
    /// Capacitors in parallel.
    pub cans: u32,
    /// Device and its sink by rail.
    pub devices: Vec<(&'c PassDevice, Option<&'c Sink>)>,
    /// Winding, rectifier and reservoir.
    pub section_w: f64,
    /// Pass devices by rail.
    pub pass_w: Vec<f64>,
    /// Apparent power of its windings.
    pub va: f64,
    /// Least cost that it can have in any build, the transformer aside.
    pub floor_cost: Money,
    /// Whether it holds with the transformer to itself; otherwise its ripple at the low corner may hold beside others.
    pub holds_alone: bool,
    /// In how many places it differs from the build to stay close to, those of the plan aside.
    pub changes: usize,
}

impl<'c> Feed<'c> {
    /// Pieces of a rectifier on an outlet; none on the negative half of a dual pair.
    #[must_use]
    pub(super) fn pieces(rectifier: &Rectifier, path: Path, holds_secondaries: bool) -> u64 {
        if holds_secondaries {
            pieces_of_rectifier(rectifier.kind, path)
        } else {
            0
        }
    }

    /// Whether it can hold at the low corner beside what the plan's other sections draw at least. More of it lowers the
    /// valley (see `Solved`), so what fails here stays so; the rest is for the audit of the whole plan.
    #[must_use]
    pub fn holds_beside(&self, site: &Site, groups: &[Group], outlet: &Outlet) -> bool {
        if outlet.others_va <= 0.0 {
            return self.holds_alone;
        }
        let source = &groups[outlet.group].sources[outlet.source];
        let raw = Raw {
            transformer: source.transformer,
            hookup: &source.hookup,
            path: source.path,
            rectifier: self.rectifier,
            reservoir: self.reservoir,
            cans: self.cans,
        };
        let stages = || {
            let rails = outlet.rails.iter().map(|&rail| &site.supply.rails[rail]);
            rails
                .zip(&self.devices)
                .map(|(rail, &(device, _))| Stage::new(rail, device))
        };
        let load_a: Known<f64> = stages().try_fold(0.0, |sum, stage| Ok(sum + stage.load_a()?));
        let Ok(load_a) = load_a else { return false };
        let all = loads(raw.hookup, load_a, outlet.others_va);
        let at = |corner| raw.wave(site, corner, Ok(load_a), Ok(&all));
        let Ok(low) = at(Corner::Low) else { return false };
        let holds = |stage: Stage| {
            site.holds(stage.headroom(site, Ok(&low)))
                && site.holds(stage.ride_through(site, &raw, Ok(load_a), Ok(&low)))
        };
        if !stages().all(holds) {
            return false;
        }
        if stages().all(|stage| stage.rail.ripple_v.is_none() && stage.rail.accuracy.is_none()) {
            return true;
        }
        let (Ok(high), Ok(worn)) = (at(Corner::High), at(Corner::Worn)) else {
            return false;
        };
        stages().all(|stage| {
            let ripple = stage.ripple(Ok(&low), Ok(&high), Ok(&worn));
            // The ripple at the low corner itself has no sign.
            (site.holds(ripple) || ripple.is_some_and(|c| c.corner == Some(Corner::Low)))
                && site.holds(stage.accuracy(Ok(&low), Ok(&high)))
        })
    }

    /// Its heat.
    #[must_use]
    pub fn heat_w(&self) -> f64 {
        self.section_w + self.pass_w.iter().sum::<f64>()
    }

    /// Price of the fitted values of its devices.
    #[must_use]
    pub fn fitted(&self) -> Money {
        self.devices.iter().map(|(device, _)| device.fitted_price).sum()
    }

    /// Its parts with their pieces, in slot order, each part once.
    #[must_use]
    pub fn lines(&self) -> Vec<(&'c Part, u64)> {
        let mut lines: Vec<(&'c Part, u64)> = vec![(&self.reservoir.part, u64::from(self.cans))];
        let sinks = self.devices.iter().filter_map(|&(_, sink)| sink);
        let singles = (self.devices.iter().map(|(device, _)| &device.part))
            .chain(self.rectifier_sink.into_iter().chain(sinks).map(|sink| &sink.part))
            .map(|part| (part, 1));
        for (part, pieces) in std::iter::once((&self.rectifier.part, self.rectifier_pieces)).chain(singles) {
            match lines.iter_mut().find(|(known, _)| known.id == part.id) {
                Some((_, count)) => *count += pieces,
                None if pieces > 0 => lines.push((part, pieces)),
                None => {}
            }
        }
        lines.sort_by_key(|(part, _)| part.id);
        lines
    }
}
