//! Who shares with whom: isolated rails, section names, floating and dual sections, each kind of case by itself; the whole
//! front; the nearest build; what else a question can ask.

use std::collections::BTreeSet;

use binrail::build::{distance, places};
use binrail::catalogue::{Catalogue, PartId, Polarity, Slot};
use binrail::optimise::{Near, Question};
use binrail::screen::Objective;
use binrail::supply::Supply;
use serde_json::json;

use crate::brute_force::{Brute, Judged, Wish, one_for_each_bill};
use crate::common::Random;
use crate::oracle_run::{OBJECTIVES, Tally, front, hold, keys, keys_of, over, over_kind, question, solve};
use crate::own_rules::apart;
use crate::small_case::{Case, Kind};

/// The first ten by either objective, with and without parts demanded at a rail; counts where taking away what the
/// kind is about changes the optimum.
fn kind_holds(kind: Kind, keys: &[&str]) -> Tally {
    let tally = Tally::default();
    over_kind(kind, [0, 20, 20], |case| {
        let (catalogue, supply) = (case.catalogue(), case.supply());
        let brute = Brute::new(&supply, &catalogue);
        let free = case.without_keys(keys);
        let (free_catalogue, free_supply) = (free.catalogue(), free.supply());
        let freed = Brute::new(&free_supply, &free_catalogue);
        let mut random = Random::new(case.seed);
        for objective in OBJECTIVES {
            let list = brute.list(&catalogue, objective, &Wish::default());
            tally.add("answers", 1);
            hold(case, "plain", &question(&supply, &catalogue, objective, 10), &list);
            let best = |list: &[&Judged]| list.first().map(|j| (j.cost, j.heat, j.fields.clone()));
            let without = freed.list(&free_catalogue, objective, &Wish::default());
            tally.add("binds", usize::from(best(&list) != best(&without)));
            let Some(best) = list.first() else { continue };
            tally.add("with a build", 1);
            let sections = &best.build.sections;
            tally.add("dual", usize::from(sections.iter().any(|s| s.pair.is_some())));
            let floats = |rail: usize| {
                supply.rails[rail].voltage_v < 0.0 && best.build.rails[rail].pass.polarity == Polarity::Positive
            };
            tally.add("floats", usize::from((0..supply.rails.len()).any(floats)));
            for _ in 0..3 {
                let some = random.pick(&brute.all);
                let part = *random.pick(&some.bill.keys().copied().collect::<Vec<_>>());
                let rail = random.below(supply.rails.len());
                let others: Vec<PartId> = best.bill.keys().copied().filter(|&id| id != part).collect();
                let wish = Wish {
                    with: vec![(part, Some(rail))],
                    without: BTreeSet::from([*random.pick(&others)]),
                };
                let list = brute.list(&catalogue, objective, &wish);
                let mut asked = question(&supply, &catalogue, objective, 10);
                (asked.without, asked.with) = (wish.without.clone(), wish.with.clone());
                hold(case, &format!("{wish:?}"), &asked, &list);
                tally.add("wishes with a build", usize::from(!list.is_empty()));
            }
        }
    });
    println!("{kind:?} {tally:#?}");
    tally
}

fn enough(tally: &Tally, what: &str, least: usize) {
    assert!(
        std::env::var("ORACLE_SEEDS").is_ok() || tally.of(what) >= least,
        "{what}: {tally:#?}"
    );
}

#[test]
fn isolated_rails_are_alone() {
    let tally = kind_holds(Kind::Isolated, &["isolated"]);
    enough(&tally, "binds", 20);
}

#[test]
fn section_names_are_kept() {
    let tally = kind_holds(Kind::Pinned, &["section"]);
    enough(&tally, "binds", 20);
}

#[test]
fn floating_sections_are_found() {
    let tally = kind_holds(Kind::Floating, &[]);
    enough(&tally, "floats", 30);
}

#[test]
fn dual_pairs_are_found() {
    let tally = kind_holds(Kind::Dual, &[]);
    enough(&tally, "dual", 40);
}

