//! Owns the exact search over frames, with prices, stock and caps over the whole supply.
//!
//! Deepening: every outlet's walk is asked for the feeds that can take part in a build with a score of at most T; all
//! combinations on all frames up to T are searched; T rises until it has passed all that is wanted. What T has passed is
//! proved, so a search that is stopped still has a true bound.

use super::Question;
use super::best::Wanted;
use super::combine::{Combine, Kept, List, Run, Setting, Work, heat_bound, slack};
use super::frame_build::Judge;
use super::frames::{Frame, frames};
use super::lists::Lists;
use super::milp::{Answer, Choices, Column, PlanChoice, Solver, least as least_by_solver};
use super::tighten::{heat_share, tighten};
use super::view::{Ready, View};
use crate::audit::Site;
use crate::catalogue::Catalogue;
use crate::screen::{Counts, Group, Must, Objective, Plan, Weights, plans};

/// T starts at the least that any build can have and first rises by this share of it, then by twice as much each time.
const FIRST_STEP: f64 = 64.0;
/// While the least is not settled, plans within this share above it are looked into together. A longer step
/// solves much more than it saves in rounds.
const SETTLE_STEP: f64 = 256.0;
/// Columns beyond which the solver's memory grows past reason.
const MOST_SOLVER_COLUMNS: usize = 5_000;
/// Scores above this are not tightened, which adds them up in whole numbers: the entries of a frame stay below 2^63.
const MOST_WHOLE_SCORE: f64 = 1e17;
/// Longest time for one solver call.
const SOLVER_SECONDS: f64 = 30.0;

/// What may be built at all: groups of rails and plans of transformers.
pub(super) struct Ground<'s, 'c> {
    pub(super) site: &'s Site<'c>,
    pub(super) groups: Vec<Group<'c>>,
    pub(super) plans: Vec<Plan<'c>>,
    /// Parts of the catalogue.
    pub(super) parts: usize,
}

impl<'s, 'c> Ground<'s, 'c> {
    pub(super) fn new(site: &'s Site<'c>, catalogue: &'c Catalogue, must: &Must) -> Ground<'s, 'c> {
        let groups = Group::all(site, catalogue, must);
        let parts = catalogue.parts().count();
        let plans = plans(site, &groups, parts);
        Ground {
            site,
            groups,
            plans,
            parts,
        }
    }
}

/// How a search ended.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum End {
    /// Nothing is left that could be wanted.
    Complete,
    /// Stopped; no build that was not looked at has a score below the bound.
    Stopped { bound: f64 },
}

/// One search of a ground by one score.
pub(super) struct Search<'g, 'c> {
    ground: &'g Ground<'g, 'c>,
    question: &'g Question<'c>,
    lists: Lists<'g, 'c>,
    least: Vec<f64>,
}

impl<'g, 'c> Search<'g, 'c> {
    /// `only_best`: only builds matter that no other betters or equals in cost and heat and betters in one.
    pub(super) fn start(
        ground: &'g Ground<'g, 'c>,
        question: &'g Question<'c>,
        weights: Weights,
        only_best: bool,
        counts: &mut Counts,
    ) -> Search<'g, 'c> {
        // What is closer to a given build, or tighter, may matter though it is dearer and hotter.
        let only_best = only_best && question.near.is_none() && question.tightness == f64::NEG_INFINITY;
        let (groups, plans) = (&ground.groups, &ground.plans);
        let lists = Lists::start(ground.site, question, groups, plans, weights, only_best, counts);
        let least = lists.least();
        Search {
            ground,
            question,
            lists,
            least,
        }
    }

    /// Starts again by other weights; what was solved stays solved. Heat counts in all of them or in none.
    pub(super) fn go_by(&mut self, weights: Weights, counts: &mut Counts) {
        self.lists.go_by(weights, counts);
        self.least = self.lists.least();
    }

    /// Least score of any build, as far as it is known.
    pub(super) fn base(&self) -> f64 {
        self.least.last().copied().unwrap_or(f64::INFINITY)
    }

    fn beside(&self, mask: u32) -> f64 {
        self.least[(self.least.len() - 1) & !(mask as usize)]
    }

