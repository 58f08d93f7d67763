//! Owns how far a rail's shelf reaches: the hook-ups that can feed it at all, and how many pieces of each part it can
//! use at most.

use std::sync::Arc;

use super::bounds::{least_rms_a, let_through_v, source_reaches};
use super::shelf::Shelf;
use crate::audit::{Check, Corner, Known, Site, Stage, core_w, rectifier, reservoir, transformer};
use crate::build::{Hookup, diodes_in_path, hookups, pieces_of_rectifier, sink_takes};
use crate::catalogue::{Catalogue, Part, Rectifier, RectifierKind, Transformer};
use crate::physics::raw_section::RawSection;
use crate::physics::winding::WindingLoad;
use crate::supply::Path;

/// One transformer hook-up with a path.
pub(super) struct Source<'c> {
    pub(super) transformer: &'c Transformer,
    pub(super) hookup: Arc<Hookup>,
    pub(super) path: Path,
    /// Unloaded raw voltage at high mains.
    pub(super) idle_v: f64,
    pub(super) core_w: f64,
    /// Devices whose input ratings hold on it, as places in the shelf, least load first.
    pub(super) stages: Vec<usize>,
    /// The same, cheapest first; settled once prices are known.
    pub(super) by_price: Vec<usize>,
}

/// A rail's shelf with the hook-ups that can feed it.
pub struct Reach<'c> {
    pub(super) shelf: Shelf<'c>,
    pub(super) sources: Vec<Source<'c>>,
}

impl<'c> Reach<'c> {
    /// Finds the hook-ups.
    #[must_use]
    pub fn new(site: &Site<'c>, shelf: Shelf<'c>) -> Reach<'c> {
        let sources = sources(site, &shelf);
        Reach { shelf, sources }
    }

    /// Most pieces of each part that any column of this rail can use.
    #[must_use]
    pub fn most_pieces(&self, site: &Site, catalogue: &Catalogue) -> Vec<u64> {
        let mut most = vec![0; catalogue.parts().count()];
        let mut at_least = |part: &Part, pieces: u64| {
            let most = &mut most[part.id.0 as usize];
            *most = pieces.max(*most);
        };
        let mut cases: Vec<&str> = Vec::new();
        for source in &self.sources {
            at_least(&source.transformer.part, 1);
            for &stage in &source.stages {
                let device = self.shelf.stages[stage].device;
                at_least(&device.part, 1);
                cases.extend(device.case.as_deref());
            }
            for rectifier in &self.shelf.rectifiers {
                if rectifier::reverse_voltage(site, rectifier, source.path, source.idle_v).met() {
                    at_least(&rectifier.part, pieces_of_rectifier(rectifier.kind, source.path));
                }
            }
        }
        let least_v = self.sources.iter().map(|s| s.idle_v).fold(f64::INFINITY, f64::min);
        for bank in &self.shelf.banks {
            if reservoir::voltage(site, bank.can, least_v).met() {
                at_least(&bank.can.part, u64::from(bank.cans));
            }
        }
        cases.sort_unstable();
        cases.dedup();
        let modules = self.shelf.rectifiers.iter().filter(|r| r.kind == RectifierKind::Bridge);
        let modules: Vec<&str> = modules.filter_map(|r| r.case.as_deref()).collect();
        for sink in &self.shelf.sinks {
            let on = |cases: &[&str]| u64::from(cases.iter().any(|&case| sink_takes(sink, Some(case))));
            at_least(&sink.part, on(&cases) + on(&modules));
        }
        most
    }
}

/// The circuit of a source at a corner with a rectifier (`None`: a lossless one) and without its bank.
pub(super) fn bare_circuit(
    site: &Site,
    source: &Source,
    rectifier: Option<&Rectifier>,
    corner: Corner,
    load_a: f64,
) -> Known<RawSection> {
    let (threshold_v, slope_ohm) = rectifier.map_or(Ok((0.0, 0.0)), |r| site.forward(r, corner))?;
    let own = WindingLoad {
        volts_v: source.hookup.volts_v,
        load_a,
    };
    let winding_ohm = site.winding_ohm(source.transformer, &source.hookup, corner, load_a, &[own]);
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

/// The transformer's limits at a source current of the high corner.
pub(super) fn carries(
    transformer: &Transformer,
    hookup: &Hookup,
    path: Path,
    source_rms_a: Known<f64>,
    load_a: f64,
) -> bool {
    transformer::current(hookup, path, source_rms_a).met()
        && transformer::load(
            transformer,
            source_rms_a.map(|a| transformer::section_va(hookup, path, a)),
        )
        .met()
        && transformer::bias(transformer, hookup, path, Ok(load_a)).is_none_or(|c| c.met())
}

/// Every hook-up and path of the shelf's transformers that some device can stand behind, with any rectifier and bank.
fn sources<'c>(site: &Site<'c>, shelf: &Shelf<'c>) -> Vec<Source<'c>> {
    let mut found = Vec::new();
    for &transformer in &shelf.transformers {
        for hookup in hookups(transformer) {
            let hookup = Arc::new(hookup);
            let idle_v = site.idle_v(transformer, &hookup);
            for &path in site.supply.rails[shelf.rail]
                .paths
                .iter()
                .filter(|&&path| hookup.kind.takes(path))
            {
                let mut source = Source {
                    transformer,
                    hookup: Arc::clone(&hookup),
                    path,
                    idle_v,
                    core_w: core_w(site, transformer),
                    stages: Vec::new(),
                    by_price: Vec::new(),
                };
                source.stages = (0..shelf.stages.len())
                    .filter(|&i| feeds(site, &source, &shelf.stages[i]))
                    .collect();
                let load = |i: usize| shelf.stages[i].load_a().unwrap_or(f64::INFINITY);
                source
                    .stages
                    .sort_by(|&a, &b| load(a).total_cmp(&load(b)).then(a.cmp(&b)));
                if !source.stages.is_empty() {
                    found.push(source);
                }
            }
        }
    }
    found
}

/// Whether a device can stand behind a source at all: input ratings, and the kindest rectifier and bank.
fn feeds(site: &Site, source: &Source, stage: &Stage) -> bool {
    let mut holds = true;
    stage.input(source.idle_v, |check: Check| holds &= check.met());
    let (Ok(load_a), Ok(level_v)) = (stage.load_a(), stage.valley_wanted_v(site)) else {
        return false;
    };
    let at = |corner| bare_circuit(site, source, None, corner, load_a);
    let (Ok(low), Ok(high)) = (at(Corner::Low), at(Corner::High)) else {
        return false;
    };
    holds
        && source_reaches(&low, let_through_v(level_v))
        && carries(
            source.transformer,
            &source.hookup,
            source.path,
            Ok(least_rms_a(&high, 0.0)),
            load_a,
        )
}
