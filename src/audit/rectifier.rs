//! Owns the limits of rectifiers.

use std::f64::consts::SQRT_2;

use super::check::{Check, Corner, Known, Limit};
use super::site::{Raw, Site};
use super::thermal::rise_k;
use crate::build::diodes_in_path;
use crate::catalogue::{Rectifier, RectifierKind, Sink};
use crate::physics::constants::CAPACITIVE_DERATING;
use crate::physics::diode;
use crate::physics::raw_section::Waveform;
use crate::physics::winding::WindingLoad;
use crate::supply::Path;

/// Reverse voltage; `idle_v` is the unloaded raw voltage at high mains.
#[must_use]
pub fn reverse_voltage(site: &Site, rectifier: &Rectifier, path: Path, idle_v: f64) -> Check {
    let inverse_v = match path {
        Path::Bridge => idle_v,
        Path::HalfWave | Path::CentreTap | Path::Dual => 2.0 * idle_v,
    };
    let bound = (1.0 + site.supply.margins.reverse) * inverse_v;
    Check::new(
        Limit::ReverseVoltage,
        Corner::Idle,
        rectifier.vrrm_v.ok_or("vrrm_v"),
        Ok(bound),
    )
}

/// Mean current that io_a speaks of: the output of a module, one diode of the others.
#[must_use]
pub fn current(raw: &Raw, high: Known<&Waveform>) -> Check {
    let share = diode_share(raw);
    let bound = raw.rectifier.io_a.ok_or("io_a").map(|io| {
        if raw.rectifier.io_capacitive {
            io
        } else {
            CAPACITIVE_DERATING * io
        }
    });
    Check::new(
        Limit::RectifierCurrent,
        Corner::High,
        high.map(|w| share * w.source_mean_a()),
        bound,
    )
}

/// The same of a dual pair: its larger polarity; `raw` of either section.
#[must_use]
pub fn pair_current(raw: &Raw, positive: Known<&Waveform>, negative: Known<&Waveform>) -> Check {
    current(raw, positive).or_tighter(current(raw, negative))
}

/// Switch-on at the mains crest into the empty reservoir; does not hang on the load.
#[must_use]
pub fn surge(site: &Site, raw: &Raw) -> Check {
    // Alone on its transformer the winding's resistance is the same at any load.
    let any_load = WindingLoad {
        volts_v: raw.hookup.volts_v,
        load_a: 1.0,
    };
    let circuit = raw.circuit(site, Corner::SwitchOn, Ok(any_load.load_a), Ok(&[any_load]));
    let value = circuit.map(|c| c.source_rms_v * SQRT_2 / (c.series_ohm + c.bank_esr_ohm));
    Check::new(
        Limit::RectifierSurge,
        Corner::SwitchOn,
        value,
        raw.rectifier.ifsm_a.ok_or("ifsm_a"),
    )
}

/// The same of a dual pair: the worse of both banks.
#[must_use]
pub fn pair_surge(site: &Site, positive: &Raw, negative: &Raw) -> Check {
    surge(site, positive).or_tighter(surge(site, negative))
}

/// Loss of all diodes of the section at high mains.
///
/// # Errors
/// Names the column that is blank.
pub fn loss_w(site: &Site, raw: &Raw, high: Known<&Waveform>) -> Known<f64> {
    let (threshold_v, slope_ohm) = site.forward(raw.rectifier, Corner::High)?;
    let wave = high?;
    Ok(diodes_in_path(raw.path) * diode::loss_w(threshold_v, slope_ohm, wave.source_mean_a(), wave.source_rms_a()))
}

/// Loss of one package: all of a module's, a single diode's own share.
///
/// # Errors
/// Names the column that is blank.
pub fn package_loss_w(site: &Site, raw: &Raw, high: Known<&Waveform>) -> Known<f64> {
    let all = loss_w(site, raw, high)?;
    Ok(match raw.rectifier.kind {
        RectifierKind::Bridge => all,
        RectifierKind::Diode => all / diodes_in_path(raw.path) * diode_share(raw),
    })
}

/// The same of a dual pair: both polarities heat a module, a single diode serves one of them; `raw` of either section.
///
/// # Errors
/// Names the column that is blank.
pub fn pair_package_w(site: &Site, raw: &Raw, positive: Known<&Waveform>, negative: Known<&Waveform>) -> Known<f64> {
    let (positive_w, negative_w) = (
        package_loss_w(site, raw, positive)?,
        package_loss_w(site, raw, negative)?,
    );
    Ok(match raw.rectifier.kind {
        RectifierKind::Bridge => positive_w + negative_w,
        RectifierKind::Diode => positive_w.max(negative_w),
    })
}

/// Junction of the package with that loss, free-standing or on a sink.
#[must_use]
pub fn junction(site: &Site, rectifier: &Rectifier, package_w: Known<f64>, sink: Option<&Sink>) -> Check {
    let rise = package_w.and_then(|w| rise_k(w, rectifier.rth_ja_k_w, rectifier.rth_jc_k_w, sink));
    let bound = rectifier
        .tj_max_c
        .ok_or("tj_max_c")
        .map(|tj| tj - site.supply.margins.junction_k);
    Check::new(
        Limit::RectifierJunction,
        Corner::High,
        rise.map(|k| site.t_hi_c + k),
        bound,
    )
}

/// Share of the section's mean current that flows through what io_a and a package speak of.
fn diode_share(raw: &Raw) -> f64 {
    match (raw.rectifier.kind, raw.path) {
        (RectifierKind::Bridge, _) | (RectifierKind::Diode, Path::HalfWave) => 1.0,
        (RectifierKind::Diode, Path::CentreTap | Path::Bridge | Path::Dual) => 0.5,
    }
}
