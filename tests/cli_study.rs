//! `rank --each`, `swap`, `front` and `why` as a user meets them: exit codes, forms, widths, files.
#![allow(clippy::unwrap_used)]

use std::fs;
use std::path::Path;
use std::process::{Command, Output};

use serde_json::Value;

const SUPPLY: &str = "examples/tide-gauge/supply.toml";
const TWO_RAILS: &str = "examples/ramp-beacon/supply.toml";

fn run(arguments: &[&str]) -> Output {
    let mut command = Command::new(env!("CARGO_BIN_EXE_binrail"));
    command.args(arguments).env_remove("COLUMNS").env_remove("NO_COLOR");
    command.output().unwrap()
}

#[track_caller]
fn check(arguments: &[&str], code: i32, on_out: &str, on_err: &str) -> String {
    let output = run(arguments);
    let (out, err) = (
        String::from_utf8_lossy(&output.stdout),
        String::from_utf8_lossy(&output.stderr),
    );
    assert_eq!(output.status.code(), Some(code), "{arguments:?}\n{out}\n{err}");
    assert!(out.contains(on_out), "{arguments:?}: no \"{on_out}\" in\n{out}");
    assert!(err.contains(on_err), "{arguments:?}: no \"{on_err}\" in\n{err}");
    assert!(!err.contains("panicked"), "{err}");
    out.into_owned()
}

#[track_caller]
fn document(arguments: &[&str], code: i32) -> Value {
    let mut all = arguments.to_vec();
    all.extend(["--format", "json"]);
    serde_json::from_str(&check(&all, code, "", "")).unwrap()
}

/// The pick of a supply in a file, and its document.
fn saved(folder: &Path, supply: &str) -> (String, Value) {
    let path = folder.join("build.json").display().to_string();
    check(&["pick", supply, "--save", &path], 0, "", "");
    let document = serde_json::from_str(&fs::read_to_string(&path).unwrap()).unwrap();
    (path, document)
}

/// The demo catalogue with its files changed line by line; an empty line is left out.
fn catalog(folder: &Path, change: impl Fn(&str) -> String) -> String {
    let copy = folder.join("catalog");
    fs::create_dir_all(&copy).unwrap();
    for entry in fs::read_dir("catalog").unwrap() {
        let path = entry.unwrap().path();
        let text = fs::read_to_string(&path).unwrap();
        let changed: Vec<String> = text.lines().map(&change).filter(|line| !line.is_empty()).collect();
        fs::write(copy.join(path.file_name().unwrap()), changed.join("\n") + "\n").unwrap();
    }
    copy.display().to_string()
}

fn part(document: &Value, slot: &str) -> String {
    let lines = document["lines"].as_array().unwrap();
    let line = lines.iter().find(|line| line["slot"] == slot).unwrap();
    line["part"].as_str().unwrap().to_owned()
}

fn names(list: &Value, key: &str) -> Vec<String> {
    let name = |item: &Value| item[key].as_str().unwrap().to_owned();
    list.as_array().unwrap().iter().map(name).collect()
}