    /// Looks into plans until the first feeds of a cheapest cover are out; returns that cover, empty when there is none
    /// or the search was stopped.
    pub(super) fn settle(&mut self, counts: &mut Counts) -> Vec<usize> {
        loop {
            self.least = self.lists.least();
            let base = self.base();
            if !base.is_finite() || self.question.stop.now() {
                return Vec::new();
            }
            let cover = self.lists.cheapest_cover(&self.least);
            let settled = |&plan: &usize| self.lists.sources[plan].views.iter().all(|view| !view.held.is_empty());
            if cover.iter().all(settled) {
                return cover;
            }
            let reach = base + (base / SETTLE_STEP).max(1.0);
            for place in 0..self.lists.sources.len() {
                let source = &self.lists.sources[place];
                let beside = source.floor() + self.beside(source.plan.mask);
                if beside <= reach {
                    for outlet in 0..source.plan.outlets.len() {
                        let own = self.lists.sources[place].views[outlet].floor();
                        self.lists.ask(place, outlet, reach - (beside - own));
                    }
                }
            }
            self.lists.bring(true, &self.question.stop, counts);
        }
    }

    /// What the first feeds of a cover take of what the objective does not minimise, in millionths, at least.
    pub(super) fn second(&self, cover: &[usize], objective: Objective) -> f64 {
        let sources = cover.iter().map(|&plan| &self.lists.sources[plan]);
        let first = |view: &View| &self.lists.flows[view.flow].ready[view.held[0]];
        let entries = sources.flat_map(|s| std::iter::once(&s.transformer).chain(s.views.iter().map(first)));
        #[allow(clippy::cast_precision_loss)]
        let of = |ready: &Ready| match objective {
            Objective::Cost => ready.heat_w * 1e6,
            Objective::Heat => ready.floor as f64,
        };
        entries.map(of).sum()
    }

    /// Offers the first feeds of a cover: a build to start with, mostly within a few per cent of the best.
    pub(super) fn offer_first(&self, cover: &[usize], wanted: &mut dyn Wanted<'c>, counts: &mut Counts) {
        let mut plans = cover.to_vec();
        plans.sort_by_key(|&plan| self.lists.sources[plan].plan.mask.trailing_zeros());
        let lists = self.lists_of(&plans, |_| 1);
        if lists.iter().any(|list| list.kept.is_empty()) {
            return;
        }
        let choice: Vec<usize> = lists.iter().map(|list| list.kept[0].place).collect();
        let set = self.setting();
        let mut work = self.work(wanted, counts);
        Combine::new(&set, &plans, &lists, &mut work, f64::INFINITY).offer_choice(&choice);
    }

