//! Owns one raw section under one load: its steady states, solved when asked for, and what they rule out.

use super::Counts;
use super::reach::{carries, loads};
use crate::audit::{Check, Corner, Known, NoWave, Raw, SectionHeat, Site, Stage, rectifier, reservoir, transformer};
use crate::physics::raw_section::Waveform;

/// Losses of a section with its devices at high mains.
pub(super) struct Losses {
    pub(super) section_w: f64,
    pub(super) package_w: f64,
    /// By rail.
    pub(super) pass_w: Vec<f64>,
    /// The same with the other rails of the section idle; empty for a rail that has the section to itself.
    pub(super) alone_w: Vec<f64>,
    /// Load of the section.
    pub(super) load_a: f64,
    /// Apparent power of its windings.
    pub(super) va: f64,
    /// Whether all holds with the transformer to itself too.
    pub(super) alone_holds: bool,
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
            let all = loads(raw.hookup, self.load_a, 0.0);
            self.waves[slot] = Some(known(raw.wave(site, corner, Ok(self.load_a), Ok(&all))));
        }
        match &self.waves[slot] {
            Some(Ok(wave)) => Ok(wave),
            Some(Err(column)) => Err(column),
            None => Err(COLLAPSED),
        }
    }

    /// Whether transformer and rectifier can carry at least this load. As the load rises, the valley falls and the
    /// source current rises at every instant: what fails here stays so, and so does headroom.
    ///
    /// Proof: let u be the capacitor voltage less ESR I (constant load I). Then C u' = (v_s - drop - u)+/(R + ESR) - I,
    /// so more I lowers u at every instant of the periodic state and raises i = (v_s - drop - u)+/(R + ESR); and the
    /// raw voltage u + ESR i rises with u, so its valley falls. More crest, less R or less drop raise u the same way.
    pub(super) fn feeds(&mut self, site: &Site, raw: &Raw, counts: &mut Counts) -> bool {
        let load_a = self.load_a;
        feeds(site, raw, load_a, self.wave(site, raw, Corner::High, counts))
    }

    /// Everything but the junctions; the losses if it holds. At the low corner the section has its transformer to itself,
    /// which is as kind as it can be: beside others the audit of the whole plan decides.
    pub(super) fn losses(&mut self, site: &Site, raw: &Raw, stages: &[&Stage], counts: &mut Counts) -> Option<Losses> {
        let load_a = self.load_a;
        let low = self.wave(site, raw, Corner::Low, counts).copied();
        let low = low.as_ref().map_err(|&column| column);
        for stage in stages {
            if !site.holds(stage.headroom(site, low)) || !site.holds(stage.ride_through(site, raw, Ok(load_a), low)) {
                return None;
            }
        }
        let high = self.wave(site, raw, Corner::High, counts).copied();
        let high = high.as_ref().map_err(|&column| column);
        let holds = *self
            .holds
            .get_or_insert_with(|| feeds(site, raw, load_a, high) && lasts(site, raw, high));
        if !holds || !stages.iter().all(|stage| site.holds(stage.accuracy(low, high))) {
            return None;
        }
        let mut alone_holds = true;
        if stages.iter().any(|stage| stage.rail.ripple_v.is_some()) {
            let worn = self.wave(site, raw, Corner::Worn, counts);
            for stage in stages {
                let ripple = stage.ripple(low, high, worn);
                if !site.holds(ripple) {
                    // Beside other sections more resistance lowers the valley, but has no sign on the ripple itself.
                    if ripple.is_none_or(|c| c.corner != Some(Corner::Low)) {
                        return None;
                    }
                    alone_holds = false;
                }
            }
        }
        let mut alone_w = Vec::new();
        if stages.len() > 1 {
            for (place, stage) in stages.iter().enumerate() {
                let alone_a: Known<f64> = (stages.iter().enumerate()).try_fold(0.0, |sum, (other, its)| {
                    Ok(sum + if other == place { its.load_a()? } else { its.idle_a()? })
                });
                counts.solves += 1;
                let wave = known(raw.wave(site, Corner::Alone, alone_a, Ok(&[])));
                alone_w.push(stage.loss_w(wave.as_ref().map_err(|&column| column)).ok()?);
            }
        }
        let rms_a = high.map(Waveform::source_rms_a).ok()?;
        Some(Losses {
            section_w: SectionHeat::new(site, raw, Ok(load_a), high).ok()?.sum_w(),
            package_w: rectifier::package_loss_w(site, raw, high).ok()?,
            pass_w: stages
                .iter()
                .map(|stage| stage.loss_w(high).ok())
                .collect::<Option<_>>()?,
            alone_w,
            load_a,
            va: transformer::section_va(raw.hookup, raw.path, rms_a),
            alone_holds,
        })
    }
}

/// Stands for a waveform that does not exist; every limit that needs it then fails.
const COLLAPSED: &str = "collapse";

fn known(wave: Result<Waveform, NoWave>) -> Known<Waveform> {
    wave.map_err(|why| match why {
        NoWave::Missing(column) => column,
        NoWave::Collapse(_) => COLLAPSED,
    })
}

/// The limits of transformer and rectifier that hang on the source current at the high corner; what fails one fails it
/// at any higher load.
fn feeds(site: &Site, raw: &Raw, load_a: f64, high: Known<&Waveform>) -> bool {
    let rms_a = high.map(Waveform::source_rms_a);
    site.holds(rectifier::current(raw, high)) && carries(site, raw.transformer, raw.hookup, raw.path, rms_a, load_a)
}

/// Whether the cans last at the high corner.
fn lasts(site: &Site, raw: &Raw, high: Known<&Waveform>) -> bool {
    let wear: [Check; 3] = reservoir::wear(site, raw.reservoir, raw.path, reservoir::ripple_a(raw, high));
    wear.into_iter().all(|check| site.holds(check))
}
