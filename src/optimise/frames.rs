//! Owns the frames of a search: plans that together feed every rail, each once, within a reach.

use super::lists::Lists;
use crate::audit::Site;

/// Plans that together feed every rail, each once.
pub(super) struct Frame {
    /// Places among the sources, by first rail.
    pub(super) plans: Vec<usize>,
    /// Least score of a build on it, its transformers at their true prices.
    pub(super) floor: f64,
}

/// Every frame whose least score is within reach, the least first; `least` by set of rails.
pub(super) fn frames(lists: &Lists, site: &Site, least: &[f64], reach: f64, near: Option<usize>) -> Vec<Frame> {
    let mut by_mask: Vec<Vec<(f64, usize)>> = vec![Vec::new(); least.len()];
    for (place, source) in lists.sources.iter().enumerate() {
        let floor = source.floor();
        if floor.is_finite() {
            by_mask[source.plan.mask as usize].push((floor, place));
        }
    }
    for plans in &mut by_mask {
        plans.sort_by(|a, b| a.0.total_cmp(&b.0).then(a.1.cmp(&b.1)));
    }
    let mut finder = Finder {
        lists,
        site,
        least,
        reach,
        near: near.unwrap_or(usize::MAX),
        by_mask,
        chosen: Vec::new(),
        found: Vec::new(),
    };
    finder.fill(least.len() - 1, 0.0, 0);
    let mut found = finder.found;
    found.sort_by(|a, b| a.floor.total_cmp(&b.floor).then_with(|| a.plans.cmp(&b.plans)));
    found
}

struct Finder<'f, 'a, 'c> {
    lists: &'f Lists<'a, 'c>,
    site: &'f Site<'c>,
    least: &'f [f64],
    reach: f64,
    near: usize,
    by_mask: Vec<Vec<(f64, usize)>>,
    chosen: Vec<usize>,
    found: Vec<Frame>,
}

impl Finder<'_, '_, '_> {
    /// Adds plans for the first rail that is left.
    fn fill(&mut self, left: usize, so_far: f64, changes: usize) {
        if left == 0 {
            self.close(so_far);
            return;
        }
        let first = left & left.wrapping_neg();
        let mut mask = left;
        while mask != 0 {
            if mask & first != 0 {
                let rest = self.least[left & !mask];
                for at in 0..self.by_mask[mask].len() {
                    let (floor, place) = self.by_mask[mask][at];
                    if so_far + floor + rest > self.reach {
                        break;
                    }
                    let changes = changes + self.lists.sources[place].changes;
                    if changes <= self.near {
                        self.chosen.push(place);
                        self.fill(left & !mask, so_far + floor, changes);
                        self.chosen.pop();
                    }
                }
            }
            mask = (mask - 1) & left;
        }
    }

    /// A whole frame, if its transformers are in stock and at their true prices within reach.
    fn close(&mut self, so_far: f64) {
        let (lists, chosen) = (self.lists, &self.chosen);
        let mut floor = so_far;
        for &place in chosen {
            let plan = lists.sources[place].plan;
            let id = plan.transformer.part.id;
            let count = chosen
                .iter()
                .filter(|&&p| lists.sources[p].plan.transformer.part.id == id)
                .count() as u64;
            // Each at the price of all: what the floor took is replaced.
            let price = plan.transformer.part.unit_price(count * self.site.supply.builds);
            floor += lists.weights.score(price.0 - plan.floor_cost, 0);
        }
        if floor <= self.reach && lists.stocked(self.site, chosen) {
            self.found.push(Frame {
                plans: chosen.clone(),
                floor,
            });
        }
    }
}