    fn setting(&self) -> Setting<'_, 'g, 'c> {
        Setting {
            question: self.question,
            site: self.ground.site,
            lists: &self.lists,
            parts: self.ground.parts,
        }
    }

    fn work<'w>(&self, wanted: &'w mut dyn Wanted<'c>, counts: &'w mut Counts) -> Work<'w, 'g, 'c> {
        Work {
            judge: Judge::new(self.ground.site),
            wanted,
            counts,
        }
    }

    /// Searches everything that can be wanted.
    pub(super) fn run(&mut self, wanted: &mut dyn Wanted<'c>, counts: &mut Counts) -> End {
        let cover = self.settle(counts);
        let base = self.base();
        if !base.is_finite() {
            return End::Complete;
        }
        if self.question.stop.now() {
            return End::Stopped { bound: base };
        }
        self.offer_first(&cover, wanted, counts);
        let mut passed = base;
        // Heats are floored one by one and rounded in the sum: the first reach covers the difference.
        let mut reach = base + slack(base);
        let mut step = (base / FIRST_STEP).max(1.0);
        let mut work = self.work(wanted, counts);
        loop {
            reach = reach.min(work.wanted.limit().max(base) + slack(base));
            self.least = self.lists.least();
            let near = self.question.near.as_ref().map(|near| near.most);
            let found = frames(&self.lists, self.ground.site, &self.least, reach, near);
            for frame in &found {
                for &plan in &frame.plans {
                    for outlet in 0..self.lists.sources[plan].views.len() {
                        let own = self.lists.sources[plan].views[outlet].floor();
                        self.lists.ask(plan, outlet, reach - (frame.floor - own));
                    }
                }
            }
            self.lists.bring(false, &self.question.stop, work.counts);
            if self.question.stop.now() {
                return End::Stopped { bound: passed };
            }
            for frame in &found {
                if frame.floor > reach.min(work.wanted.limit() + slack(reach)) {
                    break;
                }
                if self.on(frame, reach, &mut work) != Run::Whole {
                    return End::Stopped { bound: passed };
                }
            }
            passed = reach;
            self.tell(passed, work.wanted.limit(), work.counts);
            if reach >= work.wanted.limit() {
                return End::Complete;
            }
            self.least = self.lists.least();
            let next = self.lists.next(&self.least);
            reach = if next.is_finite() {
                (reach + step).max(next + slack(next))
            } else if reach < self.lists.dearest(self.question.supply.builds) {
                // All feeds are here, but a build may score more than the least shares that they were let in by.
                reach + step
            } else {
                return End::Complete;
            };
            step *= 2.0;
        }
    }

    /// The lists of a frame with the first entries of each outlet as far as `count` says.
    fn lists_of(&self, plans: &[usize], count: impl Fn(&View) -> usize) -> Vec<List<'_, 'c>> {
        let mut lists = Vec::new();
        for (at, &plan) in plans.iter().enumerate() {
            let source = &self.lists.sources[plan];
            let ready = std::slice::from_ref(&source.transformer);
            lists.push(List::new(at, None, ready, &[0]));
            for (outlet, view) in source.views.iter().enumerate() {
                let ready = &self.lists.flows[view.flow].ready;
                lists.push(List::new(
                    at,
                    Some(outlet),
                    ready,
                    &view.held[..count(view).min(view.held.len())],
                ));
            }
        }
        lists
    }

    /// Searches one frame.
    fn on(&self, frame: &Frame, reach: f64, work: &mut Work<'_, 'g, 'c>) -> Run {
        let most = reach.min(work.wanted.limit());
        let most = most + slack(most);
        let mut lists = self.lists_of(&frame.plans, |view| {
            let own = most - (frame.floor - view.floor());
            let ready = &self.lists.flows[view.flow].ready;
            view.held.partition_point(|&place| ready[place].score <= own)
        });
        self.tightened(&mut lists, most);
        sifted(&mut lists, work.wanted);
        if lists.iter().any(|list| list.kept.is_empty()) {
            return Run::Whole;
        }
        let columns: usize = lists.iter().map(|list| list.kept.len()).sum();
        // Only the single best can be asked of the solver, and not of too many columns.
        let may_ask = self.may_ask() && columns <= MOST_SOLVER_COLUMNS;
        let budget = if may_ask { self.question.node_budget } else { u64::MAX };
        let set = self.setting();
        let go = |budget: u64, reach: f64, work: &mut Work<'_, 'g, 'c>| {
            Combine::new(&set, &frame.plans, &lists, work, reach).run(budget)
        };
        let run = go(budget, reach, work);
        if run != Run::OutOfNodes {
            return run;
        }
        match self.ask_solver(&set, frame, &lists, work) {
            // What remains is to settle ties up to that build, or the solver has shown that there is none.
            Said::Least(value) => go(u64::MAX, reach.min(value), work),
            Said::NothingWithin => Run::Whole,
            Said::Nothing => go(u64::MAX, reach, work),
        }
    }

    /// Tells whoever watches how far the search is, where its score is the objective.
    #[allow(clippy::cast_possible_truncation)] // saturates
    fn tell(&self, passed: f64, limit: f64, counts: &Counts) {
        let stop = &self.question.stop;
        stop.looked_at(counts.nodes);
        if self.may_ask() {
            stop.bounded(passed as i64);
            // Without a build the limit is what an i64 can hold at most.
            if limit < 9e18 {
                stop.found(limit as i64);
            }
        }
    }

    /// Whether the solver's objective is what this search wants.
    fn may_ask(&self) -> bool {
        let question = self.question;
        question.top == 1 && question.near.is_none() && self.lists.weights == Weights::of(question.objective)
    }

    /// Keeps what can still take part in a build with a score of at most `most`.
    fn tightened(&self, lists: &mut [List<'_, 'c>], most: f64) {
        let weights = self.lists.weights;
        #[allow(clippy::float_cmp)] // set so, not computed
        let by_cost = weights.cost == 1.0;
        if !by_cost || most > MOST_WHOLE_SCORE {
            return;
        }
        let kept: Vec<Vec<(usize, i64)>> = (lists.iter())
            .map(|list| list.kept.iter().map(|k| (k.place, k.floor)).collect())
            .collect();
        let ready: Vec<_> = lists.iter().map(|list| list.ready).collect();
        let builds = self.question.supply.builds;
        #[allow(clippy::cast_possible_truncation)] // saturates
        let most = most.ceil() as i64;
        let kept = tighten(&ready, kept, self.ground.parts, builds, weights, most);
        for (list, kept) in lists.iter_mut().zip(kept) {
            #[allow(clippy::cast_precision_loss)]
            let kept = kept.into_iter().map(|(place, floor)| Kept {
                place,
                floor: floor - heat_share(&list.ready[place], weights),
                score: floor as f64,
            });
            list.kept = kept.collect();
        }
    }

    /// Asks the solver for the best choice on a frame. A choice is judged again here; that there is none is taken at
    /// the solver's word.
    fn ask_solver(
        &self,
        set: &Setting<'_, 'g, 'c>,
        frame: &Frame,
        lists: &[List<'_, 'c>],
        work: &mut Work<'_, 'g, 'c>,
    ) -> Said {
        let column = |list: &List<'_, 'c>, kept: &Kept| Column::new(&list.ready[kept.place]);
        let plans = frame.plans.iter().enumerate().map(|(at, &plan)| {
            let outlets = lists.iter().filter(|l| l.plan == at && l.outlet.is_some());
            PlanChoice {
                plan: self.lists.sources[plan].plan,
                outlets: outlets.map(|l| l.kept.iter().map(|k| column(l, k)).collect()).collect(),
            }
        });
        let choices = Choices { plans: plans.collect() };
        let stop = &self.question.stop;
        let left = stop.deadline.map_or(SOLVER_SECONDS, |at| {
            let left = at.saturating_duration_since(std::time::Instant::now());
            left.as_secs_f64().min(SOLVER_SECONDS)
        });
        work.counts.solver_calls += 1;
        let objective = self.question.objective;
        match least_by_solver(self.question.supply, objective, &choices, Solver::MicroLp, left) {
            Answer::Least(chosen) => {
                let of = |list: &List| match list.outlet {
                    None => Some(0),
                    Some(outlet) => {
                        let (_, places) = chosen.iter().find(|(plan, _)| *plan == list.plan)?;
                        Some(list.kept.get(*places.get(outlet)?)?.place)
                    }
                };
                let Some(choice) = lists.iter().map(of).collect::<Option<Vec<usize>>>() else {
                    return Said::Nothing;
                };
                let mut combine = Combine::new(set, &frame.plans, lists, work, f64::INFINITY);
                match combine.offer_choice(&choice) {
                    Some((cost, heat)) => Said::Least(self.lists.weights.score(cost, heat)),
                    None => Said::Nothing,
                }
            }
            Answer::Infeasible => Said::NothingWithin,
            Answer::Undecided(_) => Said::Nothing,
        }
    }
}

