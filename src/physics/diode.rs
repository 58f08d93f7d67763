//! Owns the rectifier diode: threshold over temperature, and its loss.

use super::constants::{DATASHEET_C, THRESHOLD_FLOOR_V};

/// Threshold voltage at a temperature.
///
/// Formula: V_T0(T) = V_T0 + tc (25 degC - T), never below 0.2 V.
/// Valid for: -60..175 degC. Source: common practice (2 mV/K junction, 1 mV/K Schottky).
#[must_use]
pub fn threshold_v(at_25_v: f64, tc_v_k: f64, temperature_c: f64) -> f64 {
    (at_25_v + tc_v_k * (DATASHEET_C - temperature_c)).max(THRESHOLD_FLOOR_V)
}

/// Conduction loss, watts.
///
/// Formula: P = V_T0 I_avg + r_T I_rms^2. Valid for: currents near the rated one. Source: IEC 60747-2.
///
/// # Examples
/// 1.15 V, 29 milliohm, 20 A square wave at half duty (a maker's application note, 2004): 17.3 W.
/// ```
/// let p = binrail::physics::diode::loss_w(1.15, 0.029, 10.0, 20.0 * 0.5_f64.sqrt());
/// assert!((p - 17.3).abs() < 1e-9);
/// ```
#[must_use]
pub fn loss_w(threshold_v: f64, slope_ohm: f64, mean_a: f64, rms_a: f64) -> f64 {
    threshold_v * mean_a + slope_ohm * rms_a * rms_a
}
