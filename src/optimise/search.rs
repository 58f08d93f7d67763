//! Owns the exact search: one column for each rail, least key first, with prices, stock and caps over the whole supply.
//!
//! Deepening: every rail's walk is asked for the columns that can take part in a build with an objective of at most T;
//! all their combinations up to T are searched depth first; T rises until it has passed the N-th best build. What T has
//! passed is proved, so a search that is stopped still has a true bound.

use std::collections::BTreeMap;

use super::Question;
use super::best::{Best, Bill};
use crate::audit::{Site, compared, total_w, whole};
use crate::build::{Build, Instance, RailChoice, Section, section_id, transformer_id};
use crate::catalogue::{Part, PartId};
use crate::screen::{Column, Counts, FloorPrices, Must, Objective, Shelf, Stop, Walk};
use crate::supply::Supply;
use crate::units::Money;

/// Nodes after which the integer-programming solver is asked before the search goes on.
pub const NODE_BUDGET: u64 = 20_000_000;

/// Two columns with the same lines whose heats differ by more than this never tie in whole microwatts.
const NEVER_TIES_W: f64 = 1.5e-6;

/// How a search ended.
pub(super) enum End {
    /// Nothing is left that could enter the list.
    Complete,
    /// Stopped; no build that was not looked at has an objective below the bound.
    Stopped { bound: i64 },
}

/// A column ready to be combined.
struct Ready<'c> {
    column: Column<'c>,
    key: (i64, i64),
    heat_w: f64,
    lines: Vec<(&'c Part, u64)>,
}

/// One rail: its walk and the columns that came of it so far.
struct RailColumns<'s, 'c> {
    walk: Walk<'s, 'c>,
    ready: Vec<Ready<'c>>,
    /// Least heat by lines: of equal lines only the coolest can matter.
    coolest: BTreeMap<Bill, f64>,
    exhausted: bool,
}

impl RailColumns<'_, '_> {
    fn extend(&mut self, most: i64, stop: &Stop, counts: &mut Counts, only_first: bool) {
        while let Some((column, key)) = self.walk.next(most, stop, counts) {
            let lines = column.lines();
            let heat_w = column.heat_w();
            let bill: Bill = lines.iter().map(|&(part, pieces)| (part.id, pieces)).collect();
            let coolest = self.coolest.entry(bill).or_insert(f64::INFINITY);
            if heat_w > *coolest + NEVER_TIES_W {
                continue;
            }
            *coolest = coolest.min(heat_w);
            self.ready.push(Ready {
                column,
                key,
                heat_w,
                lines,
            });
            if only_first {
                return;
            }
        }
        self.exhausted = self.walk.floor().is_none();
    }
}

/// One search for one placement of the demanded parts.
pub(super) struct Search<'s, 'c> {
    question: &'s Question<'c>,
    rails: Vec<RailColumns<'s, 'c>>,
    parts: usize,
}

impl<'s, 'c> Search<'s, 'c> {
    pub(super) fn new(site: &'s Site<'c>, question: &'s Question<'c>, must: &Must, counts: &mut Counts) -> Self {
        let prices = FloorPrices::new(question.supply);
        let rails = (0..question.supply.rails.len())
            .map(|rail| {
                let shelf = Shelf::new(site, question.catalogue, rail, must);
                RailColumns {
                    walk: Walk::new(site, shelf, question.objective, prices, counts),
                    ready: Vec::new(),
                    coolest: BTreeMap::new(),
                    exhausted: false,
                }
            })
            .collect();
        Search {
            question,
            rails,
            parts: question.catalogue.parts().count(),
        }
    }

    pub(super) fn run(mut self, best: &mut Best<'c>, counts: &mut Counts) -> End {
        let stop = &self.question.stop;
        let mut least = Vec::new();
        for rail in &mut self.rails {
            rail.extend(i64::MAX, stop, counts, true);
            match rail.ready.first() {
                Some(first) => least.push(first.key.0),
                // Whoever stopped the walk before its first column has proved nothing.
                None if stop.now() => return End::Stopped { bound: 0 },
                None => return End::Complete,
            }
        }
        let base: i64 = least.iter().sum();
        let mut passed = base - 1;
        let mut reach = base;
        let mut step = (base / 64).max(1);
        loop {
            if best.worst().is_some_and(|worst| worst.0 < reach) {
                reach = best.worst().map_or(reach, |worst| worst.0);
            }
            for (rail, least) in self.rails.iter_mut().zip(&least) {
                rail.extend(reach - (base - least), stop, counts, false);
                if stop.now() {
                    return End::Stopped { bound: passed + 1 };
                }
            }
            let mut combine = Combine::new(&self, best, counts, reach);
            if !combine.all() {
                return End::Stopped { bound: passed + 1 };
            }
            passed = reach;
            let done = best.worst().is_some_and(|worst| worst.0 <= reach);
            if done || self.beyond_cap(reach) || self.rails.iter().all(|r| r.exhausted) {
                return End::Complete;
            }
            // On to the next build that can come at all.
            let next = self
                .rails
                .iter()
                .zip(&least)
                .filter_map(|(rail, least)| Some(rail.walk.floor()?.0 + base - least));
            reach = (reach + step).max(next.min().unwrap_or(reach));
            step *= 2;
        }
    }
}

