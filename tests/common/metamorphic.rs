//! What must not change when money, rows or parts that do not matter change.

use std::collections::BTreeSet;

use binrail::screen::Objective;

use crate::common::Random;
use crate::oracle_run::{Keys, OBJECTIVES, keys, over, question, solve};
use crate::small_case::Case;

/// Ten times the prices: the same builds in the same order at ten times the cost.
#[test]
fn dearer_money_changes_no_build() {
    over([30, 30, 10], |case| {
        let mut dearer = case.clone();
        for row in &mut dearer.rows {
            for column in ["price", "fitted_price"] {
                if let Some(text) = row.cell(column) {
                    let text = ten_times(text);
                    row.set(column, text);
                }
            }
            if let Some(breaks) = row.cell("breaks") {
                let times = |item: &str| {
                    item.split_once(':')
                        .map(|(n, p)| format!("{n}:{}", ten_times(p)))
                        .unwrap()
                };
                let breaks: Vec<String> = breaks.split(' ').map(times).collect();
                row.set("breaks", breaks.join(" "));
            }
        }
        if let Some(cap) = dearer.supply["caps"]["cost"].as_f64() {
            dearer.supply["caps"]["cost"] = (cap * 10.0).into();
        }
        for objective in OBJECTIVES {
            let mut wanted = answer(case, objective, 50);
            wanted.iter_mut().for_each(|key| key.0 *= 10);
            assert_eq!(answer(&dearer, objective, 50), wanted, "by {objective:?}\n{case}");
        }
    });
}

/// A price in tenths, moved by one decimal.
fn ten_times(price: &str) -> String {
    let (whole, tenths) = price.split_once('.').unwrap();
    assert_eq!(tenths.len(), 1, "{price}");
    format!("{whole}{tenths}")
}

fn answer(case: &Case, objective: Objective, top: usize) -> Keys {
    let (catalogue, supply) = (case.catalogue(), case.supply());
    keys(&solve(
        case,
        "metamorphic",
        &question(&supply, &catalogue, objective, top),
    ))
}

/// Rows in another order: the identical result, after the identical work.
#[test]
fn order_of_rows_changes_nothing() {
    over([30, 30, 10], |case| {
        let mut shuffled = case.clone();
        let mut random = Random::new(case.seed);
        for place in (1..shuffled.rows.len()).rev() {
            shuffled.rows.swap(place, random.below(place + 1));
        }
        let (plain, other, supply) = (case.catalogue(), shuffled.catalogue(), case.supply());
        for objective in OBJECTIVES {
            let wanted = solve(case, "plain", &question(&supply, &plain, objective, 50));
            let got = solve(case, "shuffled", &question(&supply, &other, objective, 50));
            assert_eq!(keys(&got), keys(&wanted), "by {objective:?}\n{case}");
            assert_eq!(got.counts, wanted.counts, "by {objective:?}\n{case}");
            for (a, b) in got.builds.iter().zip(&wanted.builds) {
                assert_eq!(a.build, b.build, "by {objective:?}\n{case}");
            }
        }
    });
}

/// A copy of a part that is dearer at every number of pieces never enters the optimum, nor moves it; of parts with
/// limited stock a copy could, so those are left out.
#[test]
fn a_dominated_part_changes_nothing() {
    over([30, 30, 10], |case| {
        let mut random = Random::new(case.seed);
        for round in 0..3 {
            let row = random.pick(&case.rows);
            if row.cell("stock").is_some() {
                continue;
            }
            let dearer = |price: &str| format!("{:.1}", price.parse::<f64>().unwrap() + 0.1);
            let mut copy = row.clone();
            copy.name = format!("0{}", row.name);
            copy.set("price", dearer(row.cell("price").unwrap()));
            if let Some(breaks) = row.cell("breaks") {
                let item = |item: &str| item.split_once(':').map(|(n, p)| format!("{n}:{}", dearer(p))).unwrap();
                copy.set("breaks", breaks.split(' ').map(item).collect::<Vec<_>>().join(" "));
            }
            let mut more = case.clone();
            more.rows.push(copy);
            for objective in OBJECTIVES {
                let (got, wanted) = (answer(&more, objective, 1), answer(case, objective, 1));
                assert_eq!(
                    got, wanted,
                    "round {round}, by {objective:?}: copy of {}\n{case}",
                    row.name
                );
            }
        }
    });
}

/// Without any one part that was not picked the pick is the same.
#[test]
fn an_unpicked_part_may_go() {
    over([30, 30, 10], |case| {
        let (catalogue, supply) = (case.catalogue(), case.supply());
        for objective in OBJECTIVES {
            let outcome = solve(case, "plain", &question(&supply, &catalogue, objective, 1));
            let picked: BTreeSet<&str> = (outcome.builds.iter())
                .flat_map(|found| found.build.uses().map(|(part, _)| part.name.as_str()))
                .collect();
            let wanted = keys(&outcome);
            for gone in case.rows.iter().filter(|row| !picked.contains(row.name.as_str())) {
                let mut less = case.clone();
                less.rows.retain(|row| row.name != gone.name);
                assert_eq!(
                    answer(&less, objective, 1),
                    wanted,
                    "by {objective:?} less {}\n{case}",
                    gone.name
                );
            }
        }
    });
}
