//! The brute force itself, held against what can be counted and listed by hand.

use std::collections::BTreeSet;

use binrail::build::HookupKind;
use binrail::catalogue::Transformer;
use binrail::screen::Objective;
use serde_json::{Value, json};

use crate::brute_force::{Brute, Wish};
use crate::choices::{Choices, assemble};
use crate::layouts::{layouts, partitions, set_partitions};
use crate::oracle_run::{hold, question};
use crate::own_rules::{apart, groups, takes};
use crate::small_case::{Case, Kind};

const TRANSFORMER: &str = "transformer T: price=8; primary_v=230; va=40; secondary_v=9+9; regulation_pct=10; ta_c=70";
const OTHERS: [&str; 5] = [
    "rectifier B: price=0.9; kind=bridge; vrrm_v=200; io_a=6; ifsm_a=200; threshold_v=0.7; slope_mohm=20; rth_ja_k_w=12; tj_max_c=150",
    "reservoir C: price=0.7; c_uf=6800; v_rated_v=35; esr_mohm=30; ripple_a=6; t_max_c=105; life_h=8000",
    "pass P: price=0.5; kind=fixed; vout_v=5; tol_pct=2; dropout_v=0.6; vin_max_v=20; iout_max_a=1; ground_ma=5; rth_jc_k_w=3; rth_ja_k_w=30; tj_max_c=150; case=TO-220",
    "pass N: price=0.6; kind=fixed; polarity=-; vout_v=5; tol_pct=2; dropout_v=0.6; vin_max_v=20; iout_max_a=1; ground_ma=5; rth_jc_k_w=3; rth_ja_k_w=30; tj_max_c=150; case=TO-220",
    "sink S: price=0.2; cases=GBU; rth_sa_k_w=8",
];

/// Rails as (voltage, keys), in a supply with ample everything.
fn case(transformer: &str, rails: &[(&str, Value)]) -> Case {
    let rail = |(place, (voltage, keys)): (usize, &(&str, Value))| {
        let mut rail = json!({"name": format!("rail {place}"), "voltage": voltage, "current": "0.2 A"});
        for (key, value) in keys.as_object().unwrap() {
            rail[key] = value.clone();
        }
        rail
    };
    let rails: Vec<Value> = rails.iter().enumerate().map(rail).collect();
    let supply = json!({
        "mains": {"voltage": "230 V", "tolerance": "6 %", "frequency": "50 Hz"},
        "ambient": {"low": "20 degC", "high": "30 degC", "inside_rise": "0 K"},
        "margins": {"junction": "5 K"},
        "ageing": {"life": "2000 h"},
        "caps": {"cans": 1},
        "rail": rails,
    });
    Case::read(&format!("seed 0\n{supply}\n{transformer}\n{}", OTHERS.join("\n")))
}

