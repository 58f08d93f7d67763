//! Owns the walk of one source with the feeds that came of it, and the view that an outlet of a plan has of them.

use std::collections::BTreeMap;

use super::best::Bill;
use super::rivals::{Market, NEVER_TIES_W};
use crate::audit::Site;
use crate::catalogue::Part;
use crate::screen::{Counts, Feed, Group, Outlet, Stop, Walk};
use crate::units::Money;

/// A feed, or the transformer of a plan, ready to be combined.
pub(super) struct Ready<'c> {
    /// Lower bound of its share of any build's score.
    pub(super) score: f64,
    /// The same of its cost.
    pub(super) floor: i64,
    pub(super) heat_w: f64,
    pub(super) lines: Vec<(&'c Part, u64)>,
    pub(super) fitted: Money,
    /// Apparent power of its windings.
    pub(super) va: f64,
    /// Places in which it differs from the build to stay close to.
    pub(super) changes: usize,
    /// `None`: the transformer.
    pub(super) feed: Option<Feed<'c>>,
}

/// One source with its walk and the feeds that came of it so far, in the order of their scores. Plans that use the source
/// share it: but for the low corner a section knows nothing of the others on its transformer.
pub(super) struct Flow<'a, 'c> {
    pub(super) walk: Walk<'a, 'c>,
    pub(super) ready: Vec<Ready<'c>>,
    /// Score up to which feeds are asked for.
    pub(super) need: f64,
}

impl<'c> Flow<'_, 'c> {
    /// Least score of the feeds that have not come yet.
    pub(super) fn to_come(&self) -> f64 {
        self.walk.floor().unwrap_or(f64::INFINITY)
    }

    /// Asks the walk for the next feed up to `most`; false when there is none or it was told to stop.
    pub(super) fn one_more(&mut self, most: f64, stop: &Stop, counts: &mut Counts) -> bool {
        let Some((feed, score)) = self.walk.next(most, stop, counts) else {
            return false;
        };
        self.ready.push(Ready {
            score,
            floor: feed.floor_cost.0,
            heat_w: feed.heat_w(),
            lines: feed.lines(),
            fitted: feed.fitted(),
            va: feed.va,
            changes: feed.changes,
            feed: Some(feed),
        });
        true
    }
}

/// One outlet of a plan: which feeds of its source hold beside the plan's other sections, as far as is looked at.
pub(super) struct View {
    pub(super) flow: usize,
    /// Places of those that hold.
    pub(super) held: Vec<usize>,
    /// So many were looked at.
    pub(super) seen: usize,
    /// Least heat by lines: of equal lines only the coolest can matter, where nothing else tells them apart.
    pub(super) coolest: Option<BTreeMap<Bill, f64>>,
    /// Of those that hold, the heat, and whether they surely hold beside the plan's other sections; kept where only the best build is
    /// wanted.
    pub(super) robust: Option<Vec<(f64, bool)>>,
    /// Places that may differ from the build to stay close to.
    pub(super) most_changes: usize,
    /// Least score of those that hold, or of those that were not looked at.
    pub(super) floor: f64,
    /// Whether a feed may hold, and surely holds, beside the plan's other sections, sinks aside.
    pub(super) beside: BTreeMap<usize, (bool, bool)>,
    /// Score from which they are asked to be looked at.
    pub(super) need: f64,
}

impl View {
    /// Least score of any of its feeds.
    pub(super) fn floor(&self) -> f64 {
        self.floor
    }

    /// Least score of what was not looked at.
    pub(super) fn to_come(&self, flow: &Flow) -> f64 {
        flow.ready
            .get(self.seen)
            .map_or_else(|| flow.to_come(), |next| next.score)
    }

    fn is_coolest(&mut self, ready: &Ready) -> bool {
        let Some(coolest) = &mut self.coolest else { return true };
        let bill: Bill = ready.lines.iter().map(|&(part, pieces)| (part.id, pieces)).collect();
        let coolest = coolest.entry(bill).or_insert(f64::INFINITY);
        let may_matter = ready.heat_w <= *coolest + NEVER_TIES_W;
        *coolest = coolest.min(ready.heat_w);
        may_matter
    }

    /// Whether one of those that hold betters it.
    fn bettered(&self, groups: &[Group], outlet: &Outlet, flow: &Flow, ready: &Ready) -> bool {
        let Some(robust) = &self.robust else { return false };
        let market = Market {
            group: &groups[outlet.group()],
            outlet,
        };
        let cooler = self
            .held
            .iter()
            .zip(robust)
            .filter(|(_, (heat_w, _))| *heat_w <= ready.heat_w);
        cooler
            .into_iter()
            .any(|(&place, &(_, robust))| market.betters(&flow.ready[place], robust, ready))
    }

    /// Looks at what has come; only up to the first that holds if `only_first`.
    pub(super) fn look(&mut self, site: &Site, groups: &[Group], outlet: &Outlet, flow: &Flow, only_first: bool) {
        while let Some(ready) = flow.ready.get(self.seen) {
            if only_first && !self.held.is_empty() {
                break;
            }
            let near = |feed: &&Feed| feed.changes <= self.most_changes;
            if let Some(feed) = ready.feed.as_ref().filter(near)
                && !self.bettered(groups, outlet, flow, ready)
            {
                let only_best = self.robust.is_some();
                let (may, surely) = *self.beside.entry(feed.stack).or_insert_with(|| {
                    let may = feed.may_hold(site, groups, outlet);
                    let ask = may && only_best && outlet.others_va() > 0.0;
                    (may, ask && feed.surely_holds(site, groups, outlet))
                });
                if may && self.is_coolest(ready) {
                    self.held.push(self.seen);
                    self.robust
                        .iter_mut()
                        .for_each(|robust| robust.push((ready.heat_w, surely)));
                }
            }
            self.seen += 1;
        }
        self.floor = match self.held.first() {
            Some(&first) => flow.ready[first].score,
            None => self.to_come(flow),
        };
    }
}
