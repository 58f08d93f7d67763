//! Owns the depth-first combination of the lists of one frame, up to a reach.

use super::Question;
use super::best::{Bill, Wanted};
use super::frame_build::{Fed, Judge, build, heat_w};
use super::lists::Lists;
use super::view::Ready;
use crate::audit::{Site, compared, transformer, whole};
use crate::catalogue::Part;
use crate::screen::{Counts, Feed, Weights, heat_floor};
use crate::supply::Path;
use crate::units::Money;

/// How a run over all combinations ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Run {
    /// Everything up to the reach was looked at.
    Whole,
    /// Told to stop.
    Stopped,
    /// Out of nodes.
    OutOfNodes,
}

/// An entry that may take part.
#[derive(Debug, Clone, Copy)]
pub(super) struct Kept {
    /// Its place in the list.
    pub(super) place: usize,
    /// Least share of the cost.
    pub(super) floor: i64,
    /// Least share of the score.
    pub(super) score: f64,
}

/// One list of a frame: a transformer, or the feeds of an outlet.
pub(super) struct List<'f, 'c> {
    /// Place of its plan in the frame.
    pub(super) plan: usize,
    /// `None`: the transformer.
    pub(super) outlet: Option<usize>,
    pub(super) ready: &'f [Ready<'c>],
    /// Entries that may take part, scores rising.
    pub(super) kept: Vec<Kept>,
}

impl<'f, 'c> List<'f, 'c> {
    /// With the entries at these places.
    pub(super) fn new(plan: usize, outlet: Option<usize>, ready: &'f [Ready<'c>], places: &[usize]) -> List<'f, 'c> {
        let kept = |&place: &usize| Kept {
            place,
            floor: ready[place].floor,
            score: ready[place].score,
        };
        List {
            plan,
            outlet,
            ready,
            kept: places.iter().map(kept).collect(),
        }
    }
}

/// What all runs share.
pub(super) struct Setting<'f, 'a, 'c> {
    pub(super) question: &'f Question<'c>,
    pub(super) site: &'f Site<'c>,
    pub(super) lists: &'f Lists<'a, 'c>,
    /// Parts of the catalogue.
    pub(super) parts: usize,
}

/// What a search works with over all its runs.
pub(super) struct Work<'w, 's, 'c> {
    pub(super) judge: Judge<'s, 'c>,
    pub(super) wanted: &'w mut dyn Wanted<'c>,
    pub(super) counts: &'w mut Counts,
}

/// Rounding of sums of scores: a bound may let through what fails, never the reverse.
pub(super) fn slack(score: f64) -> f64 {
    1e-9 * score.abs() + 2.0
}

/// One run over all combinations of a frame.
pub(super) struct Combine<'f, 'w, 's, 'a, 'c> {
    set: &'f Setting<'f, 'a, 'c>,
    /// Sources of the frame.
    plans: &'f [usize],
    lists: &'f [List<'f, 'c>],
    work: &'f mut Work<'w, 's, 'c>,
    reach: f64,
    /// Lists in the order in which they are decided.
    order: Vec<usize>,
    /// Behind each depth: least cost, heat, score and changes of the lists not yet decided.
    rest: Vec<(i64, f64, f64, usize)>,
    /// Behind each depth, by part: most pieces that the undecided lists can add.
    addable: Vec<Vec<u64>>,
    /// At each depth the plan that is complete with it, if its sections must hold together.
    completes: Vec<Option<usize>>,
    pieces: Vec<u64>,
    chosen: Vec<usize>,
    /// Nodes at which the run gives up.
    last_node: u64,
    ended: Option<Run>,
}

/// What is decided so far.
#[derive(Debug, Clone, Copy, Default)]
struct Decided {
    cost: i64,
    heat_w: f64,
    fitted: i64,
    changes: usize,
}

