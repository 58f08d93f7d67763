//! Owns the integrated series regulator: dropout, dissipation, output tolerance, ripple rejection.

use super::constants::{DIVIDER_TOLERANCE, PSRR_FULL_HEADROOM_V, PSRR_LOST_DB};

/// Dropout of an integrated device at a current.
///
/// Formula: `full_v` at every current, or the straight line from `light_v` at no load to `full_v` at `rated_a`, clamped there.
/// Valid for: 0 <= `load_a`. Source: linear output stage, common practice.
#[must_use]
pub fn dropout_v(full_v: f64, light: Option<(f64, f64)>, load_a: f64) -> f64 {
    match light {
        None => full_v,
        Some((light_v, rated_a)) => light_v + (full_v - light_v) * (load_a / rated_a).min(1.0),
    }
}

/// Dissipation of a series device, watts.
///
/// Formula: (mean raw - V_out) I + mean raw x ground current. Valid for: in regulation.
/// Source: energy balance; US amateur pool question E7D13 (public domain) for the first term.
#[must_use]
pub fn dissipation_w(mean_raw_v: f64, out_v: f64, load_a: f64, ground_a: f64) -> f64 {
    (mean_raw_v - out_v) * load_a + mean_raw_v * ground_a
}

/// What the resistors of an output divider add to the output tolerance, a fraction.
///
/// Formula: 2 x 1 % (1 - vref/V_out). Valid for: V_out >= vref, two 1 % resistors. Source: first-order sensitivity.
#[must_use]
pub fn divider_tolerance(vref_v: f64, out_v: f64) -> f64 {
    2.0 * DIVIDER_TOLERANCE * (1.0 - vref_v / out_v)
}

/// Ripple rejection that is left at the output and headroom in use, dB; never below 0.
///
/// Formula: stated - 20 log10(V_out/V_stated), not below 0, then - 20 dB (1 - h/1 V) where h < 1 V.
/// Valid for: the frequency that the row states it for. Source: loop gain falls with closed-loop gain; the fading near
/// dropout is from memory.
#[must_use]
pub fn rejection_db(stated_db: f64, out_over_stated: f64, above_dropout_v: f64) -> f64 {
    let at_output = (stated_db - 20.0 * out_over_stated.log10()).max(0.0);
    let faded = PSRR_LOST_DB * (1.0 - above_dropout_v / PSRR_FULL_HEADROOM_V).max(0.0);
    (at_output - faded).max(0.0)
}

/// Ripple behind a device, volts peak to peak.
///
/// Formula: raw x 10^(-dB/20). Source: definition of ripple rejection; 60 dB: 1 V gives 1 mV.
///
/// # Examples
/// ```
/// assert!((binrail::physics::regulator::output_ripple_v(1.0, 60.0) - 1e-3).abs() < 1e-15);
/// ```
#[must_use]
pub fn output_ripple_v(raw_pp_v: f64, rejection_db: f64) -> f64 {
    raw_pp_v * 10_f64.powf(-rejection_db / 20.0)
}