impl Search<'_, '_> {
    /// Whether the supply's cap on the objective rules out everything above this.
    #[allow(clippy::cast_precision_loss)]
    fn beyond_cap(&self, passed: i64) -> bool {
        let supply = self.question.supply;
        let cap = match self.question.objective {
            Objective::Cost => whole::cost(supply, Money(passed)),
            Objective::Heat => whole::heat(supply, Ok((passed - 1) as f64 * 1e-6)),
        };
        cap.is_some_and(|c| !c.met())
    }
}

/// Every column of every rail, unpruned: for the second opinion on small catalogues.
#[must_use]
pub fn columns_of<'c>(question: &Question<'c>) -> Vec<Vec<Column<'c>>> {
    let site = Site::new(question.supply);
    let must = Must {
        without: question.without.clone(),
        named: question.with.iter().map(|&(part, _)| part).collect(),
        in_rail: Vec::new(),
    };
    let mut search = Search::new(&site, question, &must, &mut Counts::default());
    for rail in &mut search.rails {
        rail.extend(i64::MAX, &question.stop, &mut Counts::default(), false);
    }
    search
        .rails
        .into_iter()
        .map(|rail| rail.ready.into_iter().map(|r| r.column).collect())
        .collect()
}

/// Depth-first combination of the ready columns up to a reach.
struct Combine<'a, 's, 'c> {
    search: &'a Search<'s, 'c>,
    supply: &'c Supply,
    best: &'a mut Best<'c>,
    counts: &'a mut Counts,
    reach: i64,
    /// Rails in the order in which they are decided.
    order: Vec<usize>,
    /// Behind each depth: least cost and heat of the rails not yet decided.
    rest: Vec<(i64, f64)>,
    /// Behind each depth, by part: most pieces that the undecided rails can add.
    addable: Vec<Vec<u64>>,
    pieces: Vec<u64>,
    chosen: Vec<usize>,
    stopped: bool,
}

impl<'a, 's, 'c> Combine<'a, 's, 'c> {
    fn new(search: &'a Search<'s, 'c>, best: &'a mut Best<'c>, counts: &'a mut Counts, reach: i64) -> Self {
        let mut order: Vec<usize> = (0..search.rails.len()).collect();
        order.sort_by_key(|&rail| (search.rails[rail].ready.len(), rail));
        let mut rest = vec![(0, 0.0); order.len() + 1];
        let mut addable = vec![vec![0; search.parts]; order.len() + 1];
        for depth in (0..order.len()).rev() {
            let ready = &search.rails[order[depth]].ready;
            let cost = ready.iter().map(|r| r.column.floor_cost.0).min().unwrap_or(0);
            let heat = ready.iter().map(|r| r.heat_w).fold(f64::INFINITY, f64::min);
            rest[depth] = (rest[depth + 1].0 + cost, rest[depth + 1].1 + heat);
            let mut most = vec![0; search.parts];
            for &(part, pieces) in ready.iter().flat_map(|r| &r.lines) {
                let most = &mut most[part.id.0 as usize];
                *most = pieces.max(*most);
            }
            addable[depth] = addable[depth + 1].iter().zip(most).map(|(a, b)| a + b).collect();
        }
        Combine {
            search,
            supply: best.supply,
            best,
            counts,
            reach,
            chosen: vec![0; order.len()],
            order,
            rest,
            addable,
            pieces: vec![0; search.parts],
            stopped: false,
        }
    }

    /// Whether it came to its end.
    fn all(&mut self) -> bool {
        self.decide(0, 0, 0.0, &mut Vec::new());
        !self.stopped
    }

