//! For every key of a supply and every column of a catalogue a change that changes an answer, and exactly which ones.
//!
//! A base case is a small catalogue, a supply, and a build of it that is also the pick. A row changes one key or one
//! cell and lists everything that then differs; anything more or less fails it:
//!
//! | word | meaning |
//! |---|---|
//! | `+of.limit`, `-of.limit` | the margin of this limit rises, falls |
//! | `=of.limit` | value and bound of this limit move together: the margin stays |
//! | `*of.limit`, `/of.limit` | this limit comes, goes |
//! | `+cost`, `-cost`, `+heat`, `-heat` | of the base build |
//! | `currents`, `idle`, `valley` behind a sign | all limits of that [`GROUPS`] |
//! | `cautions`, `bill` | this text changes; `bill`: the descriptions in the bill of materials |
//! | `title`, `folder` | the saved build's title changes, the folder where the catalogue is looked for |
//! | `refused` | the rules of assembly no longer allow the base build (its limits are then not compared) |
//! | `pick:PART` | the pick takes this part, which it did not before; `pick:none`: nothing passes |
//!
//! The pick is compared whole (parts, quantities, hook-up, path), so a row without `pick` says that it stays.
#![allow(clippy::unwrap_used)]

use std::collections::{BTreeMap, BTreeSet};
use std::path::Path;
use std::process::Command;

use binrail::audit::audit;
use binrail::catalogue::{Catalogue, Form as CellForm, Missing, SavedPart, Slot, columns, from_cells};
use binrail::optimise::{Outcome, Proof, Question, optimise};
use binrail::report::{Report, csv, json as documents};
use binrail::saved;
use binrail::screen::Objective;
use binrail::supply::{Form, Supply, from_json, keys};
use serde_json::{Value, json};

// ---- The base cases

#[derive(Clone)]
struct Case {
    supply: Value,
    /// transformers, sections and rails of the base build.
    build: Value,
    parts: Vec<SavedPart>,
}

/// Rows of a catalogue: "slot part: column=cell; column=cell"; an indented line goes on with the one before.
fn parts(text: &str) -> Vec<SavedPart> {
    let part = |line: &str| {
        let (place, cells) = line.split_once(": ").unwrap();
        let (slot, name) = place.split_once(' ').unwrap();
        let slot = Slot::ALL.into_iter().find(|s| s.word() == slot).unwrap();
        let cell = |text: &str| {
            text.split_once('=')
                .map(|(column, cell)| (column.to_owned(), cell.to_owned()))
                .unwrap()
        };
        (slot, name.to_owned(), cells.split("; ").map(cell).collect())
    };
    lines(text).iter().map(|line| part(line)).collect()
}

/// The lines of a table, those that go on joined; without blank ones and headings.
fn lines(text: &str) -> Vec<String> {
    let mut lines: Vec<String> = Vec::new();
    for line in text
        .lines()
        .filter(|line| !line.trim().is_empty() && !line.starts_with('#'))
    {
        match lines.last_mut() {
            Some(last) if line.starts_with(' ') => *last += &format!(" {}", line.trim()),
            _ => lines.push(line.to_owned()),
        }
    }
    lines
}

/// One section, `parts` being rectifier, its sink and reservoir.
fn section(path: &str, secondaries: &[u32], hookup: &str, parts: (&str, Option<&str>, &str), cans: u32) -> Value {
    json!({"id": "A", "transformer": "T1", "secondaries": secondaries, "hookup": hookup, "path": path,
           "rectifier": parts.0, "rectifier_sink": parts.1, "reservoir": parts.2, "reservoir_qty": cans,
           "rails": ["main"]})
}

/// Fixed device and bridge module, both on sinks; one winding of two in use; for every part a dearer spare.
fn fixed() -> Case {
    Case {
        supply: json!({
            "builds": 40,
            "mains": {"voltage": "230 V", "tolerance": "10 %", "frequency": "50 Hz"},
            "ambient": {"low": "0 degC", "high": "40 degC", "inside_rise": "5 K"},
            "caps": {"height": "60 mm"},
            "rail": [{"name": "main", "voltage": "12 V", "current": "1 A",
                      "accuracy": "6 %", "ripple": "5 mV", "dip": "8 ms"}],
        }),
        build: json!({
            "transformers": [{"id": "T1", "part": "T1"}],
            "sections": [section("bridge", &[1], "single", ("B1", Some("S2"), "C1"), 2)],
            "rails": [{"name": "main", "section": "A", "pass": "F1", "sink": "S1"}],
        }),
        parts: parts(
            "
transformer T1: price=14; height_mm=44; primary_v=230; va=66; secondary_v=17+9; secondary_a=3.4+0.7;
    regulation_pct=11; winding_c=90; primary_share_pct=45; v_tol_pct=3; core_loss_w=2.1; ta_c=50
transformer T2: price=20; height_mm=50; primary_v=230; freq_min_hz=45; va=120; secondary_v=16; regulation_pct=8;
    core_loss_w=3; ta_c=70
rectifier B1: price=1; height_mm=20; kind=bridge; vrrm_v=200; io_a=1.2; io_for=capacitive; ifsm_a=120;
    threshold_v=0.8; slope_mohm=22; rth_ja_k_w=60; rth_jc_k_w=3.2; case=SIP-4; tj_max_c=150
rectifier B2: price=2; height_mm=20; kind=bridge; vrrm_v=400; io_a=6; ifsm_a=200; threshold_v=0.75;
    slope_mohm=15; rth_ja_k_w=40; rth_jc_k_w=2; case=SIP-4; tj_max_c=150
reservoir C1: price=0.9; height_mm=36; c_uf=4700; v_rated_v=35; esr_mohm=48; ripple_a=1.2; t_max_c=105;
    life_h=2000
reservoir C2: price=2; height_mm=40; c_uf=10000; v_rated_v=50; esr_mohm=20; ripple_a=4; t_max_c=105; life_h=5000
pass F1: price=0.6; height_mm=19; kind=fixed; vout_v=12; tol_pct=4; dropout_v=2.1; vin_max_v=40; iout_max_a=1.5;
    ground_ma=8; psrr_db=60; load_reg_pct=0.6; line_reg_pct_v=0.02; rth_jc_k_w=2.5; rth_ja_k_w=60; tj_max_c=150;
    case=TO-220
pass F2: price=0.8; height_mm=19; kind=fixed; vout_v=12; tol_pct=2; dropout_v=1.9; vin_max_v=40; iout_max_a=2;
    ground_ma=8; psrr_db=66; rth_jc_k_w=2; rth_ja_k_w=50; tj_max_c=150; case=TO-220
pass F3: price=1.5; height_mm=19; kind=adjustable; vout_min_v=3; vout_max_v=15; vref_v=3; tol_pct=2;
    dropout_v=1.9; vin_max_v=40; iout_max_a=2; ground_ma=8; psrr_db=90; rth_jc_k_w=2; tj_max_c=150; case=TO-220
sink S1: price=2.3; height_mm=40; cases=TO-220; rth_sa_k_w=2.4; rise_k=75; rth_cs_k_w=0.6
sink S2: price=0.8; breaks=100:0.7; stock=900; height_mm=30; cases=SIP-4; rth_sa_k_w=9.5
sink S3: price=4; height_mm=45; cases=TO-220 SIP-4; rth_sa_k_w=2
",
        ),
    }
}