impl<'f, 'w, 's, 'a, 'c> Combine<'f, 'w, 's, 'a, 'c> {
    pub(super) fn new(
        set: &'f Setting<'f, 'a, 'c>,
        plans: &'f [usize],
        lists: &'f [List<'f, 'c>],
        work: &'f mut Work<'w, 's, 'c>,
        reach: f64,
    ) -> Self {
        let of_plan = |plan: usize| lists.iter().filter(move |l| l.plan == plan).map(|l| l.kept.len());
        let mut order: Vec<usize> = (0..lists.len()).collect();
        order.sort_by_key(|&l| {
            let list = &lists[l];
            let all: usize = of_plan(list.plan).sum();
            (all, list.plan, list.outlet.is_some(), list.kept.len(), l)
        });
        let completes = (0..order.len())
            .map(|depth| {
                let plan = lists[order[depth]].plan;
                let last = order[depth + 1..].iter().all(|&l| lists[l].plan != plan);
                let sections = set.lists.sources[plans[plan]].views.len();
                (last && sections > 1).then_some(plan)
            })
            .collect();
        let mut rest = vec![(0, 0.0, 0.0, 0); order.len() + 1];
        let mut addable = vec![vec![0; set.parts]; order.len() + 1];
        for depth in (0..order.len()).rev() {
            let list = &lists[order[depth]];
            let entries = || list.kept.iter().map(|k| &list.ready[k.place]);
            let cost = list.kept.iter().map(|k| k.floor).min().unwrap_or(0);
            let heat = entries().map(|r| r.heat_w).fold(f64::INFINITY, f64::min);
            let score = list.kept.first().map_or(0.0, |k| k.score);
            let changes = entries().map(|r| r.changes).min().unwrap_or(0);
            let behind: (i64, f64, f64, usize) = rest[depth + 1];
            rest[depth] = (behind.0 + cost, behind.1 + heat, behind.2 + score, behind.3 + changes);
            let mut most = vec![0; set.parts];
            for &(part, pieces) in entries().flat_map(|r| &r.lines) {
                let most = &mut most[part.id.0 as usize];
                *most = pieces.max(*most);
            }
            addable[depth] = addable[depth + 1].iter().zip(most).map(|(a, b)| a + b).collect();
        }
        Combine {
            set,
            plans,
            work,
            reach,
            chosen: vec![0; lists.len()],
            lists,
            order,
            rest,
            addable,
            completes,
            pieces: vec![0; set.parts],
            last_node: u64::MAX,
            ended: None,
        }
    }

    /// Looks at everything up to the reach, within a budget of nodes.
    pub(super) fn run(&mut self, budget: u64) -> Run {
        self.last_node = self.work.counts.nodes.saturating_add(budget);
        self.decide(0, Decided::default(), &mut Vec::new());
        self.ended.unwrap_or(Run::Whole)
    }

    /// Decides the list at this depth.
    fn decide(&mut self, depth: usize, so_far: Decided, used: &mut Vec<&'c Part>) {
        let (site, weights) = (self.set.site, self.set.lists.weights);
        let at = self.order[depth];
        let (rest_cost, rest_heat, rest_score, rest_changes) = self.rest[depth + 1];
        let decided = score(weights, so_far.cost, so_far.heat_w);
        let near = self.set.question.near.as_ref().map_or(usize::MAX, |near| near.most);
        for index in 0..self.lists[at].kept.len() {
            let Kept {
                place,
                floor,
                score: own,
            } = self.lists[at].kept[index];
            self.work.counts.nodes += 1;
            if self.work.counts.nodes.is_multiple_of(4096) && self.set.question.stop.now() {
                self.ended = Some(Run::Stopped);
            } else if self.work.counts.nodes > self.last_node {
                self.ended = Some(Run::OutOfNodes);
            }
            if self.ended.is_some() {
                return;
            }
            // Scores rise, so what is beyond the limit stays so.
            if self.too_far(decided + own + rest_score) {
                break;
            }
            let ready = &self.lists[at].ready[place];
            let heat_w = so_far.heat_w + ready.heat_w;
            let least_heat = heat_bound(heat_w + rest_heat);
            let changes = so_far.changes + ready.changes;
            // A hair less than the sum, which the audit adds up in another order.
            let cool = site.holds(whole::heat(site.supply, Ok((heat_w + rest_heat) * (1.0 - 1e-12))));
            let least_score = decided + own + rest_score;
            if self
                .work
                .wanted
                .beyond(so_far.cost + floor + rest_cost, least_heat, least_score)
                || !cool
                || changes.saturating_add(rest_changes) > near
            {
                continue;
            }
            let known = used.len();
            if self.take(ready, used) {
                self.chosen[at] = place;
                let fitted = so_far.fitted + ready.fitted.0;
                let cost = self.priced(depth + 1, used).0 + fitted;
                let least = cost + rest_cost;
                let affordable = site.holds(whole::cost(site.supply, Money(least)));
                if affordable
                    && !self.too_far(score(weights, cost, heat_w) + rest_score)
                    && !(self.work.wanted).beyond(least, least_heat, score(weights, cost, heat_w) + rest_score)
                    && self.carried(depth)
                {
                    if depth + 1 == self.order.len() {
                        self.offer(Money(cost), used);
                    } else {
                        let decided = Decided {
                            cost,
                            heat_w,
                            fitted,
                            changes,
                        };
                        self.decide(depth + 1, decided, used);
                    }
                }
            }
            for &(part, pieces) in &ready.lines {
                self.pieces[part.id.0 as usize] -= pieces;
            }
            used.truncate(known);
        }
    }

    /// Whether a build with at least this score is of no interest, or beyond the reach.
    fn too_far(&self, least: f64) -> bool {
        let limit = self.work.wanted.limit().min(self.reach);
        least > limit + slack(limit)
    }

