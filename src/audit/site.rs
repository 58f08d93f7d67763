//! Owns the corners: what mains, temperature, ageing and load do to a section's circuit.

use std::f64::consts::SQRT_2;

use super::check::{Check, Corner, Known};
use crate::build::{Hookup, diodes_in_path};
use crate::catalogue::{Forward, Junction, Rectifier, Reservoir, Transformer};
use crate::physics::constants::{
    DATASHEET_C, HIGH_FREQUENCY_ESR, HIGH_FREQUENCY_HZ, HIGH_FREQUENCY_RIPPLE, JUNCTION_TC_V_K, POINT_SLOPE_V,
    POINT_SPREAD_V, POINT_TYPICAL_V, SCHOTTKY_TC_V_K,
};
use crate::physics::raw_section::{RawSection, Waveform, steady_state};
use crate::physics::winding::{WindingLoad, copper_ohm, open_circuit_v, series_ohm};
use crate::physics::{diode, reservoir};
use crate::supply::{Path, Supply};

/// A supply with what follows from it alone.
#[derive(Debug, Clone)]
pub struct Site<'s> {
    /// The requirement.
    pub supply: &'s Supply,
    /// Coldest air at the parts.
    pub t_lo_c: f64,
    /// Hottest air at the parts.
    pub t_hi_c: f64,
    /// Factor on capacitance at the end of life and in the cold, tolerance aside.
    aged_c: f64,
    /// Factor on series resistance at the end of life and in the cold.
    aged_esr: f64,
    /// Tightness that every limit must have beside being met; minus infinity: none is asked.
    tightness: f64,
}

impl<'s> Site<'s> {
    /// Works out what every corner shares.
    #[must_use]
    pub fn new(supply: &'s Supply) -> Site<'s> {
        let t_lo_c = supply.ambient.low_c;
        Site {
            supply,
            t_lo_c,
            t_hi_c: supply.ambient.high_c + supply.ambient.inside_rise_k,
            aged_c: (1.0 - supply.ageing.capacitance_loss) * reservoir::cold_capacitance(t_lo_c),
            aged_esr: supply.ageing.esr_rise * reservoir::cold_esr(t_lo_c),
            tightness: f64::NEG_INFINITY,
        }
    }

    /// The same for a search that asks for more than that limits are met.
    #[must_use]
    pub fn with_tightness(self, tightness: f64) -> Site<'s> {
        Site { tightness, ..self }
    }

    /// Whether a limit holds: it is met, as tightly as is asked. What does not apply holds.
    #[must_use]
    pub fn holds(&self, check: impl Into<Option<Check>>) -> bool {
        check
            .into()
            .is_none_or(|check| check.met() && check.tightness() >= self.tightness)
    }

    /// Rated primary voltage in the wiring nearest to the nominal mains, of two the higher.
    #[must_use]
    pub fn primary_v(&self, transformer: &Transformer) -> f64 {
        let off = |v: f64| (v - self.supply.mains.nominal_v).abs();
        // Wirings rise, so `<=` keeps the higher of two equally near ones.
        transformer
            .primary_v
            .iter()
            .copied()
            .reduce(|best, v| if off(v) <= off(best) { v } else { best })
            .unwrap_or(0.0)
    }

    /// Open-circuit voltage of a hook-up, rms of the sine with the crest that the mains has at this corner.
    #[must_use]
    pub fn source_v(&self, transformer: &Transformer, hookup: &Hookup, corner: Corner) -> f64 {
        let mains = &self.supply.mains;
        let (mains_v, tolerance) = match corner {
            Corner::Low => (mains.low_v * (1.0 - mains.flat_top), -transformer.v_tol),
            Corner::Nominal => (mains.nominal_v, 0.0),
            Corner::High | Corner::Alone | Corner::Worn | Corner::Idle | Corner::SwitchOn => {
                (mains.high_v, transformer.v_tol)
            }
        };
        let rated = open_circuit_v(
            hookup.volts_v,
            transformer.regulation,
            mains_v,
            self.primary_v(transformer),
        );
        rated * (1.0 + tolerance)
    }

    /// Raw voltage without load at high mains.
    #[must_use]
    pub fn idle_v(&self, transformer: &Transformer, hookup: &Hookup) -> f64 {
        self.source_v(transformer, hookup, Corner::Idle) * SQRT_2
    }

    /// Series resistance of a hook-up at a corner; `all` are the loads of every section of the transformer.
    #[must_use]
    pub fn winding_ohm(
        &self,
        transformer: &Transformer,
        hookup: &Hookup,
        corner: Corner,
        own_a: f64,
        all: &[WindingLoad],
    ) -> f64 {
        let own = WindingLoad {
            volts_v: hookup.volts_v,
            load_a: own_a,
        };
        let all_va = transformer.secondaries.iter().map(|s| s.volts_v * s.amps_a).sum();
        let with = |loads: &[WindingLoad]| {
            series_ohm(
                transformer.regulation,
                transformer.primary_share,
                all_va,
                own,
                hookup.amps_a,
                loads,
            )
        };
        match corner {
            Corner::Low | Corner::Nominal => with(all),
            Corner::SwitchOn => copper_ohm(with(&[own]), self.t_lo_c, transformer.winding_c),
            _ => copper_ohm(with(&[own]), self.t_hi_c, transformer.winding_c),
        }
    }