/// The same with the mains' limits written out.
fn low_high() -> Case {
    let mut case = fixed();
    case.supply["mains"] = json!({"voltage": "230 V", "low": "207 V", "high": "253 V", "frequency": "50 Hz"});
    case
}

/// Adjustable device and two diodes on a centre-tap, all free-standing.
fn adjustable() -> Case {
    Case {
        supply: json!({
            "mains": {"voltage": "120 V", "tolerance": "8 %", "frequency": "60 Hz", "flat_top": "2 %"},
            "ambient": {"low": "-10 degC", "high": "40 degC"},
            "rail": [{"name": "main", "voltage": "9 V", "current": "0.2 A", "accuracy": "8 %", "ripple": "20 mV",
                      "paths": ["centre-tap"]}],
        }),
        build: json!({
            "transformers": [{"id": "T1", "part": "T1"}],
            "sections": [section("centre-tap", &[1, 2], "centre-tap", ("D1", None, "C1"), 1)],
            "rails": [{"name": "main", "section": "A", "pass": "A1", "sink": null}],
        }),
        parts: parts(
            "
transformer T1: price=6; primary_v=120; va=12; secondary_v=12-0-12; regulation_pct=20
rectifier D1: price=0.1; kind=diode; vrrm_v=100; io_a=1; ifsm_a=30; vf_v=1; vf_a=1; rth_ja_k_w=60; tj_max_c=150
rectifier D2: price=0.3; kind=diode; vrrm_v=200; io_a=3; ifsm_a=90; vf_v=0.95; vf_a=3; rth_ja_k_w=30;
    tj_max_c=150
reservoir C1: price=0.3; c_uf=1000; v_rated_v=35; esr_mohm=120; ripple_a=1; t_max_c=105; life_h=2000
pass A1: price=0.4; kind=adjustable; vout_v=9; vout_min_v=1.5; vout_max_v=30; vref_v=1.5; tol_pct=4;
    dropout_v=2; dropout_light_v=1.5; vdiff_max_v=30; iout_max_a=0.5; ground_ma=2; psrr_db=60; psrr_vout_v=5;
    rth_ja_k_w=30; tj_max_c=125
pass A2: price=0.9; kind=adjustable; vout_min_v=1.2; vout_max_v=37; vref_v=1.2; tol_pct=2; dropout_v=2;
    vdiff_max_v=35; iout_max_a=1; ground_ma=2; psrr_db=75; rth_ja_k_w=25; tj_max_c=150
sink S1: price=1; cases=TO-3; rth_sa_k_w=5
",
        ),
    }
}

/// One diode, half-wave.
fn half_wave() -> Case {
    Case {
        supply: json!({
            "mains": {"voltage": "230 V", "tolerance": "10 %", "frequency": "50 Hz"},
            "ambient": {"low": "5 degC", "high": "40 degC"},
            "rail": [{"name": "main", "voltage": "5 V", "current": "60 mA", "ripple": "3 mV", "paths": ["half-wave"]}],
        }),
        build: json!({
            "transformers": [{"id": "T1", "part": "T1"}],
            "sections": [section("half-wave", &[1, 2], "series", ("D1", None, "C1"), 1)],
            "rails": [{"name": "main", "section": "A", "pass": "F1", "sink": null}],
        }),
        parts: parts(
            "
transformer T1: price=6; primary_v=230; va=7; secondary_v=4+4; regulation_pct=18; core=laminated; core_loss_w=1
rectifier D1: price=0.1; kind=diode; vrrm_v=200; io_a=1; ifsm_a=30; threshold_v=0.7; slope_mohm=60;
    rth_ja_k_w=70; tj_max_c=150
reservoir C1: price=0.3; c_uf=2200; v_rated_v=25; esr_mohm=90; ripple_a=1; t_max_c=105; life_h=2000
pass F1: price=0.2; kind=fixed; vout_v=5; tol_pct=5; dropout_v=1.7; vin_max_v=30; iout_max_a=0.1; ground_ma=3.5;
    psrr_db=54; rth_ja_k_w=120; tj_max_c=150
sink S1: price=1; cases=TO-3; rth_sa_k_w=5
",
        ),
    }
}

