//! Owns what one transformer can feed: the sections on its secondaries, with the rails of each.

use std::collections::BTreeMap;
use std::sync::Arc;

use super::bounds::{least_rms_a, source_reaches};
use super::prices::FloorPrices;
use super::reach::{Group, Source, bare_circuit, most_by_rail, prices_but_for};
use crate::audit::{Corner, Site, rectifier, transformer};
use crate::build::{Hookup, Windings, pieces_of_rectifier, windings};
use crate::catalogue::{PartId, Rectifier, Transformer};
use crate::supply::Path;

/// One section of a plan: which rails, through which secondaries, by which path.
#[derive(Debug, Clone)]
pub struct Outlet<'c> {
    /// Place of the group.
    pub(super) group: usize,
    /// Place of the source in it.
    pub(super) source: usize,
    /// On the secondaries that it takes; none on the negative half of a dual pair.
    pub hookup: Arc<Hookup>,
    /// Rectifier circuit.
    pub path: Path,
    /// Places of its rails, rising.
    pub rails: Vec<usize>,
    /// The other half of a dual pair, by place in the plan.
    pub pair: Option<usize>,
    /// The rectifier that both halves of a dual pair have.
    pub rectifier: Option<&'c Rectifier>,
    /// What the other sections of the transformer draw at least: rated volts times load.
    pub(super) others_va: f64,
    /// What they draw at most.
    pub(super) others_most_va: f64,
}

/// What tells apart the walks of outlets: group, source, the rectifier of a dual pair, and whether the outlet holds the
/// secondaries.
pub type FlowKey = (usize, usize, Option<PartId>, bool);

impl Outlet<'_> {
    /// Place of its group.
    #[must_use]
    pub fn group(&self) -> usize {
        self.group
    }

    /// What the other sections of the transformer draw at least: rated volts times load; 0: there are none.
    #[must_use]
    pub fn others_va(&self) -> f64 {
        self.others_va
    }

    /// Outlets with the same key have the same feeds, the low corner beside other sections aside.
    #[must_use]
    pub fn flow_key(&self) -> FlowKey {
        let rectifier = self.rectifier.map(|r| r.part.id);
        (self.group, self.source, rectifier, !self.hookup.secondaries.is_empty())
    }
}

/// A transformer with all that it feeds.
#[derive(Debug, Clone)]
pub struct Plan<'c> {
    /// Which.
    pub transformer: &'c Transformer,
    /// Its iron loss.
    pub core_w: f64,
    /// Least cost of it in any build.
    pub floor_cost: i64,
    /// One bit for each rail that it feeds.
    pub mask: u32,
    /// Its sections in the order of their first rails.
    pub outlets: Vec<Outlet<'c>>,
}

/// A section of a plan in the making.
#[derive(Clone, Copy)]
struct Draft<'c> {
    group: usize,
    source: usize,
    windings: usize,
    /// Place of the other half in the draft, and the rectifier of both.
    pair: Option<(usize, &'c Rectifier)>,
    /// Whether it holds the secondaries: not on the negative half.
    holds: bool,
}

