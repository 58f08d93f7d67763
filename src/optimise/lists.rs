//! Owns the lists that the search draws from: for every outlet of every plan its walk and the feeds that came of it so
//! far, with the least scores that follow for plans and for sets of rails.

use std::collections::BTreeMap;
use std::sync::Mutex;

use super::Question;
use super::view::{Flow, Ready, View};
use crate::audit::{Check, Site, whole};
use crate::build::{Place, wiring};
use crate::catalogue::Part;
use crate::screen::{Apart, Counts, FlowKey, Group, Outlet, Plan, Stop, Walk, Weights, heat_floor};
use crate::units::Money;

/// A plan with its outlets' views.
pub(super) struct Source<'a, 'c> {
    pub(super) plan: &'a Plan<'c>,
    pub(super) views: Vec<View>,
    /// The transformer as an entry of its own.
    pub(super) transformer: Ready<'c>,
    /// Places that the transformer and the wiring of its rails change.
    pub(super) changes: usize,
}

impl Source<'_, '_> {
    /// Least score of the whole plan.
    pub(super) fn floor(&self) -> f64 {
        self.transformer.score + self.views.iter().map(View::floor).sum::<f64>()
    }
}

/// All plans with their lists.
pub(super) struct Lists<'a, 'c> {
    site: &'a Site<'c>,
    groups: &'a [Group<'c>],
    pub(super) flows: Vec<Flow<'a, 'c>>,
    pub(super) sources: Vec<Source<'a, 'c>>,
    pub(super) weights: Weights,
    rails: usize,
}

/// Feeds that are brought at once while only first ones are wanted.
const HANDFUL: usize = 4;