/// Two rails on one section.
fn shared() -> Case {
    let mut case = fixed();
    let second = json!({"name": "second", "voltage": "12 V", "current": "0.3 A", "idle": "50 mA"});
    case.supply["rail"].as_array_mut().unwrap().push(second);
    case.build["sections"][0]["rails"] = json!(["main", "second"]);
    case.build["sections"][0]["rectifier"] = json!("B2");
    case.build["sections"][0]["rectifier_sink"] = json!(null);
    case.build["rails"][0]["pass"] = json!("F2");
    let second = json!({"name": "second", "section": "A", "pass": "F1", "sink": "S1"});
    case.build["rails"].as_array_mut().unwrap().push(second);
    case
}

// ---- The answers

#[derive(Debug, Clone, PartialEq)]
enum Item {
    Limit { margin: f64, value: f64, bound: f64 },
    Number(f64),
    Text(String),
}

type Answers = BTreeMap<String, Item>;

impl Case {
    fn catalogue(&self) -> Catalogue {
        from_cells(self.parts.clone(), "sensitivity.rs", None).unwrap()
    }

    fn supply(&self) -> Supply {
        from_json(&self.supply, "sensitivity.rs").unwrap()
    }

    /// The base build as a hand-written document.
    fn document(&self) -> Value {
        let mut document = self.build.clone();
        document["supply"] = self.supply.clone();
        document
    }

    fn answers(&self) -> Answers {
        let mut answers = Answers::new();
        let (catalogue, supply) = (self.catalogue(), self.supply());
        let saved = saved::from_value(&self.document(), "sensitivity.rs").unwrap();
        let mut passes = false;
        match saved.build(&catalogue) {
            Ok(build) => {
                let report = Report::new(&supply, build, None, None, String::new());
                passes = report.audit.passes();
                for margin in &report.audit.margins {
                    let check = &margin.check;
                    let limit = Item::Limit {
                        margin: check.margin().unwrap(),
                        value: check.value.unwrap(),
                        bound: check.bound.unwrap(),
                    };
                    let at = format!("{}.{}", margin.of, check.limit.word());
                    assert!(answers.insert(at, limit).is_none());
                }
                answers.insert("cost".into(), Item::Number(report.audit.cost.value()));
                answers.insert("heat".into(), Item::Number(report.audit.heat_w.unwrap()));
                answers.insert("cautions".into(), Item::Text(report.cautions.join("\n")));
                let bill = csv::bill(&report);
                let descriptions: Vec<&str> = bill.lines().map(|line| line.split(',').nth(2).unwrap()).collect();
                answers.insert("bill".into(), Item::Text(descriptions.join("\n")));
                let title = documents::build(&report)["supply"]["name"].clone();
                answers.insert("title".into(), Item::Text(title.to_string()));
                answers.insert("folder".into(), Item::Text(saved.catalogue.unwrap_or_default()));
            }
            Err(faults) => {
                answers.insert("refused".into(), Item::Text(format!("{faults:?}")));
            }
        }
        let outcome = pick(&supply, &catalogue);
        assert!(
            !passes || !outcome.builds.is_empty(),
            "the base build passes and the search finds none"
        );
        answers.insert("pick".into(), Item::Text(picked(&supply, &outcome)));
        answers
    }

    /// The case with one key ("rail.ripple", "mains.low", "builds") or cell ("C1.esr_mohm") changed; "" takes it away.
    /// A name changes wherever it stands.
    fn changed(&self, target: &str, text: &str) -> Case {
        let mut case = self.clone();
        let (at, name) = target.split_once('.').unwrap_or(("", target));
        if name == "part" || target == "rail.name" {
            let quoted = |text: &str| format!("\"{text}\"");
            let mut build = self.build.to_string();
            if name == "part" {
                for place in ["part", "rectifier", "rectifier_sink", "reservoir", "pass", "sink"] {
                    let at_place = |part: &str| format!("\"{place}\":{}", quoted(part));
                    build = build.replace(&at_place(at), &at_place(text));
                }
            } else {
                build = build.replace(&quoted("main"), &quoted(text));
            }
            case.build = serde_json::from_str(&build).unwrap();
        }
        if name == "part" {
            case.parts.iter_mut().find(|(_, part, _)| part == at).unwrap().1 = text.to_owned();
            return case;
        }
        if let Some((_, _, cells)) = case.parts.iter_mut().find(|(_, part, _)| part == at) {
            cells.retain(|(column, _)| column != name);
            if !text.is_empty() {
                cells.push((name.to_owned(), text.to_owned()));
            }
            return case;
        }
        let table = match at {
            "" => &mut case.supply,
            "rail" => &mut case.supply["rail"][0],
            "rail2" => &mut case.supply["rail"][1],
            table => &mut case.supply[table],
        };
        if text.is_empty() {
            table.as_object_mut().unwrap().remove(name);
        } else {
            table[name] = serde_json::from_str(text).unwrap_or_else(|_| json!(text));
        }
        case
    }

    /// What column or key a target is: ("reservoirs.csv", "esr_mohm"), ("rail", "ripple").
    fn named(&self, target: &str) -> (String, String) {
        let (at, name) = target.split_once('.').unwrap_or(("", target));
        let at = match self.parts.iter().find(|(_, part, _)| part == at) {
            Some((slot, _, _)) => slot.file(),
            None => at.trim_end_matches('2'),
        };
        (at.to_owned(), name.to_owned())
    }
}

fn pick<'c>(supply: &'c Supply, catalogue: &'c Catalogue) -> Outcome<'c> {
    let outcome = optimise(&Question {
        ..Question::new(supply, catalogue, Objective::Cost)
    })
    .unwrap();
    assert_eq!(outcome.proof, Proof::Proved);
    outcome
}

/// The pick as words: its parts with their pieces, then hook-up and path.
fn picked(supply: &Supply, outcome: &Outcome) -> String {
    let Some(found) = outcome.builds.first() else {
        return "none".into();
    };
    let mut words: Vec<String> = Vec::new();
    for line in found.build.lines(supply) {
        words.push(if line.qty == 1 {
            line.part.name.clone()
        } else {
            format!("{}x{}", line.part.name, line.qty)
        });
    }
    for section in &found.build.sections {
        words.extend([section.hookup.kind.word().to_owned(), section.path.word().to_owned()]);
        words.push(format!("{:?}", section.hookup.secondaries).replace(' ', ""));
    }
    words.join(" ")
}

