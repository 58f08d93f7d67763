//! Wrong answers that this program once gave; each test tells its story.
#![allow(clippy::unwrap_used)]

use std::time::{Duration, Instant};

use binrail::catalogue::{Catalogue, SavedPart, Slot, from_cells};
use binrail::optimise::{NODE_BUDGET, Outcome, Proof, Question, optimise};
use binrail::screen::{Objective, Stop};
use binrail::supply::{Supply, from_json};
use serde_json::{Value, json};

const PARTS: &str = "
    transformer T: price=10; primary_v=230; va=30; secondary_v=15; regulation_pct=10; ta_c=70; core_loss_w=1
    rectifier R: price=1; kind=bridge; vrrm_v=200; io_a=4; ifsm_a=100; threshold_v=0.7; slope_mohm=30; rth_ja_k_w=10; tj_max_c=150
    reservoir C: price=1; c_uf=4700; v_rated_v=50; esr_mohm=50; ripple_a=5; t_max_c=105; life_h=8000
    pass D: price=1; kind=fixed; vout_v=12; tol_pct=2; dropout_v=1; vin_max_v=60; iout_max_a=3; ground_ma=5; rth_jc_k_w=3; rth_ja_k_w=60; tj_max_c=150; case=TO-220
";

fn catalogue(more: &str) -> Catalogue {
    let row = |line: &str| -> SavedPart {
        let (place, cells) = line.split_once(": ").unwrap();
        let (slot, name) = place.split_once(' ').unwrap();
        let slot = Slot::ALL.into_iter().find(|s| s.word() == slot).unwrap();
        let cell = |cell: &str| cell.split_once('=').map(|(a, b)| (a.to_owned(), b.to_owned())).unwrap();
        (slot, name.to_owned(), cells.split("; ").map(cell).collect())
    };
    let lines = format!("{PARTS}{more}");
    from_cells(
        lines
            .lines()
            .map(str::trim)
            .filter(|l| !l.is_empty())
            .map(row)
            .collect(),
        "test",
        None,
    )
    .unwrap()
}

fn supply(rails: &[&str], caps: Value) -> Supply {
    let rails: Vec<Value> = rails
        .iter()
        .map(|name| json!({"name": name, "voltage": "12 V", "current": "0.7 A"}))
        .collect();
    let document = json!({
        "mains": {"voltage": "230 V", "tolerance": "10 %", "frequency": "50 Hz"},
        "ambient": {"low": "0 degC", "high": "30 degC", "inside_rise": "5 K"},
        "share": "never",
        "caps": caps,
        "rail": rails,
    });
    from_json(&document, "test").unwrap()
}

fn ask<'c>(supply: &'c Supply, catalogue: &'c Catalogue, top: usize, node_budget: u64, stop: Stop) -> Outcome<'c> {
    let objective = Objective::Cost;
    let question = Question {
        top,
        stop,
        node_budget,
        ..Question::new(supply, catalogue, objective)
    };
    optimise(&question).unwrap()
}

fn costs(outcome: &Outcome) -> Vec<f64> {
    outcome.builds.iter().map(|found| found.key.cost as f64 / 1e6).collect()
}

/// 2026-12: the walk prices a sink as if there were two of it. Once every column was out, the search took "no column is
/// left" for "no build is left", and said that none passes: the only one costs more than the sum of its least prices.
#[test]
fn a_build_dearer_than_its_least_prices_is_found() {
    let catalogue = catalogue("sink S: price=10; breaks=2:1; cases=TO-220; rth_sa_k_w=5");
    let supply = supply(&["a"], json!({"cans": 1}));
    let outcome = ask(&supply, &catalogue, 1, NODE_BUDGET, Stop::default());
    assert_eq!((costs(&outcome), outcome.proof), (vec![23.0], Proof::Proved));
}

/// 2026-12: for the same reason the last of a ranking were missing.
#[test]
fn a_ranking_goes_on_to_its_end() {
    let sinks = "sink S: price=1; cases=TO-220; rth_sa_k_w=5\nsink U: price=9; cases=TO-220; rth_sa_k_w=4";
    let catalogue = catalogue(sinks);
    let supply = supply(&["a", "b"], json!({"cans": 1}));
    let outcome = ask(&supply, &catalogue, 50, NODE_BUDGET, Stop::default());
    assert_eq!(
        (costs(&outcome), outcome.proof),
        (vec![28.0, 36.0, 44.0], Proof::Proved)
    );
}

/// 2026-12: the integer program's row for a cap was tighter than the audit, which lets a rounding error pass; its "there
/// is none" was then taken for a proof.
#[test]
fn the_solver_s_caps_are_as_wide_as_the_audit_s() {
    let sinks = "sink S: price=1; cases=TO-220; rth_sa_k_w=5\nsink U: price=9; cases=TO-220; rth_sa_k_w=4";
    let mut catalogue = catalogue(sinks);
    catalogue.rectifiers[0].part.price = binrail::units::Money(400_000_000_200);
    let supply = supply(&["a", "b"], json!({"cans": 1, "cost": 800_026.0}));
    let searched = ask(&supply, &catalogue, 1, NODE_BUDGET, Stop::default());
    let asked = ask(&supply, &catalogue, 1, 1, Stop::default());
    assert_eq!(costs(&searched), costs(&asked));
    assert_eq!(searched.builds.len(), 1);
}

/// 2026-12: with a cap on heat the coolest build is looked for first; that look used up the whole of a time limit, and
/// the build that it found was thrown away.
#[test]
fn a_cap_does_not_eat_the_time_limit() {
    let catalogue = catalogue("sink S: price=1; cases=TO-220; rth_sa_k_w=5");
    let supply = supply(&["a"], json!({"cans": 1, "heat": "500 W"}));
    let half = Stop {
        deadline: Some(Instant::now() + Duration::from_secs(60)),
        ..Stop::default()
    }
    .half();
    let left = half.deadline.unwrap() - Instant::now();
    assert!(
        left > Duration::from_secs(25) && left <= Duration::from_secs(30),
        "{left:?}"
    );
    let outcome = ask(&supply, &catalogue, 1, NODE_BUDGET, Stop::default());
    assert_eq!((costs(&outcome), outcome.proof), (vec![14.0], Proof::Proved));
}
