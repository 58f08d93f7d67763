//! The other way to the optimum: every combination, judged by the audit, sorted by the key.
//!
//! Shares with the program only the audit and the rules of assembly; hook-ups, pieces, prices, keys and order are
//! written here once more from the rules. Each rail has its own section and transformer (share = "never").
#![allow(dead_code)]

use std::cmp::Ordering;
use std::collections::{BTreeMap, BTreeSet};

use binrail::audit::audit;
use binrail::build::{Build, Hookup, HookupKind, Instance, RailChoice, Section, device_serves, misfits, sink_takes};
use binrail::catalogue::{Catalogue, Part, PartId, PassDevice, Rectifier, RectifierKind, Sink, Status, Transformer};
use binrail::screen::Objective;
use binrail::supply::{Path, Supply};

use crate::own_rules::{Bill, fields, own_hookups, pieces, pieces_in, price};

/// A feasible build with what it is ordered by.
#[derive(Debug, Clone)]
pub struct Judged<'c> {
    pub build: Build<'c>,
    pub bill: Bill,
    /// Millionths of the currency.
    pub cost: i64,
    /// Microwatts.
    pub heat: i64,
    /// The text of the key, field by field.
    pub fields: Vec<String>,
}

impl Judged<'_> {
    pub fn objective(&self, objective: Objective) -> i64 {
        match objective {
            Objective::Cost => self.cost,
            Objective::Heat => self.heat,
        }
    }

    fn compare(&self, other: &Self, objective: Objective) -> Ordering {
        let pair = |j: &Self| match objective {
            Objective::Cost => (j.cost, j.heat),
            Objective::Heat => (j.heat, j.cost),
        };
        pair(self)
            .cmp(&pair(other))
            .then_with(|| self.fields.cmp(&other.fields))
    }
}

/// What --with and --without ask for.
#[derive(Debug, Clone, Default)]
pub struct Wish {
    pub without: BTreeSet<PartId>,
    pub with: Vec<(PartId, Option<usize>)>,
}

/// Every feasible build of a case, withdrawn parts included.
#[derive(Default)]
pub struct Brute<'c> {
    pub all: Vec<Judged<'c>>,
    /// Builds that were audited.
    pub audited: usize,
    /// Joint builds that the audit rejected, by limit.
    pub rejected: BTreeMap<&'static str, usize>,
}

impl<'c> Brute<'c> {
    /// Judges the whole cross product of what each rail's own limits allow (see [`singles`]).
    pub fn new(supply: &Supply, catalogue: &'c Catalogue) -> Brute<'c> {
        let (each, audited) = singles(supply, catalogue);
        let mut brute = Brute {
            audited,
            ..Brute::default()
        };
        brute.product(supply, catalogue, &each, &mut Vec::new());
        brute
    }

    fn product<'a>(
        &mut self,
        supply: &Supply,
        catalogue: &Catalogue,
        each: &'a [Vec<Build<'c>>],
        chosen: &mut Vec<&'a Build<'c>>,
    ) {
        if chosen.len() == each.len() {
            self.judge(supply, catalogue, join(chosen));
            return;
        }
        for single in &each[chosen.len()] {
            chosen.push(single);
            self.product(supply, catalogue, each, chosen);
            chosen.pop();
        }
    }

    /// Keeps the build with its key if the audit passes.
    fn judge(&mut self, supply: &Supply, catalogue: &Catalogue, build: Build<'c>) {
        let verdict = audit(supply, &build);
        self.audited += 1;
        let failing = || verdict.margins.iter().filter(|m| !m.check.met());
        for limit in failing().map(|m| m.check.limit.word()).collect::<BTreeSet<_>>() {
            *self.rejected.entry(limit).or_default() += 1;
        }
        if failing().next().is_some() {
            return;
        }
        let misfits = misfits(supply, &build);
        assert!(misfits.is_empty(), "{misfits:?}");
        let mut bill = Bill::new();
        for rail in 0..build.rails.len() {
            for (part, count) in pieces(&build, rail) {
                *bill.entry(part.id).or_default() += count;
            }
        }
        let fitted: i64 = build.rails.iter().map(|r| r.pass.fitted_price.0).sum();
        let cost = price(supply, catalogue, &bill) + fitted;
        assert_eq!(cost, verdict.cost.0, "the audit's cost of {bill:?}");
        self.all.push(Judged {
            cost,
            heat: (verdict.heat_w.unwrap() * 1e6).round() as i64,
            fields: fields(&build),
            bill,
            build,
        });
    }

    /// The builds that a wish allows, one for each bill of materials, best first.
    pub fn list(&self, catalogue: &Catalogue, objective: Objective, wish: &Wish) -> Vec<&Judged<'c>> {
        let named: BTreeSet<PartId> = wish.with.iter().map(|&(id, _)| id).collect();
        let parts: Vec<&Part> = catalogue.parts().collect();
        let usable = |id: &PartId| {
            let part = parts[id.0 as usize];
            !wish.without.contains(id) && (part.status != Status::Withdrawn || named.contains(id))
        };
        let holds = |build: &Build, id: PartId, at: Option<usize>| {
            (0..build.rails.len())
                .filter(|&rail| at.is_none_or(|at| at == rail))
                .any(|rail| pieces(build, rail).iter().any(|&(part, _)| part.id == id))
        };
        let mut best: BTreeMap<&Bill, &Judged<'c>> = BTreeMap::new();
        let allowed =
            |j: &&Judged| j.bill.keys().all(usable) && wish.with.iter().all(|&(id, at)| holds(&j.build, id, at));
        for judged in self.all.iter().filter(allowed) {
            let least = best.entry(&judged.bill).or_insert(judged);
            if judged.compare(least, objective).is_lt() {
                *least = judged;
            }
        }
        let mut list: Vec<&Judged> = best.into_values().collect();
        list.sort_by(|a, b| a.compare(b, objective));
        list
    }
}