/// Everything that differs, in the words of the module's table.
fn differences(before: &Answers, after: &Answers) -> BTreeSet<String> {
    let mut found = BTreeSet::new();
    let refused = after.contains_key("refused");
    for name in before.keys().chain(after.keys()) {
        let text = |item: &Item| match item {
            Item::Text(text) => text.clone(),
            _ => panic!("{name} is no text"),
        };
        let word = match (before.get(name), after.get(name)) {
            (Some(_), None) if refused => continue,
            (Some(_), None) => format!("/{name}"),
            (None, Some(_)) if name == "refused" => name.clone(),
            (None, Some(_)) => format!("*{name}"),
            (Some(a), Some(b)) if same(a, b) => continue,
            (Some(Item::Number(a)), Some(Item::Number(b))) => format!("{}{name}", sign(b - a)),
            (Some(Item::Limit { margin: a, .. }), Some(Item::Limit { margin: b, .. })) => {
                if close(*a, *b) {
                    format!("={name}")
                } else {
                    format!("{}{name}", sign(b - a))
                }
            }
            (Some(a), Some(b)) if name == "pick" => {
                let (a, b) = (text(a), text(b));
                let old: Vec<&str> = a.split(' ').collect();
                let new: Vec<String> = b
                    .split(' ')
                    .filter(|word| !old.contains(word))
                    .map(|word| format!("pick:{word}"))
                    .collect();
                assert!(!new.is_empty(), "the pick only loses parts: {a} -> {b}");
                found.extend(new);
                continue;
            }
            _ => name.clone(),
        };
        found.insert(word);
    }
    found
}

fn sign(x: f64) -> char {
    if x > 0.0 { '+' } else { '-' }
}

/// Equal but for the order in which a sum is rounded.
fn close(a: f64, b: f64) -> bool {
    (a - b).abs() <= 1e-12 * a.abs().max(b.abs())
}

fn same(a: &Item, b: &Item) -> bool {
    match (a, b) {
        (Item::Number(a), Item::Number(b)) => close(*a, *b),
        (Item::Limit { value: a, bound: c, .. }, Item::Limit { value: b, bound: d, .. }) => {
            close(*a, *b) && close(*c, *d)
        }
        _ => a == b,
    }
}

// ---- The rows

struct Row {
    base: String,
    /// "PART.column" or "table.key".
    target: String,
    text: String,
    /// Words of the module's table.
    changes: String,
}

fn base(name: &str) -> Case {
    match name {
        "fixed" => fixed(),
        "low-high" => low_high(),
        "adjustable" => adjustable(),
        "half-wave" => half_wave(),
        "shared" => shared(),
        // Its second rail names its section.
        "named" => shared().changed("rail2.section", "B"),
        _ => panic!("{name}"),
    }
}

/// Limits that move together: what the source's current loads, what the unloaded voltage loads, what the valley holds.
const GROUPS: [(&str, &[&str]); 3] = [
    (
        "currents",
        &[
            "A.reservoir-hot",
            "A.reservoir-life",
            "A.reservoir-ripple",
            "A.winding-current",
            "T1.transformer-load",
        ],
    ),
    (
        "idle",
        &["A.reservoir-voltage", "A.reverse-voltage", "main.input-ceiling"],
    ),
    ("valley", &["main.headroom", "main.ride-through"]),
];

/// Base, "PART.column" or "table.key", its new text, every change. What a row expects follows from the formulas, not from a run.
const ROWS: &str = r#"
# transformers.csv
fixed T1.primary_v = 220 -> +valley -currents -idle -A.rectifier-junction -A.rectifier-surge -T1.primary-voltage
    -main.output-accuracy -main.output-ripple -main.pass-junction +heat pick:B2 pick:T2
fixed T1.freq_min_hz = 60 -> -T1.primary-frequency -T1.primary-voltage pick:B2 pick:T2
fixed T1.va = 30 -> -T1.transformer-load pick:B2 pick:T2
adjustable T1.va = 10 -> +A.rectifier-junction +A.rectifier-surge +A.reservoir-hot +A.reservoir-life
    +A.reservoir-ripple +main.output-ripple +main.pass-junction -A.winding-current -T1.transformer-load -main.headroom
    -heat
fixed T1.secondary_v = 15+9 -> +currents +idle -valley +A.rectifier-junction +A.rectifier-surge +main.output-accuracy
    +main.pass-junction -main.output-ripple -heat pick:C2x2 pick:F2
fixed T1.secondary_a = 2+0.7 -> -valley +A.rectifier-junction +A.rectifier-surge +A.reservoir-hot +A.reservoir-life
    +A.reservoir-ripple +T1.transformer-load +main.output-accuracy +main.output-ripple +main.pass-junction
    -A.winding-current -heat pick:F2
fixed T1.regulation_pct = 30 -> +currents +valley -idle +A.rectifier-junction +A.rectifier-surge +main.output-ripple
    -main.output-accuracy -main.pass-junction +heat pick:C2 pick:F2
fixed T1.winding_c = 120 -> -currents -A.rectifier-junction -A.rectifier-surge -main.output-accuracy
    -main.output-ripple -main.pass-junction +heat
fixed T1.primary_share_pct = 90 -> +valley -currents -A.rectifier-junction -A.rectifier-surge -main.output-accuracy
    -main.output-ripple -main.pass-junction +heat
fixed T1.v_tol_pct = 15 -> -currents -idle -valley -A.rectifier-junction -A.rectifier-surge -main.output-accuracy
    -main.output-ripple -main.pass-junction +heat pick:B2 pick:T2