/// Every plan that the groups allow, by transformer, then rails.
#[must_use]
pub fn plans<'c>(site: &Site<'c>, groups: &[Group<'c>], parts: usize) -> Vec<Plan<'c>> {
    let mut by_transformer: BTreeMap<PartId, Vec<(usize, usize)>> = BTreeMap::new();
    for (g, group) in groups.iter().enumerate() {
        for (s, source) in group.sources.iter().enumerate() {
            let of = by_transformer.entry(source.transformer.part.id).or_default();
            of.push((g, s));
        }
    }
    let rails = site.supply.rails.len();
    let most = most_by_rail(site, groups, rails, parts);
    let prices: BTreeMap<u32, FloorPrices> = (1_u32..1 << rails)
        .map(|mask| {
            (
                mask,
                prices_but_for(site, &most, mask, mask.count_ones() as usize, parts),
            )
        })
        .collect();
    let mut found = Vec::new();
    for options in by_transformer.values() {
        let (g, s) = options[0];
        let transformer = groups[g].sources[s].transformer;
        let windings = windings(transformer);
        let mut planner = Planner {
            site,
            groups,
            prices: &prices,
            transformer,
            left: windings.iter().map(|w| w.places.len()).collect(),
            options: options
                .iter()
                .map(|&(g, s)| {
                    let first = groups[g].sources[s].hookup.secondaries[0];
                    let of = windings.iter().position(|w| w.places.contains(&first));
                    (g, s, of.unwrap_or(0))
                })
                .collect(),
            windings,
            drafts: Vec::new(),
            found: &mut found,
        };
        planner.extend(0, 0);
    }
    found
}

struct Planner<'a, 'c> {
    site: &'a Site<'c>,
    groups: &'a [Group<'c>],
    prices: &'a BTreeMap<u32, FloorPrices>,
    transformer: &'c Transformer,
    windings: Vec<Windings>,
    /// Places left of each kind of winding.
    left: Vec<usize>,
    /// Group, source, kind of winding.
    options: Vec<(usize, usize, usize)>,
    drafts: Vec<Draft<'c>>,
    found: &'a mut Vec<Plan<'c>>,
}

