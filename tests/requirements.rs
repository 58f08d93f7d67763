//! What would have to give, what each requirement costs, and the roomiest build, against brute force on small random
//! cases. The keys, their far ends and "one digit nearer" are written here once more from the rules.
//!
//! A failure prints the whole case.
#![allow(clippy::unwrap_used, clippy::print_stdout, unreachable_pub)]

#[path = "common/brute_force.rs"]
mod brute_force;
#[path = "common/choices.rs"]
mod choices;
mod common;
#[path = "common/layouts.rs"]
mod layouts;
#[path = "common/oracle_run.rs"]
mod oracle_run;
#[path = "common/own_rules.rs"]
mod own_rules;
#[path = "common/small_case.rs"]
mod small_case;
#[path = "common/small_maker.rs"]
mod small_maker;
#[path = "common/small_parts.rs"]
mod small_parts;

use std::sync::atomic::Ordering;
use std::time::{Duration, Instant};

use binrail::catalogue::Status;
use binrail::screen::{Objective, Stop};
use binrail::study::{Relaxation, Share, prices, relax, roomiest};
use binrail::supply::{Supply, changed};
use serde_json::json;

use brute_force::{Brute, Judged, Wish};
use common::Random;
use oracle_run::{OBJECTIVES, Tally, over, question, solve};
use small_case::Case;

/// A case with one requirement at another value.
fn with(case: &Case, requirement: &str, value: &str) -> Option<Case> {
    let mut case = case.clone();
    match requirement.strip_prefix("stock.") {
        Some(part) => case
            .rows
            .iter_mut()
            .find(|row| row.name == part)
            .unwrap()
            .set("stock", value),
        None => {
            case.supply = changed(&case.supply(), &[format!("{requirement}={value}")])
                .ok()?
                .content
        }
    }
    Some(case)
}

/// The least objective of all builds of a case.
fn least(case: &Case, objective: Objective) -> Option<i64> {
    let (catalogue, supply) = (case.catalogue(), case.supply());
    let brute = Brute::new(&supply, &catalogue);
    let list = brute.list(&catalogue, objective, &Wish::default());
    list.first().map(|judged| judged.objective(objective))
}

fn number(text: &str) -> (f64, &str) {
    let (number, unit) = text.split_once(' ').unwrap_or((text, ""));
    (number.parse().unwrap(), unit)
}

/// One digit nearer to where the requirement comes from, but not past it; its text.
fn nearer(relaxation: &Relaxation) -> String {
    let ((from, unit), (to, _)) = (number(&relaxation.from), number(&relaxation.to));
    let whole = matches!(relaxation.requirement.as_str(), "builds" | "caps.cans")
        || relaxation.requirement.starts_with("stock.");
    let digit = |value: f64| {
        let step = 10f64.powi(value.abs().log10().floor() as i32 - 2);
        if whole { step.max(1.0) } else { step }
    };
    // Rising from below a power of ten the digit is the smaller one.
    let step = if from.abs() < to.abs() {
        digit(to * (1.0 - 1e-9))
    } else {
        digit(to)
    };
    let back = to + step.copysign(from - to);
    let past = (from - back) * (from - to) <= 0.0;
    if past {
        return relaxation.from.clone();
    }
    // Nothing finer than what is written.
    let back = format!("{back:.9}");
    let back = back.trim_end_matches('0').trim_end_matches('.');
    format!("{back} {unit}").trim().to_owned()
}

/// Every requirement that may give, with values that ask for less, the last of them least.
fn far_ends(case: &Case) -> Vec<(String, Vec<String>)> {
    let supply: Supply = case.supply();
    let one = |text: &str| vec![text.to_owned()];
    let air = |share: f64| {
        let (low, high) = (supply.ambient.low_c, supply.ambient.high_c);
        format!("{:.1} degC", high + share * (low - high))
    };
    let mut all = vec![
        ("ambient.high".to_owned(), [0.1, 0.3, 0.6, 1.0].map(air).to_vec()),
        ("mains.low".into(), one(&format!("{} V", supply.mains.nominal_v))),
        ("margins.headroom".into(), one("0 V")),
        ("margins.reservoir".into(), one("0 %")),
        ("margins.reverse".into(), one("0 %")),
        ("margins.junction".into(), one("0 K")),
        ("ageing.capacitance_loss".into(), one("0 %")),
        ("ageing.esr_rise".into(), one("1")),
        ("ageing.life".into(), one("1 h")),
        ("caps.cans".into(), one(&(supply.caps.cans * 4).to_string())),
    ];
    let caps = &supply.caps;
    all.extend(caps.cost.map(|_| ("caps.cost".into(), one("1000000"))));
    all.extend(caps.heat_w.map(|_| ("caps.heat".into(), one("1000000 W"))));
    all.extend(caps.height_m.map(|_| ("caps.height".into(), one("100 m"))));
    let runs = (1..supply.builds).rev().map(|n| n.to_string()).collect();
    all.push(("builds".into(), runs));
    for rail in &supply.rails {
        let key = |key: &str| format!("rail.{}.{key}", rail.name);
        let amps = [0.9, 0.5, 0.00101].map(|share| format!("{:.6} A", rail.current_a * share));
        all.push((key("current"), amps.to_vec()));
        all.extend(rail.ripple_v.map(|_| (key("ripple"), one("1000 V"))));
        all.extend(rail.accuracy.map(|_| (key("accuracy"), one("100 %"))));
        all.extend(rail.dip_s.map(|_| (key("dip"), one("1 us"))));
    }
    let limited = case.catalogue();
    let limited = limited
        .parts()
        .filter(|p| p.stock.is_some() && p.status != Status::Withdrawn);
    all.extend(limited.map(|p| (format!("stock.{}", p.name), one("1000000"))));
    all
}

