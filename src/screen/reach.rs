//! Owns how far a section's shelf reaches: the hook-ups that can feed it at all, and how many pieces of each part it
//! can use at most.

use std::sync::Arc;

use super::bounds::{least_rms_a, let_through_v, source_reaches};
use super::prices::FloorPrices;
use super::shelf::{Must, Shelf};
use crate::audit::{Corner, Known, Site, Stage, core_w, rectifier, reservoir, transformer};
use crate::build::{Hookup, diodes_in_path, hookups, pieces_of_rectifier, sink_takes};
use crate::catalogue::{Catalogue, Part, Polarity, Rectifier, RectifierKind, Transformer};
use crate::physics::raw_section::RawSection;
use crate::physics::winding::WindingLoad;
use crate::supply::Path;

/// One transformer hook-up with a path, for one group of rails.
pub(super) struct Source<'c> {
    pub(super) transformer: &'c Transformer,
    /// On the lowest places, as if all secondaries were free.
    pub(super) hookup: Arc<Hookup>,
    pub(super) path: Path,
    /// Unloaded raw voltage at high mains.
    pub(super) idle_v: f64,
    pub(super) core_w: f64,
    /// By rail, devices that can stand behind it, as places in the shelf, least load first.
    pub(super) stages: Vec<Vec<usize>>,
    /// The same, cheapest first; settled once prices are known.
    pub(super) by_price: Vec<Vec<usize>>,
    /// Least load of the section.
    pub(super) load_a: f64,
    /// Most load.
    pub(super) most_load_a: f64,
    /// By rail, the least valley and the least input that regulates, over its devices.
    pub(super) levels: Vec<(f64, f64)>,
}

/// Rails that one section can feed: their shelf, the hook-ups that can feed them, and prices.
pub struct Group<'c> {
    pub(super) shelf: Shelf<'c>,
    /// One bit for each rail.
    pub(super) mask: u32,
    pub(super) sources: Vec<Source<'c>>,
    pub(super) prices: FloorPrices,
    /// Banks by least price.
    pub(super) banks: Vec<(usize, i64)>,
}

impl<'c> Group<'c> {
    /// Every group of rails that may share a section and that some hook-up can feed, by mask.
    #[must_use]
    pub fn all(site: &Site<'c>, catalogue: &'c Catalogue, must: &Must) -> Vec<Group<'c>> {
        let supply = site.supply;
        let count = supply.rails.len();
        let mut groups: Vec<Group<'c>> = Vec::new();
        for mask in 1_u32..1 << count {
            let rails: Vec<usize> = (0..count).filter(|rail| mask & (1 << rail) != 0).collect();
            if !crate::build::may_share(supply, &rails) {
                continue;
            }
            let shelf = Shelf::new(site, catalogue, &rails, must);
            let sources = sources(site, &shelf);
            if !sources.is_empty() {
                groups.push(Group {
                    prices: FloorPrices::new(supply.builds, rails.len(), Vec::new()),
                    shelf,
                    mask,
                    sources,
                    banks: Vec::new(),
                });
            }
        }
        let parts = catalogue.parts().count();
        let most = most_by_rail(site, &groups, count, parts);
        for group in &mut groups {
            group.prices = prices_but_for(site, &most, group.mask, group.shelf.rails.len(), parts);
            let prices = &group.prices;
            for source in &mut group.sources {
                for (stages, kinds) in source.stages.iter().zip(&group.shelf.stages) {
                    let mut by_price = stages.clone();
                    by_price.sort_by_key(|&i| (device_cost(prices, &kinds[i]), i));
                    source.by_price.push(by_price);
                }
            }
            group.banks = (group.shelf.banks.iter().enumerate())
                .map(|(i, bank)| (i, prices.cost(&bank.can.part, u64::from(bank.cans)).0))
                .collect();
            group.banks.sort_by_key(|&(i, price)| (price, i));
        }
        groups
    }
}

impl Group<'_> {
    /// Most by which `own` pieces of a part cost more in a build than `its` in their place, whatever the rest of it;
    /// `None` where the stock may not suffice for more pieces.
    #[must_use]
    pub fn most_dearer(&self, part: &Part, own: u64, its: u64) -> Option<i64> {
        self.prices.most_dearer(part, own, its, 0)
    }
}

/// Least cost of a device with its fitted values.
pub(super) fn device_cost(prices: &FloorPrices, stage: &Stage) -> i64 {
    (prices.cost(&stage.device.part, 1) + stage.device.fitted_price).0
}

