//! Best companies and joint limits: against brute force, against samples of the demo catalogue, and by hand.
#![allow(clippy::unwrap_used)]

mod brute;
mod case;
#[path = "../common/mod.rs"]
mod common;

use std::collections::{BTreeMap, BTreeSet};
use std::path::Path as File;
use std::sync::atomic::Ordering;

use binrail::audit::{Limit, audit};
use binrail::build::{Build, Instance, RailChoice, Section, device_serves, hookups, pieces_of_rectifier, sink_takes};
use binrail::catalogue::{self, Catalogue, RectifierKind, Sink, Slot, Status};
use binrail::optimise::{Joint, companies, optimise, rejections};
use binrail::supply::{Path, Supply};
use binrail::units::Money;
use case::{Case, bridge, can, case as random_case, fixed, numbered, rail, sink, supply, transformer};
use common::Random;

const SEEDS: u64 = 400;

#[test]
fn best_companies_equal_brute_force() {
    let mut seen: BTreeMap<&str, usize> = BTreeMap::new();
    let mut limits: BTreeMap<Limit, usize> = BTreeMap::new();
    for seed in 1..=SEEDS {
        let case = random_case(&mut Random::new(seed));
        let (best, passes) = case.brute();
        let got = companies(&case.question());
        let mut count = |what: &'static str| *seen.entry(what).or_insert(0) += 1;
        assert!(got.complete, "seed {seed}");
        assert_eq!(got.passes, passes, "seed {seed}");
        count(if passes.iter().all(|&p| p) { "passes" } else { "fails" });
        for part in case.catalogue.parts() {
            let at = format!("seed {seed}, {}", part.name);
            match (best.get(&part.id), got.of[part.id.0 as usize]) {
                (None, None) => count("in no build"),
                (Some(wanted), Some(company)) if wanted.met => {
                    assert!(company.met, "{at}");
                    count("met");
                }
                (Some(wanted), Some(company)) => {
                    assert!(!company.met, "{at}");
                    let off = (company.tightness - wanted.tightness).abs();
                    assert!(
                        off <= 1e-12 * wanted.tightness.abs(),
                        "{at}: got {company:?}, wanted {} by {:?}",
                        wanted.tightness,
                        wanted.limits
                    );
                    assert!(
                        wanted.limits.contains(&company.limit),
                        "{at}: {:?} is not in {:?}",
                        company.limit,
                        wanted.limits
                    );
                    assert_eq!(company.margin.is_none(), wanted.tightness <= -1e9, "{at}");
                    *limits.entry(company.limit).or_insert(0) += 1;
                    count("rejected");
                }
                (wanted, company) => panic!("{at}: wanted {}, got {company:?}", wanted.is_some()),
            }
        }
        let reasons = rejections(&case.question()).unwrap();
        let rejected: usize = reasons.rejected.iter().map(|r| r.count).sum();
        assert_eq!(rejected, best.values().filter(|b| !b.met).count(), "seed {seed}");
    }
    // Enough of each kind, or the test shows little.
    let enough = [("fails", 350), ("met", 100), ("rejected", 3000), ("in no build", 1000)];
    assert!(enough.iter().all(|&(what, least)| seen[what] >= least), "{seen:?}");
    assert!(limits.len() >= 22, "{limits:?}");
}

/// A build of one rail at random, from parts that are not withdrawn.
fn random_build<'c>(r: &mut Random, supply: &Supply, c: &'c Catalogue) -> Build<'c> {
    let rail = &supply.rails[0];
    loop {
        let transformer = r.pick(&c.transformers);
        let hookup = r.pick(&hookups(transformer)).clone();
        let path = *r.pick(&[Path::Bridge, Path::CentreTap]);
        let rectifier = r.pick(&c.rectifiers);
        let (reservoir, pass) = (r.pick(&c.reservoirs), r.pick(&c.pass_devices));
        let parts = [&transformer.part, &rectifier.part, &reservoir.part, &pass.part];
        if !hookup.kind.takes(path)
            || pieces_of_rectifier(rectifier.kind, path) == 0
            || !device_serves(pass, rail, true)
            || parts.iter().any(|p| p.status == Status::Withdrawn)
        {
            continue;
        }
        let mut cooler = |case: Option<&str>| -> Option<&'c Sink> {
            let fitting: Vec<&Sink> = (c.sinks.iter())
                .filter(|s| s.part.status != Status::Withdrawn && sink_takes(s, case))
                .collect();
            (!fitting.is_empty() && r.chance(0.9)).then(|| *r.pick(&fitting))
        };
        let module = rectifier.kind == RectifierKind::Bridge;
        let rectifier_sink = cooler(rectifier.case.as_deref().filter(|_| module));
        let sink = cooler(pass.case.as_deref());
        return Build {
            transformers: vec![Instance {
                id: "T1".into(),
                part: transformer,
            }],
            sections: vec![Section {
                id: "A".into(),
                transformer: 0,
                hookup,
                path,
                pair: None,
                rectifier,
                rectifier_sink,
                reservoir,
                cans: 1 + r.below(supply.caps.cans as usize) as u32,
                rails: vec![0],
            }],
            rails: vec![RailChoice { section: 0, pass, sink }],
        };
    }
}

