//! Owns the lists that the search draws from: for every outlet of every plan its walk and the feeds that came of it so
//! far, with the least scores that follow for plans and for sets of rails.

use std::collections::BTreeMap;
use std::sync::Mutex;

use super::Question;
use super::best::Bill;
use crate::audit::{Check, Site, whole};
use crate::build::{Place, wiring};
use crate::catalogue::Part;
use crate::screen::{Apart, Counts, Feed, Group, Plan, Stop, Walk, Weights, heat_floor};
use crate::units::Money;

/// Two feeds with the same lines whose heats differ by more than this never tie in whole microwatts.
const NEVER_TIES_W: f64 = 1.5e-6;

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

/// One outlet: its walk and the feeds that came of it so far, in the order of their scores.
pub(super) struct Outflow<'a, 'c> {
    walk: Walk<'a, 'c>,
    pub(super) ready: Vec<Ready<'c>>,
    /// Least heat by lines: of equal lines only the coolest can matter, where nothing else tells them apart.
    coolest: Option<BTreeMap<Bill, f64>>,
    /// Score up to which feeds are asked for.
    need: f64,
}

impl<'c> Outflow<'_, 'c> {
    /// Least score of any of its feeds.
    pub(super) fn floor(&self) -> f64 {
        match self.ready.first() {
            Some(first) => first.score,
            None => self.to_come(),
        }
    }

    /// Least score of the feeds that have not come yet.
    fn to_come(&self) -> f64 {
        self.walk.floor().unwrap_or(f64::INFINITY)
    }

    /// Asks the walk for the next feed up to `most`; false when there is none or it was told to stop.
    fn one_more(&mut self, most: f64, stop: &Stop, counts: &mut Counts) -> bool {
        while let Some((feed, score)) = self.walk.next(most, stop, counts) {
            let lines = feed.lines();
            let heat_w = feed.heat_w();
            if let Some(coolest) = &mut self.coolest {
                let bill: Bill = lines.iter().map(|&(part, pieces)| (part.id, pieces)).collect();
                let coolest = coolest.entry(bill).or_insert(f64::INFINITY);
                if heat_w > *coolest + NEVER_TIES_W {
                    continue;
                }
                *coolest = coolest.min(heat_w);
            }
            self.ready.push(Ready {
                score,
                floor: feed.floor_cost.0,
                heat_w,
                lines,
                fitted: feed.fitted(),
                va: feed.va,
                changes: feed.changes,
                feed: Some(feed),
            });
            return true;
        }
        false
    }
}

/// A plan with its outlets' lists.
pub(super) struct Source<'a, 'c> {
    pub(super) plan: &'a Plan<'c>,
    pub(super) outflows: Vec<Outflow<'a, 'c>>,
    /// The transformer as an entry of its own.
    pub(super) transformer: Ready<'c>,
    /// Places that the transformer and the wiring of its rails change.
    pub(super) changes: usize,
}

impl Source<'_, '_> {
    /// Least score of the whole plan.
    pub(super) fn floor(&self) -> f64 {
        self.transformer.score + self.outflows.iter().map(Outflow::floor).sum::<f64>()
    }
}

/// All plans with their lists.
pub(super) struct Lists<'a, 'c> {
    pub(super) sources: Vec<Source<'a, 'c>>,
    pub(super) weights: Weights,
    rails: usize,
}