impl<'a, 'c> Lists<'a, 'c> {
    /// Starts every walk; `only_best`: only builds matter that no other betters or equals in cost and heat and betters in
    /// one.
    pub(super) fn start(
        site: &'a Site<'c>,
        question: &Question<'c>,
        groups: &'a [Group<'c>],
        plans: &'a [Plan<'c>],
        weights: Weights,
        only_best: bool,
        counts: &mut Counts,
    ) -> Lists<'a, 'c> {
        let rails = question.supply.rails.len();
        let changes: Vec<usize> = plans.iter().map(|plan| plan_changes(question, plan)).collect();
        let elsewhere = least_changes(plans, &changes, rails);
        let all = (1_usize << rails) - 1;
        let most = question.near.as_ref().map_or(usize::MAX, |near| near.most);
        let mut places: BTreeMap<FlowKey, usize> = BTreeMap::new();
        let mut wanted: Vec<(&Outlet<'c>, usize)> = Vec::new();
        let mut sources = Vec::new();
        for (plan, changes) in plans.iter().zip(changes) {
            let beside = changes.saturating_add(elsewhere[all & !(plan.mask as usize)]);
            if beside > most {
                continue;
            }
            let single = plan.outlets.len() == 1 && plan.mask.count_ones() == 1 && question.near.is_none();
            let mut views = Vec::with_capacity(plan.outlets.len());
            for outlet in &plan.outlets {
                let flow = *places.entry(outlet.flow_key()).or_insert_with(|| {
                    wanted.push((outlet, 0));
                    wanted.len() - 1
                });
                let most_changes = most - beside;
                wanted[flow].1 = wanted[flow].1.max(most_changes);
                views.push(View {
                    flow,
                    held: Vec::new(),
                    seen: 0,
                    coolest: single.then(BTreeMap::new),
                    robust: only_best.then(Vec::new),
                    most_changes,
                    floor: f64::NEG_INFINITY,
                    beside: BTreeMap::new(),
                    need: f64::NEG_INFINITY,
                });
            }
            sources.push(Source {
                plan,
                views,
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
        counts.sources += wanted.len() as u64;
        let flow = |(outlet, most): (&Outlet<'c>, usize)| {
            let apart = question.near.as_ref().map(|near| Apart {
                rails: outlet.rails.iter().map(|&r| near.places[r].clone()).collect(),
                most,
            });
            Flow {
                walk: Walk::new(site, groups, outlet, weights, apart, only_best),
                ready: Vec::new(),
                need: f64::NEG_INFINITY,
            }
        };
        let mut lists = Lists {
            site,
            groups,
            flows: wanted.into_iter().map(flow).collect(),
            sources,
            weights,
            rails,
        };
        lists.begin();
        lists
    }

    /// Starts again by other weights; what was solved stays solved. Heat counts in all of them or in none.
    pub(super) fn go_by(&mut self, weights: Weights, counts: &mut Counts) {
        self.weights = weights;
        on_threads(self.flows.iter_mut().collect(), counts, |flow: &mut Flow<'a, 'c>, _| {
            flow.ready.clear();
            flow.walk.go_by(weights);
        });
        for source in &mut self.sources {
            let plan = source.plan;
            source.transformer.score = weights.score(plan.floor_cost, heat_floor(plan.core_w));
        }
        self.begin();
    }

    /// Forgets what the views have seen.
    fn begin(&mut self) {
        for source in &mut self.sources {
            for view in &mut source.views {
                view.held.clear();
                view.seen = 0;
                view.coolest.iter_mut().for_each(BTreeMap::clear);
                view.robust.iter_mut().for_each(Vec::clear);
                view.need = f64::NEG_INFINITY;
                view.floor = self.flows[view.flow].to_come();
            }
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
        let view = &mut self.sources[source].views[outlet];
        view.need = view.need.max(score);
        let flow = &mut self.flows[view.flow];
        flow.need = flow.need.max(score);
    }

    /// Brings what was asked for, and takes it as answered: all of it, or a few feeds of each list so that the next that
    /// holds may be among them. Sources know nothing of each other, so the result is the same whatever the threads.
    pub(super) fn bring(&mut self, only_first: bool, stop: &Stop, counts: &mut Counts) {
        let flows = self
            .flows
            .iter_mut()
            .filter(|flow| flow.need >= flow.to_come())
            .collect();
        on_threads(flows, counts, |flow: &mut Flow<'a, 'c>, counts| {
            let mut left = if only_first { HANDFUL } else { usize::MAX };
            while left > 0 && flow.one_more(flow.need, stop, counts) {
                left -= 1;
            }
        });
        let flows = &self.flows;
        let (site, groups) = (self.site, self.groups);
        let views = self
            .sources
            .iter_mut()
            .flat_map(|source| source.views.iter_mut().zip(&source.plan.outlets));
        let asked: Vec<(&mut View, &Outlet<'c>)> = views.filter(|(view, _)| view.need > f64::NEG_INFINITY).collect();
        on_threads(asked, counts, |(view, outlet), _| {
            view.look(site, groups, outlet, &flows[view.flow], only_first);
            view.need = f64::NEG_INFINITY;
        });
        self.flows.iter_mut().for_each(|flow| flow.need = f64::NEG_INFINITY);
    }

    /// Least score of a build with a feed that has not come yet; infinite when all have.
    pub(super) fn next(&self, least: &[f64]) -> f64 {
        let all = least.len() - 1;
        let of = |source: &Source| {
            let beside = source.floor() + least[all & !(source.plan.mask as usize)];
            (source.views.iter())
                .map(|view| beside - view.floor() + view.to_come(&self.flows[view.flow]))
                .filter(|score| !score.is_nan())
                .fold(f64::INFINITY, f64::min)
        };
        self.sources.iter().map(of).fold(f64::INFINITY, f64::min)
    }

    /// No combination of what has come scores above this: a price never rises with the pieces that others add.
    pub(super) fn dearest(&self, builds: u64) -> f64 {
        let price = |lines: &[(&Part, u64)]| -> i64 {
            lines
                .iter()
                .map(|&(part, pieces)| (part.unit_price(pieces * builds) * pieces).0)
                .sum()
        };
        let mut by_rail = vec![0.0_f64; self.rails];
        for source in &self.sources {
            let transformer = price(&[(&source.plan.transformer.part, 1)]);
            let mut most = self.weights.score(transformer, heat_floor(source.plan.core_w) + 1);
            for view in &source.views {
                let of = |&place: &usize| {
                    let ready = &self.flows[view.flow].ready[place];
                    let heat = heat_floor(ready.heat_w) + 2;
                    self.weights.score(price(&ready.lines) + ready.fitted.0, heat)
                };
                most += view.held.iter().map(of).fold(0.0, f64::max);
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
            let count = plans
                .iter()
                .filter(|&&q| self.sources[q].plan.transformer.part.id == part.id)
                .count();
            let check: Option<Check> = whole::stock(site.supply, part, count as u64);
            site.holds(check)
        })
    }
}

/// Fewer items are not worth the starting of threads.
const WORTH_THREADS: usize = 4;

/// Works on every item, on as many threads as the machine has; the counts add up to the same whatever their number.
fn on_threads<T: Send>(items: Vec<T>, counts: &mut Counts, work: impl Fn(T, &mut Counts) + Sync) {
    let threads = std::thread::available_parallelism()
        .map_or(1, usize::from)
        .min(items.len());
    if threads < 2 || items.len() < WORTH_THREADS {
        items.into_iter().for_each(|item| work(item, counts));
        return;
    }
    let queue = Mutex::new(items.into_iter());
    let next = || queue.lock().ok().and_then(|mut queue| queue.next());
    std::thread::scope(|scope| {
        let spawn = |_| {
            scope.spawn(|| {
                let mut counts = Counts::default();
                while let Some(item) = next() {
                    work(item, &mut counts);
                }
                counts
            })
        };
        let workers: Vec<_> = (0..threads).map(spawn).collect();
        for worker in workers {
            match worker.join() {
                Ok(done) => counts.add(&done),
                // A thread that panics takes the program with it, since its share would be missing.
                Err(panic) => std::panic::resume_unwind(panic),
            }
        }
    });
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
