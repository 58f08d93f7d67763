//! Rails that share a section, sections that share a transformer, and dual pairs: documents that go out and come back,
//! rules of assembly, what a collapse leaves to say. Their numbers are held by `tests/hand_builds.rs`, whose builds are
//! the ones here.
#![allow(clippy::unwrap_used)]

use std::collections::BTreeSet;

use binrail::audit::{Audit, audit, cautions};
use binrail::fault::Fault;
use binrail::report::table::Page;
use binrail::report::{Report, json as documents, table};
use binrail::saved;
use serde_json::{Value, json};

const MODULE: &str = "dual with a module";
const DIODES: &str = "dual with diodes";
const ONE_SECTION: &str = "one section, three rails";
const ONE_TRANSFORMER: &str = "one transformer, two sections";

fn build(name: &str) -> Value {
    let text = std::fs::read_to_string("tests/reference/hand_builds.json").unwrap();
    let mut cases: Value = serde_json::from_str(&text).unwrap();
    let cases = cases["cases"].as_array_mut().unwrap();
    cases.iter_mut().find(|case| case["name"] == name).unwrap()["build"].take()
}

/// The document with values set: ("/sections/0/pair", ...); an object's keys are set one by one.
fn changed(name: &str, changes: &[(&str, Value)]) -> Value {
    let mut document = build(name);
    for (place, value) in changes {
        let (table, key) = place.rsplit_once('/').unwrap();
        match (document.pointer_mut(place), value) {
            (Some(Value::Object(old)), Value::Object(new)) => old.extend(new.clone()),
            (Some(old), new) => *old = new.clone(),
            (None, new) => document.pointer_mut(table).unwrap()[key] = new.clone(),
        }
    }
    document
}

fn verdict(document: &Value) -> Audit {
    let saved = saved::from_value(document, "b.json").unwrap();
    let catalogue = saved.own_catalogue().unwrap().unwrap();
    audit(&saved.supply, &saved.build(&catalogue).unwrap())
}

#[track_caller]
fn refused(name: &str, changes: &[(&str, Value)], expected: &[&str]) {
    let read = || -> Result<(), Vec<Fault>> {
        let saved = saved::from_value(&changed(name, changes), "b.json")?;
        let catalogue = saved.own_catalogue().unwrap()?;
        saved.build(&catalogue).map(|_| ())
    };
    let told: Vec<String> = read().unwrap_err().iter().map(ToString::to_string).collect();
    assert_eq!(told, expected);
}

#[test]
fn a_saved_build_comes_back_the_same() {
    for name in [MODULE, DIODES, ONE_SECTION, ONE_TRANSFORMER] {
        let document = build(name);
        let saved = saved::from_value(&document, name).unwrap();
        let catalogue = saved.own_catalogue().unwrap().unwrap();
        let build = saved.build(&catalogue).unwrap();
        let report = Report::new(&saved.supply, build.clone(), None, None, String::new());
        let written = documents::build(&report);
        // As it was written by hand, key by key.
        for key in ["transformers", "sections", "rails"] {
            assert_eq!(written[key], document[key], "{name}: {key}");
        }
        let again = saved::from_value(&written, name).unwrap();
        let own = again.own_catalogue().unwrap().unwrap();
        let back = again.build(&own).unwrap();
        assert_eq!(back.text(), build.text(), "{name}");
        assert_eq!(
            back.sections.iter().map(|s| s.pair).collect::<Vec<_>>(),
            build.sections.iter().map(|s| s.pair).collect::<Vec<_>>()
        );
        let (first, second) = (audit(&saved.supply, &build), audit(&again.supply, &back));
        assert_eq!(first, second, "{name}");
    }
}

