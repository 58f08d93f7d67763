//! Owns the electrolytic capacitor: cold, heat, life.

use super::constants::{COLD_C, COLD_C_LOSS_PER_K, COLD_ESR_DOUBLING_K, LIFE_HALVING_K, RATED_RIPPLE_RISE_K};

/// Factor on capacitance at a low temperature.
///
/// Formula: 1 - 0.004 (20 degC - T) below 20 degC, else 1. Valid for: down to -55 degC. Source: from memory.
#[must_use]
pub fn cold_capacitance(temperature_c: f64) -> f64 {
    1.0 - COLD_C_LOSS_PER_K * (COLD_C - temperature_c).max(0.0)
}

/// Factor on series resistance at a low temperature.
///
/// Formula: 2^((20 degC - T)/25 K) below 20 degC, else 1. Valid for: down to -55 degC. Source: from memory.
#[must_use]
pub fn cold_esr(temperature_c: f64) -> f64 {
    ((COLD_C - temperature_c).max(0.0) / COLD_ESR_DOUBLING_K).exp2()
}

/// Hottest spot of a can, degC.
///
/// Formula: ambient + 5 K (ripple/rating)^2. Valid for: natural convection around the can.
/// Source: Albertsen, "Electrolytic capacitor lifetime estimation", Jianghai Europe.
#[must_use]
pub fn hot_c(ambient_c: f64, ripple_a: f64, rating_a: f64) -> f64 {
    ambient_c + RATED_RIPPLE_RISE_K * (ripple_a / rating_a).powi(2)
}

/// Life in hours.
///
/// Formula: L = L_0 2^((t_max + 5 - hot)/10). Valid for: hot above about 40 degC. Source: the 10-kelvin rule, as above.
///
/// # Examples
/// 2000 h at 105 degC without ripple heat, run at 85 degC: 8000 h, and the 5 K that rated ripple would have taken.
/// ```
/// let h = binrail::physics::reservoir::life_h(2000.0, 105.0, 85.0 + 5.0);
/// assert!((h - 8000.0).abs() < 1e-9);
/// ```
#[must_use]
pub fn life_h(rated_h: f64, t_max_c: f64, hot_c: f64) -> f64 {
    rated_h * ((t_max_c + RATED_RIPPLE_RISE_K - hot_c) / LIFE_HALVING_K).exp2()
}