    /// Decides the rail at this depth; `floor` and `heat_w` are those of the rails decided before it.
    fn decide(&mut self, depth: usize, floor: i64, heat_w: f64, used: &mut Vec<&'c Part>) {
        let search = self.search;
        let objective = search.question.objective;
        let rail = self.order[depth];
        for (place, ready) in search.rails[rail].ready.iter().enumerate() {
            self.counts.nodes += 1;
            if self.counts.nodes.is_multiple_of(4096) && search.question.stop.now() {
                self.stopped = true;
            }
            if self.stopped {
                return;
            }
            let floor = floor + ready.column.floor_cost.0;
            let heat_w = heat_w + ready.heat_w;
            let (rest_cost, rest_heat) = self.rest[depth + 1];
            let least_heat = heat_bound(heat_w + rest_heat);
            let least = objective.order(floor + rest_cost, least_heat);
            // Columns rise in the first part of their key, so what is beyond reach stays so.
            if least.0 > self.reach.saturating_add(HEAT_ROUNDING) {
                break;
            }
            // A hair less than the sum, which the audit adds up in another order.
            let cool = whole::heat(self.supply, Ok((heat_w + rest_heat) * (1.0 - 1e-12))).is_none_or(|c| c.met());
            if self.beyond(least) || !cool {
                continue;
            }
            let known = used.len();
            let stocked = self.take(ready, used);
            if stocked {
                self.chosen[rail] = place;
                let cost = self.priced(depth + 1, used) + self.fitted(depth + 1);
                let least = objective.order(cost.0 + rest_cost, least_heat);
                let affordable = whole::cost(self.supply, cost + Money(rest_cost)).is_none_or(|c| c.met());
                if affordable && !self.beyond(least) {
                    if depth + 1 == self.order.len() {
                        self.offer(cost, used);
                    } else {
                        self.decide(depth + 1, floor, heat_w, used);
                    }
                }
            }
            for &(part, pieces) in &ready.lines {
                self.pieces[part.id.0 as usize] -= pieces;
            }
            used.truncate(known);
        }
    }

    /// Whether nothing with such a bound can enter the list.
    fn beyond(&self, least: (i64, i64)) -> bool {
        self.best.worst().is_some_and(|worst| least > worst)
    }

    /// Adds a column's pieces; whether the stock still allows them.
    fn take(&mut self, ready: &Ready<'c>, used: &mut Vec<&'c Part>) -> bool {
        let mut stocked = true;
        for &(part, pieces) in &ready.lines {
            let count = &mut self.pieces[part.id.0 as usize];
            if *count == 0 {
                used.push(part);
            }
            *count += pieces;
            stocked &= whole::stock(self.supply, part, *count).is_none_or(|c| c.met());
        }
        stocked
    }

    /// Least cost of the parts in use: at the tier that they and the most that may still join them reach. Behind the
    /// last rail nothing can join, and this is their cost.
    fn priced(&self, depth: usize, used: &[&'c Part]) -> Money {
        let price = |part: &&'c Part| {
            let id = part.id.0 as usize;
            let most = (self.pieces[id] + self.addable[depth][id]) * self.supply.builds;
            part.unit_price(part.stock.map_or(most, |stock| most.min(stock))) * self.pieces[id]
        };
        used.iter().map(price).sum()
    }

    fn fitted(&self, depth: usize) -> Money {
        self.order[..depth]
            .iter()
            .map(|&rail| self.at(rail).column.pass.fitted_price)
            .sum()
    }

    fn at(&self, rail: usize) -> &'a Ready<'c> {
        &self.search.rails[rail].ready[self.chosen[rail]]
    }

    /// A complete choice that no limit speaks against.
    fn offer(&mut self, cost: Money, used: &[&'c Part]) {
        let columns: Vec<&Column<'c>> = (0..self.order.len()).map(|rail| &self.at(rail).column).collect();
        let heat_w = total_w(
            (columns.iter().map(|c| c.core_w))
                .chain(columns.iter().map(|c| c.section_w))
                .chain(columns.iter().map(|c| c.pass_w)),
        );
        if !whole::heat(self.supply, Ok(heat_w)).is_none_or(|c| c.met()) {
            return;
        }
        let mut bill: Bill = used.iter().map(|p| (p.id, self.pieces[p.id.0 as usize])).collect();
        bill.sort_unstable();
        self.best.offer(bill, cost.0, compared(heat_w), || build_of(&columns));
    }
}

/// Columns with the same floored heat come by cost, so the next one may be cooler by less than this, in microwatts.
const HEAT_ROUNDING: i64 = 1;

/// Lower bound of a heat as it is compared, whatever the order in which it is added up.
#[allow(clippy::cast_possible_truncation)]
fn heat_bound(watts: f64) -> i64 {
    (watts * 1e6 - 1e-3).round() as i64
}

/// The build that takes these columns, each with its own transformer and section.
fn build_of<'c>(columns: &[&Column<'c>]) -> Build<'c> {
    let place = |rail: usize, column: &&Column<'c>| Section {
        id: section_id(rail),
        transformer: rail,
        hookup: (*column.hookup).clone(),
        path: column.path,
        rectifier: column.rectifier,
        rectifier_sink: column.rectifier_sink,
        reservoir: column.reservoir,
        cans: column.cans,
        rails: vec![rail],
    };
    Build {
        transformers: (columns.iter().enumerate())
            .map(|(rail, c)| Instance {
                id: transformer_id(rail),
                part: c.transformer,
            })
            .collect(),
        sections: columns.iter().enumerate().map(|(rail, c)| place(rail, c)).collect(),
        rails: (columns.iter().enumerate())
            .map(|(rail, c)| RailChoice {
                section: rail,
                pass: c.pass,
                sink: c.sink,
            })
            .collect(),
    }
}