fn plain(voltages: &[&'static str]) -> Vec<(&'static str, Value)> {
    voltages.iter().map(|&v| (v, json!({}))).collect()
}

/// How many partitions and layouts a supply has.
fn counts(rails: &[(&str, Value)]) -> (usize, usize) {
    let supply = case(TRANSFORMER, rails).supply();
    let found = layouts(&supply);
    let different: BTreeSet<_> = found.iter().collect();
    assert_eq!(different.len(), found.len());
    (partitions(&supply).len(), found.len())
}

#[test]
fn layouts_can_be_counted() {
    let bell: Vec<usize> = (0..6).map(|n| set_partitions(n).len()).collect();
    assert_eq!(bell, [1, 1, 2, 5, 15, 52]);
    // One section, or two on one or two transformers.
    assert_eq!(counts(&plain(&["5 V", "5 V"])), (2, 3));
    // Two sections on one or two transformers, or a pair.
    assert_eq!(counts(&plain(&["5 V", "-5 V"])), (1, 3));
    // {abc} 1, three of {ab}{c} with 2 each, {a}{b}{c} with 5.
    assert_eq!(counts(&plain(&["5 V", "5 V", "5 V"])), (5, 12));
    // {ac}{b}: 2 and a pair 1. {a}{b}{c}: 5, and a pair of b with a or c, beside the third or not: 2 each.
    assert_eq!(counts(&plain(&["5 V", "-5 V", "5 V"])), (2, 12));
    // Two by two. Sections {ab}{cd}: 2 + 1. {ab}{c}{d} and its mirror: 5 + two pairs with 2 each, twice 9. All single: 15,
    // one pair (4 of them) with 5 each, two pairs (2) with 2 each: 39.
    assert_eq!(counts(&plain(&["5 V", "5 V", "-5 V", "-5 V"])), (4, 3 + 18 + 39));
}

#[test]
fn keys_rule_layouts_out() {
    let never = {
        let mut case = case(TRANSFORMER, &plain(&["5 V", "-5 V", "5 V"]));
        case.supply["share"] = json!("never");
        layouts(&case.supply())
    };
    assert_eq!(never.len(), 1);
    assert!(never[0].len() == 3 && never[0].iter().all(|instance| instance.len() == 1));

    let with = |keys: [Value; 3]| {
        let rails: Vec<_> = ["5 V", "-5 V", "5 V"].into_iter().zip(keys).collect();
        counts(&rails)
    };
    let (none, isolated, bridge) = (json!({}), json!({"isolated": true}), json!({"paths": ["bridge"]}));
    let (a, b) = (json!({"section": "A"}), json!({"section": "B"}));
    // Three single sections and a pair of b with c.
    assert_eq!(with([isolated.clone(), none.clone(), none.clone()]), (1, 5 + 2));
    // No pair at all.
    assert_eq!(with([none.clone(), isolated, none.clone()]), (2, 2 + 5));
    // Dual is not allowed to b; to c.
    assert_eq!(with([none.clone(), bridge.clone(), none.clone()]), (2, 2 + 5));
    assert_eq!(with([none.clone(), none.clone(), bridge]), (2, 2 + 5 + 2));
    // One name: together; two: apart; one alone: nothing.
    assert_eq!(with([a.clone(), none.clone(), a.clone()]), (1, 3));
    assert_eq!(with([a.clone(), none.clone(), b.clone()]), (1, 9));
    assert_eq!(with([a.clone(), b, none.clone()]), (2, 12));
    // An unnamed one may join those with a name.
    let named = |name: &Value| ("5 V", name.clone());
    assert_eq!(counts(&[named(&a), named(&none), named(&a)]).0, 2);
}

fn transformer(secondary_v: &str) -> Transformer {
    let row = TRANSFORMER.replace("9+9", secondary_v);
    case(&row, &plain(&["5 V"])).catalogue().transformers.remove(0)
}

#[test]
fn windings_can_be_counted() {
    let count = |secondary_v: &str| takes(&groups(&transformer(secondary_v))).len();
    assert_eq!(count("9"), 1);
    // Single, series, parallel, centre-tap, dual.
    assert_eq!(count("9+9"), 5);
    // Series and parallel of three too.
    assert_eq!(count("9+9+9"), 7);
    assert_eq!(count("9+8"), 2);
    assert_eq!(count("9+8+9"), 6);
    // One half, series, centre-tap, dual; the second such winding is like the first.
    assert_eq!(count("9-0-9"), 4);
    assert_eq!(count("9-0-9+9-0-9"), 4);
    assert_eq!(count("9+9-0-9"), 5);
    let of = groups(&transformer("9-0-9+8+9-0-9+9"));
    let places: Vec<_> = of.iter().map(|group| group.windings.clone()).collect();
    assert_eq!(places, [vec![vec![1, 2], vec![4, 5]], vec![vec![3]], vec![vec![6]]]);
}

/// The secondaries of each section of every build that the rules allow on one transformer, devices apart.
fn places(secondary_v: &str, rails: &[(&str, Value)]) -> Vec<Vec<Vec<usize>>> {
    let case = case(&TRANSFORMER.replace("9+9", secondary_v), rails);
    let (catalogue, supply) = (case.catalogue(), case.supply());
    let choices = Choices::unsifted(&supply, &catalogue);
    let all: Vec<usize> = (0..supply.rails.len()).collect();
    let mut found = BTreeSet::new();
    let mut count = 0;
    for layout in choices.layouts.iter().filter(|layout| layout.len() == 1) {
        choices.each(layout, &mut |chosen| {
            let build = assemble(&all, chosen);
            let ids: Vec<&str> = build.sections.iter().map(|s| s.id.as_str()).collect();
            assert_eq!(ids, ["A", "B", "C"][..ids.len()]);
            let at = |s: &binrail::build::Section| (s.hookup.kind, s.hookup.secondaries.clone());
            found.insert(build.sections.iter().map(at).collect::<Vec<_>>());
            count += 1;
        });
    }
    let on_one = choices.layouts.iter().filter(|layout| layout.len() == 1);
    assert_eq!(count, on_one.map(|layout| choices.count(layout, false)).sum::<u64>());
    let mut found: Vec<_> = found.into_iter().collect();
    found.sort_by_key(|sections| sections.iter().map(|(_, places)| places.clone()).collect::<Vec<_>>());
    found
        .into_iter()
        .map(|sections| sections.into_iter().map(|(_, places)| places).collect())
        .collect()
}

#[test]
fn sections_take_the_lowest_free_places() {
    let (bridge, isolated) = (
        json!({"paths": ["bridge"]}),
        json!({"paths": ["bridge"], "isolated": true}),
    );
    let two = [("5 V", bridge.clone()), ("5 V", isolated.clone())];
    // Series and parallel show the same places.
    assert_eq!(
        places("9+9+9", &two),
        [
            vec![vec![1], vec![2]],
            vec![vec![1], vec![2, 3]],
            vec![vec![1], vec![2, 3]],
            vec![vec![1, 2], vec![3]],
            vec![vec![1, 2], vec![3]],
        ]
    );
    assert_eq!(places("9+8", &two), [[[1], [2]], [[2], [1]]]);
    assert_eq!(places("9-0-9", &two), Vec::<Vec<Vec<usize>>>::new());
    assert_eq!(
        places("9-0-9+9-0-9", &two),
        [
            vec![vec![1], vec![3]],
            vec![vec![1], vec![3, 4]],
            vec![vec![1, 2], vec![3]],
            vec![vec![1, 2], vec![3, 4]],
        ]
    );
    // The negative rail comes first, its section takes none; the other positive one is before the pair's.
    let dual = json!({"paths": ["dual"]});
    let three = [("-5 V", dual.clone()), ("5 V", isolated), ("5 V", dual)];
    assert_eq!(places("9+9+9", &three), [[vec![], vec![1], vec![2, 3]]]);
    assert_eq!(places("9+9", &three), Vec::<Vec<Vec<usize>>>::new());
}

/// Text of a build, its fields parted by spaces, "-" for none.
fn texts(brute: &Brute) -> BTreeSet<String> {
    let text = |fields: &Vec<String>| {
        let fields: Vec<&str> = fields.iter().map(|f| if f.is_empty() { "-" } else { f }).collect();
        fields.join(" ")
    };
    brute.all.iter().map(|judged| text(&judged.fields)).collect()
}

/// Two 5 V rails, one of each part. In series the windings give more than the device takes, so the rails share a section
/// on one winding or two in parallel, or have two sections on one transformer, or a transformer each.
#[test]
fn two_rails_of_one_sign() {
    let bridge = json!({"paths": ["bridge"]});
    let case = case(TRANSFORMER, &[("5 V", bridge.clone()), ("5 V", bridge)]);
    let (catalogue, supply) = (case.catalogue(), case.supply());
    let brute = Brute::new(&supply, &catalogue);
    let (one, two, both) = ("T 1 single", "T 2 single", "T 1,2 parallel");
    let rest = "bridge B - C 001 P -";
    let build = |a: &str, b: &str, ids: &str| format!("{a} {rest} {b} {rest} {ids}");
    let wanted = [
        build(one, one, "A T1 A T1"),
        build(both, both, "A T1 A T1"),
        build(one, two, "A T1 B T1"),
        build(one, one, "A T1 B T2"),
        build(one, both, "A T1 B T2"),
        build(both, one, "A T1 B T2"),
        build(both, both, "A T1 B T2"),
    ];
    assert_eq!(texts(&brute), wanted.into_iter().collect());
    let costs = |objective| -> Vec<i64> {
        let list = brute.list(&catalogue, objective, &Wish::default());
        list.iter().map(|j| j.cost).collect()
    };
    // 8 + 0.9 + 0.7 + 2 x 0.5, a bridge and a can more, a transformer more.
    assert_eq!(costs(Objective::Cost), [10_600_000, 12_200_000, 20_200_000]);
    let mut sorted = costs(Objective::Heat);
    sorted.sort_unstable();
    assert_eq!(sorted, [10_600_000, 12_200_000, 20_200_000]);
    let front = brute.front(&catalogue, &Wish::default());
    assert_eq!(front[0].cost, 10_600_000);
    let coolest = brute.list(&catalogue, Objective::Heat, &Wish::default())[0];
    assert_eq!(front.last().unwrap().build, coolest.build);

    // Apart: both rails' wiring (the rails of the section) and nothing else; a transformer more is no place.
    let at = |text: &str| {
        brute
            .all
            .iter()
            .find(|j| j.fields.join(" ").replace("  ", " - ").contains(text))
            .unwrap()
    };
    let (shared, one_each, apart_each) = (at("A T1 A T1"), at("A T1 B T1"), at("A T1 B T2"));
    assert_eq!(apart(&shared.build, &one_each.build), 2);
    assert_eq!(
        apart(&one_each.build, &apart_each.build),
        usize::from(apart_each.fields[11] != "2") + usize::from(apart_each.fields[1] != "1")
    );
    // The transformer anywhere, nowhere.
    let without = Wish {
        without: [catalogue.find("T").unwrap().id].into_iter().collect(),
        ..Wish::default()
    };
    assert!(brute.list(&catalogue, Objective::Cost, &without).is_empty());
}

/// A positive and a negative rail: a pair from one bridge, or two sections, where the negative one may float with the
/// positive device.
#[test]
fn two_rails_of_either_sign() {
    let paths = json!({"paths": ["dual", "bridge"]});
    let case = case(TRANSFORMER, &[("-5 V", paths.clone()), ("5 V", paths)]);
    let (catalogue, supply) = (case.catalogue(), case.supply());
    let brute = Brute::new(&supply, &catalogue);
    let mut wanted = BTreeSet::from([
        // The negative half holds no secondaries.
        "T - dual dual B - C 001 N - T 1,2 dual dual B - C 001 P - A T1 B T1".to_owned(),
    ]);
    let rest = "bridge B - C 001";
    for device in ["N", "P"] {
        wanted.insert(format!("T 1 single {rest} {device} - T 2 single {rest} P - A T1 B T1"));
        for a in ["1 single", "1,2 parallel"] {
            for b in ["1 single", "1,2 parallel"] {
                wanted.insert(format!("T {a} {rest} {device} - T {b} {rest} P - A T1 B T2"));
            }
        }
    }
    assert_eq!(texts(&brute), wanted);
    let list = brute.list(&catalogue, Objective::Cost, &Wish::default());
    let costs: Vec<i64> = list.iter().map(|j| j.cost).collect();
    // 8 + 0.9 + 2 x 0.7 + 0.6 + 0.5; a bridge more with N or another P; a transformer more.
    assert_eq!(costs, [11_400_000, 12_200_000, 12_300_000, 20_200_000, 20_300_000]);
    let pair = &list[0].build;
    assert_eq!((pair.sections[0].pair, pair.sections[1].pair), (Some(1), Some(0)));
    assert_eq!(pair.sections[0].hookup.kind, HookupKind::Dual);
    let id = |name: &str| catalogue.find(name).unwrap().id;
    // The bridge is in the section of either rail, the positive device is not at the negative rail of the pair.
    let with = |part: &str, rail: usize| {
        let wish = Wish {
            with: vec![(id(part), Some(rail))],
            ..Wish::default()
        };
        let list = brute.list(&catalogue, Objective::Cost, &wish);
        let mut asked = question(&supply, &catalogue, Objective::Cost, 10);
        asked.with.clone_from(&wish.with);
        hold(&case, &format!("with {part} at {rail}"), &asked, &list);
        list[0].cost
    };
    assert_eq!(
        [with("B", 0), with("B", 1), with("P", 0), with("N", 0)],
        [11_400_000, 11_400_000, 12_200_000, 11_400_000]
    );
    // Nearest to the pair when N is gone: everything but transformer, bridge pieces of the positive half, cans, its device.
    let wish = Wish {
        without: BTreeSet::from([id("N")]),
        ..Wish::default()
    };
    let (distance, nearest) = brute.nearest(&catalogue, pair, Objective::Cost, &wish).unwrap();
    // Wiring of both, the bridge (0 pieces before) and device of the negative one.
    assert_eq!((distance, nearest.cost), (4, 12_200_000));
}

/// Dropping what fails alone loses no build.
#[test]
fn nothing_is_lost_by_sifting() {
    let mut held = 0;
    for seed in 0..400 {
        let case = Case::new(seed, 2, [Kind::Any, Kind::Dual][seed as usize % 2]);
        let (catalogue, supply) = (case.catalogue(), case.supply());
        let unsifted = Choices::unsifted(&supply, &catalogue);
        if unsifted.count_all(false) > 30_000 {
            continue;
        }
        let all = Brute::of(&supply, &catalogue, &unsifted);
        assert_eq!(texts(&all), texts(&Brute::new(&supply, &catalogue)), "{case}");
        held += usize::from(!all.all.is_empty());
        if held == 25 {
            return;
        }
    }
    panic!("only {held} cases were small enough");
}