#[test]
fn exit_codes() {
    let folder = tempfile::tempdir().unwrap();
    let (path, build) = saved(folder.path(), SUPPLY);
    let rectifier = part(&build, "rectifier");
    check(
        &["rank", SUPPLY, "--each", "pass"],
        0,
        "Best build around each pass",
        "",
    );
    check(
        &["rank", SUPPLY, "--each", "valve"],
        2,
        "",
        "transformer, rectifier, reservoir, pass, sink",
    );
    check(&["rank", SUPPLY, "--each", "pass", "--top", "3"], 2, "", "--top");
    check(&["front", SUPPLY], 0, "no other beats", "");
    check(&["why", SUPPLY, &rectifier], 0, "The best build holds it", "");
    check(&["why", SUPPLY, "Z4-0450"], 0, "Forcing it in costs +", "");
    check(&["why", SUPPLY, "Z4-2304"], 1, "does not fit: pass-junction by ", "");
    check(&["why", SUPPLY, "Z4-0401"], 1, "serves none of the rails", "");
    check(&["why", SUPPLY, "Z4-0402x"], 2, "", "did you mean \"Z4-0402\"?");
    check(
        &["why", SUPPLY, &rectifier, "--without", &rectifier],
        2,
        "",
        "is the part that is asked about",
    );
    check(&["why", SUPPLY], 2, "", "<PART>");

    check(
        &["swap", &path, "--without", &rectifier],
        0,
        "proved: fewest changes (1), then cheapest: ",
        "",
    );
    check(
        &["swap", &path, "--without", &rectifier, "--by", "heat"],
        0,
        "then coolest: ",
        "",
    );
    check(
        &["swap", &path, "--without", &rectifier, "--free"],
        0,
        "proved cheapest, ",
        "",
    );
    check(&["swap", &path, "--each"], 0, "every part has a substitute", "");
    check(&["swap", &path], 0, "fewest changes (0)", "");
    check(&["swap", &path, "--without", "Z2-106x"], 2, "", "did you mean");
    check(&["swap", "no-such.json"], 2, "", "no-such.json");
    check(&["swap", SUPPLY], 2, "", "is not JSON");
    check(&["swap", &path, "--catalogue", "no-such"], 2, "", "no-such");
    let (path, build) = saved(folder.path(), TWO_RAILS);
    let transformer = part(&build, "transformer");
    check(
        &["swap", &path, "--without", &transformer],
        1,
        "no build passes (proved)",
        "",
    );
    check(&["swap", &path, "--each"], 0, "NO SUBSTITUTE", "");

    let no_time = ["--seconds", "0.000001"];
    for command in [
        vec!["why", SUPPLY, "Z4-0450"],
        vec!["front", SUPPLY],
        vec!["rank", SUPPLY, "--each", "pass"],
        vec!["swap", &path, "--without", &transformer],
        vec!["swap", &path, "--each"],
    ] {
        check(&[&command[..], &no_time[..]].concat(), 3, "", "");
    }
}

/// A part that is gone from the catalogue, one that is withdrawn, one that is short.
#[test]
fn a_build_is_redone_when_parts_are_lost() {
    let folder = tempfile::tempdir().unwrap();
    let (path, build) = saved(folder.path(), SUPPLY);
    let (can, sink) = (part(&build, "reservoir"), part(&build, "sink"));
    let new = folder.path().join("new.json").display().to_string();

    let without_can = catalog(folder.path(), |line| {
        if line.starts_with(&can) {
            String::new()
        } else {
            line.to_owned()
        }
    });
    let says = format!("{can} is not in the catalogue any more.");
    let call = ["swap", &path, "--catalogue", &without_can];
    let table = check(&[&call[..], &["--save", &new]].concat(), 0, &says, "");
    assert!(
        table.contains("fewest changes (1)") && table.contains("Priced as then"),
        "{table}"
    );
    // Named or not: it is gone.
    let named = check(&[&call[..], &["--without", &can]].concat(), 0, "fewest changes (1)", "");
    assert!(!named.contains(&says), "{named}");
    // The new build stands by itself.
    check(&["audit", &new], 0, "passes: all ", "");
    let swap = document(&call, 0);
    let saved: Value = serde_json::from_str(&fs::read_to_string(&new).unwrap()).unwrap();
    assert_eq!(swap["build"], saved);
    let changes = swap["changes"].as_array().unwrap();
    assert_eq!(changes.len(), 1);
    assert_eq!(
        (&changes[0]["rail"], &changes[0]["place"]),
        (&"logic".into(), &"reservoir".into())
    );
    assert_eq!(changes[0]["from"], format!("1 x {can}"));
    let (then, now) = (
        build["cost_per_unit"].as_f64().unwrap(),
        saved["cost_per_unit"].as_f64().unwrap(),
    );
    assert!((swap["extra_cost"].as_f64().unwrap() - (now - then)).abs() < 1e-9);
    assert!((swap["extra_cost_run"].as_f64().unwrap() - 250.0 * (now - then)).abs() < 1e-6);
    let heat = saved["heat_w"].as_f64().unwrap() - build["heat_w"].as_f64().unwrap();
    assert!((swap["extra_heat_w"].as_f64().unwrap() - heat).abs() < 1e-9);

    let withdrawn = catalog(folder.path(), |line| {
        if line.starts_with(&can) {
            line.replace(",current,", ",withdrawn,")
        } else {
            line.to_owned()
        }
    });
    check(
        &["swap", &path, "--catalogue", &withdrawn],
        0,
        &format!("{can} is withdrawn."),
        &format!("{can}: status was"),
    );
    // Asked for by name it may stay.
    check(
        &["swap", &path, "--catalogue", &withdrawn, "--with", &can],
        0,
        "fewest changes (0)",
        "",
    );

    let short = catalog(folder.path(), |line| {
        let cells: Vec<&str> = line.split(',').collect();
        let stock = cells.iter().position(|cell| *cell == "current");
        match stock.filter(|_| line.starts_with(&sink)) {
            Some(at) => [&cells[..at - 1], &["249"], &cells[at..]].concat().join(","),
            None => line.to_owned(),
        }
    });
    let says = format!("{sink} is short: the run needs 250, the stock holds 249.");
    let table = check(&["swap", &path, "--catalogue", &short], 0, &says, "");
    assert!(table.contains("fewest changes (1)"), "{table}");
}