/// The whole front.
#[test]
fn the_front_is_that_of_brute_force() {
    let tally = Tally::default();
    over([20, 40, 24], |case| {
        let (catalogue, supply) = (case.catalogue(), case.supply());
        let wanted = Brute::new(&supply, &catalogue);
        let wanted = wanted.front(&catalogue, &Wish::default());
        let got = front(case, &question(&supply, &catalogue, Objective::Cost, 1));
        assert_eq!(got, keys_of(&wanted), "{case}");
        tally.add("cases", 1);
        tally.add("builds", wanted.len());
        tally.add("several", usize::from(wanted.len() > 2));
    });
    println!("{tally:#?}");
    enough(&tally, "several", 20);
}

/// Transformers that differ by a microwatt of iron: much money for each, so that what rounding a heat hides weighs much.
const A_MICROWATT_APART: &str = r#"
seed 0
{"mains": {"voltage": "230 V", "tolerance": "10 %", "frequency": "50 Hz"}, "ambient": {"low": "0 degC", "high": "40 degC"}, "caps": {"cans": 1}, "ageing": {"life": "2000 h"}, "rail": [{"name": "5 V", "voltage": "5 V", "current": "0.8 A"}]}
transformer T1: price=2; primary_v=230; va=30; secondary_v=10; regulation_pct=10; core_loss_w=4.000002
transformer T2: price=10.9; primary_v=230; va=30; secondary_v=10; regulation_pct=10; core_loss_w=4.000001
transformer T3: price=11; primary_v=230; va=30; secondary_v=10; regulation_pct=10; core_loss_w=4.000000
rectifier B: price=0.4; kind=bridge; vrrm_v=200; io_a=4; ifsm_a=100; threshold_v=0.7; slope_mohm=30; rth_ja_k_w=20; tj_max_c=150
reservoir C: price=0.4; c_uf=4700; v_rated_v=25; esr_mohm=50; ripple_a=3; t_max_c=105; life_h=5000
pass U: price=0.5; kind=fixed; vout_v=5; tol_pct=4; dropout_v=2; vin_max_v=35; iout_max_a=1; ground_ma=5; rth_jc_k_w=3; rth_ja_k_w=60; tj_max_c=150; case=TO-220
sink S: price=0.5; cases=TO-220 GBU; rth_sa_k_w=8
"#;

/// Steep as the curve may be, no build of it is lost; nor does adding up fail where a unit costs as much as a house.
#[test]
fn steep_fronts_are_whole() {
    for price in ["10.9", "990000"] {
        for hundredths in (0..100).step_by(8) {
            let mut case = Case::read(A_MICROWATT_APART);
            for row in case.rows.iter_mut().filter(|row| row.slot == Slot::Transformer) {
                let core = format!("{}{hundredths:02}", row.cell("core_loss_w").unwrap());
                row.set("core_loss_w", core);
                if row.name == "T2" {
                    row.set("price", price);
                } else if row.name == "T3" {
                    row.set("price", if price == "10.9" { "11" } else { "1000000" });
                }
            }
            let (catalogue, supply) = (case.catalogue(), case.supply());
            let brute = Brute::new(&supply, &catalogue);
            let wanted = brute.front(&catalogue, &Wish::default());
            let asked = question(&supply, &catalogue, Objective::Cost, 1);
            let outcome = binrail::optimise::front(&asked).unwrap_or_else(|bug| panic!("{bug:?}\n{case}"));
            assert_eq!(keys(&outcome), keys_of(&wanted), "{case}");
        }
    }
}

/// share = "never" gives a build of the shared problem, so it never costs less, nor runs cooler.
#[test]
fn sharing_never_costs_more() {
    let tally = Tally::default();
    over([0, 40, 20], |case| {
        let named = |rail: &serde_json::Value| rail.get("section").is_some();
        let never_already = case.supply.get("share").is_some();
        if never_already || case.supply["rail"].as_array().unwrap().iter().any(named) {
            return;
        }
        let mut never = case.clone();
        never.supply["share"] = json!("never");
        let (catalogue, supply, apart) = (case.catalogue(), case.supply(), never.supply());
        let (all, some) = (Brute::new(&supply, &catalogue), Brute::new(&apart, &catalogue));
        let texts: BTreeSet<&Vec<String>> = all.all.iter().map(|j| &j.fields).collect();
        assert!(some.all.iter().all(|j| texts.contains(&j.fields)), "{case}");
        for objective in OBJECTIVES {
            let best = |case: &Case, supply: &Supply| {
                let outcome = solve(case, "pick", &question(supply, &catalogue, objective, 1));
                outcome.builds.first().map(|found| found.key.objective(objective))
            };
            let (shared, own) = (best(case, &supply), best(&never, &apart));
            assert!(
                own.is_none_or(|own| shared.is_some_and(|shared| shared <= own)),
                "{shared:?} {own:?} {case}"
            );
            tally.add("answers", 1);
            tally.add("sharing gains", usize::from(shared.is_some() && shared != own));
        }
    });
    println!("{tally:#?}");
    enough(&tally, "sharing gains", 30);
}