/// For each rail every build of it alone that passes the audit without caps on cost and heat: the limits that a joint
/// build must meet in any case (stock only tightens as pieces add up; a cost can fall when breaks are shared).
/// Second: how many were audited.
pub fn singles<'c>(supply: &Supply, catalogue: &'c Catalogue) -> (Vec<Vec<Build<'c>>>, usize) {
    let mut audited = 0;
    let of_rail = |rail: usize| {
        let mut alone = supply.clone();
        alone.rails = vec![supply.rails[rail].clone()];
        (alone.caps.cost, alone.caps.heat_w) = (None, None);
        let builds = combinations(&alone, catalogue);
        audited += builds.len();
        builds
            .into_iter()
            .filter(|build| audit(&alone, build).passes())
            .collect()
    };
    let found = (0..supply.rails.len()).map(of_rail).collect();
    (found, audited)
}

/// Every build of a one-rail supply.
fn combinations<'c>(supply: &Supply, catalogue: &'c Catalogue) -> Vec<Build<'c>> {
    let mut found = Vec::new();
    for transformer in &catalogue.transformers {
        for hookup in own_hookups(transformer)
            .into_iter()
            .filter(|h| h.kind != HookupKind::Dual)
        {
            for &path in &supply.rails[0].paths {
                let centre = hookup.kind == HookupKind::CentreTap;
                if path == Path::Dual || centre != (path == Path::CentreTap) {
                    continue;
                }
                for rectifier in catalogue.rectifiers.iter().filter(|r| pieces_in(r, path) > 0) {
                    behind(supply, catalogue, transformer, &hookup, path, rectifier, &mut found);
                }
            }
        }
    }
    found
}

/// Every build with that transformer, hook-up, path and rectifier.
fn behind<'c>(
    supply: &Supply,
    catalogue: &'c Catalogue,
    transformer: &'c Transformer,
    hookup: &Hookup,
    path: Path,
    rectifier: &'c Rectifier,
    found: &mut Vec<Build<'c>>,
) {
    let module = rectifier.kind == RectifierKind::Bridge;
    let rectifier_sinks = sinks_for(catalogue, rectifier.case.as_deref().filter(|_| module));
    let devices = catalogue
        .pass_devices
        .iter()
        .filter(|d| device_serves(d, &supply.rails[0], true));
    let coolings: Vec<(&PassDevice, Option<&Sink>)> = devices
        .flat_map(|d| sinks_for(catalogue, d.case.as_deref()).into_iter().map(move |s| (d, s)))
        .collect();
    for &rectifier_sink in &rectifier_sinks {
        for reservoir in &catalogue.reservoirs {
            for cans in 1..=supply.caps.cans {
                for &(pass, sink) in &coolings {
                    found.push(Build {
                        transformers: vec![Instance {
                            id: "T1".into(),
                            part: transformer,
                        }],
                        sections: vec![Section {
                            id: "A".into(),
                            transformer: 0,
                            hookup: hookup.clone(),
                            path,
                            pair: None,
                            rectifier,
                            rectifier_sink,
                            reservoir,
                            cans,
                            rails: vec![0],
                        }],
                        rails: vec![RailChoice { section: 0, pass, sink }],
                    });
                }
            }
        }
    }
}

fn sinks_for<'c>(catalogue: &'c Catalogue, case: Option<&str>) -> Vec<Option<&'c Sink>> {
    let fitting = catalogue.sinks.iter().filter(|s| sink_takes(s, case)).map(Some);
    std::iter::once(None).chain(fitting).collect()
}

/// One build of all rails, each with its own section and transformer.
fn join<'c>(singles: &[&Build<'c>]) -> Build<'c> {
    let mut joint = Build {
        transformers: Vec::new(),
        sections: Vec::new(),
        rails: Vec::new(),
    };
    for (place, single) in singles.iter().enumerate() {
        joint.transformers.push(Instance {
            id: ["T1", "T2", "T3"][place].into(),
            part: single.transformers[0].part,
        });
        joint.sections.push(Section {
            id: ["A", "B", "C"][place].into(),
            transformer: place,
            rails: vec![place],
            ..single.sections[0].clone()
        });
        joint.rails.push(RailChoice {
            section: place,
            ..single.rails[0].clone()
        });
    }
    joint
}
