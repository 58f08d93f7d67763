//! Owns lower bounds on prices: what a piece costs at least, whatever the other rails use.

use crate::catalogue::{Part, Slot};
use crate::supply::Supply;
use crate::units::Money;

/// Least unit prices. A break counts pieces over the whole supply, so a piece is never cheaper than at the most pieces
/// that any build can hold, and no build holds more than the stock.
#[derive(Debug, Clone, Copy)]
pub struct FloorPrices {
    builds: u64,
    /// Rails of the supply.
    rails: u64,
    most_cans: u64,
}

/// Most pieces of one diode type in a rail's rectifier.
const MOST_DIODES: u64 = 4;
/// Sinks of one type in a rail: one on the rectifier, one on the pass device.
const MOST_SINKS: u64 = 2;

impl FloorPrices {
    /// For a supply.
    #[must_use]
    pub fn new(supply: &Supply) -> FloorPrices {
        FloorPrices {
            builds: supply.builds,
            rails: supply.rails.len() as u64,
            most_cans: u64::from(supply.caps.cans),
        }
    }

    /// Least cost of `pieces` of a part in one unit when this rail uses just them (of sinks: perhaps one more).
    #[must_use]
    pub fn cost(&self, part: &Part, pieces: u64) -> Money {
        let elsewhere = match part.slot {
            Slot::Transformer | Slot::Pass => self.rails - 1,
            Slot::Rectifier => MOST_DIODES * (self.rails - 1),
            Slot::Reservoir => self.most_cans * (self.rails - 1),
            Slot::Sink => MOST_SINKS * self.rails - pieces,
        };
        let most = (pieces + elsewhere) * self.builds;
        part.unit_price(part.stock.map_or(most, |stock| most.min(stock))) * pieces
    }
}