/// By rail and part: the most pieces that a build can use for that rail, a section's own parts counted with each of its
/// rails.
pub(super) fn most_by_rail(site: &Site, groups: &[Group], rails: usize, parts: usize) -> Vec<Vec<u64>> {
    let mut most = vec![vec![0; parts]; rails];
    for group in groups {
        let of_group = most_pieces(site, group, parts);
        for &rail in &group.shelf.rails {
            for (most, pieces) in most[rail].iter_mut().zip(&of_group) {
                *most = (*most).max(*pieces);
            }
        }
    }
    most
}

/// Least prices for a section with these rails.
pub(super) fn prices_but_for(site: &Site, most: &[Vec<u64>], mask: u32, rails: usize, parts: usize) -> FloorPrices {
    let others = || (0..most.len()).filter(|rail| mask & (1 << rail) == 0);
    let elsewhere = (0..parts).map(|part| others().map(|rail| most[rail][part]).sum());
    FloorPrices::new(site.supply.builds, rails, elsewhere.collect())
}

/// Most pieces of each part that a section of the group can use with one of its rails.
fn most_pieces(site: &Site, group: &Group, parts: usize) -> Vec<u64> {
    let shelf = &group.shelf;
    let mut most = vec![0; parts];
    let mut at_least = |part: &Part, pieces: u64| {
        let most = &mut most[part.id.0 as usize];
        *most = pieces.max(*most);
    };
    let mut cases: Vec<&str> = Vec::new();
    for source in &group.sources {
        at_least(&source.transformer.part, 1);
        for (stages, kinds) in source.stages.iter().zip(&shelf.stages) {
            for &stage in stages {
                at_least(&kinds[stage].device.part, 1);
                cases.extend(kinds[stage].device.case.as_deref());
            }
        }
        for rectifier in &shelf.rectifiers {
            if site.holds(rectifier::reverse_voltage(site, rectifier, source.path, source.idle_v)) {
                at_least(&rectifier.part, pieces_of_rectifier(rectifier.kind, source.path));
            }
        }
    }
    let least_v = group.sources.iter().map(|s| s.idle_v).fold(f64::INFINITY, f64::min);
    for bank in &shelf.banks {
        if site.holds(reservoir::voltage(site, bank.can, least_v)) {
            at_least(&bank.can.part, u64::from(bank.cans));
        }
    }
    cases.sort_unstable();
    cases.dedup();
    let modules = shelf.rectifiers.iter().filter(|r| r.kind == RectifierKind::Bridge);
    let modules: Vec<&str> = modules.filter_map(|r| r.case.as_deref()).collect();
    for sink in &shelf.sinks {
        let on = |cases: &[&str]| u64::from(cases.iter().any(|&case| sink_takes(sink, Some(case))));
        at_least(&sink.part, on(&cases) + on(&modules));
    }
    most
}

/// Loads on a transformer: a section's own, and what its other sections draw together.
pub(super) fn loads(hookup: &Hookup, load_a: f64, others_va: f64) -> Vec<WindingLoad> {
    let own = WindingLoad {
        volts_v: hookup.volts_v,
        load_a,
    };
    let others = WindingLoad {
        volts_v: 1.0,
        load_a: others_va,
    };
    if others_va > 0.0 { vec![own, others] } else { vec![own] }
}

/// The circuit of a source at a corner with a rectifier (`None`: a lossless one) and without its bank; `others_va` is
/// what the transformer's other sections draw (rated volts times load).
pub(super) fn bare_circuit(
    site: &Site,
    source: &Source,
    rectifier: Option<&Rectifier>,
    corner: Corner,
    load_a: f64,
    others_va: f64,
) -> Known<RawSection> {
    let (threshold_v, slope_ohm) = rectifier.map_or(Ok((0.0, 0.0)), |r| site.forward(r, corner))?;
    let all = loads(&source.hookup, load_a, others_va);
    let winding_ohm = site.winding_ohm(source.transformer, &source.hookup, corner, load_a, &all);
    let diodes = diodes_in_path(source.path);
    Ok(RawSection {
        source_rms_v: site.source_v(source.transformer, &source.hookup, corner),
        mains_hz: site.supply.mains.frequency_hz,
        full_wave: source.path != Path::HalfWave,
        series_ohm: winding_ohm + diodes * slope_ohm,
        drop_v: diodes * threshold_v,
        bank_f: 1.0,
        bank_esr_ohm: 0.0,
        load_a,
        load_s: 0.0,
    })
}

