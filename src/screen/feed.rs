//! Owns a feed: the parts of one section with the devices behind it, complete with sinks.

use crate::build::pieces_of_rectifier;
use crate::catalogue::{Part, PassDevice, Rectifier, Reservoir, Sink};
use crate::supply::Path;
use crate::units::Money;

/// A choice for one outlet of a plan that meets every limit of its own; what the sections of a plan must meet together
/// is for the audit to say.
#[derive(Debug, Clone)]
pub struct Feed<'c> {
    /// Rectifier.
    pub rectifier: &'c Rectifier,
    /// Its pieces: none on the negative half of a dual pair.
    pub rectifier_pieces: u64,
    /// Its sink.
    pub rectifier_sink: Option<&'c Sink>,
    /// Capacitor.
    pub reservoir: &'c Reservoir,
    /// Capacitors in parallel.
    pub cans: u32,
    /// Device and its sink by rail.
    pub devices: Vec<(&'c PassDevice, Option<&'c Sink>)>,
    /// Winding, rectifier and reservoir.
    pub section_w: f64,
    /// Pass devices by rail.
    pub pass_w: Vec<f64>,
    /// Apparent power of its windings.
    pub va: f64,
    /// Least cost that it can have in any build, the transformer aside.
    pub floor_cost: Money,
    /// In how many places it differs from the build to stay close to, those of the plan aside.
    pub changes: usize,
}

impl<'c> Feed<'c> {
    /// Pieces of a rectifier on an outlet; none on the negative half of a dual pair.
    #[must_use]
    pub(super) fn pieces(rectifier: &Rectifier, path: Path, holds_secondaries: bool) -> u64 {
        if holds_secondaries {
            pieces_of_rectifier(rectifier.kind, path)
        } else {
            0
        }
    }

    /// Its heat.
    #[must_use]
    pub fn heat_w(&self) -> f64 {
        self.section_w + self.pass_w.iter().sum::<f64>()
    }

    /// Price of the fitted values of its devices.
    #[must_use]
    pub fn fitted(&self) -> Money {
        self.devices.iter().map(|(device, _)| device.fitted_price).sum()
    }

    /// Its parts with their pieces, in slot order, each part once.
    #[must_use]
    pub fn lines(&self) -> Vec<(&'c Part, u64)> {
        let mut lines: Vec<(&'c Part, u64)> = vec![(&self.reservoir.part, u64::from(self.cans))];
        let sinks = self.devices.iter().filter_map(|&(_, sink)| sink);
        let singles = (self.devices.iter().map(|(device, _)| &device.part))
            .chain(self.rectifier_sink.into_iter().chain(sinks).map(|sink| &sink.part))
            .map(|part| (part, 1));
        for (part, pieces) in std::iter::once((&self.rectifier.part, self.rectifier_pieces)).chain(singles) {
            match lines.iter_mut().find(|(known, _)| known.id == part.id) {
                Some((_, count)) => *count += pieces,
                None if pieces > 0 => lines.push((part, pieces)),
                None => {}
            }
        }
        lines.sort_by_key(|(part, _)| part.id);
        lines
    }
}