/// On the whole demo catalogue no build of a large sample is better company than the search found; and where the
/// optimizer finds none, the search finds none that passes.
#[test]
fn no_sampled_build_of_the_demo_is_better_company() {
    let root = File::new(env!("CARGO_MANIFEST_DIR"));
    let loaded = catalogue::load(&root.join("catalog"));
    let gauge = binrail::supply::read(&root.join("examples/tide-gauge/supply.toml")).unwrap();
    let mut hot = gauge.clone();
    hot.ambient.high_c = 75.0;
    let mut dear = gauge.clone();
    dear.caps.cost = Some(8.5);
    let mut cool = hot.clone();
    cool.caps.heat_w = Some(8.0);
    cool.caps.height_m = Some(0.02);
    for (name, supply) in [("hot", hot), ("dear", dear), ("cool", cool)] {
        let case = Case {
            supply,
            catalogue: loaded.catalogue.clone(),
            without: BTreeSet::new(),
            with: Vec::new(),
        };
        let got = companies(&case.question());
        assert!(got.complete && got.passes == [false], "{name}");
        let mut r = Random::new(7);
        for _ in 0..20_000 {
            let build = random_build(&mut r, &case.supply, &case.catalogue);
            let tightest = audit(&case.supply, &build).tightest().unwrap().check.tightness();
            for (part, _) in build.uses() {
                let company = got.of[part.id.0 as usize].unwrap();
                assert!(
                    company.met || tightest <= company.tightness * (1.0 - 1e-12),
                    "{name}: {} is in better company than {company:?}: {tightest} in {}",
                    part.name,
                    build.text().replace('\0', " ")
                );
            }
        }
    }
}

/// Two rails of 5 V 1 A that each pass alone.
fn two_rails() -> Case {
    let mut c = Catalogue {
        transformers: vec![transformer("T1", 40.0, &[9.0]), transformer("T2", 40.0, &[9.0])],
        rectifiers: vec![bridge("D1")],
        reservoirs: vec![can("C1", 4700.0, 25.0)],
        pass_devices: vec![fixed("P1", 5.0)],
        sinks: vec![sink("S1", &["TO-220"], 3.0)],
        ..Catalogue::default()
    };
    c.transformers[1].part.price = Money(9_000_000);
    c.transformers[1].core_loss_w = Some(0.5);
    let mut supply = supply(vec![rail("one", 5.0, 1.0), rail("two", 5.0, 1.0)]);
    supply.ageing.life_h = 5000.0;
    Case {
        supply,
        catalogue: numbered(c),
        without: BTreeSet::new(),
        with: Vec::new(),
    }
}

#[track_caller]
fn check_joint(case: &Case, wanted: &[(Limit, Option<&str>)]) {
    assert!(
        optimise(&case.question()).unwrap().builds.is_empty(),
        "some build passes"
    );
    let reasons = rejections(&case.question()).unwrap();
    let wanted: Vec<Joint> = (wanted.iter())
        .map(|&(limit, part)| Joint {
            limit,
            part: part.map(str::to_owned),
        })
        .collect();
    assert_eq!(reasons.joint, wanted);
    assert!(reasons.complete);
}

/// Cost and heat of the best build of both rails, and of one rail alone.
fn figures(case: &Case) -> [(f64, f64); 2] {
    let best = |rails: usize| {
        let supply = Supply {
            rails: case.supply.rails[..rails].to_vec(),
            ..case.supply.clone()
        };
        let mut question = case.question();
        question.supply = &supply;
        let found = &optimise(&question).unwrap().builds[0];
        (found.key.cost as f64 * 1e-6, found.key.heat as f64 * 1e-6)
    };
    [best(2), best(1)]
}

#[test]
fn one_cap_stands_between_two_rails() {
    let [(cost, heat_w), (alone, alone_w)] = figures(&two_rails());
    let mut case = two_rails();
    case.supply.caps.cost = Some(0.5 * (cost + alone));
    check_joint(&case, &[(Limit::Cost, None)]);
    let mut case = two_rails();
    case.supply.caps.heat_w = Some(0.5 * (heat_w + alone_w));
    // A roomy cap on cost has no part in it.
    case.supply.caps.cost = Some(10.0 * cost);
    check_joint(&case, &[(Limit::Heat, None)]);
}

#[test]
fn stock_stands_between_two_rails() {
    let mut case = two_rails();
    case.catalogue.reservoirs[0].part.stock = Some(19);
    case.catalogue.sinks[0].part.stock = Some(1000);
    check_joint(&case, &[(Limit::Stock, Some("C1"))]);
    // Two parts are short, and neither alone would do.
    case.catalogue.rectifiers[0].part.stock = Some(19);
    check_joint(&case, &[(Limit::Stock, Some("C1")), (Limit::Stock, Some("D1"))]);
}