/// What stands on the positive half alone, and how many pieces a pair takes.
#[test]
fn a_pair_is_bought_once() {
    for (name, negative, rectifier, pieces) in [(MODULE, 1, "Z2-0404", 1), (DIODES, 0, "Z2-0131", 8)] {
        let document = build(name);
        let saved = saved::from_value(&document, name).unwrap();
        let catalogue = saved.own_catalogue().unwrap().unwrap();
        let build = saved.build(&catalogue).unwrap();
        let half = &build.sections[negative];
        let other = &build.sections[half.pair.unwrap()];
        assert!(half.is_negative_half() && half.rectifier_pieces() == 0);
        assert_eq!(half.hookup, other.hookup.negative_half());
        let report = Report::new(&saved.supply, build.clone(), None, None, String::new());
        let written = &documents::build(&report)["sections"][negative];
        assert_eq!(
            (&written["windings"], &written["secondaries"], &written["rectifier_qty"]),
            (&json!(0), &json!([]), &json!(0))
        );
        assert_eq!(
            (&written["rectifier_sink"], &written["hookup"], &written["pair"]),
            (&Value::Null, &json!("dual"), &json!(other.id))
        );
        let line = |part: &str| report.lines.iter().find(|l| l.part.name == part).unwrap().qty;
        assert_eq!(line(rectifier), pieces, "{name}");
    }
}

#[test]
fn halves_of_a_pair_agree() {
    let [a, b] = ["b.json: A: ", "b.json: B: "];
    let null = Value::Null;
    refused(
        MODULE,
        &[("/sections/1/pair", json!("C"))],
        &["b.json: sections.B.pair: \"C\" is no section of this build; name the other half of the dual pair, or null"],
    );
    refused(
        MODULE,
        &[("/sections/1/pair", null.clone())],
        &[
            "b.json: sections.B: has no secondaries, nor has a pair of it on this transformer; the negative half of a dual pair names the positive one, which holds two",
        ],
    );
    refused(
        MODULE,
        &[("/sections/0/pair", null.clone())],
        &[
            &format!("{a}path dual makes two sections; name the one of the other polarity as its pair"),
            &format!("{b}names A as its pair, which must name it in turn"),
        ],
    );
    refused(
        MODULE,
        &[("/sections/0/pair", json!("A"))],
        &[
            &format!("{a}names A as its pair, which must name it in turn"),
            &format!("{b}names A as its pair, which must name it in turn"),
        ],
    );
    refused(
        MODULE,
        &[("/sections/1/rectifier_qty", json!(1))],
        &["b.json: sections.B.rectifier_qty: \"1\" is counted on the positive half of the pair; 0, or leave it out"],
    );
    refused(
        MODULE,
        &[("/sections/1/rectifier_sink", json!("Z5-0012"))],
        &[&format!(
            "{b}is the negative half of a pair: secondaries and the rectifier's sink stand on A alone"
        )],
    );
    refused(
        DIODES,
        &[
            ("/sections/0/secondaries", json!([1, 2])),
            ("/sections/0/windings", json!(2)),
            ("/sections/0/rectifier_qty", null.clone()),
            ("/sections/1/secondaries", json!([])),
            ("/sections/1/windings", json!(0)),
            ("/sections/1/rectifier_qty", null.clone()),
        ],
        &[
            &format!(
                "{b}secondaries [] of Z1-1818 cannot be joined as dual; equal secondaries only, and a tapped winding in series, by one half, as a centre-tap or dual"
            ),
            &format!("{a}is the negative half of a pair: secondaries and the rectifier's sink stand on B alone"),
        ],
    );
    refused(
        MODULE,
        &[("/sections/0/secondaries", json!([1, 3]))],
        &[&format!(
            "{a}secondaries [1, 3] of Z1-0616 cannot be joined as dual; equal secondaries only, and a tapped winding in series, by one half, as a centre-tap or dual"
        )],
    );
    refused(
        MODULE,
        &[
            ("/sections/0/secondaries", json!([1])),
            ("/sections/0/windings", json!(1)),
        ],
        &[&format!(
            "{a}secondaries [1] of Z1-0616 cannot be joined as dual; equal secondaries only, and a tapped winding in series, by one half, as a centre-tap or dual"
        )],
    );
    refused(
        MODULE,
        &[
            (
                "/transformers",
                json!([{"id": "T1", "part": "Z1-0616"}, {"id": "T2", "part": "Z1-0616"}]),
            ),
            ("/sections/1/transformer", json!("T2")),
        ],
        &[&format!("{a}and its pair B must be fed by the same transformer")],
    );
    let mut twin = build(MODULE)["parts"]["Z2-0404"].clone();
    twin["price"] = json!("0.75");
    refused(
        MODULE,
        &[("/parts/Z2-0405", twin), ("/sections/1/rectifier", json!("Z2-0405"))],
        &[&format!("{a}and its pair B have one rectifier; both must name it")],
    );
    // Two positive sections.
    refused(
        MODULE,
        &[
            ("/supply/rail/1/voltage", json!("12 V")),
            ("/rails/1/pass", json!("Z4-1215")),
        ],
        &[
            &format!(
                "{b}secondaries [] of Z1-0616 cannot be joined as dual; equal secondaries only, and a tapped winding in series, by one half, as a centre-tap or dual"
            ),
            &format!("{a}has the polarity of its pair B; a dual pair is a positive and a negative section"),
        ],
    );
    // Only dual sections come in pairs.
    refused(
        ONE_TRANSFORMER,
        &[("/sections/0/pair", json!("B")), ("/sections/1/pair", json!("A"))],
        &[
            "b.json: guard: is isolated and fed by half of a dual pair",
            &format!("{a}has a pair on path bridge; only path dual makes two sections"),
            &format!("{b}has a pair on path half-wave; only path dual makes two sections"),
        ],
    );
    refused(
        MODULE,
        &[("/sections/0/pair", json!(["B"]))],
        &["b.json: sections[1].pair: \"[\"B\"]\" does not fit; a text"],
    );
}

