//! Owns what can be connected at all: which device serves a rail, which sink takes a case, which rectifier a path.
//!
//! These are rules of assembly, not limits: a choice that breaks one is no build. The search lists only what they
//! allow; `misfits` holds a hand-written build against them before it is audited.

use crate::catalogue::{DeviceKind, PassDevice, Polarity, RectifierKind, Sink};
use crate::supply::{Path, Rail};

/// How close a fixed output must be to the rail's voltage, volts: only rounding of the two texts.
const SAME_VOLTAGE_V: f64 = 1e-9;

/// Diodes in series in a path.
#[must_use]
pub fn diodes_in_path(path: Path) -> f64 {
    match path {
        Path::Bridge => 2.0,
        Path::HalfWave | Path::CentreTap | Path::Dual => 1.0,
    }
}

/// Pieces of a rectifier that a path takes; 0: it does not serve that path.
#[must_use]
pub fn pieces_of_rectifier(kind: RectifierKind, path: Path) -> u64 {
    match (kind, path) {
        (RectifierKind::Bridge, Path::Bridge | Path::Dual) => 1,
        (RectifierKind::Bridge, Path::HalfWave | Path::CentreTap) => 0,
        (RectifierKind::Diode, Path::Bridge | Path::Dual) => 4,
        (RectifierKind::Diode, Path::CentreTap) => 2,
        (RectifierKind::Diode, Path::HalfWave) => 1,
    }
}

/// Whether a device can give the rail's voltage: right kind, right output, right sign. A negative rail takes a
/// positive device too when its section floats ([`Section::floats`](super::Section::floats)) and the device's output
/// is grounded.
#[must_use]
pub fn device_serves(device: &PassDevice, rail: &Rail, floats: bool) -> bool {
    let out_v = rail.voltage_v.abs();
    let output = match device.kind {
        DeviceKind::Fixed => device.vout_v.is_some_and(|v| (v - out_v).abs() <= SAME_VOLTAGE_V),
        _ => match (device.vout_min_v, device.vout_max_v) {
            (Some(low), Some(high)) => low <= out_v && out_v <= high,
            _ => false,
        },
    };
    let sign = match device.polarity {
        Polarity::Positive => rail.voltage_v > 0.0 || floats,
        Polarity::Negative => rail.voltage_v < 0.0,
    };
    output && sign && rail.devices.contains(&device.kind)
}

/// Whether a sink takes a part of that outline.
#[must_use]
pub fn sink_takes(sink: &Sink, case: Option<&str>) -> bool {
    case.is_some_and(|case| sink.cases.iter().any(|c| c == case))
}