#[test]
fn either_of_two_limits_could_give() {
    let [(cost, _), _] = figures(&two_rails());
    let mut case = two_rails();
    case.catalogue.transformers[0].part.stock = Some(19);
    case.supply.caps.cost = Some(cost + 0.5);
    check_joint(&case, &[(Limit::Cost, None), (Limit::Stock, Some("T1"))]);
}

#[test]
fn both_of_two_limits_must_give() {
    let [(cost, heat_w), (alone, alone_w)] = figures(&two_rails());
    let mut case = two_rails();
    case.supply.caps.cost = Some(0.5 * (cost + alone));
    case.supply.caps.heat_w = Some(0.5 * (heat_w + alone_w));
    case.catalogue.pass_devices[0].part.stock = Some(1000);
    check_joint(&case, &[(Limit::Cost, None), (Limit::Heat, None)]);
}

#[test]
fn nothing_is_joint_when_one_rail_fails_alone() {
    let mut case = two_rails();
    case.supply.caps.cost = Some(20.0);
    case.supply.rails[1].current_a = 2.0;
    check_joint(&case, &[]);
    let reasons = rejections(&case.question()).unwrap();
    // Every part serves rail one.
    assert_eq!(reasons.rejected, []);
}

/// Slot, limit, count; part, margin and unit of the nearest.
type Line = (Slot, Limit, usize, String, Option<f64>, &'static str);

#[test]
fn rejections_are_sorted_and_name_the_nearest() {
    let mut case = two_rails();
    case.supply.rails.truncate(1);
    case.supply.ambient.high_c = 60.0;
    for (place, (name, ta_c)) in [("T0", 40.0), ("T1", 50.0), ("T2", 50.0)].into_iter().enumerate() {
        let mut t = transformer(name, 40.0, &[9.0]);
        t.ta_c = ta_c;
        case.catalogue.transformers.splice(place.min(2).., [t]);
    }
    let mut foreign = transformer("T3", 40.0, &[9.0]);
    foreign.primary_v = vec![120.0];
    case.catalogue.transformers.push(foreign);
    case.catalogue.sinks.push(sink("S2", &["TO-3"], 3.0));
    case.catalogue.pass_devices.push(fixed("P2", 12.0));
    case.catalogue.reservoirs[0].part.status = Status::LastBuy;
    case.catalogue.reservoirs.push(can("C2", 4700.0, 35.0));
    case.catalogue.reservoirs[1].part.status = Status::Withdrawn;
    case.catalogue = numbered(case.catalogue);
    let lines = |case: &Case| -> Vec<Line> {
        let reasons = rejections(&case.question()).unwrap();
        assert!(reasons.complete && reasons.joint.is_empty());
        (reasons.rejected.into_iter())
            .map(|r| {
                (
                    r.slot,
                    r.limit,
                    r.count,
                    r.nearest.part,
                    r.nearest.margin,
                    r.nearest.unit,
                )
            })
            .collect()
    };
    // T_hi is 65 degC. P2 serves no rail, S2 takes no case, C2 is withdrawn: they are in no build.
    let by_ambient = |slot, count, part: &str| {
        let short = Some(-15.0);
        (slot, Limit::TransformerAmbient, count, part.to_owned(), short, "degC")
    };
    let wanted = |cans| {
        vec![
            by_ambient(Slot::Transformer, 3, "T1"),
            (
                Slot::Transformer,
                Limit::PrimaryVoltage,
                1,
                "T3".to_owned(),
                Some(-121.0),
                "V",
            ),
            by_ambient(Slot::Rectifier, 1, "D1"),
            by_ambient(Slot::Reservoir, cans, "C1"),
            by_ambient(Slot::Pass, 1, "P1"),
            by_ambient(Slot::Sink, 1, "S1"),
        ]
    };
    assert_eq!(lines(&case), wanted(1));
    case.with = vec![(case.id("C2"), None)];
    assert_eq!(lines(&case), wanted(2));
    // Without the better two the last one is the best company.
    case.without = BTreeSet::from([case.id("T1"), case.id("T2")]);
    let left = lines(&case);
    assert_eq!((left[1].2, left[1].3.as_str(), left[1].4), (1, "T0", Some(-25.0)));
    assert_eq!((left[2].2, left[2].4), (1, Some(-25.0)));
}

#[test]
fn a_supply_that_nothing_can_serve_rejects_nothing() {
    let mut case = two_rails();
    case.supply.rails.truncate(1);
    case.supply.rails[0].voltage_v = 9.0;
    let reasons = rejections(&case.question()).unwrap();
    assert!(reasons.complete && reasons.rejected.is_empty() && reasons.joint.is_empty());
}

#[test]
fn a_stopped_search_says_that_it_is_incomplete() {
    let mut case = two_rails();
    case.supply.ambient.high_c = 75.0;
    let question = case.question();
    question.stop.asked.store(true, Ordering::Relaxed);
    let reasons = rejections(&question).unwrap();
    assert!(!reasons.complete && reasons.rejected.is_empty() && reasons.joint.is_empty());
}