fixed T1.core_loss_w = 5 -> +heat
fixed T1.core_loss_w =  -> +heat cautions
half-wave T1.core = toroid -> -A.core-bias pick:none
fixed T1.ta_c = 44 -> -T1.transformer-ambient pick:B2 pick:T2
# rectifiers.csv
fixed B1.kind = diode -> refused pick:B2
fixed B1.type = schottky -> +valley +main.output-accuracy +main.pass-junction -A.rectifier-junction
fixed B1.vrrm_v = 40 -> -A.reverse-voltage pick:B2
fixed B1.io_a = 0.9 -> -A.rectifier-current pick:B2
fixed B1.io_for = resistive -> -A.rectifier-current pick:B2
fixed B1.ifsm_a = 50 -> -A.rectifier-surge pick:B2
fixed B1.threshold_v = 1.6 -> -valley +main.pass-junction -A.rectifier-junction pick:B2
fixed B1.slope_mohm = 300 -> +currents -valley +A.rectifier-surge +main.output-accuracy +main.output-ripple
    +main.pass-junction -A.rectifier-junction -heat pick:B2
fixed B1.rth_jc_k_w = 50 -> -A.rectifier-junction pick:B2
fixed B1.case = GBU -> refused pick:B2
fixed B1.tj_max_c = 80 -> -A.rectifier-junction pick:B2
adjustable D1.vf_v = 2.6 -> -main.headroom -main.output-ripple pick:C1x2
adjustable D1.vf_a = 0.3 -> +currents +A.rectifier-surge +main.output-ripple +main.pass-junction -A.rectifier-junction
    -main.headroom -heat
adjustable D1.rth_ja_k_w = 2000 -> -A.rectifier-junction pick:D2x2
# reservoirs.csv
fixed C1.c_uf = 2200 -> +currents -valley +A.rectifier-junction +main.pass-junction -main.output-accuracy
    -main.output-ripple -heat pick:C2
fixed C1.tol_minus_pct = 40 -> -valley -main.output-accuracy -main.output-ripple pick:F2
fixed C1.tol_plus_pct = 80 -> -currents -A.rectifier-junction -main.output-accuracy -main.pass-junction +heat
fixed C1.v_rated_v = 25 -> -A.reservoir-voltage pick:C2
fixed C1.esr_mohm = 600 -> +currents -valley +A.rectifier-junction +A.rectifier-surge +main.pass-junction
    -main.output-accuracy -main.output-ripple -heat pick:C2
fixed C1.esr_hz = 100000 -> +currents -valley +A.rectifier-junction +A.rectifier-surge +main.pass-junction
    -main.output-accuracy -main.output-ripple -heat cautions
fixed C1.ripple_a = 0.8 -> -A.reservoir-hot -A.reservoir-life -A.reservoir-ripple pick:C2
fixed C1.ripple_hz = 100000 -> -A.reservoir-hot -A.reservoir-life -A.reservoir-ripple cautions pick:C2
fixed C1.t_max_c = 60 -> -A.reservoir-hot -A.reservoir-life pick:C2
fixed C1.life_h = 100 -> -A.reservoir-life pick:C2
# pass_devices.csv
adjustable A1.kind = fixed -> +main.headroom +main.output-accuracy +main.output-ripple cautions
fixed F1.polarity = - -> refused pick:F2
fixed F1.vout_v = 15 -> refused pick:F2
adjustable A1.vout_min_v = 10 -> refused pick:A2
adjustable A1.vout_max_v = 8 -> refused pick:A2
adjustable A1.vref_v = 1 -> -main.headroom -main.output-accuracy
fixed F1.tol_pct = 9 -> -valley -main.output-accuracy pick:F2
fixed F1.dropout_v = 4.5 -> -valley -main.output-ripple pick:F2
adjustable A1.dropout_light_v = 1.9 -> -main.headroom
fixed F1.vin_max_v = 30 -> -main.input-ceiling pick:F2
fixed F1.vdiff_max_v = 15 -> *main.input-difference cautions pick:F2
adjustable A1.vdiff_max_v = 10 -> -main.input-difference pick:A2
fixed F1.iout_max_a = 0.9 -> -main.pass-current pick:F2
fixed F1.ground_ma = 80 -> -currents -valley -A.rectifier-current -A.rectifier-junction -main.output-accuracy
    -main.output-ripple -main.pass-junction +heat pick:F2
fixed F1.psrr_db = 40 -> -main.output-ripple pick:F2
adjustable A1.psrr_vout_v = 1.5 -> -main.output-ripple
fixed F1.load_reg_pct = 3 -> -main.output-accuracy pick:F2
fixed F1.line_reg_pct_v = 0.9 -> -main.output-accuracy pick:F2
fixed F1.rth_jc_k_w = 9 -> -main.pass-junction pick:F2
adjustable A1.rth_ja_k_w = 60 -> -main.pass-junction pick:A2
fixed F1.tj_max_c = 110 -> -main.pass-junction pick:F2
fixed F1.case = TO-3 -> refused pick:F2
fixed F1.fitted_price = 0.15 -> +cost
# sinks.csv
fixed S1.cases = TO-3 -> refused pick:S3
fixed S1.rth_sa_k_w = 6 -> -main.pass-junction pick:S3
fixed S1.rise_k =  -> +main.pass-junction
fixed S1.rth_cs_k_w = 9 -> -main.pass-junction pick:S3
# Top of the supply
fixed name = Greenhouse vent -> title
fixed catalogue = elsewhere -> folder
shared share = never -> refused pick:B1x2 pick:C1x3 pick:F1x2 pick:S2 pick:T1x2
fixed builds = 1000 -> -S2.stock -cost pick:B2
# [mains]
fixed mains.voltage = 220 V -> +currents +idle -valley +A.rectifier-junction +A.rectifier-surge +T1.primary-voltage
    +main.output-accuracy +main.output-ripple +main.pass-junction -heat pick:F2
