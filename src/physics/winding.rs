//! Owns the transformer as the section sees it: open-circuit voltage, series resistance, iron loss.

use super::constants::{COPPER_K, CORE_LOSS_EXPONENT, CORE_LOSS_W};

/// Open-circuit voltage of a winding, rms.
///
/// Formula: V_oc = V_s (1 + reg) V_mains / V_primary, reg on the full-load base.
/// Valid for: mains near the rated primary voltage (no saturation); errs by the magnetising drop, below 1 %.
/// Source: definition of regulation (V_noload - V_full)/V_full, IEC 61558-1.
///
/// # Examples
/// 18 V, 12 %: 20.16 V on rated mains.
/// ```
/// let v = binrail::physics::winding::open_circuit_v(18.0, 0.12, 230.0, 230.0);
/// assert!((v - 20.16).abs() < 1e-12);
/// ```
#[must_use]
pub fn open_circuit_v(rated_v: f64, regulation: f64, mains_v: f64, primary_v: f64) -> f64 {
    rated_v * (1.0 + regulation) * mains_v / primary_v
}

/// A load on one hook-up of a transformer, as the shared primary sees it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct WindingLoad {
    /// Rated voltage of the hook-up.
    pub volts_v: f64,
    /// Direct load current of its section; > 0.
    pub load_a: f64,
}

/// Series resistance of a hook-up at the rated winding temperature, ohms.
///
/// Formula: R_k = reg V_k ((1 - a)/I_k + (a/S) (sum of V_b I_Lb)/I_Lk): the share `a` of the copper drop sits in the
/// primary, which all sections load at the same instant.
/// Valid for: resistive drop (small transformers, where leakage reactance is minor). `all_va` = S, all secondaries.
/// Source: proportional copper drop, common practice; equals reg V/I for one section on all windings.
///
/// # Examples
/// 50 VA, 18 V, 12 %, one winding: 0.7776 ohm, whatever the load.
/// ```
/// use binrail::physics::winding::{WindingLoad, series_ohm};
/// let own = WindingLoad { volts_v: 18.0, load_a: 0.3 };
/// let r = series_ohm(0.12, 0.5, 50.0, own, 50.0 / 18.0, &[own]);
/// assert!((r - 0.7776).abs() < 1e-12);
/// ```
#[must_use]
pub fn series_ohm(
    regulation: f64,
    primary_share: f64,
    all_va: f64,
    own: WindingLoad,
    rated_a: f64,
    loads: &[WindingLoad],
) -> f64 {
    let together: f64 = loads.iter().map(|b| b.volts_v * b.load_a).sum();
    regulation * own.volts_v * ((1.0 - primary_share) / rated_a + primary_share / all_va * together / own.load_a)
}

/// Resistance of copper at another temperature than the rated one, never above it.
///
/// Formula: R(T) = R (234.5 + min(T, rated))/(234.5 + rated).
/// Valid for: -60..200 degC. Source: IEC 60028.
///
/// # Examples
/// From 75 degC down to 25 degC: 1/1.193.
/// ```
/// let r = binrail::physics::winding::copper_ohm(1.0, 25.0, 75.0);
/// assert!((1.0 / r - 1.1927).abs() < 5e-5);
/// ```
#[must_use]
pub fn copper_ohm(ohm_at_rated: f64, temperature_c: f64, rated_c: f64) -> f64 {
    ohm_at_rated * (COPPER_K + temperature_c.min(rated_c)) / (COPPER_K + rated_c)
}

/// Iron loss at rated voltage where the row states none, watts.
///
/// Formula: 0.27 W x VA^0.62. Valid for: laminated mains transformers of 3 to 500 VA; within a factor of 2.
/// Source: from memory.
#[must_use]
pub fn estimated_core_loss_w(va: f64) -> f64 {
    CORE_LOSS_W * va.powf(CORE_LOSS_EXPONENT)
}

/// Iron loss at another voltage, watts.
///
/// Formula: P (V/V_primary)^2. Valid for: below saturation. Source: eddy and hysteresis loss near B^2, common practice.
#[must_use]
pub fn core_loss_w(at_rated_w: f64, mains_v: f64, primary_v: f64) -> f64 {
    at_rated_w * (mains_v / primary_v).powi(2)
}
