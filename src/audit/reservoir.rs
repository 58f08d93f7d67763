//! Owns the limits of reservoirs.

use super::check::{Check, Corner, Known, Limit};
use super::site::{Raw, Site};
use crate::catalogue::Reservoir;
use crate::physics::constants::{HALF_WAVE_RIPPLE, RATED_RIPPLE_RISE_K};
use crate::physics::raw_section::Waveform;
use crate::physics::reservoir::{hot_c, life_h};
use crate::supply::Path;

/// Rated voltage; `idle_v` is the unloaded raw voltage at high mains.
#[must_use]
pub fn voltage(site: &Site, can: &Reservoir, idle_v: f64) -> Check {
    let bound = can
        .v_rated_v
        .ok_or("v_rated_v")
        .map(|v| v * (1.0 - site.supply.margins.reservoir));
    Check::new(Limit::ReservoirVoltage, Corner::Idle, Ok(idle_v), bound)
}

/// Rms current per can.
///
/// # Errors
/// Names the column that is blank.
pub fn ripple_a(raw: &Raw, high: Known<&Waveform>) -> Known<f64> {
    Ok(high?.reservoir_rms_a() / f64::from(raw.cans))
}

/// Ripple current, hottest spot and life of a can that carries so much; all three are kindest without any.
#[must_use]
pub fn wear(site: &Site, can: &Reservoir, path: Path, ripple_a: Known<f64>) -> [Check; 3] {
    let rating_a = site.can_ripple_a(can).map(|a| {
        if path == Path::HalfWave {
            HALF_WAVE_RIPPLE * a
        } else {
            a
        }
    });
    let hot = ripple_a.and_then(|a| Ok(hot_c(site.t_hi_c, a, rating_a?)));
    let t_max = can.t_max_c.ok_or("t_max_c");
    let life = hot.and_then(|c| Ok(life_h(can.life_h.ok_or("life_h")?, t_max?, c)));
    [
        Check::new(Limit::ReservoirRipple, Corner::High, ripple_a, rating_a),
        Check::new(
            Limit::ReservoirHot,
            Corner::High,
            hot,
            t_max.map(|c| c + RATED_RIPPLE_RISE_K),
        ),
        Check::new(Limit::ReservoirLife, Corner::High, life, Ok(site.supply.ageing.life_h)),
    ]
}

/// Loss in the bank at high mains.
///
/// # Errors
/// Names the column that is blank.
pub fn loss_w(site: &Site, raw: &Raw, high: Known<&Waveform>) -> Known<f64> {
    let esr_ohm = site.can_esr_ohm(raw.reservoir, Corner::High)? / f64::from(raw.cans);
    Ok(esr_ohm * high?.reservoir_rms_a().powi(2))
}
