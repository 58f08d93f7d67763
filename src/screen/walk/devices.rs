//! Owns the middle step of the walk: the devices behind a section.

use std::cmp::Reverse;

use super::{Choice, Entry, Score, Stack, Walk};
use crate::audit::{Corner, Raw, Stage};
use crate::screen::Counts;
use crate::screen::solved::Solved;

/// Loads of one section whose steady states are kept.
const KEPT_LOADS: usize = 2;

impl<'a, 'c> Walk<'a, 'c> {
    fn stage(&self, rail: usize, place: usize) -> &'a Stage<'c> {
        &self.group.shelf.stages[rail][place]
    }

    /// By rail the devices that the section leaves under the least load, cheapest first; `None` when some rail has none.
    pub(super) fn hopeful(&self, raw: &Raw, solved: &mut Solved, counts: &mut Counts) -> Option<Vec<Vec<usize>>> {
        let low = solved.wave(self.site, raw, Corner::Low, counts);
        let mut devices = Vec::with_capacity(self.source.by_price.len());
        for (rail, by_price) in self.source.by_price.iter().enumerate() {
            let with_headroom = |&i: &usize| self.site.holds(self.stage(rail, i).headroom(self.site, low));
            let list: Vec<usize> = by_price.iter().copied().filter(with_headroom).collect();
            if list.is_empty() {
                return None;
            }
            devices.push(list);
        }
        solved.feeds(self.site, raw, counts).then_some(devices)
    }

    pub(super) fn push_devices(&mut self, section: usize, choice: Choice) {
        let open = &self.sections[section];
        let picked = choice.places().enumerate();
        let cost: i64 = picked
            .map(|(rail, place)| self.device_cost(self.stage(rail, open.devices[rail][place])))
            .sum();
        let score = self.weights.score(open.cost + cost, open.heat);
        self.heap.push(Reverse((Score(score), Entry::Devices(section, choice))));
    }

    pub(super) fn push_more_devices(&mut self, section: usize, choice: &Choice) {
        let open = &self.sections[section];
        let children: Vec<Choice> = choice.children(|rail| open.devices[rail].len()).collect();
        for child in children {
            self.push_devices(section, child);
        }
    }

    /// What comes of some devices behind a section: sinks that hold, or nothing.
    pub(super) fn try_devices(&mut self, section: usize, choice: &Choice, counts: &mut Counts) {
        let known = self.sections[section].stacks.get(choice).copied();
        let stack = known.unwrap_or_else(|| {
            let stack = self.solve_devices(section, choice, counts).map(|stack| {
                self.stacks.push(stack);
                self.stacks.len() - 1
            });
            self.sections[section].stacks.insert(choice.clone(), stack);
            stack
        });
        if let Some(stack) = stack {
            self.push_sinks(stack, Choice::first(self.stacks[stack].sinks.len()));
        }
    }

    /// Solves one section for some devices, and stacks what holds.
    fn solve_devices(&mut self, section: usize, choice: &Choice, counts: &mut Counts) -> Option<Stack<'c>> {
        let mut solved = std::mem::take(&mut self.sections[section].solved);
        let open = &self.sections[section];
        let pair = &self.pairs[open.pair];
        let bank = self.group.shelf.banks[open.bank];
        let raw = self.raw(pair, bank);
        let stages: Vec<&Stage<'c>> = (choice.places().enumerate())
            .map(|(rail, place)| self.stage(rail, open.devices[rail][place]))
            .collect();
        let mut stack = None;
        // In the order of the audit's sum.
        let load_a = stages
            .iter()
            .try_fold(0.0, |sum, stage| Ok::<f64, &str>(sum + stage.load_a()?));
        if let Ok(load_a) = load_a {
            // Devices with equal loads share their steady states.
            #[allow(clippy::float_cmp)]
            let known = solved.iter().position(|s| s.load_a == load_a);
            let at = known.unwrap_or_else(|| {
                solved.push(Solved::new(load_a));
                solved.len() - 1
            });
            if let Some(losses) = solved[at].losses(self.site, &raw, &stages, counts) {
                stack = self.stack(pair, bank, &stages, &losses);
            }
        }
        // The first is the least load, the last was just used; those between would only fill the memory.
        if solved.len() > KEPT_LOADS {
            solved.remove(1);
        }
        self.sections[section].solved = solved;
        stack
    }
}