/// A requirement that is likely to leave no build.
fn squeezed(case: &Case) -> Option<Case> {
    let mut random = Random::new(case.seed + 77);
    let rail = *random.pick(&case.supply["rail"].as_array().unwrap().iter().collect::<Vec<_>>());
    let key = |key: &str| format!("rail.{}.{key}", rail["name"].as_str().unwrap());
    let amps = number(rail["current"].as_str().unwrap()).0;
    let best = |objective| least(case, objective).map(|best| best as f64 / 1e6);
    let (requirement, value) = match case.seed % 8 {
        0 => ("ambient.high".to_owned(), format!("{} degC", 55 + random.below(35))),
        1 => (key("ripple"), format!("{:.3} mV", random.decades(0.01, 2.0))),
        2 => (
            "caps.cost".into(),
            format!("{:.2}", best(Objective::Cost)? * random.between(0.7, 0.99)),
        ),
        3 => (key("current"), format!("{:.2} A", amps * random.between(1.3, 2.5))),
        4 => (
            "builds".into(),
            (case.supply().builds * (2 + random.below(40) as u64)).to_string(),
        ),
        5 => (key("dip"), format!("{} ms", 20 + random.below(60))),
        6 => (
            "caps.heat".into(),
            format!("{:.3} W", best(Objective::Heat)? * random.between(0.8, 0.99)),
        ),
        _ => ("ageing.life".into(), format!("{} h", 30_000 * (1 + random.below(6)))),
    };
    let case = with(case, &requirement, &value)?;
    least(&case, Objective::Cost).is_none().then_some(case)
}

/// Each relaxation lets a build pass, none does one digit nearer, and what is not named does not help.
#[test]
fn relaxations_are_those_of_brute_force() {
    let tally = Tally::default();
    over([30, 26, 6], |case| {
        let Some(case) = squeezed(case) else { return };
        let (catalogue, supply) = (case.catalogue(), case.supply());
        let question = question(&supply, &catalogue, Objective::Cost, 1);
        assert!(solve(&case, "squeezed", &question).builds.is_empty(), "{case}");
        let relaxed = relax(&question).unwrap_or_else(|bug| panic!("{bug:?}\n{case}"));
        assert!(relaxed.complete, "{case}");
        tally.add("cases", 1);
        tally.add("relaxations", relaxed.list.len());
        tally.add("hopeless", usize::from(relaxed.list.is_empty()));
        for r in &relaxed.list {
            tally.add(word(&r.requirement), 1);
            let passes = |value: &str| least(&with(&case, &r.requirement, value).unwrap(), Objective::Cost).is_some();
            assert!(passes(&r.to), "{r:?}\n{case}");
            assert!(!passes(&nearer(r)), "{r:?} nearer {}\n{case}", nearer(r));
        }
        for (requirement, values) in far_ends(&case) {
            let named = relaxed.list.iter().find(|r| r.requirement == requirement);
            let helps = |value: &String| {
                let changed = with(&case, &requirement, value);
                changed.is_some_and(|changed| least(&changed, Objective::Cost).is_some())
            };
            match named {
                // Of a run every size is tried.
                Some(r) if requirement == "builds" => {
                    assert_eq!(values.iter().find(|v| helps(v)), Some(&r.to), "{r:?}\n{case}");
                }
                Some(_) => {}
                None => assert!(!values.iter().any(helps), "{requirement} would help\n{case}"),
            }
        }
        let known: Vec<String> = far_ends(&case)
            .into_iter()
            .map(|(requirement, _)| requirement)
            .collect();
        assert!(
            relaxed.list.iter().all(|r| known.contains(&r.requirement)),
            "{relaxed:?}\n{case}"
        );
    });
    println!("{tally:#?}");
    for (what, least) in [("cases", 20), ("relaxations", 30), ("hopeless", 1)] {
        assert!(tally.of(what) >= least, "{what}: {tally:#?}");
    }
}

