//! Owns `wave`.

use clap::{Args, ValueEnum};

use super::output::{Answer, page};
use super::{Common, Failure, Format, call_fault};
use crate::build::diodes_in_path;
use crate::physics::raw_section::{RawSection, steady_state};
use crate::report::{csv, json, table};
use crate::supply::Path;

#[derive(ValueEnum, Debug, Clone, Copy)]
enum PathWord {
    HalfWave,
    CentreTap,
    Bridge,
}

/// All in SI units; numbers such as 4700e-6 are taken.
#[derive(Args, Debug)]
#[command(allow_negative_numbers = true)]
pub(super) struct Wave {
    /// Open-circuit winding voltage, rms (of one half for centre-tap)
    #[arg(long, value_name = "V")]
    source_v: f64,
    /// Mains frequency
    #[arg(long, value_name = "HZ")]
    hz: f64,
    /// Series resistance of the winding
    #[arg(long, value_name = "OHM")]
    winding_ohm: f64,
    /// Rectifier circuit
    #[arg(long, value_enum)]
    path: PathWord,
    /// Threshold of each diode
    #[arg(long, value_name = "V")]
    threshold_v: f64,
    /// Slope of each diode
    #[arg(long, value_name = "OHM")]
    slope_ohm: f64,
    /// Reservoir
    #[arg(long, value_name = "F")]
    farad: f64,
    /// Its series resistance
    #[arg(long, value_name = "OHM")]
    esr_ohm: f64,
    /// Constant load current
    #[arg(long, value_name = "A", required_unless_present = "load_ohm")]
    amps: Option<f64>,
    /// Resistive load
    #[arg(long, value_name = "OHM")]
    load_ohm: Option<f64>,
}

/// Largest magnitude that a figure may have: beyond it nothing electrical is meant.
const MOST: f64 = 1e9;

impl Wave {
    pub(super) fn run(&self, common: &Common) -> Result<Answer, Failure> {
        let positive = [
            ("--source-v", Some(self.source_v)),
            ("--hz", Some(self.hz)),
            ("--farad", Some(self.farad)),
            ("--load-ohm", self.load_ohm),
        ];
        let not_negative = [
            ("--winding-ohm", Some(self.winding_ohm)),
            ("--threshold-v", Some(self.threshold_v)),
            ("--slope-ohm", Some(self.slope_ohm)),
            ("--esr-ohm", Some(self.esr_ohm)),
            ("--amps", self.amps),
        ];
        let mut faults = Vec::new();
        for (flag, value) in positive {
            if value.is_some_and(|v| !(v > 1e-15 && v <= MOST)) {
                faults.push(call_fault(
                    flag,
                    &format!("{}", value.unwrap_or(0.0)),
                    "is out of range",
                    "above 0 to 1e9",
                ));
            }
        }
        for (flag, value) in not_negative {
            if value.is_some_and(|v| !(0.0..=MOST).contains(&v)) {
                faults.push(call_fault(
                    flag,
                    &format!("{}", value.unwrap_or(0.0)),
                    "is out of range",
                    "0 to 1e9",
                ));
            }
        }
        if !faults.is_empty() {
            return Err(Failure::Input(faults));
        }
        let path = match self.path {
            PathWord::HalfWave => Path::HalfWave,
            PathWord::CentreTap => Path::CentreTap,
            PathWord::Bridge => Path::Bridge,
        };
        let diodes = diodes_in_path(path);
        let wave = steady_state(&RawSection {
            source_rms_v: self.source_v,
            mains_hz: self.hz,
            full_wave: path != Path::HalfWave,
            series_ohm: self.winding_ohm + diodes * self.slope_ohm,
            drop_v: diodes * self.threshold_v,
            bank_f: self.farad,
            bank_esr_ohm: self.esr_ohm,
            load_a: self.amps.unwrap_or(0.0),
            load_s: self.load_ohm.map_or(0.0, f64::recip),
        });
        let text = match common.format {
            Format::Table => table::wave(wave.as_ref(), page(common)),
            Format::Json => json::text(&json::wave(wave.as_ref())),
            Format::Csv => csv::wave(wave.as_ref()),
        };
        Ok(Answer::new(text, u8::from(wave.is_none())))
    }
}
