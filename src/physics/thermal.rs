//! Owns the path of heat from a junction to the air.

use super::constants::CONVECTION_EXPONENT;

/// Rise of a sink above the air, kelvin.
///
/// Formula: constant sink: P rth. Where rth is stated at a rise (natural convection): rth (stated/actual)^0.25, so
/// actual = P rth (stated/actual)^0.25, whose fixed point is closed: actual^1.25 = P rth stated^0.25.
/// Valid for: natural convection, still air; P >= 0 (below, a device out of regulation, counts as 0).
/// Source: laminar convection, McAdams 1954; a sink maker's correction table agrees to 0.001 (tests/published.rs).
///
/// # Examples
/// A sink of 4 K/W at 75 K, at the power that gives 30 K, has 1.257 times its stated resistance.
/// ```
/// let p = 30.0 / (4.0 * 1.2574);
/// assert!((binrail::physics::thermal::sink_rise_k(p, 4.0, Some(75.0)) - 30.0).abs() < 1e-3);
/// ```
#[must_use]
pub fn sink_rise_k(power_w: f64, rth_sa_k_w: f64, stated_at_k: Option<f64>) -> f64 {
    let power_w = power_w.max(0.0);
    match stated_at_k {
        None => power_w * rth_sa_k_w,
        Some(rise) => (power_w * rth_sa_k_w * rise.powf(CONVECTION_EXPONENT)).powf(1.0 / (1.0 + CONVECTION_EXPONENT)),
    }
}
