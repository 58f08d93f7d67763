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

/// Rms current in the hook-up's windings (in one half for centre-tap).
#[must_use]
pub fn winding_rms_a(path: Path, source_rms_a: f64) -> f64 {
    match path {
        Path::CentreTap => source_rms_a / SQRT_2,
        Path::HalfWave | Path::Bridge | Path::Dual => source_rms_a,
    }
}

/// Apparent power of a hook-up, to be summed over the transformer.
#[must_use]
pub fn section_va(hookup: &Hookup, path: Path, source_rms_a: f64) -> f64 {
    let halves = if hookup.kind == HookupKind::CentreTap { 2.0 } else { 1.0 };
    halves * hookup.volts_v * winding_rms_a(path, source_rms_a)
}

/// The sum of [`section_va`] against the rating.
#[must_use]
pub fn load(transformer: &Transformer, va: Known<f64>) -> Check {
    Check::new(Limit::TransformerLoad, Corner::High, va, Ok(transformer.va))
}

/// Winding current; `source_rms_a` is that of the high corner.
#[must_use]
pub fn current(hookup: &Hookup, path: Path, source_rms_a: Known<f64>) -> Check {
    let rms_a = source_rms_a.map(|a| winding_rms_a(path, a));
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
