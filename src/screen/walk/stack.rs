//! Owns the last step of the walk: the sinks of a solved section with its device.

use std::sync::Arc;

use super::{Bank, Column, Entry, Losses, Pair, Stack, Walk, heat_floor};
use crate::audit::{Corner, Stage, rectifier};
use crate::build::{pieces_of_rectifier, sink_takes};
use crate::catalogue::{RectifierKind, Sink};
use crate::units::Money;
use std::cmp::Reverse;

impl<'c> Walk<'_, 'c> {
    pub(super) fn push_stack(&mut self, stack: usize, place: usize) {
        if place < self.stacks[stack].sinks.len() {
            let column = self.column(stack, place);
            let key = self.objective.order(column.floor_cost.0, heat_floor(column.heat_w()));
            self.heap.push(Reverse((key, Entry::Stack(stack, place))));
        }
    }

    pub(super) fn column(&self, stack: usize, place: usize) -> Column<'c> {
        let Stack { column, sinks } = &self.stacks[stack];
        let sink = sinks[place];
        let sink_cost = sink.map_or(0, |s| self.prices.cost(&s.part, 1).0);
        let mut column = column.clone();
        column.sink = sink;
        column.floor_cost.0 += sink_cost;
        column
    }

    /// Stacks every choice of sinks that keeps both junctions.
    pub(super) fn stack(
        &self,
        pair: &Pair,
        bank: Bank<'c>,
        stage: &Stage<'c>,
        losses: &Losses,
        found: &mut Vec<Stack<'c>>,
    ) {
        let source = &self.sources[pair.source];
        let rectifier = self.shelf.rectifiers[pair.rectifier];
        let case = if rectifier.kind == RectifierKind::Bridge {
            rectifier.case.as_deref()
        } else {
            None
        };
        let rectifier_sinks = self.sinks_that(case, |sink| {
            rectifier::junction(self.site, rectifier, Ok(losses.package_w), sink).met()
        });
        let sinks = self.sinks_that(stage.device.case.as_deref(), |sink| {
            stage.junction(self.site, Corner::High, Ok(losses.pass_w), sink).met()
        });
        if sinks.is_empty() {
            return;
        }
        let section_cost = self.prices.cost(&source.transformer.part, 1)
            + self
                .prices
                .cost(&rectifier.part, pieces_of_rectifier(rectifier.kind, source.path))
            + self.prices.cost(&bank.can.part, u64::from(bank.cans));
        for rectifier_sink in rectifier_sinks {
            found.push(Stack {
                column: Column {
                    transformer: source.transformer,
                    hookup: Arc::clone(&source.hookup),
                    path: source.path,
                    rectifier,
                    rectifier_sink,
                    reservoir: bank.can,
                    cans: bank.cans,
                    pass: stage.device,
                    sink: None,
                    core_w: source.core_w,
                    section_w: losses.section_w,
                    pass_w: losses.pass_w,
                    floor_cost: section_cost + Money(self.device_cost(stage)) + self.sink_cost(rectifier_sink),
                },
                sinks: sinks.clone(),
            });
        }
    }

    fn sink_cost(&self, sink: Option<&Sink>) -> Money {
        sink.map_or(Money(0), |s| self.prices.cost(&s.part, 1))
    }

    /// No sink and every sink for that outline with which the junction holds, cheapest first.
    fn sinks_that(&self, case: Option<&str>, holds: impl Fn(Option<&Sink>) -> bool) -> Vec<Option<&'c Sink>> {
        let fitting = self
            .shelf
            .sinks
            .iter()
            .filter(|s| sink_takes(s, case))
            .map(|&s| Some(s));
        let mut all: Vec<Option<&'c Sink>> = std::iter::once(None).chain(fitting).filter(|&s| holds(s)).collect();
        all.sort_by_key(|&s| (self.sink_cost(s), s.map(|s| s.part.id)));
        all
    }
}
