//! Owns closed-form bounds on the raw section: what no reservoir can mend, and the least capacitance that might do.
//!
//! Both follow from folding the bank's series resistance into the source: for a constant load the voltage behind it
//! (its value at rest) obeys the same circuit with R + ESR and no ESR, and meets the true raw voltage where conduction
//! starts. Conduction starts at the valley or before it, so the valley is at most the source's voltage there.

use std::f64::consts::PI;

use crate::physics::raw_section::{RawSection, steady_state};

/// Rounding slack on bounds: they may let through what fails, never the reverse.
const SLACK: f64 = 1e-9;

/// The lowest valley that the audit still lets pass for a wanted one.
pub(super) fn let_through_v(level_v: f64) -> f64 {
    level_v - 2.0 * SLACK * level_v.abs().max(1.0)
}

/// Whether the source can deliver the load at all while the raw voltage stays at `level_v` or above.
///
/// Bound: with v >= level, i <= (v_s - drop - level)+/R at every instant, so its mean must reach the load:
/// (2 or 1 pulses)/(2 pi R) (V (2 cos t) - (drop + level)(pi - 2 t)) >= I_L with sin t = (drop + level)/V.
/// Holds for any capacitance and ESR.
pub(super) fn source_reaches(section: &RawSection, level_v: f64) -> bool {
    let crest = section.source_rms_v * std::f64::consts::SQRT_2;
    let floor = (section.drop_v + level_v) / crest;
    if floor >= 1.0 {
        return false;
    }
    if section.series_ohm <= 0.0 || floor <= 0.0 {
        return true;
    }
    let start = floor.asin();
    let pulses = if section.full_wave { 2.0 } else { 1.0 };
    let area = crest * (2.0 * start.cos() - floor * (PI - 2.0 * start));
    pulses * area / (2.0 * PI * section.series_ohm) >= section.load_a * (1.0 - SLACK)
}

/// Least capacitance with which the valley can reach `level_v`, and still `held_v` after the load has drawn on the bank
/// for `held_s` more seconds.
///
/// Bound: conduction lies between the two instants at which the source passes the level, so the load alone discharges
/// the bank for the rest of the period, from at most the crest less the drop:
/// I_L t_off / C <= V - drop - level, and I_L (t_off + held) / C <= V - drop - held level.
pub(super) fn least_bank_f(section: &RawSection, level_v: f64, held_v: f64, held_s: f64) -> f64 {
    let crest = section.source_rms_v * std::f64::consts::SQRT_2;
    let per_second = 2.0 * PI * section.mains_hz;
    let off_s = |level: f64| {
        let start = ((section.drop_v + level) / crest).clamp(0.0, 1.0).asin();
        let period = if section.full_wave { PI } else { 2.0 * PI };
        (period - PI + 2.0 * start) / per_second
    };
    let need =
        |level: f64, seconds: f64| section.load_a * seconds / (crest - section.drop_v - level).max(f64::MIN_POSITIVE);
    need(level_v, off_s(level_v)).max(need(held_v, off_s(held_v) + held_s)) * (1.0 - SLACK)
}

/// Least rms source current while the raw voltage stays at `level_v` or above during conduction.
///
/// Bound: the mean current I_L flows within the pulses, none longer than the source stays above level and drop; rms is
/// least when it is even there: I_rms >= I_L sqrt(period/pulse).
pub(super) fn least_rms_a(section: &RawSection, level_v: f64) -> f64 {
    let crest = section.source_rms_v * std::f64::consts::SQRT_2;
    let period = if section.full_wave { PI } else { 2.0 * PI };
    let pulse = PI - 2.0 * ((section.drop_v + level_v.max(0.0)) / crest).clamp(0.0, 1.0).asin();
    section.load_a * (period / pulse.max(f64::MIN_POSITIVE)).sqrt() * (1.0 - SLACK)
}

/// Lower bound on the heat of a section and its device at the high corner, iron loss aside, for any bank.
///
/// Bound: let u be the voltage behind the bank's resistance (module head). Its peak is at least the level U that an
/// endless bank would hold, else the source would give more than the load takes all the time; and it falls between
/// pulses by at most I_L T/C. Current flows only while the source lies above u and the drop, so the source gives at
/// least (U - I_L T/C + drop) I_L; all of it but the rail's own power is heat. U falls with the bank's resistance.
pub(super) struct HeatBound {
    level_v: f64,
    drop_v: f64,
    load_a: f64,
    /// Seconds between pulses.
    interval_s: f64,
    rail_w: f64,
}

/// A bank that holds its voltage but for microvolts; its valley lies below that of an endless one.
const ENDLESS_F: f64 = 1e3;

impl HeatBound {
    /// For a circuit without its bank, the highest series resistance of any bank, and the power that the rail takes.
    pub(super) fn new(high: &RawSection, esr_ohm: f64, rail_w: f64) -> HeatBound {
        let endless = RawSection {
            series_ohm: high.series_ohm + esr_ohm,
            bank_f: ENDLESS_F,
            bank_esr_ohm: 0.0,
            ..*high
        };
        HeatBound {
            level_v: steady_state(&endless).map_or(0.0, |wave| wave.valley_v()),
            drop_v: high.drop_v,
            load_a: high.load_a,
            interval_s: 1.0 / (high.mains_hz * if high.full_wave { 2.0 } else { 1.0 }),
            rail_w,
        }
    }

    /// With a bank of so much capacitance at the high corner.
    pub(super) fn least_w(&self, bank_f: f64) -> f64 {
        let level_v = (self.level_v - self.load_a * self.interval_s / bank_f).max(0.0);
        ((level_v + self.drop_v) * self.load_a - self.rail_w) * (1.0 - SLACK)
    }
}