fixed mains.tolerance = 15 % -> -currents -idle -valley -A.rectifier-junction -A.rectifier-surge -T1.primary-voltage
    -main.output-accuracy -main.output-ripple -main.pass-junction +heat pick:B2 pick:F2 pick:T2
low-high mains.low = 180 V -> -valley -main.output-accuracy -main.output-ripple pick:B2 pick:C2x2 pick:F2
low-high mains.high = 260 V -> -currents -idle -A.rectifier-junction -A.rectifier-surge -T1.primary-voltage
    -main.output-accuracy -main.output-ripple -main.pass-junction +heat pick:B2 pick:T2
fixed mains.frequency = 44 Hz -> +currents -valley +A.rectifier-junction +main.pass-junction -T1.primary-frequency
    -T1.primary-voltage -main.output-accuracy -main.output-ripple -heat pick:none
fixed mains.flat_top = 12 % -> -valley -main.output-accuracy -main.output-ripple pick:C1x3 pick:F2
# [ambient]
fixed ambient.low = -30 degC -> -valley -A.rectifier-surge -main.output-accuracy -main.output-ripple
fixed ambient.high = 52 degC -> +A.reservoir-ripple +A.winding-current +T1.transformer-load +main.output-accuracy
    +main.output-ripple -A.rectifier-junction -A.reservoir-hot -A.reservoir-life -T1.transformer-ambient
    -main.pass-junction -heat pick:B2 pick:T2
fixed ambient.inside_rise = 0 K -> +A.rectifier-junction +A.reservoir-hot +A.reservoir-life +T1.transformer-ambient
    +main.pass-junction -A.reservoir-ripple -A.winding-current -T1.transformer-load -main.output-accuracy
    -main.output-ripple +heat cautions
# [margins]
fixed margins.headroom = 4 V -> -main.headroom pick:none
fixed margins.reservoir = 40 % -> -A.reservoir-voltage pick:B2 pick:C2 pick:T2
fixed margins.reverse = 900 % -> -A.reverse-voltage pick:B2
fixed margins.junction = 80 K -> -A.rectifier-junction -main.pass-junction pick:none
# [ageing]
fixed ageing.capacitance_loss = 60 % -> -valley -main.output-accuracy -main.output-ripple pick:C1x3
fixed ageing.esr_rise = 40 -> -valley -main.output-accuracy -main.output-ripple pick:C2x2
fixed ageing.life = 200000 h -> -A.reservoir-life pick:C2
# [caps]
fixed caps.cost = 15 -> *supply.cost pick:none
fixed caps.heat = 15 W -> *supply.heat pick:none
fixed caps.height = 42 mm -> -supply.height pick:none
fixed caps.cans = 1 -> refused pick:C2
# [[rail]]
fixed rail.name = aux -> /main.headroom /main.input-ceiling /main.output-accuracy /main.output-ripple
    /main.pass-current /main.pass-junction /main.ride-through *aux.headroom *aux.input-ceiling *aux.output-accuracy
    *aux.output-ripple *aux.pass-current *aux.pass-junction *aux.ride-through
adjustable rail.voltage = 12 V -> +main.input-difference +main.pass-junction -main.headroom -main.output-accuracy
    -main.output-ripple -heat pick:none
fixed rail.current = 1.4 A -> -currents -valley -A.rectifier-current -A.rectifier-junction -main.output-accuracy
    -main.output-ripple -main.pass-current -main.pass-junction +heat pick:B2 pick:C2 pick:F2 pick:T2
shared rail2.idle = 290 mA -> +main.pass-junction
fixed rail.accuracy = 3 % -> -main.output-accuracy pick:F2
fixed rail.ripple = 1 mV -> -main.output-ripple pick:F2
fixed rail.dip = 15 ms -> -main.ride-through pick:C1x3
fixed rail.paths = ["half-wave"] -> refused pick:none
fixed rail.devices = ["adjustable"] -> refused pick:F3
shared rail.isolated = true -> refused pick:B1x2 pick:C1x3 pick:F1x2 pick:S2 pick:T1x2
named rail.section = A -> refused pick:B1x2 pick:C1x3 pick:F1x2 pick:S2 pick:T1x2
"#;

/// What every slot's part answers to alike: base part, its spare.
const COMMON: [(&str, &str); 5] = [("T1", "T2"), ("B1", "B2"), ("C1", "C2"), ("F1", "F2"), ("S1", "S3")];

/// Columns, supply keys and what they wait for: nothing may hang on them yet. When one of these features comes, the row
/// here fails and belongs above. (`devices` and `paths` above likewise take no discrete kind or shunt yet.)
const NOT_YET: &[(&str, &str, &str, &str)] = &[
    ("fixed", "F1.vbe_v", "0.9", "discrete devices"),
    ("fixed", "F1.hfe_min", "25", "discrete devices"),
    ("fixed", "F1.soa", "10:5 30:1.2", "discrete devices"),
    ("fixed", "F1.iz_min_ma", "1", "shunt regulators"),
    ("fixed", "F1.iz_max_ma", "100", "shunt regulators"),
    ("fixed", "F1.rz_ohm", "8", "shunt regulators"),
    ("adjustable", "A1.min_load_ma", "10", "fitted values (the bleeder)"),
    ("fixed", "rail.short_circuit", "survive", "discrete devices"),
];

// ---- The tests

