//! Owns the build that a frame makes with one feed for each outlet, and the verdict on one plan alone.

use std::collections::BTreeMap;

use super::lists::Lists;
use crate::audit::{Site, audit, total_w};
use crate::build::{Build, Instance, RailChoice, Section, section_id, transformer_id};
use crate::screen::{Feed, Outlet, Plan};
use crate::supply::Supply;

/// A plan with a feed for each of its outlets.
pub(super) type Fed<'a, 'c> = (&'a Plan<'c>, Vec<&'a Feed<'c>>);

/// The build of these plans, by first rail; rails are numbered as in `rails`, which lists all that they feed.
pub(super) fn build<'c>(fed: &[Fed<'_, 'c>], rails: &[usize]) -> Build<'c> {
    let number = |rail: usize| rails.iter().position(|&r| r == rail).unwrap_or(0);
    let mut order: Vec<(usize, usize)> = Vec::new();
    for (p, (plan, _)) in fed.iter().enumerate() {
        order.extend((0..plan.outlets.len()).map(|o| (p, o)));
    }
    let outlet = |&(p, o): &(usize, usize)| -> &Outlet<'c> { &fed[p].0.outlets[o] };
    order.sort_by_key(|at| outlet(at).rails[0]);
    let section_of = |plan: usize, other: usize| order.iter().position(|&at| at == (plan, other));
    let sections: Vec<Section<'c>> = (order.iter().enumerate())
        .map(|(place, at)| {
            let (outlet, feed) = (outlet(at), fed[at.0].1[at.1]);
            Section {
                id: section_id(place),
                transformer: at.0,
                hookup: (*outlet.hookup).clone(),
                path: outlet.path,
                pair: outlet.pair.and_then(|other| section_of(at.0, other)),
                rectifier: feed.rectifier,
                rectifier_sink: feed.rectifier_sink,
                reservoir: feed.reservoir,
                cans: feed.cans,
                rails: outlet.rails.iter().map(|&rail| number(rail)).collect(),
            }
        })
        .collect();
    let mut choices: Vec<(usize, RailChoice<'c>)> = Vec::new();
    for (section, at) in order.iter().enumerate() {
        for (&rail, &(pass, sink)) in outlet(at).rails.iter().zip(&fed[at.0].1[at.1].devices) {
            choices.push((rail, RailChoice { section, pass, sink }));
        }
    }
    choices.sort_by_key(|&(rail, _)| rail);
    Build {
        transformers: (fed.iter().enumerate())
            .map(|(place, (plan, _))| Instance {
                id: transformer_id(place),
                part: plan.transformer,
            })
            .collect(),
        sections,
        rails: choices.into_iter().map(|(_, choice)| choice).collect(),
    }
}

/// Heat of all, added up as the audit does.
pub(super) fn heat_w(fed: &[Fed]) -> f64 {
    let feeds = || fed.iter().flat_map(|(plan, feeds)| plan.outlets.iter().zip(feeds));
    let mut sections: Vec<(usize, f64)> = feeds().map(|(o, feed)| (o.rails[0], feed.section_w)).collect();
    let mut devices: Vec<(usize, f64)> = feeds()
        .flat_map(|(o, feed)| o.rails.iter().copied().zip(feed.pass_w.iter().copied()))
        .collect();
    sections.sort_by_key(|&(rail, _)| rail);
    devices.sort_by_key(|&(rail, _)| rail);
    let cores = fed.iter().map(|(plan, _)| plan.core_w);
    let rest = sections.into_iter().chain(devices).map(|(_, watts)| watts);
    total_w(cores.chain(rest))
}

/// Verdicts on plans alone: what their sections must meet together.
pub(super) struct Judge<'s, 'c> {
    site: &'s Site<'c>,
    /// By rails, the supply of these alone.
    supplies: BTreeMap<u32, Supply>,
    /// By source and the places of its feeds.
    known: BTreeMap<(usize, Vec<usize>), bool>,
}

impl<'s, 'c> Judge<'s, 'c> {
    pub(super) fn new(site: &'s Site<'c>) -> Self {
        Judge {
            site,
            supplies: BTreeMap::new(),
            known: BTreeMap::new(),
        }
    }

    /// Whether the sections of a plan hold together, caps of the whole supply aside.
    pub(super) fn holds(&mut self, lists: &Lists<'_, 'c>, source: usize, places: &[usize]) -> bool {
        if let Some(&known) = self.known.get(&(source, places.to_vec())) {
            return known;
        }
        let plan = lists.sources[source].plan;
        let rails: Vec<usize> = (0..self.site.supply.rails.len())
            .filter(|rail| plan.mask & (1 << rail) != 0)
            .collect();
        let whole = self.site.supply;
        let supply = self.supplies.entry(plan.mask).or_insert_with(|| {
            let mut supply = whole.clone();
            supply.rails = rails.iter().map(|&rail| whole.rails[rail].clone()).collect();
            (supply.caps.cost, supply.caps.heat_w) = (None, None);
            supply
        });
        let views = places.iter().zip(&lists.sources[source].views);
        let feeds = views.filter_map(|(&place, view)| lists.flows[view.flow].ready[place].feed.as_ref());
        let build = build(&[(plan, feeds.collect())], &rails);
        let verdict = audit(supply, &build);
        let holds = verdict.heat_w.is_some() && verdict.margins.iter().all(|margin| self.site.holds(margin.check));
        self.known.insert((source, places.to_vec()), holds);
        holds
    }
}
