//! Owns the heat of a build: all of it at the high corner, every rail at full load.

use super::check::{Corner, Known};
use super::site::{Raw, Site};
use super::{rectifier, reservoir};
use crate::catalogue::Transformer;
use crate::physics::raw_section::Waveform;
use crate::physics::winding::{core_loss_w, estimated_core_loss_w};
use crate::units::microwatts;

/// Heat of one part of the build.
#[derive(Debug, Clone, PartialEq)]
pub struct HeatItem {
    /// Transformer, section or rail.
    pub of: String,
    /// What heats: core, winding, rectifier, reservoir, pass.
    pub what: &'static str,
    /// Part that it sits in.
    pub part: String,
    /// Watts.
    pub heat_w: f64,
}

/// Iron loss of a transformer at high mains.
#[must_use]
pub fn core_w(site: &Site, transformer: &Transformer) -> f64 {
    let rated_w = transformer
        .core_loss_w
        .unwrap_or_else(|| estimated_core_loss_w(transformer.va));
    core_loss_w(rated_w, site.supply.mains.high_v, site.primary_v(transformer))
}

/// Heat of a section but for its pass devices.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SectionHeat {
    /// In the windings.
    pub winding_w: f64,
    /// In all diodes.
    pub rectifier_w: f64,
    /// In the bank.
    pub reservoir_w: f64,
}

impl SectionHeat {
    /// Heat of a section at high mains.
    ///
    /// # Errors
    /// Names the column that is blank.
    pub fn new(site: &Site, raw: &Raw, load_a: Known<f64>, high: Known<&Waveform>) -> Known<SectionHeat> {
        let ohm = site.winding_ohm(raw.transformer, raw.hookup, Corner::High, load_a?, &[]);
        Ok(SectionHeat {
            winding_w: ohm * high?.source_rms_a().powi(2),
            rectifier_w: rectifier::loss_w(site, raw, high)?,
            reservoir_w: reservoir::loss_w(site, raw, high)?,
        })
    }

    /// Sum of the three.
    #[must_use]
    pub fn sum_w(&self) -> f64 {
        self.winding_w + self.rectifier_w + self.reservoir_w
    }
}

/// The one order in which the heat of a build is added up, so that equal builds have equal sums to the last bit: iron by
/// transformer, then sections, then pass devices, each in the order of the build.
#[must_use]
pub fn total_w(parts: impl Iterator<Item = f64>) -> f64 {
    parts.fold(0.0, |sum, w| sum + w)
}

/// Heat as it is compared: whole microwatts.
#[must_use]
pub fn compared(heat_w: f64) -> i64 {
    microwatts(heat_w)
}