impl<'c> Planner<'_, 'c> {
    /// Adds every further section whose first rail is `from` or later.
    fn extend(&mut self, from: u32, taken: u32) {
        for place in 0..self.options.len() {
            let (group, source, kind) = self.options[place];
            let mask = self.groups[group].mask;
            let used = self.used_up(group, source, kind);
            if mask.trailing_zeros() < from || mask & taken != 0 || used > self.left[kind] {
                continue;
            }
            let draft = Draft {
                group,
                source,
                windings: kind,
                pair: None,
                holds: true,
            };
            self.left[kind] -= used;
            if self.source(&draft).path == Path::Dual {
                self.pairs(&draft, taken | mask);
            } else {
                self.drafts.push(draft);
                self.go_on(mask.trailing_zeros() + 1, taken | mask);
                self.drafts.pop();
            }
            self.left[kind] += used;
        }
    }

    /// The plan so far, and what may be added to it.
    fn go_on(&mut self, from: u32, taken: u32) {
        let Some(plan) = self.plan(taken) else { return };
        self.found.push(plan);
        if !self.site.supply.share_never {
            self.extend(from, taken);
        }
    }

    /// Every other half, whose first rail comes later, with every rectifier of both.
    fn pairs(&mut self, first: &Draft<'c>, taken: u32) {
        let negative = |group: usize| {
            let rail = self.groups[group].shelf.rails[0];
            self.site.supply.rails[rail].voltage_v < 0.0
        };
        let own = &self.groups[first.group];
        let (from, own_negative) = (own.mask.trailing_zeros(), negative(first.group));
        for place in 0..self.options.len() {
            let (group, source, kind) = self.options[place];
            let other = &self.groups[group];
            let fits = other.sources[source].path == Path::Dual
                && kind == first.windings
                && negative(group) != own_negative
                && other.mask & taken == 0
                && other.mask.trailing_zeros() > from;
            if !fits {
                continue;
            }
            let (groups, site) = (self.groups, self.site);
            for &rectifier in &groups[first.group].shelf.rectifiers {
                let shared = other.shelf.rectifiers.iter().any(|r| r.part.id == rectifier.part.id);
                let idle_v = other.sources[source].idle_v;
                let serves = pieces_of_rectifier(rectifier.kind, Path::Dual) > 0
                    && site.holds(rectifier::reverse_voltage(site, rectifier, Path::Dual, idle_v));
                if !shared || !serves {
                    continue;
                }
                let at = self.drafts.len();
                self.drafts.push(Draft {
                    pair: Some((at + 1, rectifier)),
                    holds: !own_negative,
                    ..*first
                });
                self.drafts.push(Draft {
                    group,
                    source,
                    windings: kind,
                    pair: Some((at, rectifier)),
                    holds: own_negative,
                });
                self.go_on(from + 1, taken | other.mask);
                self.drafts.truncate(at);
            }
        }
    }

    fn source(&self, draft: &Draft) -> &Source<'c> {
        &self.groups[draft.group].sources[draft.source]
    }

    fn used_up(&self, group: usize, source: usize, kind: usize) -> usize {
        let hookup = &self.groups[group].sources[source].hookup;
        self.windings[kind].used_up(hookup.secondaries.len())
    }

    /// The drafts as a plan, on the lowest free places in the order of their first rails; `None` when they are too much
    /// for the transformer with any rectifiers, banks and devices.
    fn plan(&self, mask: u32) -> Option<Plan<'c>> {
        let mut order: Vec<usize> = (0..self.drafts.len()).collect();
        order.sort_by_key(|&d| self.groups[self.drafts[d].group].mask.trailing_zeros());
        let drawn: Vec<f64> = (self.drafts.iter())
            .map(|d| self.source(d).hookup.volts_v * self.source(d).load_a)
            .collect();
        let most_drawn: Vec<f64> = (self.drafts.iter())
            .map(|d| self.source(d).hookup.volts_v * self.source(d).most_load_a)
            .collect();
        let mut next = vec![0; self.windings.len()];
        let mut outlets = Vec::with_capacity(order.len());
        for &d in &order {
            let draft = &self.drafts[d];
            let source = self.source(draft);
            let mut hookup = (*source.hookup).clone();
            let count = hookup.secondaries.len();
            hookup.secondaries.clear();
            if draft.holds {
                let from = next[draft.windings];
                next[draft.windings] += self.windings[draft.windings].used_up(count);
                let places = &self.windings[draft.windings].places[from..from + count];
                hookup.secondaries.extend_from_slice(places);
            }
            let others = |of: &[f64]| -> f64 { (0..of.len()).filter(|&o| o != d).map(|o| of[o]).sum() };
            outlets.push(Outlet {
                group: draft.group,
                source: draft.source,
                hookup: Arc::new(hookup),
                path: source.path,
                rails: self.groups[draft.group].shelf.rails.clone(),
                pair: draft.pair.and_then(|(other, _)| order.iter().position(|&o| o == other)),
                rectifier: draft.pair.map(|(_, rectifier)| rectifier),
                others_va: others(&drawn),
                others_most_va: others(&most_drawn),
            });
        }
        let plan = Plan {
            transformer: self.transformer,
            core_w: self.source(&self.drafts[0]).core_w,
            floor_cost: self.prices[&mask].cost(&self.transformer.part, 1).0,
            mask,
            outlets,
        };
        (self.drafts.len() == 1 || self.can_feed(&plan)).then_some(plan)
    }

    /// Whether the transformer can feed all at once: least currents at the high corner, and each level at the low one
    /// with all others on the primary.
    fn can_feed(&self, plan: &Plan) -> bool {
        let mut va = 0.0;
        for outlet in &plan.outlets {
            let source = &self.groups[outlet.group].sources[outlet.source];
            let at = |corner, others_va| bare_circuit(self.site, source, None, corner, source.load_a, others_va);
            let (Ok(low), Ok(high)) = (at(Corner::Low, outlet.others_va), at(Corner::High, 0.0)) else {
                return false;
            };
            let level_v = source.levels.iter().map(|&(level_v, _)| level_v).fold(0.0, f64::max);
            if !source_reaches(&low, level_v) {
                return false;
            }
            // The halves of a pair meet in the square root of the sum of squares: left to the audit.
            if source.path != Path::Dual {
                va += transformer::section_va(&source.hookup, source.path, least_rms_a(&high, 0.0));
            }
        }
        self.site.holds(transformer::load(self.transformer, Ok(va)))
    }
}
