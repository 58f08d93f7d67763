//! Owns one raw section under one load: its steady states, solved when asked for, and what they rule out.

use super::Counts;
use super::reach::carries;
use crate::audit::{Check, Corner, Known, NoWave, Raw, SectionHeat, Site, Stage, rectifier, reservoir};
use crate::physics::raw_section::Waveform;
use crate::physics::winding::WindingLoad;

/// Losses of a section with its device at high mains.
pub(super) struct Losses {
    pub(super) section_w: f64,
    pub(super) package_w: f64,
    pub(super) pass_w: f64,
}

/// The steady states of one section under one load, solved when asked for.
pub(super) struct Solved {
    pub(super) load_a: f64,
    waves: [Option<Known<Waveform>>; 3],
    /// Whether transformer, rectifier and cans hold at the high corner.
    holds: Option<bool>,
}

impl Solved {
    pub(super) fn new(load_a: f64) -> Solved {
        Solved {
            load_a,
            waves: [None; 3],
            holds: None,
        }
    }

    /// The waveform at low, high or worn.
    pub(super) fn wave(&mut self, site: &Site, raw: &Raw, corner: Corner, counts: &mut Counts) -> Known<&Waveform> {
        let slot = match corner {
            Corner::Low => 0,
            Corner::High => 1,
            _ => 2,
        };
        if self.waves[slot].is_none() {
            counts.solves += 1;
            let own = [WindingLoad {
                volts_v: raw.hookup.volts_v,
                load_a: self.load_a,
            }];
            self.waves[slot] = Some(
                raw.wave(site, corner, Ok(self.load_a), Ok(&own))
                    .map_err(|why| match why {
                        NoWave::Missing(column) => column,
                        NoWave::Collapse(_) => COLLAPSED,
                    }),
            );
        }
        match &self.waves[slot] {
            Some(Ok(wave)) => Ok(wave),
            Some(Err(column)) => Err(column),
            None => Err(COLLAPSED),
        }
    }

    /// Whether any of these devices, all with at least this load, can still stand behind the section. As the load
    /// rises, the valley falls and the source current rises at every instant: what fails here stays so.
    ///
    /// Proof: let u be the capacitor voltage less ESR I (constant load I). Then C u' = (v_s - drop - u)+/(R + ESR) - I,
    /// so more I lowers u at every instant of the periodic state and raises i = (v_s - drop - u)+/(R + ESR); and the
    /// raw voltage u + ESR i rises with u, so its valley falls. More crest, less R or less drop raise u the same way.
    pub(super) fn hope<'x>(
        &mut self,
        site: &Site,
        raw: &Raw,
        mut stages: impl Iterator<Item = &'x Stage<'x>>,
        counts: &mut Counts,
    ) -> bool {
        let low = self.wave(site, raw, Corner::Low, counts);
        if !stages.any(|stage| stage.headroom(site, low).met()) {
            return false;
        }
        let load_a = self.load_a;
        feeds(raw, load_a, self.wave(site, raw, Corner::High, counts))
    }

    /// Everything but the junctions; the losses if it holds.
    pub(super) fn losses(&mut self, site: &Site, raw: &Raw, stage: &Stage, counts: &mut Counts) -> Option<Losses> {
        let load_a = self.load_a;
        let met = |check: Option<Check>| check.is_none_or(|c| c.met());
        let low = self.wave(site, raw, Corner::Low, counts).copied();
        let low = low.as_ref().map_err(|&column| column);
        if !stage.headroom(site, low).met() || !met(stage.ride_through(site, raw, Ok(load_a), low)) {
            return None;
        }
        let high = self.wave(site, raw, Corner::High, counts).copied();
        let high = high.as_ref().map_err(|&column| column);
        let holds = *self
            .holds
            .get_or_insert_with(|| feeds(raw, load_a, high) && lasts(site, raw, high));
        if !holds || !met(stage.accuracy(low, high)) {
            return None;
        }
        if stage.rail.ripple_v.is_some() {
            let worn = self.wave(site, raw, Corner::Worn, counts);
            if !met(stage.ripple(low, high, worn)) {
                return None;
            }
        }
        Some(Losses {
            section_w: SectionHeat::new(site, raw, Ok(load_a), high).ok()?.sum_w(),
            package_w: rectifier::package_loss_w(site, raw, high).ok()?,
            pass_w: stage.loss_w(high).ok()?,
        })
    }
}

/// Stands for a waveform that does not exist; every limit that needs it then fails.
const COLLAPSED: &str = "collapse";

/// The limits of transformer and rectifier that hang on the source current at the high corner; what fails one fails it
/// at any higher load.
fn feeds(raw: &Raw, load_a: f64, high: Known<&Waveform>) -> bool {
    let rms_a = high.map(Waveform::source_rms_a);
    rectifier::current(raw, high).met() && carries(raw.transformer, raw.hookup, raw.path, rms_a, load_a)
}

/// Whether the cans last at the high corner.
fn lasts(site: &Site, raw: &Raw, high: Known<&Waveform>) -> bool {
    reservoir::wear(site, raw.reservoir, raw.path, reservoir::ripple_a(raw, high))
        .iter()
        .all(Check::met)
}