#[test]
fn documents_hold_what_is_asked() {
    let folder = tempfile::tempdir().unwrap();
    let (path, build) = saved(folder.path(), TWO_RAILS);
    // The saved build carries its shelf, and is read all the same.
    let shelf = &build["shelf"];
    assert_eq!(names(&shelf["lines"], "part"), names(&build["lines"], "part"));
    assert!(shelf["units"].is_u64() && shelf["first"].is_string());
    check(&["audit", &path], 0, "passes: all ", "");

    let each = document(&["rank", TWO_RAILS, "--each", "rectifier"], 0);
    assert_eq!(
        (&each["schema"], &each["slot"]),
        (&"binrail.rank-each/1".into(), &"rectifier".into())
    );
    let rows = each["parts"].as_array().unwrap();
    let costs: Vec<f64> = rows.iter().filter_map(|row| row["extra_cost"].as_f64()).collect();
    assert!(
        costs.len() >= 2 && costs.len() < rows.len() && costs.is_sorted() && costs[0] == 0.0,
        "{costs:?}"
    );
    assert!(rows[costs.len()..].iter().all(|row| row["build"].is_null()));
    for row in &rows[..costs.len()] {
        assert!(names(&row["build"]["lines"], "part").contains(&row["part"].as_str().unwrap().to_owned()));
        assert!(row["build"].get("shelf").is_none());
    }

    let loss = document(&["swap", &path, "--each"], 0);
    assert_eq!(names(&loss["parts"], "part"), names(&build["lines"], "part"));

    let front = document(&["front", TWO_RAILS], 0);
    let builds = front["builds"].as_array().unwrap();
    assert_eq!(builds[0]["cost_per_unit"], build["cost_per_unit"]);
    let coolest = document(&["pick", TWO_RAILS, "--by", "heat"], 0);
    assert_eq!(builds.last().unwrap()["heat_w"], coolest["heat_w"]);

    let why = document(&["why", TWO_RAILS, &part(&build, "pass")], 0);
    assert_eq!((&why["fits"], &why["extra_cost"]), (&true.into(), &0.0.into()));
    let why = document(&["why", SUPPLY, "Z4-2304"], 1);
    assert_eq!(
        (&why["fits"], &why["slot"], &why["rail"]),
        (&false.into(), &"pass".into(), &"logic".into())
    );
    let failing = why["failing"].as_array().unwrap();
    assert!(failing.iter().all(|margin| margin["margin"].as_f64().unwrap() < 0.0));
    assert_eq!(failing[0]["limit"], "pass-junction");
    let why = document(&["why", SUPPLY, "Z4-0401"], 1);
    assert!(why["rail"].is_null() && why["rule"].is_string());
    let open = document(&["why", SUPPLY, "Z4-0450", "--seconds", "0.000001"], 3);
    assert_eq!(
        (&open["schema"], &open["proof"]["status"]),
        (&"binrail.none/1".into(), &"open".into())
    );
}