#[test]
fn what_a_pair_is_not_for() {
    refused(
        MODULE,
        &[("/supply/share", json!("never"))],
        &["b.json: A: share = \"never\" excludes path dual"],
    );
    refused(
        MODULE,
        &[("/supply/rail/1/isolated", json!(true))],
        &["b.json: minus: is isolated and fed by half of a dual pair"],
    );
    refused(
        MODULE,
        &[("/supply/rail/0/paths", json!(["bridge", "centre-tap"]))],
        &["b.json: plus: its paths do not name dual"],
    );
    // The centre of a pair is common: nothing floats, and a negative half needs a negative device.
    refused(
        MODULE,
        &[("/rails/1/pass", json!("Z4-1215"))],
        &["b.json: minus: Z4-1215 does not serve -12 V with the device kinds that the rail names"],
    );
    // Nor does a section that feeds several rails.
    let serve = |rail: &str, device: &str, volts: &str| {
        format!("b.json: {rail}: {device} does not serve {volts} V with the device kinds that the rail names")
    };
    refused(
        ONE_SECTION,
        &[
            ("/supply/rail/0/voltage", json!("-12 V")),
            ("/supply/rail/1/voltage", json!("-5 V")),
            ("/supply/rail/2/voltage", json!("-9 V")),
        ],
        &[
            &serve("drive", "Z4-1212", "-12"),
            &serve("logic", "Z4-0505", "-5"),
            &serve("sensor", "Z4-0909", "-9"),
        ],
    );
    refused(
        ONE_SECTION,
        &[("/supply/rail/2/voltage", json!("-9 V"))],
        &[
            "b.json: A: feeds rails of both polarities; a section has one polarity",
            &serve("sensor", "Z4-0909", "-9"),
        ],
    );
}

