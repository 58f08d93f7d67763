//! Owns lower bounds on prices: what a piece costs at least, whatever else the build uses.

use crate::catalogue::{Part, Slot};
use crate::units::Money;

/// Least unit prices for some rails. A break counts pieces over the whole supply, so a piece is never cheaper than at
/// the most pieces that any build can hold, and no build holds more than the stock.
#[derive(Debug, Clone)]
pub(super) struct FloorPrices {
    builds: u64,
    /// Rails that one section feeds.
    rails: u64,
    /// By part: most pieces that the other rails can use of it.
    elsewhere: Vec<u64>,
}

impl FloorPrices {
    /// For a run of `builds` and a section with so many rails, with the most pieces that all other rails can use of each
    /// part.
    #[must_use]
    pub(super) fn new(builds: u64, rails: usize, elsewhere: Vec<u64>) -> FloorPrices {
        FloorPrices {
            builds,
            rails: rails as u64,
            elsewhere,
        }
    }

    /// Least cost of `pieces` of a part in one unit. Devices are counted one by one, so each is priced as if all rails
    /// of the section took it; a sink as if it stood on the rectifier too.
    #[must_use]
    pub(super) fn cost(&self, part: &Part, pieces: u64) -> Money {
        let here = match part.slot {
            Slot::Sink => 1 + self.rails,
            Slot::Pass => self.rails,
            Slot::Transformer | Slot::Rectifier | Slot::Reservoir => pieces,
        };
        let most = (here + self.elsewhere[part.id.0 as usize]) * self.builds;
        part.least_cost(pieces, most)
    }

    /// Most by which `own` pieces of a part cost more in a build than `its` in their place, whatever else takes of it, up
    /// to `more` pieces beside what the other rails can; `None` where the stock may not suffice for more pieces.
    pub(super) fn most_dearer(&self, part: &Part, own: u64, its: u64, more: u64) -> Option<i64> {
        if own == its {
            return Some(0);
        }
        let rest = self.elsewhere[part.id.0 as usize] + more;
        if own > its && part.stock.is_some_and(|stock| stock < (rest + own) * self.builds) {
            return None;
        }
        let cost = |pieces: u64| (part.unit_price(pieces * self.builds) * pieces).0;
        (0..=rest).map(|rest| cost(rest + own) - cost(rest + its)).max()
    }
}