/// The transformer's limits at a source current of the high corner, whatever its other sections draw. Of a dual pair
/// the other half is taken as silent, which leaves the currents of a centre-tapped section.
pub(super) fn carries(
    site: &Site,
    transformer: &Transformer,
    hookup: &Hookup,
    path: Path,
    source_rms_a: Known<f64>,
    load_a: f64,
) -> bool {
    let alone = if path == Path::Dual { Path::CentreTap } else { path };
    site.holds(transformer::current(hookup, alone, source_rms_a))
        && site.holds(transformer::load(
            transformer,
            source_rms_a.map(|a| transformer::section_va(hookup, alone, a)),
        ))
        && site.holds(transformer::bias(transformer, hookup, path, Ok(load_a)))
}

/// Every hook-up and path of the shelf's transformers that some devices can stand behind, with any rectifier and bank.
fn sources<'c>(site: &Site<'c>, shelf: &Shelf<'c>) -> Vec<Source<'c>> {
    let mut found = Vec::new();
    for &transformer in &shelf.transformers {
        for hookup in hookups(transformer) {
            let hookup = Arc::new(hookup);
            let idle_v = site.idle_v(transformer, &hookup);
            for &path in shelf.paths.iter().filter(|&&path| hookup.kind.takes(path)) {
                let source = Source {
                    transformer,
                    hookup: Arc::clone(&hookup),
                    path,
                    idle_v,
                    core_w: core_w(site, transformer),
                    stages: Vec::new(),
                    by_price: Vec::new(),
                    load_a: 0.0,
                    most_load_a: 0.0,
                    levels: Vec::new(),
                };
                found.extend(with_devices(site, shelf, source));
            }
        }
    }
    found
}

/// The source with the devices that can stand behind it: input ratings, and the kindest rectifier, bank and neighbours.
fn with_devices<'c>(site: &Site<'c>, shelf: &Shelf<'c>, mut source: Source<'c>) -> Option<Source<'c>> {
    let grounded = source.path != Path::Dual;
    let rated = |stage: &Stage| {
        let mut holds = true;
        stage.input(source.idle_v, |check| holds &= site.holds(check));
        // In a dual pair nothing floats.
        let floats = stage.rail.voltage_v < 0.0 && stage.device.polarity == Polarity::Positive;
        holds && (grounded || !floats)
    };
    let known = |stage: &Stage| Some((stage.load_a().ok()?, stage.valley_wanted_v(site).ok()?));
    let mut lists: Vec<Vec<(usize, f64, f64)>> = Vec::new();
    for kinds in &shelf.stages {
        let fitting = kinds.iter().enumerate().filter(|(_, stage)| rated(stage));
        let mut list: Vec<(usize, f64, f64)> = fitting
            .filter_map(|(i, stage)| known(stage).map(|(load_a, level_v)| (i, load_a, level_v)))
            .collect();
        list.sort_by(|a, b| a.1.total_cmp(&b.1).then(a.0.cmp(&b.0)));
        lists.push(list);
    }
    let least: Vec<f64> = lists
        .iter()
        .map(|list| list.first().map(|&(_, load_a, _)| load_a))
        .collect::<Option<_>>()?;
    for (rail, list) in lists.iter_mut().enumerate() {
        // Rails in their order, as the audit adds them up.
        let with = |load_a: f64| -> f64 {
            (0..least.len())
                .map(|r| if r == rail { load_a } else { least[r] })
                .sum()
        };
        list.retain(|&(_, load_a, level_v)| reaches(site, &source, with(load_a), level_v));
        if list.is_empty() {
            return None;
        }
    }
    source.load_a = lists.iter().map(|list| list[0].1).sum();
    source.most_load_a = lists.iter().filter_map(|list| list.last()).map(|last| last.1).sum();
    source.levels = (lists.iter().zip(&shelf.stages))
        .map(|(list, kinds)| {
            let floor_v = |&(i, _, _): &(usize, f64, f64)| kinds[i].floor_v.unwrap_or(f64::INFINITY);
            (
                let_through_v(
                    list.iter()
                        .map(|&(_, _, level_v)| level_v)
                        .fold(f64::INFINITY, f64::min),
                ),
                let_through_v(list.iter().map(floor_v).fold(f64::INFINITY, f64::min)),
            )
        })
        .collect();
    source.stages = lists
        .into_iter()
        .map(|list| list.into_iter().map(|(i, ..)| i).collect())
        .collect();
    Some(source)
}

/// Whether a source can hold that level under that load at all.
fn reaches(site: &Site, source: &Source, load_a: f64, level_v: f64) -> bool {
    let at = |corner| bare_circuit(site, source, None, corner, load_a, 0.0);
    let (Ok(low), Ok(high)) = (at(Corner::Low), at(Corner::High)) else {
        return false;
    };
    let rms_a = Ok(least_rms_a(&high, 0.0));
    source_reaches(&low, let_through_v(level_v))
        && carries(site, source.transformer, &source.hookup, source.path, rms_a, load_a)
}