impl<'a, 'c> Lists<'a, 'c> {
    /// Starts every walk.
    pub(super) fn start(
        site: &'a Site<'c>,
        question: &Question<'c>,
        groups: &'a [Group<'c>],
        plans: &'a [Plan<'c>],
        weights: Weights,
        counts: &mut Counts,
    ) -> Lists<'a, 'c> {
        counts.sources += plans.iter().map(|p| p.outlets.len() as u64).sum::<u64>();
        let rails = question.supply.rails.len();
        let changes: Vec<usize> = plans.iter().map(|plan| plan_changes(question, plan)).collect();
        let elsewhere = least_changes(plans, &changes, rails);
        let all = (1_usize << rails) - 1;
        let mut sources = Vec::new();
        for (plan, changes) in plans.iter().zip(changes) {
            let beside = changes.saturating_add(elsewhere[all & !(plan.mask as usize)]);
            let most = question.near.as_ref().map_or(usize::MAX, |near| near.most);
            if beside > most {
                continue;
            }
            let single = plan.outlets.len() == 1 && plan.mask.count_ones() == 1 && question.near.is_none();
            let outflows = (plan.outlets.iter())
                .map(|outlet| {
                    let apart = question.near.as_ref().map(|near| Apart {
                        rails: outlet.rails.iter().map(|&r| near.places[r].clone()).collect(),
                        most: most - beside,
                    });
                    Outflow {
                        walk: Walk::new(site, groups, outlet, weights, apart),
                        ready: Vec::new(),
                        coolest: single.then(BTreeMap::new),
                        need: f64::NEG_INFINITY,
                    }
                })
                .collect();
            sources.push(Source {
                plan,
                outflows,
                transformer: Ready {
                    score: weights.score(plan.floor_cost, heat_floor(plan.core_w)),
                    floor: plan.floor_cost,
                    heat_w: plan.core_w,
                    lines: vec![(&plan.transformer.part, 1)],
                    fitted: Money(0),
                    va: 0.0,
                    changes,
                    feed: None,
                },
                changes,
            });
        }
        Lists {
            sources,
            weights,
            rails,
        }
    }

    /// By set of rails, the least score of plans that feed just them.
    pub(super) fn least(&self) -> Vec<f64> {
        let mut by_mask = vec![f64::INFINITY; 1 << self.rails];
        for source in &self.sources {
            let least = &mut by_mask[source.plan.mask as usize];
            *least = least.min(source.floor());
        }
        cover(&by_mask, self.rails)
    }

    /// Plans of a cheapest cover of all rails, given [`Self::least`].
    pub(super) fn cheapest_cover(&self, least: &[f64]) -> Vec<usize> {
        let mut left = least.len() - 1;
        let mut found = Vec::new();
        while left != 0 {
            let first = left & left.wrapping_neg();
            let of = |source: &Source| {
                let mask = source.plan.mask as usize;
                (mask & first != 0 && mask & !left == 0).then(|| source.floor() + least[left & !mask])
            };
            let best = (self.sources.iter().enumerate())
                .filter_map(|(place, source)| Some((of(source)?, place)))
                .min_by(|a, b| a.0.total_cmp(&b.0).then(a.1.cmp(&b.1)));
            let Some((_, place)) = best else { return Vec::new() };
            left &= !(self.sources[place].plan.mask as usize);
            found.push(place);
        }
        found
    }

    /// Asks for the feeds of one outlet up to a score.
    pub(super) fn ask(&mut self, source: usize, outlet: usize, score: f64) {
        let need = &mut self.sources[source].outflows[outlet].need;
        *need = need.max(score);
    }

    /// Brings what was asked for: all of it, or only the first feed of each list. Outlets know nothing of each other, so
    /// the result is the same whatever the threads.
    pub(super) fn bring(&mut self, only_first: bool, stop: &Stop, counts: &mut Counts) {
        let asked: Vec<&mut Outflow<'a, 'c>> = (self.sources.iter_mut())
            .flat_map(|source| source.outflows.iter_mut())
            .filter(|o| o.need >= o.to_come() && !(only_first && !o.ready.is_empty()))
            .collect();
        let work = |outflow: &mut Outflow<'a, 'c>, counts: &mut Counts| {
            let need = outflow.need;
            while outflow.one_more(need, stop, counts) && !only_first {}
        };
        let threads = std::thread::available_parallelism().map_or(1, usize::from).min(asked.len());
        if threads < 2 {
            asked.into_iter().for_each(|outflow| work(outflow, counts));
            return;
        }
        let queue = Mutex::new(asked.into_iter());
        let next = || queue.lock().ok().and_then(|mut queue| queue.next());
        std::thread::scope(|scope| {
            let spawn = |_| {
                scope.spawn(|| {
                    let mut counts = Counts::default();
                    while let Some(outflow) = next() {
                        work(outflow, &mut counts);
                    }
                    counts
                })
            };
            let workers: Vec<_> = (0..threads).map(spawn).collect();
            for worker in workers {
                match worker.join() {
                    Ok(done) => counts.add(&done),
                    // A thread that panics takes the program with it, since its feeds would be missing.
                    Err(panic) => std::panic::resume_unwind(panic),
                }
            }
        });
    }

    /// Least score of a build with a feed that has not come yet; infinite when all have.
    pub(super) fn next(&self, least: &[f64]) -> f64 {
        let all = least.len() - 1;
        let of = |source: &Source| {
            let beside = source.floor() + least[all & !(source.plan.mask as usize)];
            (source.outflows.iter())
                .map(|outflow| beside - outflow.floor() + outflow.to_come())
                .filter(|score| !score.is_nan())
                .fold(f64::INFINITY, f64::min)
        };
        self.sources.iter().map(of).fold(f64::INFINITY, f64::min)
    }

    /// No combination of what has come scores above this: a price never rises with the pieces that others add.
    pub(super) fn dearest(&self, builds: u64) -> f64 {
        let price = |lines: &[(&Part, u64)]| -> i64 {
            lines.iter().map(|&(part, pieces)| (part.unit_price(pieces * builds) * pieces).0).sum()
        };
        let mut by_rail = vec![0.0_f64; self.rails];
        for source in &self.sources {
            let transformer = price(&[(&source.plan.transformer.part, 1)]);
            let mut most = self.weights.score(transformer, heat_floor(source.plan.core_w) + 1);
            for outflow in &source.outflows {
                let of = |r: &Ready| {
                    let heat = heat_floor(r.heat_w) + 2;
                    self.weights.score(price(&r.lines) + r.fitted.0, heat)
                };
                most += outflow.ready.iter().map(of).fold(0.0, f64::max);
            }
            // Counted with the first rail of the plan.
            let rail = &mut by_rail[source.plan.mask.trailing_zeros() as usize];
            *rail = rail.max(most);
        }
        by_rail.iter().sum()
    }

    /// Whether the stock holds so many pieces of the transformers of these plans.
    pub(super) fn stocked(&self, site: &Site, plans: &[usize]) -> bool {
        plans.iter().all(|&p| {
            let part = &self.sources[p].plan.transformer.part;
            let count = plans.iter().filter(|&&q| self.sources[q].plan.transformer.part.id == part.id).count();
            let check: Option<Check> = whole::stock(site.supply, part, count as u64);
            site.holds(check)
        })
    }
}

