//! Owns the limits of transformers and windings.

use std::f64::consts::SQRT_2;

use super::check::{Check, Corner, Known, Limit};
use super::site::Site;
use crate::build::{Hookup, HookupKind};
use crate::catalogue::{Core, Transformer};
use crate::physics::constants::{CORE_BIAS_SHARE, FLUX_RESERVE, FREQUENCY_LEAST, OVERVOLTAGE_MOST};
use crate::supply::Path;

/// What a transformer must hold whatever it feeds.
#[must_use]
pub fn by_itself(site: &Site, transformer: &Transformer) -> [Check; 3] {
    let mains = &site.supply.mains;
    let flux = (FLUX_RESERVE * mains.frequency_hz / transformer.freq_min_hz).min(OVERVOLTAGE_MOST);
    [
        Check::new(
            Limit::PrimaryVoltage,
            Corner::Idle,
            Ok(mains.high_v),
            Ok(site.primary_v(transformer) * flux),
        ),
        Check::new(
            Limit::PrimaryFrequency,
            None,
            Ok(mains.frequency_hz),
            Ok(FREQUENCY_LEAST * transformer.freq_min_hz),
        ),
        Check::new(Limit::TransformerAmbient, None, Ok(site.t_hi_c), Ok(transformer.ta_c)),
    ]
}

/// Rms current in the hook-up's windings (in one half for centre-tap and dual; for dual the part of one polarity alone,
/// see [`pair_rms_a`]).
#[must_use]
pub fn winding_rms_a(path: Path, source_rms_a: f64) -> f64 {
    match path {
        Path::CentreTap | Path::Dual => source_rms_a / SQRT_2,
        Path::HalfWave | Path::Bridge => source_rms_a,
    }
}

/// Rms current in one half of a dual pair's winding: each half serves the polarities by turns, half a period each.
/// Never less than [`winding_rms_a`] of one polarity alone.
#[must_use]
pub fn pair_rms_a(positive_rms_a: f64, negative_rms_a: f64) -> f64 {
    winding_rms_a(Path::Dual, positive_rms_a).hypot(winding_rms_a(Path::Dual, negative_rms_a))
}

/// Apparent power of a hook-up, to be summed over the transformer; of one polarity of a dual pair it is a lower bound of
/// [`pair_va`].
#[must_use]
pub fn section_va(hookup: &Hookup, path: Path, source_rms_a: f64) -> f64 {
    windings_va(hookup, winding_rms_a(path, source_rms_a))
}

/// The same of both sections of a dual pair together; `hookup` of either.
#[must_use]
pub fn pair_va(hookup: &Hookup, positive_rms_a: f64, negative_rms_a: f64) -> f64 {
    windings_va(hookup, pair_rms_a(positive_rms_a, negative_rms_a))
}

fn windings_va(hookup: &Hookup, rms_a: f64) -> f64 {
    let halves = match hookup.kind {
        HookupKind::CentreTap | HookupKind::Dual => 2.0,
        HookupKind::Single | HookupKind::Series | HookupKind::Parallel => 1.0,
    };
    halves * hookup.volts_v * rms_a
}

/// The sum of [`section_va`] against the rating.
#[must_use]
pub fn load(transformer: &Transformer, va: Known<f64>) -> Check {
    Check::new(Limit::TransformerLoad, Corner::High, va, Ok(transformer.va))
}

/// Winding current; `source_rms_a` is that of the high corner.
#[must_use]
pub fn current(hookup: &Hookup, path: Path, source_rms_a: Known<f64>) -> Check {
    windings_current(hookup, source_rms_a.map(|a| winding_rms_a(path, a)))
}

/// The same in a half of a dual pair's winding; `hookup` of either section.
#[must_use]
pub fn pair_current(hookup: &Hookup, positive_rms_a: Known<f64>, negative_rms_a: Known<f64>) -> Check {
    let rms_a = positive_rms_a.and_then(|a| Ok(pair_rms_a(a, negative_rms_a?)));
    windings_current(hookup, rms_a)
}

fn windings_current(hookup: &Hookup, rms_a: Known<f64>) -> Check {
    Check::new(Limit::WindingCurrent, Corner::High, rms_a, Ok(hookup.amps_a))
}

/// The core's bias, on a half-wave path only.
#[must_use]
pub fn bias(transformer: &Transformer, hookup: &Hookup, path: Path, load_a: Known<f64>) -> Option<Check> {
    let bound = transformer.core.ok_or("core").map(|core| match core {
        Core::Laminated => CORE_BIAS_SHARE * hookup.amps_a,
        Core::Toroid => 0.0,
    });
    (path == Path::HalfWave).then(|| Check::new(Limit::CoreBias, Corner::High, load_a, bound))
}