    /// Threshold and slope of one diode at a corner.
    ///
    /// # Errors
    /// Names the column that is blank.
    pub fn forward(&self, rectifier: &Rectifier, corner: Corner) -> Known<(f64, f64)> {
        let (at_25_v, slope_ohm) = match rectifier.forward? {
            Forward::Line { threshold_v, slope_ohm } => (threshold_v, slope_ohm),
            Forward::Point { vf_v, vf_a } => {
                let threshold = match corner {
                    Corner::Low => vf_v - POINT_SLOPE_V,
                    _ => POINT_TYPICAL_V.min(vf_v - POINT_SPREAD_V),
                };
                (threshold, POINT_SLOPE_V / vf_a)
            }
        };
        let tc = match rectifier.junction {
            Junction::Junction => JUNCTION_TC_V_K,
            Junction::Schottky => SCHOTTKY_TC_V_K,
        };
        let threshold = |temperature_c: f64| diode::threshold_v(at_25_v, tc, temperature_c);
        let threshold_v = match corner {
            Corner::Low => threshold(self.t_lo_c),
            Corner::Nominal => threshold(DATASHEET_C),
            Corner::High | Corner::Alone | Corner::Worn => threshold(self.t_hi_c),
            Corner::Idle | Corner::SwitchOn => 0.0,
        };
        Ok((threshold_v, slope_ohm))
    }

    /// Capacitance of one can at a corner.
    #[must_use]
    pub fn can_f(&self, can: &Reservoir, corner: Corner) -> f64 {
        match corner {
            Corner::Low | Corner::Worn => can.c_f * (1.0 - can.tol_minus) * self.aged_c,
            Corner::Nominal => can.c_f,
            _ => can.c_f * (1.0 + can.tol_plus),
        }
    }

    /// Series resistance of one can at a corner.
    ///
    /// # Errors
    /// Names the column that is blank.
    pub fn can_esr_ohm(&self, can: &Reservoir, corner: Corner) -> Known<f64> {
        let listed = can.esr_ohm.ok_or("esr_mohm")?;
        let at_mains = if can.esr_hz >= HIGH_FREQUENCY_HZ {
            listed * HIGH_FREQUENCY_ESR
        } else {
            listed
        };
        Ok(match corner {
            Corner::Low | Corner::Worn => at_mains * self.aged_esr,
            _ => at_mains,
        })
    }

    /// Ripple rating of one can at mains frequencies, before the derating of half-wave pulses.
    ///
    /// # Errors
    /// Names the column that is blank.
    pub fn can_ripple_a(&self, can: &Reservoir) -> Known<f64> {
        let listed = can.ripple_a.ok_or("ripple_a")?;
        Ok(if can.ripple_hz >= HIGH_FREQUENCY_HZ {
            listed * HIGH_FREQUENCY_RIPPLE
        } else {
            listed
        })
    }
}

/// The parts of one raw section.
#[derive(Debug, Clone, Copy)]
pub struct Raw<'c> {
    /// Feeds it.
    pub transformer: &'c Transformer,
    /// Through these secondaries.
    pub hookup: &'c Hookup,
    /// Rectifier circuit.
    pub path: Path,
    /// Rectifier.
    pub rectifier: &'c Rectifier,
    /// Capacitor.
    pub reservoir: &'c Reservoir,
    /// Capacitors in parallel.
    pub cans: u32,
}

impl Raw<'_> {
    /// The circuit at a corner under a constant load; `all` are the loads of every section of the transformer.
    ///
    /// # Errors
    /// Names the column that is blank.
    pub fn circuit(
        &self,
        site: &Site,
        corner: Corner,
        load_a: Known<f64>,
        all: Known<&[WindingLoad]>,
    ) -> Known<RawSection> {
        let diodes = diodes_in_path(self.path);
        let (threshold_v, slope_ohm) = site.forward(self.rectifier, corner)?;
        let esr_ohm = site.can_esr_ohm(self.reservoir, corner)?;
        let load_a = load_a?;
        // A blank cell of another section matters only where its load does.
        let all = match corner {
            Corner::Low | Corner::Nominal => all?,
            _ => &[],
        };
        let winding_ohm = site.winding_ohm(self.transformer, self.hookup, corner, load_a, all);
        Ok(RawSection {
            source_rms_v: site.source_v(self.transformer, self.hookup, corner),
            mains_hz: site.supply.mains.frequency_hz,
            full_wave: self.path != Path::HalfWave,
            series_ohm: winding_ohm + diodes * slope_ohm,
            drop_v: diodes * threshold_v,
            bank_f: site.can_f(self.reservoir, corner) * f64::from(self.cans),
            bank_esr_ohm: esr_ohm / f64::from(self.cans),
            load_a,
            load_s: 0.0,
        })
    }

    /// The waveform at a corner.
    ///
    /// # Errors
    /// Why there is none.
    pub fn wave(&self, site: &Site, corner: Corner, load_a: Known<f64>, all: Known<&[WindingLoad]>) -> Wave {
        let circuit = self.circuit(site, corner, load_a, all).map_err(NoWave::Missing)?;
        steady_state(&circuit).ok_or(NoWave::Collapse(corner))
    }
}

/// Why there is no waveform.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum NoWave {
    /// This cell is blank.
    Missing(&'static str),
    /// The section collapses at this corner.
    Collapse(Corner),
}

/// A waveform, or why there is none.
pub type Wave = Result<Waveform, NoWave>;