/// Drops what is of no interest even with the least of all other lists.
fn sifted<'c>(lists: &mut [List<'_, 'c>], wanted: &dyn Wanted<'c>) {
    let least = |list: &List| {
        let heats = list.kept.iter().map(|k| list.ready[k.place].heat_w);
        let cost = list.kept.iter().map(|k| k.floor).min().unwrap_or(0);
        let score = list.kept.first().map_or(f64::INFINITY, |k| k.score);
        (cost, heats.fold(f64::INFINITY, f64::min), score)
    };
    let each: Vec<(i64, f64, f64)> = lists.iter().map(least).collect();
    let cost: i64 = each.iter().map(|l| l.0).sum();
    let heat_w: f64 = each.iter().map(|l| l.1).sum();
    let score: f64 = each.iter().map(|l| l.2).sum();
    for (list, least) in lists.iter_mut().zip(each) {
        let ready = list.ready;
        list.kept.retain(|k| {
            let heat = heat_bound(heat_w - least.1 + ready[k.place].heat_w);
            !wanted.beyond(cost - least.0 + k.floor, heat, score - least.2 + k.score)
        });
    }
}

/// What the integer program says about one frame.
enum Said {
    /// The least score.
    Least(f64),
    /// No build on it.
    NothingWithin,
    /// It could not tell.
    Nothing,
}

/// Everything that a question may choose from, unpruned: for the second opinion on small catalogues.
pub(super) fn everything<'g, 'c>(search: &'g mut Search<'_, 'c>, counts: &mut Counts) -> Choices<'g, 'c> {
    for source in 0..search.lists.sources.len() {
        for outlet in 0..search.lists.sources[source].views.len() {
            search.lists.ask(source, outlet, f64::INFINITY);
        }
    }
    search.lists.bring(false, &search.question.stop, counts);
    let plans = search.lists.sources.iter().map(|source| PlanChoice {
        plan: source.plan,
        outlets: (source.views.iter())
            .map(|view| {
                let ready = &search.lists.flows[view.flow].ready;
                view.held.iter().map(|&place| Column::new(&ready[place])).collect()
            })
            .collect(),
    });
    Choices { plans: plans.collect() }
}
