//! Owns a feed: the parts of one section with the devices behind it, complete with sinks.

use super::plan::Outlet;
use super::reach::{Group, loads};
use crate::audit::{Corner, Raw, Site, Stage};
use crate::build::pieces_of_rectifier;
use crate::catalogue::{Part, PassDevice, Rectifier, Reservoir, Sink};
use crate::physics::raw_section::Waveform;
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
    /// Load of its section.
    pub load_a: f64,
    /// Whether it holds with the transformer to itself; otherwise its ripple at the low corner may hold beside others.
    pub holds_alone: bool,
    /// In how many places it differs from the build to stay close to, those of the plan aside.
    pub changes: usize,
    /// Tells apart what is alike but for sinks, among the feeds of one source.
    pub stack: usize,
}

/// A feed's section beside others on its transformer.
struct Beside<'a, 'c> {
    site: &'a Site<'c>,
    raw: Raw<'a>,
    stages: Vec<Stage<'a>>,
    load_a: f64,
}

impl<'a, 'c> Beside<'a, 'c> {
    fn new(feed: &Feed<'a>, site: &'a Site<'c>, groups: &'a [Group<'c>], outlet: &Outlet) -> Self {
        let source = &groups[outlet.group].sources[outlet.source];
        let rails = outlet.rails.iter().map(|&rail| &site.supply.rails[rail]);
        Beside {
            site,
            raw: Raw {
                transformer: source.transformer,
                hookup: &source.hookup,
                path: source.path,
                rectifier: feed.rectifier,
                reservoir: feed.reservoir,
                cans: feed.cans,
            },
            stages: rails
                .zip(&feed.devices)
                .map(|(rail, &(device, _))| Stage::new(rail, device))
                .collect(),
            load_a: feed.load_a,
        }
    }

    /// At low, high and worn, with so much drawn by the others.
    fn waves(&self, others_va: f64) -> Option<[Waveform; 3]> {
        let all = loads(self.raw.hookup, self.load_a, others_va);
        let at = |corner| self.raw.wave(self.site, corner, Ok(self.load_a), Ok(&all)).ok();
        Some([at(Corner::Low)?, at(Corner::High)?, at(Corner::Worn)?])
    }

    /// Headroom, dip and accuracy.
    fn supplied(&self, stage: &Stage, waves: &[Waveform; 3]) -> bool {
        let site = self.site;
        site.holds(stage.headroom(site, Ok(&waves[0])))
            && site.holds(stage.ride_through(site, &self.raw, Ok(self.load_a), Ok(&waves[0])))
            && site.holds(stage.accuracy(Ok(&waves[0]), Ok(&waves[1])))
    }
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
    /// raw voltage at every instant (see `Solved`), so what fails here stays so; the rest is for the audit of the plan.
    #[must_use]
    pub fn may_hold(&self, site: &Site, groups: &[Group], outlet: &Outlet) -> bool {
        if outlet.others_va <= 0.0 {
            return self.holds_alone;
        }
        let section = Beside::new(self, site, groups, outlet);
        let Some(waves) = section.waves(outlet.others_va) else {
            return false;
        };
        section.stages.iter().all(|stage| {
            let ripple = stage.ripple(Ok(&waves[0]), Ok(&waves[1]), Ok(&waves[2]));
            // The ripple at the low corner itself has no sign.
            let no_sign = ripple.is_some_and(|c| c.corner == Some(Corner::Low));
            section.supplied(stage, &waves) && (no_sign || site.holds(ripple))
        })
    }

    /// Whether it holds at the low corner whatever the plan's other sections draw: with the lowest voltage that they leave,
    /// and with all ripple between the highest crest and the lowest valley.
    #[must_use]
    pub fn surely_holds(&self, site: &Site, groups: &[Group], outlet: &Outlet) -> bool {
        let section = Beside::new(self, site, groups, outlet);
        let (Some(kind), Some(hard)) = (section.waves(outlet.others_va), section.waves(outlet.others_most_va)) else {
            return false;
        };
        section.stages.iter().all(|stage| {
            let ripple = stage.ripple_within(Ok(&hard[0]), kind[0].peak_v(), Ok(&hard[1]), Ok(&hard[2]));
            section.supplied(stage, &hard) && site.holds(ripple)
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
