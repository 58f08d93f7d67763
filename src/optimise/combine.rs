//! Owns the depth-first combination of columns, one for each rail, up to a reach.

use super::Question;
use super::best::{Best, Bill};
use super::columns::Ready;
use super::pool::{Kept, Pool};
use crate::audit::{compared, total_w, whole};
use crate::build::{Build, Instance, RailChoice, Section, section_id, transformer_id};
use crate::catalogue::Part;
use crate::screen::{Column, Counts};
use crate::supply::Supply;
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

/// One run over all combinations.
pub(super) struct Combine<'a, 'c> {
    question: &'a Question<'c>,
    ready: &'a [&'a [Ready<'c>]],
    /// Columns that may take part.
    pool: &'a Pool,
    best: &'a mut Best<'c>,
    counts: &'a mut Counts,
    reach: i64,
    /// Rails in the order in which they are decided.
    order: Vec<usize>,
    /// Behind each depth: least cost, heat and score of the rails not yet decided.
    rest: Vec<(i64, f64, f64)>,
    /// Behind each depth, by part: most pieces that the undecided rails can add.
    addable: Vec<Vec<u64>>,
    pieces: Vec<u64>,
    chosen: Vec<usize>,
    /// Nodes at which the run gives up.
    last_node: u64,
    ended: Option<Run>,
}

impl<'a, 'c> Combine<'a, 'c> {
    pub(super) fn new(
        question: &'a Question<'c>,
        ready: &'a [&'a [Ready<'c>]],
        pool: &'a Pool,
        best: &'a mut Best<'c>,
        counts: &'a mut Counts,
        parts: usize,
        reach: i64,
    ) -> Self {
        let mut order: Vec<usize> = (0..ready.len()).collect();
        order.sort_by_key(|&rail| (pool.by_rail[rail].len(), rail));
        let mut rest = vec![(0, 0.0, 0.0); order.len() + 1];
        let mut addable = vec![vec![0; parts]; order.len() + 1];
        for depth in (0..order.len()).rev() {
            let rail = order[depth];
            let kept = &pool.by_rail[rail];
            let columns = || kept.iter().map(|k| &ready[rail][k.place]);
            let cost = kept.iter().map(|k| k.floor).min().unwrap_or(0);
            let heat = columns().map(|r| r.heat_w).fold(f64::INFINITY, f64::min);
            let score = kept.first().map_or(0.0, |k| k.score);
            let (behind_cost, behind_heat, behind_score) = rest[depth + 1];
            rest[depth] = (behind_cost + cost, behind_heat + heat, behind_score + score);
            let mut most = vec![0; parts];
            for &(part, pieces) in columns().flat_map(|r| &r.lines) {
                let most = &mut most[part.id.0 as usize];
                *most = pieces.max(*most);
            }
            addable[depth] = addable[depth + 1].iter().zip(most).map(|(a, b)| a + b).collect();
        }
        Combine {
            question,
            ready,
            pool,
            best,
            counts,
            reach,
            chosen: vec![0; order.len()],
            order,
            rest,
            addable,
            pieces: vec![0; parts],
            last_node: u64::MAX,
            ended: None,
        }
    }

    /// Looks at everything up to the reach, within a budget of nodes.
    pub(super) fn run(&mut self, budget: u64) -> Run {
        self.last_node = self.counts.nodes.saturating_add(budget);
        self.decide(0, 0, 0.0, &mut Vec::new());
        self.ended.unwrap_or(Run::Whole)
    }

    fn supply(&self) -> &'c Supply {
        self.question.supply
    }

    /// Decides the rail at this depth; `cost` is the least one of the rails before it, `heat_w` their heat.
    fn decide(&mut self, depth: usize, cost: i64, heat_w: f64, used: &mut Vec<&'c Part>) {
        let objective = self.question.objective;
        let rail = self.order[depth];
        let (rest_cost, rest_heat, rest_score) = self.rest[depth + 1];
        let decided = self.pool.score(objective, cost, heat_w);
        for &Kept { place, floor, score } in &self.pool.by_rail[rail] {
            self.counts.nodes += 1;
            if self.counts.nodes.is_multiple_of(4096) && self.question.stop.now() {
                self.ended = Some(Run::Stopped);
            } else if self.counts.nodes > self.last_node {
                self.ended = Some(Run::OutOfNodes);
            }
            if self.ended.is_some() {
                return;
            }
            // Scores rise, so what is beyond the limit stays so.
            if decided + score + rest_score > self.pool.limit(self.limit()) {
                break;
            }
            let ready = &self.ready[rail][place];
            let heat_w = heat_w + ready.heat_w;
            let least_heat = heat_bound(heat_w + rest_heat);
            let least = objective.order(cost + floor + rest_cost, least_heat);
            // A hair less than the sum, which the audit adds up in another order.
            let cool = whole::heat(self.supply(), Ok((heat_w + rest_heat) * (1.0 - 1e-12))).is_none_or(|c| c.met());
            if self.beyond(least) || !cool {
                continue;
            }
            let known = used.len();
            if self.take(ready, used) {
                self.chosen[rail] = place;
                let cost = self.priced(depth + 1, used) + self.fitted(depth + 1);
                let least = objective.order(cost.0 + rest_cost, least_heat);
                let affordable = whole::cost(self.supply(), cost + Money(rest_cost)).is_none_or(|c| c.met());
                if affordable && !self.beyond(least) {
                    if depth + 1 == self.order.len() {
                        self.offer(cost, used);
                    } else {
                        self.decide(depth + 1, cost.0, heat_w, used);
                    }
                }
            }
            for &(part, pieces) in &ready.lines {
                self.pieces[part.id.0 as usize] -= pieces;
            }
            used.truncate(known);
        }
    }

