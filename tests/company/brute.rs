//! Brute force: every build of one rail alone, through the full audit.
#![allow(clippy::float_cmp)] // ties are ties to the last bit

use std::collections::{BTreeMap, BTreeSet};

use binrail::audit::{Limit, audit};
use binrail::build::{
    Build, Instance, RailChoice, Section, device_serves, hookups, misfits, pieces_of_rectifier, sink_takes,
};
use binrail::catalogue::{Part, PartId, RectifierKind, Sink, Status};
use binrail::supply::{Path, Supply};

use crate::case::Case;

/// Best company of a part: its least tightness, whether it is met, and the first tightest limit of every build that ties.
pub(crate) struct Best {
    pub(crate) tightness: f64,
    pub(crate) met: bool,
    pub(crate) limits: BTreeSet<Limit>,
}

impl Case {
    fn usable(&self, part: &Part) -> bool {
        let named = self.with.iter().any(|&(id, _)| id == part.id);
        (part.status != Status::Withdrawn || named) && !self.without.contains(&part.id)
    }

    /// Every build of one rail alone.
    pub(crate) fn builds(&self, supply: &Supply, mut to: impl FnMut(&Build)) {
        let (rail, c) = (&supply.rails[0], &self.catalogue);
        let coolers = |case: Option<&str>| -> Vec<Option<&Sink>> {
            let fitting = c.sinks.iter().filter(|s| self.usable(&s.part) && sink_takes(s, case));
            std::iter::once(None).chain(fitting.map(Some)).collect()
        };
        for transformer in c.transformers.iter().filter(|t| self.usable(&t.part)) {
            for hookup in hookups(transformer) {
                for &path in rail.paths.iter().filter(|&&p| p != Path::Dual && hookup.kind.takes(p)) {
                    for rectifier in c.rectifiers.iter().filter(|r| self.usable(&r.part)) {
                        if pieces_of_rectifier(rectifier.kind, path) == 0 {
                            continue;
                        }
                        let module = rectifier.kind == RectifierKind::Bridge;
                        for rectifier_sink in coolers(rectifier.case.as_deref().filter(|_| module)) {
                            for reservoir in c.reservoirs.iter().filter(|r| self.usable(&r.part)) {
                                for cans in 1..=supply.caps.cans {
                                    for pass in c.pass_devices.iter().filter(|d| self.usable(&d.part)) {
                                        if !device_serves(pass, rail, true) {
                                            continue;
                                        }
                                        for sink in coolers(pass.case.as_deref()) {
                                            to(&Build {
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
                    }
                }
            }
        }
    }

    pub(crate) fn brute(&self) -> (BTreeMap<PartId, Best>, Vec<bool>) {
        let mut best: BTreeMap<PartId, Best> = BTreeMap::new();
        let mut passes = Vec::new();
        for rail in &self.supply.rails {
            let alone = Supply {
                rails: vec![rail.clone()],
                ..self.supply.clone()
            };
            let mut passing = false;
            self.builds(&alone, |build| {
                assert_eq!(misfits(&alone, build), []);
                let verdict = audit(&alone, build);
                passing |= verdict.passes();
                let least = verdict.tightest().unwrap().check;
                let ties = (verdict.margins.iter().map(|m| m.check)).filter(|c| c.tightness() == least.tightness());
                let limit = ties.map(|c| c.limit).min().unwrap();
                for (part, _) in build.uses() {
                    let entry = best.entry(part.id).or_insert(Best {
                        tightness: f64::NEG_INFINITY,
                        met: false,
                        limits: BTreeSet::new(),
                    });
                    entry.met |= verdict.passes();
                    if least.tightness() > entry.tightness {
                        entry.tightness = least.tightness();
                        entry.limits.clear();
                    }
                    if least.tightness() == entry.tightness {
                        entry.limits.insert(limit);
                    }
                }
            });
            passes.push(passing);
        }
        (best, passes)
    }
}