    /// Whether the transformer of the plan decided last carries its sections so far; when the plan is complete, whether
    /// they hold together.
    fn carried(&mut self, depth: usize) -> bool {
        let list = &self.lists[self.order[depth]];
        let source = &self.set.lists.sources[self.plans[list.plan]];
        if source.views.len() < 2 {
            return true;
        }
        let decided = self.order[..=depth].iter().map(|&l| (l, &self.lists[l]));
        let va: f64 = decided
            .filter(|(_, l)| l.plan == list.plan)
            .filter(|(_, l)| l.outlet.is_some_and(|o| source.plan.outlets[o].path != Path::Dual))
            .map(|(l, list)| list.ready[self.chosen[l]].va)
            .sum();
        if !self
            .set
            .site
            .holds(transformer::load(source.plan.transformer, Ok(va * (1.0 - 1e-12))))
        {
            return false;
        }
        match self.completes[depth] {
            None => true,
            Some(plan) => {
                let places = self.places(plan);
                self.work.judge.holds(self.set.lists, self.plans[plan], &places)
            }
        }
    }

    /// Chosen places of a plan's feeds, by outlet.
    fn places(&self, plan: usize) -> Vec<usize> {
        let mut places: Vec<(usize, usize)> = (self.lists.iter().zip(&self.chosen))
            .filter(|(list, _)| list.plan == plan)
            .filter_map(|(list, &place)| Some((list.outlet?, place)))
            .collect();
        places.sort_unstable();
        places.into_iter().map(|(_, place)| place).collect()
    }

    /// Adds an entry's pieces; whether the stock still allows them.
    fn take(&mut self, ready: &Ready<'c>, used: &mut Vec<&'c Part>) -> bool {
        let mut stocked = true;
        for &(part, pieces) in &ready.lines {
            let count = &mut self.pieces[part.id.0 as usize];
            if *count == 0 {
                used.push(part);
            }
            *count += pieces;
            stocked &= self.set.site.holds(whole::stock(self.set.site.supply, part, *count));
        }
        stocked
    }

    /// Least cost of the parts in use: at the tier that they and the most that may still join them reach. Behind the
    /// last list nothing can join, and this is their cost.
    fn priced(&self, depth: usize, used: &[&'c Part]) -> Money {
        let price = |part: &&'c Part| {
            let id = part.id.0 as usize;
            let most = (self.pieces[id] + self.addable[depth][id]) * self.set.site.supply.builds;
            part.least_cost(self.pieces[id], most)
        };
        used.iter().map(price).sum()
    }

    /// Offers one choice (a place in each list), whoever made it, if it holds; returns its cost and heat.
    pub(super) fn offer_choice(&mut self, choice: &[usize]) -> Option<(i64, i64)> {
        let mut used = Vec::new();
        let mut stocked = true;
        let mut fitted = Money(0);
        let mut changes = 0;
        for (at, &place) in choice.iter().enumerate() {
            self.chosen[at] = place;
            let ready = &self.lists[at].ready[place];
            changes += ready.changes;
            fitted = fitted + ready.fitted;
            stocked &= self.take(ready, &mut used);
        }
        let cost = self.priced(self.order.len(), &used) + fitted;
        let near = self.set.question.near.as_ref().map_or(usize::MAX, |near| near.most);
        let holds = stocked
            && changes <= near
            && self.set.site.holds(whole::cost(self.set.site.supply, cost))
            && (0..self.order.len()).all(|depth| self.carried(depth));
        let heat = if holds { self.offer(cost, &used) } else { None };
        heat.map(|heat| (cost.0, heat))
    }

    /// A complete choice that no other limit speaks against; returns its heat as compared if the cap allows it.
    fn offer(&mut self, cost: Money, used: &[&'c Part]) -> Option<i64> {
        let fed: Vec<Fed<'_, 'c>> = (self.plans.iter().enumerate())
            .map(|(place, &source)| {
                let source = &self.set.lists.sources[source];
                let feeds = self.places(place).into_iter().zip(&source.views);
                let flows = &self.set.lists.flows;
                let feeds: Vec<&Feed<'c>> = feeds
                    .filter_map(|(at, view)| flows[view.flow].ready[at].feed.as_ref())
                    .collect();
                (source.plan, feeds)
            })
            .collect();
        let heat_w = heat_w(&fed);
        let site = self.set.site;
        if !site.holds(whole::heat(site.supply, Ok(heat_w))) {
            return None;
        }
        let mut bill: Bill = used.iter().map(|p| (p.id, self.pieces[p.id.0 as usize])).collect();
        bill.sort_unstable();
        let rails: Vec<usize> = (0..site.supply.rails.len()).collect();
        self.work
            .wanted
            .offer(bill, cost.0, compared(heat_w), &mut || build(&fed, &rails));
        Some(compared(heat_w))
    }
}

/// Score of a least cost and a least heat. In whole microwatts: a limit is the score of a heat as it is compared, which
/// may lie half a microwatt below the true one, and that is much where heat weighs much.
fn score(weights: Weights, cost: i64, heat_w: f64) -> f64 {
    weights.score(cost, heat_floor(heat_w))
}

/// Lower bound of a heat as it is compared, whatever the order in which it is added up.
#[allow(clippy::cast_possible_truncation)]
pub(super) fn heat_bound(watts: f64) -> i64 {
    (watts * 1e6 - 1e-3).round() as i64
}