    /// The objective beyond which nothing is of interest.
    fn limit(&self) -> i64 {
        self.best.worst().map_or(self.reach, |worst| worst.0.min(self.reach))
    }

    /// Whether nothing with such a bound can enter the list in this run.
    fn beyond(&self, least: (i64, i64)) -> bool {
        least.0 > self.reach || self.best.worst().is_some_and(|worst| least > worst)
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
            stocked &= whole::stock(self.question.supply, part, *count).is_none_or(|c| c.met());
        }
        stocked
    }

    /// Least cost of the parts in use: at the tier that they and the most that may still join them reach. Behind the
    /// last rail nothing can join, and this is their cost.
    fn priced(&self, depth: usize, used: &[&'c Part]) -> Money {
        let price = |part: &&'c Part| {
            let id = part.id.0 as usize;
            let most = (self.pieces[id] + self.addable[depth][id]) * self.supply().builds;
            part.least_cost(self.pieces[id], most)
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
        &self.ready[rail][self.chosen[rail]]
    }

    /// Offers one choice of kept columns (by place in the pool), whoever made it, if stock and caps allow it; returns its
    /// objective.
    pub(super) fn offer_choice(&mut self, choice: &[usize]) -> Option<i64> {
        let mut used = Vec::new();
        let mut stocked = true;
        for (rail, &at) in choice.iter().enumerate() {
            let place = self.pool.by_rail[rail][at].place;
            self.chosen[rail] = place;
            stocked &= self.take(&self.ready[rail][place], &mut used);
        }
        let cost = self.priced(self.order.len(), &used) + self.fitted(self.order.len());
        if !stocked || !whole::cost(self.supply(), cost).is_none_or(|c| c.met()) {
            return None;
        }
        self.offer(cost, &used)
            .map(|heat| self.question.objective.order(cost.0, heat).0)
    }

    /// A complete choice that no other limit speaks against; returns its heat as compared if the cap allows it.
    fn offer(&mut self, cost: Money, used: &[&'c Part]) -> Option<i64> {
        let columns: Vec<&Column<'c>> = (0..self.order.len()).map(|rail| &self.at(rail).column).collect();
        let heat_w = total_w(
            (columns.iter().map(|c| c.core_w))
                .chain(columns.iter().map(|c| c.section_w))
                .chain(columns.iter().map(|c| c.pass_w)),
        );
        if !whole::heat(self.supply(), Ok(heat_w)).is_none_or(|c| c.met()) {
            return None;
        }
        let mut bill: Bill = used.iter().map(|p| (p.id, self.pieces[p.id.0 as usize])).collect();
        bill.sort_unstable();
        self.best.offer(bill, cost.0, compared(heat_w), || build_of(&columns));
        Some(compared(heat_w))
    }
}

/// Lower bound of a heat as it is compared, whatever the order in which it is added up.
#[allow(clippy::cast_possible_truncation)]
fn heat_bound(watts: f64) -> i64 {
    (watts * 1e6 - 1e-3).round() as i64
}

/// The build that takes these columns, each with its own transformer and section.
fn build_of<'c>(columns: &[&Column<'c>]) -> Build<'c> {
    let section = |rail: usize, column: &Column<'c>| Section {
        id: section_id(rail),
        transformer: rail,
        hookup: (*column.hookup).clone(),
        path: column.path,
        pair: None,
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
        sections: columns.iter().enumerate().map(|(rail, c)| section(rail, c)).collect(),
        rails: (columns.iter().enumerate())
            .map(|(rail, c)| RailChoice {
                section: rail,
                pass: c.pass,
                sink: c.sink,
            })
            .collect(),
    }
}