/// A secondary serves one section, a tapped winding one section or one pair.
#[test]
fn windings_are_shared_by_nobody_else() {
    let bridge = |secondary: u32| {
        json!({"pair": null, "path": "bridge", "hookup": "single", "secondaries": [secondary], "windings": 1,
               "rectifier_qty": 4})
    };
    refused(
        DIODES,
        &[("/sections/2", bridge(1))],
        &["b.json: T1: secondary 1 serves two sections; each takes its own"],
    );
    // Without the pair: a half each for two sections.
    let apart = [
        ("/supply/rail/1/paths", json!(["bridge"])),
        ("/sections/0", bridge(3)),
        ("/sections/1", bridge(1)),
        ("/sections/2", bridge(2)),
    ];
    refused(
        DIODES,
        &apart,
        &[
            "b.json: T1: secondary 2 is half of a tapped winding that serves another section; such a winding serves one section or one dual pair",
        ],
    );
    // Two windings instead of halves may go to two sections.
    let mut two = changed(DIODES, &apart);
    two["parts"]["Z1-1818"]["secondary_v"] = json!("18+18+8.5");
    two["parts"]["Z1-1818"]["secondary_a"] = json!("1.1+1.1+1.9");
    verdict(&two);
}

#[test]
fn named_and_unwanted_sharing() {
    refused(
        ONE_SECTION,
        &[("/supply/rail/1/section", json!("Y"))],
        &["b.json: logic: must not share a section with rail drive: see their key section"],
    );
    refused(
        ONE_SECTION,
        &[("/supply/rail/2/isolated", json!(true))],
        &["b.json: sensor: is isolated and shares its section"],
    );
    refused(
        ONE_TRANSFORMER,
        &[("/supply/share", json!("never"))],
        &["b.json: T1: share = \"never\" gives every section its own transformer"],
    );
}