#[test]
fn csv_has_a_header_and_a_row_for_each_item() {
    let folder = tempfile::tempdir().unwrap();
    let (path, build) = saved(folder.path(), SUPPLY);
    let csv = |arguments: &[&str], code: i32, header: &str| -> usize {
        let mut all = arguments.to_vec();
        all.extend(["--format", "csv"]);
        let text = check(&all, code, "", "");
        assert_eq!(text.lines().next(), Some(header), "{text}");
        text.lines().count() - 1
    };
    let rows = csv(
        &["rank", SUPPLY, "--each", "pass"],
        0,
        "part,status,cost_per_unit,extra_cost,heat_w,parts",
    );
    assert!(rows >= 40, "{rows}");
    assert!(csv(&["front", SUPPLY], 0, "place,cost_per_unit,heat_w,parts") >= 1);
    let lost = ["swap", &path, "--without", &part(&build, "sink")];
    assert_eq!(csv(&lost, 0, "rail,place,from,to"), 1);
    let header = "part,status,distance,extra_cost,extra_cost_run,extra_heat_w,parts";
    assert_eq!(
        csv(&["swap", &path, "--each"], 0, header),
        build["lines"].as_array().unwrap().len()
    );
    let header = "part,slot,rail,fits,extra_cost,extra_heat_w,of,limit,value,bound,unit,margin,corner,missing";
    assert_eq!(csv(&["why", SUPPLY, "Z4-0450"], 0, header), 1);
    assert!(csv(&["why", SUPPLY, "Z4-2304"], 1, header) >= 1);
}

#[test]
fn tables_fit_the_asked_width() {
    let folder = tempfile::tempdir().unwrap();
    let (path, build) = saved(folder.path(), TWO_RAILS);
    let sink = part(&build, "sink");
    for (call, code) in [
        (vec!["pick", TWO_RAILS], 0),
        (vec!["rank", SUPPLY, "--each", "pass"], 0),
        (vec!["front", TWO_RAILS], 0),
        (vec!["swap", &path, "--without", &sink], 0),
        (vec!["swap", &path, "--each"], 0),
        (vec!["why", SUPPLY, "Z4-0450"], 0),
        (vec!["why", SUPPLY, "Z4-2304"], 1),
        (vec!["why", SUPPLY, "Z4-0401"], 1),
    ] {
        for width in ["80", "72"] {
            let text = check(&[&call[..], &["--width", width]].concat(), code, "", "");
            assert!(!text.contains('\u{1b}'));
            for line in text.lines() {
                assert!(line.chars().count() <= width.parse().unwrap(), "{call:?}: {line}");
            }
        }
    }
}

#[test]
fn the_order_of_rows_changes_nothing() {
    let folder = tempfile::tempdir().unwrap();
    let (path, build) = saved(folder.path(), SUPPLY);
    let copy = catalog(folder.path(), str::to_owned);
    for entry in fs::read_dir(&copy).unwrap() {
        let file = entry.unwrap().path();
        if file.extension().is_some_and(|e| e == "csv") {
            let text = fs::read_to_string(&file).unwrap();
            let (header, rows) = text.split_once('\n').unwrap();
            let mut rows: Vec<&str> = rows.lines().collect();
            rows.reverse();
            fs::write(&file, format!("{header}\n{}\n", rows.join("\n"))).unwrap();
        }
    }
    let sink = part(&build, "sink");
    for call in [
        vec!["rank", SUPPLY, "--each", "rectifier"],
        vec!["swap", &path, "--without", &sink],
        vec!["swap", &path, "--each"],
        vec!["why", SUPPLY, "Z4-2304"],
        vec!["why", SUPPLY, "Z4-0450"],
        vec!["front", SUPPLY],
    ] {
        let plain = run(&call);
        let reversed = run(&[&call[..], &["--catalogue", &copy]].concat());
        let text = |output: &Output| String::from_utf8_lossy(&output.stdout).into_owned();
        assert_eq!(text(&plain), text(&reversed), "{call:?}");
        assert_eq!(text(&plain), text(&run(&call)), "twice the same: {call:?}");
    }
}

/// Nothing moves on standard error when it is no terminal, however long the search takes.
#[test]
fn pipes_see_no_progress() {
    let output = run(&[
        "rank",
        "examples/berth-console/supply.toml",
        "--each",
        "rectifier",
        "--seconds",
        "2.5",
    ]);
    let err = String::from_utf8_lossy(&output.stderr).into_owned();
    assert!(err.is_empty(), "{err}");
}