/// By set of rails the least sum over disjoint sets that make it up.
fn cover(by_mask: &[f64], rails: usize) -> Vec<f64> {
    let mut least = vec![f64::INFINITY; 1 << rails];
    least[0] = 0.0;
    for set in 1..least.len() {
        let first = set & set.wrapping_neg();
        let mut part = set;
        while part != 0 {
            if part & first != 0 {
                least[set] = least[set].min(by_mask[part] + least[set & !part]);
            }
            part = (part - 1) & set;
        }
    }
    least
}

/// Places that a plan changes by its transformer and wiring.
fn plan_changes(question: &Question, plan: &Plan) -> usize {
    let Some(near) = &question.near else { return 0 };
    let mut changes = 0;
    for outlet in &plan.outlets {
        let wiring = wiring(question.supply, &outlet.hookup, outlet.path, &outlet.rails);
        for &rail in &outlet.rails {
            let was = &near.places[rail];
            changes += usize::from(was[Place::Transformer as usize] != plan.transformer.part.name);
            changes += usize::from(was[Place::Wiring as usize] != wiring);
        }
    }
    changes
}

/// By set of rails the fewest changes by transformers and wiring.
fn least_changes(plans: &[Plan], changes: &[usize], rails: usize) -> Vec<usize> {
    let mut by_mask = vec![f64::INFINITY; 1 << rails];
    for (plan, &changes) in plans.iter().zip(changes) {
        let least = &mut by_mask[plan.mask as usize];
        #[allow(clippy::cast_precision_loss)] // a few dozen
        let changes = changes as f64;
        *least = least.min(changes);
    }
    #[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)] // whole numbers, infinite ones saturate
    cover(&by_mask, rails).into_iter().map(|c| c as usize).collect()
}