/// One half collapses: it says so and no more; the other one keeps what it can know alone.
#[test]
fn a_collapsed_half_leaves_what_the_other_knows() {
    let limits = |name: &str, rail: usize, section: &str| -> BTreeSet<&'static str> {
        let copper = if name == MODULE {
            "/parts/Z1-0616"
        } else {
            "/parts/Z1-1818"
        };
        let current = format!("/supply/rail/{rail}/current");
        // All copper in the secondaries: otherwise the halves pull each other down in the primary.
        let document = changed(
            name,
            &[(&current, json!("60 A")), (copper, json!({"primary_share_pct": "0"}))],
        );
        let found = verdict(&document);
        assert!(found.heat_w.is_none() && !found.passes());
        let of = |id: &str| {
            found
                .margins
                .iter()
                .filter(|m| m.of == id)
                .map(|m| m.check.limit.word())
                .collect()
        };
        let transformer: BTreeSet<&str> = of("T1");
        assert!(!transformer.contains("transformer-load") && transformer.contains("primary-voltage"));
        of(section)
    };
    let reservoir = [
        "reservoir-voltage",
        "reservoir-ripple",
        "reservoir-hot",
        "reservoir-life",
    ];
    let alone = ["reverse-voltage", "rectifier-surge"];
    let set = |words: &[&[&'static str]]| words.concat().into_iter().collect::<BTreeSet<_>>();
    for (name, negative, positive) in [(MODULE, 1, 0), (DIODES, 0, 1)] {
        let ids = ["A", "B"];
        let collapse = set(&[&["collapse"]]);
        assert_eq!(limits(name, negative, ids[negative]), collapse);
        assert_eq!(limits(name, negative, ids[positive]), set(&[&reservoir, &alone]));
        assert_eq!(limits(name, positive, ids[positive]), collapse);
        assert_eq!(limits(name, positive, ids[negative]), set(&[&reservoir]));
    }
}

/// A blank cell fails what needs it, on the other sections of the transformer too: their winding resistance at low
/// hangs on every load. At the other corners it does not.
#[test]
fn a_blank_load_fails_its_neighbours_at_low_alone() {
    let found = verdict(&changed(ONE_TRANSFORMER, &[("/parts/Z4-1205/ground_ma", json!(""))]));
    let missing = |of: &str, limit: &str| {
        let margin = found
            .margins
            .iter()
            .find(|m| m.of == of && m.check.limit.word() == limit);
        margin.unwrap().check.missing()
    };
    for limit in ["headroom", "output-ripple", "output-accuracy"] {
        assert_eq!(missing("logic", limit), Some("ground_ma"), "{limit}");
    }
    assert_eq!(missing("logic", "pass-junction"), None);
    assert_eq!(missing("A", "winding-current"), None);
    assert_eq!(missing("T1", "transformer-load"), Some("ground_ma"));
}

#[test]
fn cautions_of_shared_parts() {
    let told = |name: &str| {
        let saved = saved::from_value(&build(name), name).unwrap();
        let catalogue = saved.own_catalogue().unwrap().unwrap();
        cautions(&saved.supply, &saved.build(&catalogue).unwrap())
    };
    let alike = |id: &str| format!("section {id}: dual halves must be wound alike, or the core takes direct current.");
    assert_eq!(told(MODULE).iter().filter(|c| **c == alike("A")).count(), 1);
    assert!(!told(MODULE).contains(&alike("B")));
    assert!(told(DIODES).contains(&alike("B")) && !told(DIODES).contains(&alike("A")));
    let insulation = "rail guard: is isolated from rails on the same transformer by the insulation between its secondaries alone; ask its maker what that holds.";
    assert!(told(ONE_TRANSFORMER).contains(&insulation.to_owned()));
    for name in [MODULE, DIODES, ONE_SECTION, ONE_TRANSFORMER] {
        assert!(!told(name).iter().any(|c| c.contains("this version")), "{name}");
    }
}

#[test]
fn the_table_shows_what_feeds_what() {
    let wiring = |name: &str, width: u16| {
        let saved = saved::from_value(&build(name), name).unwrap();
        let catalogue = saved.own_catalogue().unwrap().unwrap();
        let chosen = saved.build(&catalogue).unwrap();
        let report = Report::new(&saved.supply, chosen, None, None, String::new());
        let page = Page {
            width: Some(width),
            colour: false,
        };
        let text = table::build(&report, page);
        let text = text.split("\n\n").nth(1).unwrap().to_owned();
        assert!(
            text.lines().all(|line| line.chars().count() <= usize::from(width)),
            "{text}"
        );
        text
    };
    assert_eq!(
        wiring(DIODES, 80),
        "\
T1 Z1-1818
  A: negative half of B, 2 x Z3-0222
    minus -15.00 V 500.0 mA: Z4-1330 on sink Z5-0041
    bias -9.000 V 120.0 mA: Z4-1330
  B: secondary 1+2 dual, 4 x Z2-0131 for B and A, 1 x Z3-0222
    plus 15.00 V 300.0 mA: Z4-1230
  C: secondary 3 single, bridge 4 x Z2-0131, 2 x Z3-0472
    logic 5.000 V 800.0 mA: Z4-0500 on sink Z5-0041"
    );
    assert_eq!(
        wiring(MODULE, 60),
        "\
T1 Z1-0616
  A: secondary 1+2 dual, 1 x Z2-0404 on sink Z5-0012 for A
      and B, 2 x Z3-0472
    plus 12.00 V 900.0 mA: Z4-1215 on sink Z5-0003
  B: negative half of A, 1 x Z3-0332
    minus -12.00 V 350.0 mA: Z4-1216"
    );
    assert_eq!(
        wiring(ONE_SECTION, 80),
        "\
T1 Z1-0518
  A: secondary 1 single, bridge 1 x Z2-0404, 2 x Z3-0682
    drive 12.00 V 1.100 A: Z4-1212 on sink Z5-0018
    logic 5.000 V 250.0 mA: Z4-0505 on sink Z5-0018
    sensor 9.000 V 150.0 mA: Z4-0909"
    );
    assert_eq!(
        wiring(ONE_TRANSFORMER, 80),
        "\
T1 Z1-0916
  A: secondary 1+2 parallel, bridge 4 x Z2-0104, 1 x Z3-0103
    logic 5.000 V 1.000 A: Z4-0510 on sink Z5-0041
  B: secondary 3 single, half-wave 1 x Z2-0104, 3 x Z3-0471
    guard -12.00 V 40.00 mA: Z4-1205"
    );
}
