//! Owns the last step of the walk: the sinks of a solved section with its devices.

use std::cmp::Reverse;

use super::{Bank, Choice, Entry, Pair, Score, Stack, Walk, heat_floor};
use crate::audit::{Corner, Stage, rectifier, whole};
use crate::build::sink_takes;
use crate::catalogue::{RectifierKind, Sink};
use crate::screen::feed::Feed;
use crate::screen::solved::Losses;
use crate::supply::Path;
use crate::units::Money;

impl<'c> Walk<'_, 'c> {
    pub(super) fn push_sinks(&mut self, stack: usize, choice: Choice) {
        let Stack { feed, sinks } = &self.stacks[stack];
        let picked = choice.places().zip(sinks).map(|(place, sinks)| sinks[place]);
        let cost: Money = picked.map(|sink| self.sink_cost(sink)).sum();
        let score = self
            .weights
            .score((feed.floor_cost + cost).0, heat_floor(feed.heat_w()));
        self.heap.push(Reverse((Score(score), Entry::Stack(stack, choice))));
    }

    pub(super) fn push_more_sinks(&mut self, stack: usize, choice: &Choice) {
        let sinks = &self.stacks[stack].sinks;
        let children: Vec<Choice> = choice.children(|list| sinks[list].len()).collect();
        for child in children {
            self.push_sinks(stack, child);
        }
    }

    /// The feed with these sinks, if it holds what it must, is in stock and close enough.
    pub(super) fn complete(&self, stack: usize, choice: &Choice) -> Option<Feed<'c>> {
        let Stack { feed, sinks } = &self.stacks[stack];
        let mut picked = choice.places().zip(sinks).map(|(place, sinks)| sinks[place]);
        let mut feed = feed.clone();
        feed.rectifier_sink = picked.next().flatten();
        for (device, sink) in feed.devices.iter_mut().zip(picked) {
            device.1 = sink;
        }
        let sinks = || std::iter::once(feed.rectifier_sink).chain(feed.devices.iter().map(|d| d.1));
        let cost: Money = sinks().map(|sink| self.sink_cost(sink)).sum();
        let must = self
            .group
            .shelf
            .must_sinks
            .iter()
            .zip(&feed.devices)
            .all(|(must, (_, own))| {
                let has = |sink: &Option<&Sink>, id| sink.is_some_and(|s| s.part.id == id);
                must.iter().all(|&id| has(&feed.rectifier_sink, id) || has(own, id))
            });
        if let Some(apart) = &self.apart {
            let own = feed.devices.iter().enumerate();
            feed.changes += apart.rectifier_sink(feed.rectifier_sink)
                + own.map(|(rail, &(_, sink))| apart.sink(rail, sink)).sum::<usize>();
        }
        let near = self.apart.as_ref().is_none_or(|apart| feed.changes <= apart.most);
        feed.floor_cost = feed.floor_cost + cost;
        feed.stack = stack;
        let stocked = |(part, pieces)| self.site.holds(whole::stock(self.site.supply, part, pieces));
        (must && near && feed.lines().into_iter().all(stocked)).then_some(feed)
    }

    /// Every choice of sinks that keeps all junctions.
    pub(super) fn stack(
        &self,
        pair: &Pair,
        bank: Bank<'c>,
        stages: &[&Stage<'c>],
        losses: &Losses,
    ) -> Option<Stack<'c>> {
        let rectifier = self.group.shelf.rectifiers[pair.rectifier];
        // On the negative half nothing stands of the rectifier; its junction is judged with the positive one.
        let mut sinks = if self.holds {
            let module = rectifier.kind == RectifierKind::Bridge;
            let mut list = self.sinks_that(rectifier.case.as_deref().filter(|_| module), |sink| {
                let junction = rectifier::junction(self.site, rectifier, Ok(losses.package_w), sink);
                self.site.holds(junction)
            });
            // In a pair the package takes the losses of the other half too, so a better sink may be needed.
            if self.source.path != Path::Dual {
                self.drop_bettered(&mut list);
            }
            vec![list]
        } else {
            vec![vec![None]]
        };
        for (rail, stage) in stages.iter().enumerate() {
            let mut list = self.sinks_that(stage.device.case.as_deref(), |sink| {
                let at = |corner, power_w| stage.junction(self.site, corner, Ok(power_w), sink);
                self.site.holds(at(Corner::High, losses.pass_w[rail]))
                    && (losses.alone_w.get(rail)).is_none_or(|&w| self.site.holds(at(Corner::Alone, w)))
            });
            self.drop_bettered(&mut list);
            sinks.push(list);
        }
        if sinks.iter().any(Vec::is_empty) {
            return None;
        }
        let pieces = self.pieces(rectifier);
        let devices: i64 = stages.iter().map(|stage| self.device_cost(stage)).sum();
        let cost = self.rectifier_cost(rectifier) + devices;
        let changes = self.apart.as_ref().map_or(0, |apart| {
            let own = stages
                .iter()
                .enumerate()
                .map(|(rail, stage)| apart.device(rail, stage.device));
            apart.rectifier(rectifier, pieces) + apart.bank(bank) + own.sum::<usize>()
        });
        if self.apart.as_ref().is_some_and(|apart| changes > apart.most) {
            return None;
        }
        Some(Stack {
            feed: Feed {
                rectifier,
                rectifier_pieces: pieces,
                rectifier_sink: None,
                reservoir: bank.can,
                cans: bank.cans,
                devices: stages.iter().map(|stage| (stage.device, None)).collect(),
                section_w: losses.section_w,
                pass_w: losses.pass_w.clone(),
                va: losses.va,
                load_a: losses.load_a,
                holds_alone: losses.alone_holds,
                floor_cost: Money(cost) + self.group.prices.cost(&bank.can.part, u64::from(bank.cans)),
                changes,
                stack: 0,
            },
            sinks,
        })
    }

    /// Drops sinks that another one of the list betters: cheaper in the same place whatever the rest of the build, and in
    /// stock for any. Where all hold, nothing else tells them apart.
    fn drop_bettered(&self, sinks: &mut Vec<Option<&'c Sink>>) {
        let demanded = self.group.shelf.must_sinks.iter().any(|must| !must.is_empty());
        if !self.only_best || demanded {
            return;
        }
        // What the section itself can take of the same part in other places.
        let more = self.group.shelf.rails.len() as u64;
        let dearer = |sink: Option<&Sink>, own, its| {
            sink.map_or(Some(0), |s| self.group.prices.most_dearer(&s.part, own, its, more))
        };
        let betters = |a: Option<&Sink>, b: Option<&Sink>| {
            dearer(a, 1, 0)
                .zip(dearer(b, 0, 1))
                .is_some_and(|(more, less)| more + less < 0)
        };
        let mut kept: Vec<Option<&'c Sink>> = Vec::new();
        for &sink in sinks.iter() {
            if !kept.iter().any(|&better| betters(better, sink)) {
                kept.push(sink);
            }
        }
        *sinks = kept;
    }

    fn sink_cost(&self, sink: Option<&Sink>) -> Money {
        sink.map_or(Money(0), |s| self.group.prices.cost(&s.part, 1))
    }

    /// No sink and every sink for that outline with which the junction holds, cheapest first.
    fn sinks_that(&self, case: Option<&str>, holds: impl Fn(Option<&Sink>) -> bool) -> Vec<Option<&'c Sink>> {
        let shelf = &self.group.shelf.sinks;
        let fitting = shelf.iter().filter(|s| sink_takes(s, case)).map(|&s| Some(s));
        let mut all: Vec<Option<&'c Sink>> = std::iter::once(None).chain(fitting).filter(|&s| holds(s)).collect();
        all.sort_by_key(|&s| (self.sink_cost(s), s.map(|s| s.part.id)));
        all
    }
}
