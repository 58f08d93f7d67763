//! Owns the depth-first combination of columns, one for each rail, up to a reach.

use super::Question;
use super::best::{Best, Bill};
use super::columns::Ready;
use crate::audit::{compared, total_w, whole};
use crate::build::{Build, Instance, RailChoice, Section, section_id, transformer_id};
use crate::catalogue::Part;
use crate::screen::{Column, Counts, Objective};
use crate::supply::Supply;
use crate::units::Money;

/// Columns with the same floored heat come by cost, so the next one may be cooler by less than this, in microwatts.
const HEAT_ROUNDING: i64 = 1;

/// One run over all combinations.
pub(super) struct Combine<'a, 'c> {
    question: &'a Question<'c>,
    ready: &'a [&'a [Ready<'c>]],
    /// By rail: columns that may take part, with their least share of the objective, rising.
    kept: &'a [Vec<(usize, i64)>],
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

impl<'a, 'c> Combine<'a, 'c> {
    pub(super) fn new(
        question: &'a Question<'c>,
        ready: &'a [&'a [Ready<'c>]],
        kept: &'a [Vec<(usize, i64)>],
        best: &'a mut Best<'c>,
        counts: &'a mut Counts,
        parts: usize,
        reach: i64,
    ) -> Self {
        let mut order: Vec<usize> = (0..ready.len()).collect();
        order.sort_by_key(|&rail| (kept[rail].len(), rail));
        let mut rest = vec![(0, 0.0); order.len() + 1];
        let mut addable = vec![vec![0; parts]; order.len() + 1];
        for depth in (0..order.len()).rev() {
            let rail = order[depth];
            let columns = || kept[rail].iter().map(|&(place, floor)| (&ready[rail][place], floor));
            let cost = match question.objective {
                Objective::Cost => columns().map(|(_, floor)| floor).min(),
                Objective::Heat => columns().map(|(r, _)| r.column.floor_cost.0).min(),
            };
            let heat = columns().map(|(r, _)| r.heat_w).fold(f64::INFINITY, f64::min);
            rest[depth] = (rest[depth + 1].0 + cost.unwrap_or(0), rest[depth + 1].1 + heat);
            let mut most = vec![0; parts];
            for &(part, pieces) in columns().flat_map(|(r, _)| &r.lines) {
                let most = &mut most[part.id.0 as usize];
                *most = pieces.max(*most);
            }
            addable[depth] = addable[depth + 1].iter().zip(most).map(|(a, b)| a + b).collect();
        }
        Combine {
            question,
            ready,
            kept,
            best,
            counts,
            reach,
            chosen: vec![0; order.len()],
            order,
            rest,
            addable,
            pieces: vec![0; parts],
            stopped: false,
        }
    }

    /// Whether it came to its end.
    pub(super) fn all(&mut self) -> bool {
        self.decide(0, 0, 0.0, &mut Vec::new());
        !self.stopped
    }

    fn supply(&self) -> &'c Supply {
        self.question.supply
    }

    /// Decides the rail at this depth; `cost` is the least one of the rails before it, `heat_w` their heat.
    fn decide(&mut self, depth: usize, cost: i64, heat_w: f64, used: &mut Vec<&'c Part>) {
        let objective = self.question.objective;
        let rail = self.order[depth];
        let (rest_cost, rest_heat) = self.rest[depth + 1];
        for &(place, floor) in &self.kept[rail] {
            self.counts.nodes += 1;
            if self.counts.nodes.is_multiple_of(4096) && self.question.stop.now() {
                self.stopped = true;
            }
            if self.stopped {
                return;
            }
            let ready = &self.ready[rail][place];
            let heat_w = heat_w + ready.heat_w;
            let least_heat = heat_bound(heat_w + rest_heat);
            let least = match objective {
                Objective::Cost => (cost + floor + rest_cost, least_heat),
                Objective::Heat => (least_heat, cost + ready.column.floor_cost.0 + rest_cost),
            };
            // Columns rise in the first part, so what is beyond reach stays so.
            if least.0 > self.limit().saturating_add(HEAT_ROUNDING) {
                break;
            }
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
        least.0 > self.reach.saturating_add(HEAT_ROUNDING) || self.best.worst().is_some_and(|worst| least > worst)
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
        &self.ready[rail][self.chosen[rail]]
    }

    /// A complete choice that no limit speaks against.
    fn offer(&mut self, cost: Money, used: &[&'c Part]) {
        let columns: Vec<&Column<'c>> = (0..self.order.len()).map(|rail| &self.at(rail).column).collect();
        let heat_w = total_w(
            (columns.iter().map(|c| c.core_w))
                .chain(columns.iter().map(|c| c.section_w))
                .chain(columns.iter().map(|c| c.pass_w)),
        );
        if !whole::heat(self.supply(), Ok(heat_w)).is_none_or(|c| c.met()) {
            return;
        }
        let mut bill: Bill = used.iter().map(|p| (p.id, self.pieces[p.id.0 as usize])).collect();
        bill.sort_unstable();
        self.best.offer(bill, cost.0, compared(heat_w), || build_of(&columns));
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