/// The kind of a requirement, for the tally.
fn word(requirement: &str) -> &'static str {
    let kinds = [
        "ambient",
        "mains",
        "margins",
        "ageing",
        "caps.cost",
        "caps.heat",
        "caps.height",
        "caps.cans",
        "builds",
        "stock",
        "ripple",
        "current",
        "accuracy",
        "dip",
    ];
    let last = requirement.rsplit('.').next().unwrap();
    let found = kinds.into_iter().find(|k| *k == last || requirement.starts_with(k));
    found.unwrap_or("?")
}

/// Each price is what the best build at the relaxation saves, nothing is saved one digit nearer, and what is not named
/// saves nothing.
#[test]
fn prices_are_those_of_brute_force() {
    let tally = Tally::default();
    over([10, 8, 0], |case| {
        let (catalogue, supply) = (case.catalogue(), case.supply());
        for objective in OBJECTIVES {
            let question = question(&supply, &catalogue, objective, 1);
            let outcome = solve(case, "best", &question);
            let Some(best) = outcome.builds.first().map(|f| f.key.objective(objective)) else {
                continue;
            };
            let found = prices(&question, best).unwrap_or_else(|bug| panic!("{bug:?}\n{case}"));
            assert!(found.complete, "{case}");
            tally.add("prices", found.list.len());
            let saves = |requirement: &str, value: &str| {
                let changed = with(case, requirement, value);
                changed
                    .and_then(|case| least(&case, objective))
                    .map_or(0, |value| best - value)
            };
            for price in &found.list {
                let r = &price.relaxation;
                tally.add(word(&r.requirement), 1);
                assert_eq!(
                    saves(&r.requirement, &r.to),
                    price.saves,
                    "{price:?} by {objective:?}\n{case}"
                );
                assert!(price.saves > 0, "{price:?}");
                assert!(
                    saves(&r.requirement, &nearer(r)) <= 0,
                    "{price:?} by {objective:?}\n{case}"
                );
            }
            for (requirement, values) in far_ends(case) {
                if found
                    .list
                    .iter()
                    .any(|price| price.relaxation.requirement == requirement)
                {
                    continue;
                }
                let helps = values.iter().any(|value| saves(&requirement, value) > 0);
                assert!(!helps, "{requirement} has a price by {objective:?}\n{case}");
            }
        }
    });
    println!("{tally:#?}");
    assert!(tally.of("prices") >= 40, "{tally:#?}");
}

/// Of all builds within a share of the best the one with the greatest least tightness, of equal ones the least key.
#[test]
fn the_roomiest_build_is_that_of_brute_force() {
    let tally = Tally::default();
    over([20, 20, 6], |case| {
        let (catalogue, supply) = (case.catalogue(), case.supply());
        let brute = Brute::new(&supply, &catalogue);
        let allowed = brute.allowed(&catalogue, &Wish::default());
        for objective in OBJECTIVES {
            let question = question(&supply, &catalogue, objective, 1);
            let outcome = solve(case, "best", &question);
            let Some(best) = outcome.builds.into_iter().next() else {
                continue;
            };
            for (per_cent, share) in [(0, 0.0), (2, 0.02), (10, 0.1), (50, 0.5)] {
                let value = best.key.objective(objective);
                let most = value + value * per_cent / 100;
                let room = |j: &&&Judged| j.objective(objective) <= most;
                let wanted = (allowed.iter().filter(room))
                    .min_by(|a, b| (b.tightness.total_cmp(&a.tightness)).then_with(|| a.compare(b, objective)))
                    .unwrap();
                let found = roomiest(&question, best.clone(), Share::new(share).unwrap());
                let found = found.unwrap_or_else(|bug| panic!("{bug:?}\n{case}"));
                let at = format!("{per_cent} % by {objective:?}\n{case}");
                assert!(found.proved, "{at}");
                assert_eq!(found.tightness.to_bits(), wanted.tightness.to_bits(), "{at}");
                assert_eq!(found.found.build, wanted.build, "{at}");
                tally.add("cases", 1);
                tally.add("roomier than the best", usize::from(found.found.build != best.build));
            }
        }
    });
    println!("{tally:#?}");
    assert!(tally.of("roomier than the best") >= 60, "{tally:#?}");
}

/// A stop leaves out what is not settled, and says so.
#[test]
fn a_stop_leaves_out_what_is_not_settled() {
    let mut case = Case::new(3, 2, small_case::Kind::Any);
    case.supply["ambient"]["high"] = json!("100 degC");
    let (catalogue, supply) = (case.catalogue(), case.supply());
    let mut question = question(&supply, &catalogue, Objective::Cost, 1);
    question.stop.asked.store(true, Ordering::Relaxed);
    let relaxed = relax(&question).unwrap();
    assert!(!relaxed.complete && relaxed.list.is_empty());
    question.stop = Stop {
        deadline: Some(Instant::now() + Duration::from_millis(5)),
        ..Stop::default()
    };
    let relaxed = relax(&question).unwrap();
    assert!(!relaxed.complete || !relaxed.list.is_empty());
}
