//! Owns which feeds of an outlet cannot be in the best build because another betters them whatever the rest of it.
//!
//! A betters B when in every build with B, A in its place costs no more and heats no more, one of them less, and all
//! limits still hold. Cost: a part's price hangs on the pieces that the rest of the build takes, so the difference is
//! taken at its worst over all that it can take. Stock: A's parts must suffice for any build. What else of a build can
//! feel the exchange: nothing, where the plan has one outlet; else the load of the transformer (which the currents tell),
//! the loads on its primary (so both must draw the same), and A's own low corner, which must hold beside the most that
//! the other sections can draw.

use super::view::Ready;
use crate::catalogue::Part;
use crate::screen::{Feed, Group, Outlet};

/// Two feeds whose heats differ by more than this never tie in whole microwatts.
pub(super) const NEVER_TIES_W: f64 = 1.5e-6;

/// Where a feed is looked at.
pub(super) struct Market<'m, 'c> {
    pub(super) group: &'m Group<'c>,
    pub(super) outlet: &'m Outlet<'c>,
}

impl Market<'_, '_> {
    /// Whether `a` betters `b`; `robust`: `a` holds beside the most that the plan's other sections can draw.
    pub(super) fn betters(&self, a: &Ready, robust: bool, b: &Ready) -> bool {
        let (Some(one), Some(other)) = (&a.feed, &b.feed) else {
            return false;
        };
        a.heat_w <= b.heat_w
            && self.may_replace(one, robust, other)
            && self
                .most_dearer(a, b)
                .is_some_and(|dearer| dearer < 0 || (dearer == 0 && a.heat_w < b.heat_w - NEVER_TIES_W))
    }

    /// Whether all limits but caps and stock hold with `a` where they hold with `b`.
    fn may_replace(&self, a: &Feed, robust: bool, b: &Feed) -> bool {
        if self.outlet.others_va() <= 0.0 {
            return true;
        }
        let same_section = a.rectifier.part.id == b.rectifier.part.id
            && a.reservoir.part.id == b.reservoir.part.id
            && a.cans == b.cans
            && (a.devices.iter().zip(&b.devices)).all(|((x, _), (y, _))| x.part.id == y.part.id);
        // The junction of a pair's rectifier hangs on both halves.
        let sink = |feed: &Feed| feed.rectifier_sink.map(|s| s.part.id);
        #[allow(clippy::float_cmp)] // the very same load
        let same_load = a.load_a == b.load_a;
        (self.outlet.pair.is_none() || sink(a) == sink(b)) && (same_section || (robust && same_load && a.va <= b.va))
    }

    /// By how much a build can get dearer at most with `a` in the place of `b`; `None` where the stock may not suffice.
    fn most_dearer(&self, a: &Ready, b: &Ready) -> Option<i64> {
        let mut dearer = a.fitted.0 - b.fitted.0;
        let pieces = |lines: &[(&Part, u64)], part: &Part| {
            let line = lines.iter().find(|(p, _)| p.id == part.id);
            line.map_or(0, |&(_, pieces)| pieces)
        };
        for &(part, own) in &a.lines {
            dearer += self.group.most_dearer(part, own, pieces(&b.lines, part))?;
        }
        for &(part, its) in b.lines.iter().filter(|(part, _)| pieces(&a.lines, part) == 0) {
            dearer += self.group.most_dearer(part, 0, its)?;
        }
        Some(dearer)
    }
}
