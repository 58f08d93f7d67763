//! Owns a column: one rail's section and device, complete with sinks.

use std::sync::Arc;

use crate::build::{Hookup, pieces_of_rectifier};
use crate::catalogue::{Part, PassDevice, Rectifier, Reservoir, Sink, Transformer};
use crate::supply::Path;
use crate::units::Money;

/// A choice for one rail with its own section and transformer that meets every limit of its own.
#[derive(Debug, Clone)]
pub struct Column<'c> {
    /// Transformer.
    pub transformer: &'c Transformer,
    /// Its secondaries in use.
    pub hookup: Arc<Hookup>,
    /// Rectifier circuit.
    pub path: Path,
    /// Rectifier.
    pub rectifier: &'c Rectifier,
    /// Its sink.
    pub rectifier_sink: Option<&'c Sink>,
    /// Capacitor.
    pub reservoir: &'c Reservoir,
    /// Capacitors in parallel.
    pub cans: u32,
    /// Device.
    pub pass: &'c PassDevice,
    /// Its sink.
    pub sink: Option<&'c Sink>,
    /// Iron loss.
    pub core_w: f64,
    /// Winding, rectifier and reservoir.
    pub section_w: f64,
    /// Pass device.
    pub pass_w: f64,
    /// Least cost that it can have in any build.
    pub floor_cost: Money,
}

impl<'c> Column<'c> {
    /// Heat of this column alone.
    #[must_use]
    pub fn heat_w(&self) -> f64 {
        self.core_w + self.section_w + self.pass_w
    }

    /// Its parts with their pieces, in slot order, each part once.
    #[must_use]
    pub fn lines(&self) -> Vec<(&'c Part, u64)> {
        let mut lines = vec![
            (&self.transformer.part, 1),
            (
                &self.rectifier.part,
                pieces_of_rectifier(self.rectifier.kind, self.path),
            ),
            (&self.reservoir.part, u64::from(self.cans)),
            (&self.pass.part, 1),
        ];
        match (self.rectifier_sink, self.sink) {
            (Some(a), Some(b)) if a.part.id == b.part.id => lines.push((&a.part, 2)),
            (a, b) => {
                let mut sinks: Vec<_> = [a, b].into_iter().flatten().map(|s| (&s.part, 1)).collect();
                sinks.sort_by_key(|(part, _)| part.id);
                lines.extend(sinks);
            }
        }
        lines
    }
}
