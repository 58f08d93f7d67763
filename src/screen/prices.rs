//! Owns lower bounds on prices: what a piece costs at least, whatever the other rails use.

use crate::catalogue::{Part, Slot};
use crate::units::Money;

/// Least unit prices for one rail. A break counts pieces over the whole supply, so a piece is never cheaper than at the
/// most pieces that any build can hold, and no build holds more than the stock.
#[derive(Debug, Clone)]
pub struct FloorPrices {
    builds: u64,
    /// By part: most pieces that the other rails can use of it.
    elsewhere: Vec<u64>,
}

impl FloorPrices {
    /// For a run of `builds`, with the most pieces that the other rails can use of each part.
    #[must_use]
    pub fn new(builds: u64, elsewhere: Vec<u64>) -> FloorPrices {
        FloorPrices { builds, elsewhere }
    }

    /// Least cost of `pieces` of a part in one unit when this rail uses just them (a sink may also stand on the
    /// rail's rectifier, so it is priced as if there were two).
    #[must_use]
    pub fn cost(&self, part: &Part, pieces: u64) -> Money {
        let here = if part.slot == Slot::Sink { 2 } else { pieces };
        let most = (here + self.elsewhere[part.id.0 as usize]) * self.builds;
        part.least_cost(pieces, most)
    }
}
