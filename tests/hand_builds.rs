//! Builds worked by hand: tests/reference/hand_builds.py, which shares no code with this project, computes every
//! margin its own way and holds its corners against scipy's solve_ivp (`--verify`). Here the audit must agree.
#![allow(clippy::unwrap_used, clippy::print_stdout)]

use std::collections::BTreeMap;

use binrail::audit::audit;
use binrail::saved;
use serde_json::Value;

/// What both sides leave to rounding.
const SAME: f64 = 1e-9;

fn close(a: f64, b: f64) -> bool {
    (a - b).abs() <= SAME * a.abs().max(b.abs())
}

#[test]
fn every_margin_agrees() {
    let text = std::fs::read_to_string("tests/reference/hand_builds.json").unwrap();
    let cases: Value = serde_json::from_str(&text).unwrap();
    let cases = cases["cases"].as_array().unwrap();
    assert_eq!(cases.len(), 7);
    let mut limits = 0;
    for case in cases {
        let name = case["name"].as_str().unwrap();
        let saved = saved::from_value(&case["build"], name).unwrap();
        let catalogue = saved.own_catalogue().unwrap().unwrap();
        let build = saved.build(&catalogue).unwrap();
        let verdict = audit(&saved.supply, &build);

        let mut by_hand: BTreeMap<(&str, &str), &Value> = BTreeMap::new();
        for margin in case["margins"].as_array().unwrap() {
            by_hand.insert(
                (margin["of"].as_str().unwrap(), margin["limit"].as_str().unwrap()),
                margin,
            );
        }
        for margin in &verdict.margins {
            let check = &margin.check;
            let at = format!("{name}: {} {}", margin.of, check.limit.word());
            let wanted = by_hand
                .remove(&(margin.of.as_str(), check.limit.word()))
                .unwrap_or_else(|| panic!("{at}: not in the hand-worked list"));
            limits += 1;
            assert_eq!(
                check.missing(),
                wanted.get("missing").and_then(Value::as_str),
                "{at}: missing"
            );
            assert_eq!(
                check.corner.map_or("", |c| c.word()),
                wanted["corner"].as_str().unwrap(),
                "{at}: corner"
            );
            let number = |key: &str| wanted[key].as_f64();
            let value = if check.missing().is_some() {
                None
            } else {
                check.value.ok()
            };
            for (what, got, wanted) in [
                ("value", value, number("value")),
                ("bound", check.bound.ok(), number("bound")),
            ] {
                match (got, wanted) {
                    (Some(got), Some(wanted)) => assert!(close(got, wanted), "{at}: {what} {got} by hand {wanted}"),
                    (got, wanted) => assert_eq!(got, wanted, "{at}: {what}"),
                }
            }
            if let (Some(got), Some(wanted)) = (check.margin(), number("margin")) {
                let scale = check.value.unwrap().abs().max(check.bound.unwrap().abs());
                assert!(
                    (got - wanted).abs() <= SAME * scale,
                    "{at}: margin {got} by hand {wanted}"
                );
            }
        }
        assert!(by_hand.is_empty(), "{name}: the audit leaves out {:?}", by_hand.keys());
        assert_eq!(verdict.passes(), case["passes"].as_bool().unwrap(), "{name}: passes");
        assert!(
            close(verdict.heat_w.unwrap(), case["heat_w"].as_f64().unwrap()),
            "{name}: heat"
        );
        assert!(
            close(verdict.cost.value(), case["cost_per_unit"].as_f64().unwrap()),
            "{name}: cost"
        );
    }
    println!("{limits} limits agree");
}
