//! Owns how far a feed is from a build to stay close to.

use crate::build::Place;
use crate::catalogue::{PassDevice, Rectifier, Sink};
use crate::screen::shelf::Bank;

/// What stood in the places of an outlet's rails, and how many of them may differ.
#[derive(Debug, Clone)]
pub struct Apart {
    /// By rail of the outlet, as [`crate::build::places`] writes it.
    pub rails: Vec<[String; 7]>,
    /// Most places that may differ.
    pub most: usize,
}

impl Apart {
    fn count(&self, place: Place, text: &str) -> usize {
        self.rails.iter().filter(|rail| rail[place as usize] != text).count()
    }

    /// Changes by a rectifier, over all rails.
    pub(super) fn rectifier(&self, rectifier: &Rectifier, pieces: u64) -> usize {
        self.count(Place::Rectifier, &format!("{pieces} x {}", rectifier.part.name))
    }

    /// By a rectifier's sink.
    pub(super) fn rectifier_sink(&self, sink: Option<&Sink>) -> usize {
        self.count(Place::RectifierSink, sink.map_or("", |s| s.part.name.as_str()))
    }

    /// By a bank.
    pub(super) fn bank(&self, bank: Bank) -> usize {
        self.count(Place::Reservoir, &format!("{} x {}", bank.cans, bank.can.part.name))
    }

    /// By the device of one rail.
    pub(super) fn device(&self, rail: usize, device: &PassDevice) -> usize {
        usize::from(self.rails[rail][Place::Pass as usize] != device.part.name)
    }

    /// By its sink.
    pub(super) fn sink(&self, rail: usize, sink: Option<&Sink>) -> usize {
        usize::from(self.rails[rail][Place::Sink as usize] != sink.map_or("", |s| s.part.name.as_str()))
    }
}