/// The table and, for every slot, the columns that all have.
fn rows() -> Vec<Row> {
    let row = |line: &String| {
        let (place, changes) = line.split_once(" -> ").unwrap();
        let (place, text) = place.split_once(" =").unwrap();
        let (base, target) = place.split_once(' ').unwrap();
        let owned = |text: &str| text.trim().to_owned();
        Row {
            base: owned(base),
            target: owned(target),
            text: owned(text),
            changes: owned(changes),
        }
    };
    let mut rows: Vec<Row> = lines(ROWS).iter().map(row).collect();
    for (part, spare) in COMMON {
        let (name, few, named) = match part {
            "C1" => ("C9", "79", "C9x2"),
            "T1" => ("T9", "39", "T9"),
            "B1" => ("B9", "39", "B9"),
            "F1" => ("F9", "39", "F9"),
            _ => ("S9", "39", "S9"),
        };
        // T2 has so little resistance that only B2 takes its switch-on surge.
        let instead = if part == "T1" {
            "pick:B2 pick:T2".to_owned()
        } else {
            format!("pick:{spare}")
        };
        for (column, text, changes) in [
            ("part", name, format!("pick:{named}")),
            ("description", "as drawn", "bill".into()),
            ("price", "99", format!("+cost {instead}")),
            ("breaks", "40:0.01", "-cost".into()),
            ("breaks", "10000:0.000001", "cautions".into()),
            ("stock", few, format!("*{part}.stock {instead}")),
            ("status", "withdrawn", format!("cautions {instead}")),
            ("status", "last-buy", "cautions".into()),
            ("height_mm", "70", format!("-supply.height {instead}")),
        ] {
            rows.push(row(&format!("fixed {part}.{column} = {text} -> {changes}")));
        }
    }
    rows
}

/// The words of a row with its groups written out.
fn words(changes: &str) -> BTreeSet<String> {
    let mut words = BTreeSet::new();
    for word in changes.split_whitespace() {
        match GROUPS.iter().find(|(group, _)| &word[1..] == *group) {
            Some((_, limits)) => words.extend(limits.iter().map(|limit| format!("{}{limit}", &word[..1]))),
            None => _ = words.insert(word.to_owned()),
        }
    }
    words
}

#[test]
fn every_change_changes_what_it_should_and_nothing_else() {
    let mut before: BTreeMap<String, Answers> = BTreeMap::new();
    let rows = rows();
    let mut wrong = Vec::new();
    for row in &rows {
        let case = base(&row.base);
        let before = before.entry(row.base.clone()).or_insert_with(|| case.answers());
        let got = differences(before, &case.changed(&row.target, &row.text).answers());
        let wanted = words(&row.changes);
        assert!(
            !wanted.is_empty(),
            "{}: a row that expects nothing cannot fail",
            row.target
        );
        if got != wanted {
            let more: Vec<_> = got.difference(&wanted).collect();
            let less: Vec<_> = wanted.difference(&got).collect();
            wrong.push(format!(
                "{} {} = {:?}: unexpected {more:?}, absent {less:?}",
                row.base, row.target, row.text
            ));
        }
    }
    assert!(
        wrong.is_empty(),
        "{} of {} rows:\n{}",
        wrong.len(),
        rows.len(),
        wrong.join("\n")
    );
}

/// The base builds are what the search picks, and pass: a row's pick then compares with the build that it audits.
#[test]
fn base_builds_are_the_picks() {
    for (name, picked) in [
        ("fixed", "T1 B1 C1x2 F1 S1 S2 single bridge [1]"),
        ("low-high", "T1 B1 C1x2 F1 S1 S2 single bridge [1]"),
        ("adjustable", "T1 D1x2 C1 A1 centre-tap centre-tap [1,2]"),
        ("half-wave", "T1 D1 C1 F1 series half-wave [1,2]"),
        ("shared", "T1 B2 C1x2 F1 F2 S1x2 single bridge [1]"),
    ] {
        let answers = base(name).answers();
        assert_eq!(answers["pick"], Item::Text(picked.into()), "{name}");
        for (at, item) in &answers {
            assert!(
                !matches!(item, Item::Limit { margin, bound, .. } if *margin < -1e-9 * bound.abs()),
                "{name}: {at}"
            );
        }
    }
}

#[test]
fn every_key_and_every_column_has_a_row() {
    let named = |base_name: &str, target: &str| base(base_name).named(target);
    let tested: BTreeSet<_> = rows().iter().map(|row| named(&row.base, &row.target)).collect();
    let not_yet: BTreeSet<_> = NOT_YET.iter().map(|(base, target, ..)| named(base, target)).collect();
    let mut all: BTreeSet<(String, String)> = BTreeSet::new();
    for slot in Slot::ALL {
        all.extend(columns(slot).map(|c| (slot.file().to_owned(), c.name.to_owned())));
    }
    // The tables that the top of a supply holds, and their keys.
    let tables = keys("")
        .filter(|k| matches!(k.form, Form::Table | Form::Tables))
        .map(|k| k.name);
    for table in tables.chain([""]) {
        let plain = keys(table).filter(|k| !matches!(k.form, Form::Table | Form::Tables));
        all.extend(plain.map(|k| (table.to_owned(), k.name.to_owned())));
    }
    assert_eq!(
        tested.intersection(&not_yet).collect::<Vec<_>>(),
        Vec::<&(String, String)>::new()
    );
    let known: BTreeSet<_> = tested.union(&not_yet).cloned().collect();
    assert_eq!(
        all.difference(&known).collect::<Vec<_>>(),
        Vec::<&(String, String)>::new(),
        "without a row"
    );
    assert_eq!(
        known.difference(&all).collect::<Vec<_>>(),
        Vec::<&(String, String)>::new(),
        "no key, no column"
    );
}

#[test]
fn nothing_hangs_on_what_is_not_yet_offered() {
    for (name, target, text, feature) in NOT_YET {
        let case = base(name);
        let got = differences(&case.answers(), &case.changed(target, text).answers());
        assert!(
            got.is_empty(),
            "{target} ({feature}) now changes {got:?}: give it a row"
        );
    }
}

/// A section has one polarity: its rails see the same raw voltage.
#[test]
fn a_section_has_one_polarity() {
    let case = shared().changed("rail2.voltage", "-12 V").changed("F1.polarity", "-");
    let got = differences(&shared().answers(), &case.answers());
    assert!(got.contains("refused") && got.contains("pick:T1x2"), "{got:?}");
}