/// Each part of the optimum gone: the build with the least (distance, key) is the best within that distance, and within
/// one less there is none. The distance is the program's own.
#[test]
fn the_nearest_build_is_that_of_brute_force() {
    let tally = Tally::default();
    over([10, 20, 12], |case| {
        let (catalogue, supply) = (case.catalogue(), case.supply());
        let brute = Brute::new(&supply, &catalogue);
        let mut random = Random::new(case.seed);
        for objective in OBJECTIVES {
            let list = brute.list(&catalogue, objective, &Wish::default());
            let Some(best) = list.first() else { continue };
            for _ in 0..50 {
                let other = &random.pick(&brute.all).build;
                assert_eq!(
                    distance(&supply, &best.build, other),
                    apart(&best.build, other),
                    "{other:?}\n{case}"
                );
            }
            let parts: Vec<PartId> = best.bill.keys().copied().collect();
            for part in parts {
                let wish = Wish {
                    without: BTreeSet::from([part]),
                    with: Vec::new(),
                };
                let ask = |most| Question {
                    without: wish.without.clone(),
                    near: Some(Near {
                        places: places(&supply, &best.build),
                        most,
                    }),
                    ..question(&supply, &catalogue, objective, 1)
                };
                let what = format!("near, without {}", name(&catalogue, part));
                tally.add("asked", 1);
                let Some((least, nearest)) = brute.nearest(&catalogue, &best.build, objective, &wish) else {
                    hold(case, &what, &ask(supply.rails.len() * 7), &[]);
                    continue;
                };
                tally.add("found", 1);
                tally.add("other than the optimum without it", {
                    let free = brute.list(&catalogue, objective, &wish);
                    usize::from(free[0].fields != nearest.fields)
                });
                hold(case, &format!("{what}, within {least}"), &ask(least), &[nearest]);
                hold(case, &format!("{what}, within {least} less 1"), &ask(least - 1), &[]);
            }
        }
    });
    println!("{tally:#?}");
    enough(&tally, "found", 60);
    enough(&tally, "other than the optimum without it", 15);
}

fn name(catalogue: &Catalogue, id: PartId) -> &str {
    &catalogue.parts().find(|part| part.id == id).unwrap().name
}

/// A ceiling on the objective, a least tightness, and both: the list of the builds that keep to them.
#[test]
fn ceilings_and_tightness_filter_the_list() {
    let tally = Tally::default();
    over([10, 20, 12], |case| {
        let (catalogue, supply) = (case.catalogue(), case.supply());
        let brute = Brute::new(&supply, &catalogue);
        let mut random = Random::new(case.seed);
        for objective in OBJECTIVES {
            let allowed = brute.allowed(&catalogue, &Wish::default());
            if allowed.is_empty() {
                continue;
            }
            for round in 0..6 {
                let most = (round % 3 != 1).then(|| random.pick(&allowed).objective(objective) - i64::from(round == 0));
                // Between two builds, so that a last bit decides nothing.
                let tightness = if round % 3 == 0 {
                    f64::NEG_INFINITY
                } else {
                    random.pick(&allowed).tightness - 1e-7
                };
                let keeps =
                    |j: &&Judged| most.is_none_or(|most| j.objective(objective) <= most) && j.tightness >= tightness;
                let list = one_for_each_bill(allowed.iter().copied().filter(keeps).collect(), objective);
                let asked = Question {
                    most,
                    tightness,
                    ..question(&supply, &catalogue, objective, 10)
                };
                hold(case, &format!("most {most:?}, tightness {tightness:?}"), &asked, &list);
                tally.add("answers", 1);
                tally.add("with a build", usize::from(!list.is_empty()));
                tally.add(
                    "fewer",
                    usize::from(list.len() < one_for_each_bill(allowed.clone(), objective).len()),
                );
            }
        }
    });
    println!("{tally:#?}");
    enough(&tally, "with a build", 100);
    enough(&tally, "fewer", 100);
}