/// Of two parts alike but for their names the first in byte order is picked, in every slot.
#[test]
fn names_break_ties() {
    for (part, _) in COMMON {
        for (twin, taken) in [(format!("{}0", &part[..1]), true), (format!("{part}a"), false)] {
            let mut case = fixed();
            let mut row = case.parts.iter().find(|(_, name, _)| name == part).unwrap().clone();
            row.1.clone_from(&twin);
            case.parts.push(row);
            let got = differences(&fixed().answers(), &case.answers());
            let pieces = if part == "C1" { "x2" } else { "" };
            let wanted = if taken {
                words(&format!("pick:{twin}{pieces}"))
            } else {
                BTreeSet::new()
            };
            assert_eq!(got, wanted, "{twin}");
        }
    }
}

/// A blank cell that has no default fails exactly the limits that need it, by name, and no build with that part is
/// picked. (Cells stated in pairs are a fault alone.)
#[test]
fn a_blank_cell_fails_the_limits_that_need_it() {
    let mut cells = 0;
    for name in ["fixed", "adjustable", "half-wave"] {
        let case = base(name);
        let Item::Text(picked) = &case.answers()["pick"] else {
            panic!("no pick");
        };
        let used: Vec<&str> = picked.split(' ').map(|word| word.split('x').next().unwrap()).collect();
        for (slot, part, row) in case.parts.iter().filter(|(_, part, _)| used.contains(&part.as_str())) {
            for (column, _) in row {
                let listed = columns(*slot).find(|c| c.name == column).unwrap();
                let needed = listed.missing == Missing::Blank
                    && (matches!(listed.form, CellForm::Quantity(_)) || column == "core");
                let paired = ["threshold_v", "slope_mohm", "vf_v", "vf_a"].contains(&column.as_str());
                // Unused beside a sink: the way through the air.
                let unused = name == "fixed" && column == "rth_ja_k_w";
                if !needed || paired || unused {
                    continue;
                }
                let blank = case.changed(&format!("{part}.{column}"), "");
                let (catalogue, supply) = (blank.catalogue(), blank.supply());
                let saved = saved::from_value(&blank.document(), "sensitivity.rs").unwrap();
                let verdict = audit(&supply, &saved.build(&catalogue).unwrap());
                let at = format!("{name}: {part}.{column}");
                // Either input rating will do; without both, the ceiling is what is asked for.
                let asked = if column == "vdiff_max_v" { "vin_max_v" } else { column };
                let failing: Vec<_> = verdict.margins.iter().filter(|m| !m.check.met()).collect();
                assert!(!failing.is_empty(), "{at}: no limit needs it");
                for margin in failing {
                    assert_eq!(
                        margin.check.missing(),
                        Some(asked),
                        "{at}: {} {:?}",
                        margin.of,
                        margin.check
                    );
                }
                let outcome = pick(&supply, &catalogue);
                let found = outcome.builds.first().map(|found| found.build.lines(&supply));
                let taken = found.iter().flatten().any(|line| line.part.name == *part);
                assert!(!taken, "{at}: is picked all the same");
                cells += 1;
            }
        }
    }
    assert!(cells > 50, "only {cells} cells were tried");
}

/// Through the program: the key `catalogue` decides which folder is read, from the supply file's own folder.
#[test]
fn the_supply_names_its_catalogue() {
    let dir = tempfile::tempdir().unwrap();
    write_catalogue(&dir.path().join("one"), &fixed());
    write_catalogue(&dir.path().join("two"), &fixed().changed("F1.price", "0.7"));
    let mut costs = Vec::new();
    for folder in ["one", "two"] {
        let supply = format!("catalogue = \"{folder}\"\n{SUPPLY}");
        let file = dir.path().join(format!("{folder}.toml"));
        std::fs::write(&file, supply).unwrap();
        let mut call = Command::new(env!("CARGO_BIN_EXE_binrail"));
        let run = call.args(["pick", "--format", "json"]).arg(&file).output().unwrap();
        assert!(run.status.success(), "{}", String::from_utf8_lossy(&run.stderr));
        let document: Value = serde_json::from_slice(&run.stdout).unwrap();
        assert!(document["catalogue"].as_str().unwrap().ends_with(folder));
        costs.push(document["cost_per_unit"].as_f64().unwrap());
    }
    let Item::Number(cost) = fixed().answers()["cost"] else {
        panic!("no cost");
    };
    // The same supply and parts by file and by value cost the same.
    assert!(
        close(costs[0], cost) && close(costs[1], cost + 0.1),
        "{costs:?}, {cost}"
    );
}

/// The supply of [`fixed`] as a file.
const SUPPLY: &str = r#"
builds = 40
[mains]
voltage = "230 V"
tolerance = "10 %"
frequency = "50 Hz"
[ambient]
low = "0 degC"
high = "40 degC"
inside_rise = "5 K"
[caps]
height = "60 mm"
[[rail]]
name = "main"
voltage = "12 V"
current = "1 A"
accuracy = "6 %"
ripple = "5 mV"
dip = "8 ms"
"#;

fn write_catalogue(folder: &Path, case: &Case) {
    std::fs::create_dir(folder).unwrap();
    for slot in Slot::ALL {
        let header: Vec<&str> = columns(slot).map(|c| c.name).collect();
        let mut text = header.join(",") + "\n";
        for (_, part, cells) in case.parts.iter().filter(|(of, ..)| *of == slot) {
            let cell = |column: &str| match column {
                "part" => part.as_str(),
                _ => cells
                    .iter()
                    .find(|(name, _)| name == column)
                    .map_or("", |(_, text)| text),
            };
            text += &(header.iter().map(|column| cell(column)).collect::<Vec<_>>().join(",") + "\n");
        }
        std::fs::write(folder.join(slot.file()), text).unwrap();
    }
}
