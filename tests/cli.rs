//! The program as a user meets it: exit codes, files, pipes, widths, interruptions.
#![allow(clippy::unwrap_used)]

use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Command, Output, Stdio};

const SUPPLY: &str = "examples/tide-gauge/supply.toml";

fn binrail(arguments: &[&str]) -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_binrail"));
    command.args(arguments).env_remove("COLUMNS").env_remove("NO_COLOR");
    command
}

fn run(arguments: &[&str]) -> Output {
    binrail(arguments).output().unwrap()
}

#[track_caller]
fn check(arguments: &[&str], code: i32, on_out: &str, on_err: &str) -> Output {
    let output = run(arguments);
    let (out, err) = (
        String::from_utf8_lossy(&output.stdout),
        String::from_utf8_lossy(&output.stderr),
    );
    assert_eq!(output.status.code(), Some(code), "{arguments:?}\n{out}\n{err}");
    assert!(out.contains(on_out), "{arguments:?}: no \"{on_out}\" in\n{out}");
    assert!(err.contains(on_err), "{arguments:?}: no \"{on_err}\" in\n{err}");
    assert!(!err.contains("panicked"), "{err}");
    output
}

/// A supply file with one text replaced, in a folder of its own.
fn changed(folder: &Path, from: &str, to: &str) -> String {
    let text = fs::read_to_string(SUPPLY).unwrap();
    assert!(text.contains(from));
    let path = folder.join("supply.toml");
    fs::write(&path, text.replace(from, to)).unwrap();
    path.display().to_string()
}

fn copy_of_catalog(folder: &Path) -> PathBuf {
    let copy = folder.join("catalog");
    fs::create_dir(&copy).unwrap();
    for entry in fs::read_dir("catalog").unwrap() {
        let entry = entry.unwrap();
        fs::copy(entry.path(), copy.join(entry.file_name())).unwrap();
    }
    copy
}

#[test]
fn exit_codes() {
    let folder = tempfile::tempdir().unwrap();
    check(&["pick", SUPPLY], 0, "proved cheapest: ", "");
    check(&["pick", SUPPLY, "--by", "heat"], 0, "proved coolest: ", "");
    check(&["rank", SUPPLY, "--top", "3"], 0, "proved cheapest: ", "");
    check(&["vet", "catalog"], 0, "0 faults", "");
    // No build without its cautions, in whatever form.
    check(
        &["pick", SUPPLY, "--format", "csv"],
        0,
        "qty_for_run",
        "Mains voltage kills",
    );
    check(&["pick", SUPPLY, "--format", "json"], 0, "Mains voltage kills", "");
    check(&["pick", SUPPLY], 0, "Mains voltage kills", "");
    check(&["schema"], 0, "binrail.build/1", "");
    check(&["--help"], 0, "Examples:", "");
    check(&["--version"], 0, "binrail ", "");

    let odd = changed(
        folder.path(),
        "voltage = \"5 V\"",
        "voltage = \"5.5 V\"\ndevices = [\"fixed\"]",
    );
    check(&["pick", &odd, "--catalogue", "catalog"], 1, "no build passes", "");
    check(&["vet", folder.path().to_str().unwrap()], 1, "transformers.csv", "");
    let wave = [
        "--hz",
        "50",
        "--winding-ohm",
        "0.5",
        "--path",
        "bridge",
        "--threshold-v",
        "0.7",
        "--slope-ohm",
        "0.02",
    ];
    let wave = |volts: &str, farad: &str, code, out: &str, err: &str| {
        let mut all = vec![
            "wave",
            "--source-v",
            volts,
            "--farad",
            farad,
            "--esr-ohm",
            "0.03",
            "--amps",
            "1",
        ];
        all.extend(wave);
        check(&all, code, out, err);
    };
    wave("12", "4700e-6", 0, "valley", "");
    wave("1", "4700e-6", 1, "collapses", "");
    wave("12", "0", 2, "", "--farad");
    wave("12", "nan", 2, "", "--farad");
    wave("12", "-1e-3", 2, "", "--farad");
    wave("inf", "1e-3", 2, "", "--source-v");

    check(&[], 2, "", "Usage");
    check(&["pikc", SUPPLY], 2, "", "pick");
    check(&["pick", "no-such.toml"], 2, "", "no-such.toml");
    check(&["pick", SUPPLY, "--catalogue", "no-such"], 2, "", "no-such");
    check(&["pick", SUPPLY, "--seconds=-1"], 2, "", "seconds");
    check(&["pick", SUPPLY, "--seconds", "NaN"], 2, "", "seconds");
    check(&["pick", SUPPLY, "--width", "0"], 2, "", "width");
    check(
        &["pick", SUPPLY, "--without", "Z1-1111"],
        2,
        "",
        "did you mean \"Z1-1110\"?",
    );
    check(
        &["pick", SUPPLY, "--with", "Z1-1110@logik"],
        2,
        "",
        "did you mean \"logic\"?",
    );
    check(&["rank", SUPPLY, "--top", "0"], 2, "", "--top");
    check(&["pick", SUPPLY, "--seconds", "0.000001"], 3, "", "");
}

#[test]
fn faults_are_told_with_line_column_and_remedy() {
    let folder = tempfile::tempdir().unwrap();
    let copy = copy_of_catalog(folder.path());
    let file = copy.join("reservoirs.csv");
    let text = fs::read_to_string(&file).unwrap();
    let header: Vec<&str> = text.lines().next().unwrap().split(',').collect();
    let column = header.iter().position(|h| *h == "c_uf").unwrap();
    let line = text.lines().nth(5).unwrap();
    let cell = line.rsplitn(header.len() - column, ',').last().unwrap();
    let cell = &line[cell.len() + 1..];
    let cell = cell.split(',').next().unwrap();
    let bad = line.replacen(&format!(",{cell},"), ",NaN,", 1);
    fs::write(&file, text.replace(line, &bad)).unwrap();
    let output = check(&["vet", copy.to_str().unwrap()], 1, "reservoirs.csv:6: ", "");
    let out = String::from_utf8_lossy(&output.stdout).into_owned();
    assert!(out.contains("\"NaN\" "), "{out}");
    // Every other command refuses the catalogue with the same words and writes nothing.
    let target = folder.path().join("out.txt");
    fs::write(&target, "old").unwrap();
    let arguments = [
        "pick",
        SUPPLY,
        "--catalogue",
        copy.to_str().unwrap(),
        "-o",
        target.to_str().unwrap(),
    ];
    check(&arguments, 2, "", "reservoirs.csv:6: ");
    assert_eq!(fs::read_to_string(&target).unwrap(), "old");
    let mut json = arguments.to_vec();
    json.extend(["--format", "json"]);
    let output = check(&json, 2, "", "binrail.error/1");
    let document: serde_json::Value = serde_json::from_slice(&output.stderr).unwrap();
    assert_eq!(document["errors"][0]["line"], 6);
    assert_eq!(document["errors"][0]["text"], "NaN");
}

#[test]
fn files_are_replaced_whole_or_not_at_all() {
    let folder = tempfile::tempdir().unwrap();
    let at = |name: &str| folder.path().join(name).display().to_string();
    let printed = check(&["pick", SUPPLY, "--format", "csv"], 0, "qty_for_run", "").stdout;
    let output = check(
        &[
            "pick",
            SUPPLY,
            "--format",
            "csv",
            "-o",
            &at("bill.csv"),
            "--save",
            &at("build.json"),
        ],
        0,
        "",
        "",
    );
    assert!(output.stdout.is_empty());
    assert_eq!(fs::read(at("bill.csv")).unwrap(), printed);
    check(&["audit", &at("build.json")], 0, "passes: all ", "");
    check(
        &["audit", &at("build.json"), "--catalogue", "catalog"],
        0,
        "passes: all ",
        "",
    );
    // No temporary file is left beside them.
    assert_eq!(fs::read_dir(folder.path()).unwrap().count(), 2);

    check(
        &["pick", SUPPLY, "-o", folder.path().to_str().unwrap()],
        2,
        "",
        "is not a regular file",
    );
    check(
        &["pick", SUPPLY, "-o", &at("no/such/folder.txt")],
        2,
        "",
        "cannot be written",
    );
    // A result that cannot be saved is not printed as if it had been.
    check(
        &["pick", SUPPLY, "--save", &at("no/such/folder.json")],
        2,
        "",
        "cannot be written",
    );

    #[cfg(unix)]
    {
        std::os::unix::fs::symlink(at("bill.csv"), at("link.csv")).unwrap();
        check(&["vet", "catalog", "-o", &at("link.csv")], 0, "", "");
        assert!(fs::symlink_metadata(at("link.csv")).unwrap().is_symlink());
        assert!(fs::read_to_string(at("bill.csv")).unwrap().contains("0 faults"));
    }
}

#[test]
fn hand_written_and_broken_builds() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("build.json").display().to_string();
    check(&["pick", SUPPLY, "--save", &path], 0, "", "");
    let whole: serde_json::Value = serde_json::from_str(&fs::read_to_string(&path).unwrap()).unwrap();
    let write = |value: &serde_json::Value| fs::write(&path, value.to_string()).unwrap();
    // By hand: four keys are enough, the parts then come from a catalogue.
    let mut by_hand = serde_json::json!({});
    for key in ["supply", "transformers", "sections", "rails"] {
        by_hand[key] = whole[key].clone();
    }
    write(&by_hand);
    check(&["audit", &path, "--catalogue", "catalog"], 0, "passes: all ", "");
    // Another can: the audit judges, it does not trust.
    let mut other = whole.clone();
    other["sections"][0]["reservoir"] = "Z3-1408".into();
    write(&other);
    check(&["audit", &path, "--catalogue", "catalog"], 1, "FAILS", "");
    check(&["audit", &path], 2, "", "\"Z3-1408\" is not in the catalogue");
    // Rules of assembly.
    let mut other = whole.clone();
    other["sections"][0]["hookup"] = "centre-tap".into();
    write(&other);
    check(
        &["audit", &path],
        2,
        "",
        "path bridge does not run on hook-up centre-tap",
    );
    let mut other = whole.clone();
    other["sections"][0]["secondaries"] = serde_json::json!([1, 9]);
    write(&other);
    check(&["audit", &path], 2, "", "are not its secondaries");
    let mut other = whole.clone();
    other["sections"][0]["resevoir"] = "x".into();
    write(&other);
    check(&["audit", &path], 2, "", "did you mean \"reservoir\"?");
    let mut other = whole.clone();
    other["schema"] = "binrail.build/9".into();
    write(&other);
    check(&["audit", &path], 2, "", "binrail.build/9");
    // Today's rows may differ from the saved cells: each is named.
    let mut other = whole.clone();
    let part = whole["sections"][0]["reservoir"].as_str().unwrap();
    other["parts"][part]["life_h"] = "1".into();
    write(&other);
    check(&["audit", &path], 1, "reservoir-life", "");
    check(
        &["audit", &path, "--catalogue", "catalog"],
        0,
        "passes",
        "life_h was \"1\"",
    );
    fs::write(&path, "{").unwrap();
    check(&["audit", &path], 2, "", "is not JSON");
}

#[test]
fn tables_fit_the_asked_width_and_pipes_get_plain_text() {
    for supply in ["tide-gauge", "ramp-beacon"] {
        let supply = format!("examples/{supply}/supply.toml");
        for (command, more) in [("pick", ["--width", "80"]), ("rank", ["--width", "80"])] {
            let output = check(&[command, &supply, more[0], more[1]], 0, "Cautions", "");
            let text = String::from_utf8(output.stdout).unwrap();
            assert!(!text.contains('\u{1b}'));
            for line in text.lines() {
                assert!(line.chars().count() <= 80, "{command} {supply}: {line}");
            }
        }
    }
    assert!(String::from_utf8_lossy(&run(&["pick", SUPPLY, "--color", "always"]).stdout).contains("\u{1b}["));
    let verbose = run(&["pick", SUPPLY, "-v"]);
    assert!(String::from_utf8_lossy(&verbose.stderr).contains("steady states solved"));
}

#[test]
fn a_closed_pipe_is_quiet() {
    let mut child = binrail(&["pick", SUPPLY, "--format", "json"])
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    drop(child.stdout.take());
    let output = child.wait_with_output().unwrap();
    assert!(output.stderr.is_empty(), "{}", String::from_utf8_lossy(&output.stderr));
    assert_eq!(output.status.code(), Some(0));
}

#[test]
fn the_order_of_rows_changes_nothing() {
    let folder = tempfile::tempdir().unwrap();
    let copy = copy_of_catalog(folder.path());
    for entry in fs::read_dir(&copy).unwrap() {
        let path = entry.unwrap().path();
        if path.extension().is_some_and(|e| e == "csv") {
            let text = fs::read_to_string(&path).unwrap();
            let (header, rows) = text.split_once('\n').unwrap();
            let mut rows: Vec<&str> = rows.lines().collect();
            rows.reverse();
            fs::write(&path, format!("{header}\n{}\n", rows.join("\n"))).unwrap();
        }
    }
    for form in ["table", "csv"] {
        for command in ["pick", "rank"] {
            let plain = run(&[command, SUPPLY, "--format", form]).stdout;
            let reversed = run(&[command, SUPPLY, "--format", form, "--catalogue", copy.to_str().unwrap()]).stdout;
            assert_eq!(String::from_utf8_lossy(&plain), String::from_utf8_lossy(&reversed));
            assert_eq!(
                plain,
                run(&[command, SUPPLY, "--format", form]).stdout,
                "twice the same"
            );
        }
    }
}

/// Ctrl-C: the best found with its bound, exit 3.
#[cfg(unix)]
#[test]
fn an_interrupt_gives_the_best_so_far() {
    let folder = tempfile::tempdir().unwrap();
    let text = fs::read_to_string("examples/berth-console/supply.toml").unwrap();
    let path = folder.path().join("supply.toml");
    // A cap on heat that only dear builds meet keeps the search busy for long.
    fs::write(
        &path,
        text.replacen("[[rail]]", "[caps]\nheat = \"50 W\"\n\n[[rail]]", 1),
    )
    .unwrap();
    let child = binrail(&[
        "pick",
        path.to_str().unwrap(),
        "--catalogue",
        "catalog",
        "--format",
        "json",
    ])
    .stdout(Stdio::piped())
    .stderr(Stdio::piped())
    .spawn()
    .unwrap();
    std::thread::sleep(std::time::Duration::from_millis(1500));
    let sent = Command::new("kill")
        .args(["-INT", &child.id().to_string()])
        .status()
        .unwrap();
    assert!(sent.success());
    let output = child.wait_with_output().unwrap();
    assert_eq!(
        output.status.code(),
        Some(3),
        "{}",
        String::from_utf8_lossy(&output.stderr)
    );
    let document: serde_json::Value = serde_json::from_slice(&output.stdout).unwrap();
    let status = document["proof"]["status"].as_str().unwrap();
    assert!(["best found", "open"].contains(&status), "{status}");
    assert!(document["proof"]["bound"].as_f64().unwrap() >= 0.0);
}

/// --set: as if it stood in the file, in every command that reads a supply and in what is saved.
#[test]
fn settings_take_the_place_of_keys() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("build.json").display().to_string();
    let set = [
        "--set",
        "ambient.high=\"43 degC\"",
        "--set",
        "builds=500",
        "--set",
        "rail.logic.ripple=6 mV",
    ];
    let pick = [&["pick", SUPPLY, "--save", &path][..], &set].concat();
    check(&pick, 0, "Tide gauge, 500 units", "");
    let saved: serde_json::Value = serde_json::from_str(&fs::read_to_string(&path).unwrap()).unwrap();
    assert_eq!(saved["supply"]["ambient"]["high"], "43 degC");
    assert_eq!(saved["supply"]["builds"], 500);
    assert_eq!(saved["supply"]["rail"][0]["ripple"], "6 mV");
    check(&["audit", &path], 0, "passes: all ", "");
    let rank = [&["rank", SUPPLY, "--top", "2"][..], &set].concat();
    check(&rank, 0, "Tide gauge, 500 units", "");
    // The same as in the file.
    let edited = changed(folder.path(), "high = \"45 degC\"", "high = \"43 degC\"");
    let here = run(&["pick", &edited, "--catalogue", "catalog", "--format", "csv"]).stdout;
    let set = ["--set", "ambient.high=43 degC", "--format", "csv"];
    assert_eq!(run(&[&["pick", SUPPLY][..], &set].concat()).stdout, here);
    for (setting, problem) in [
        ("ambient.hihg=43 degC", "did you mean \"ambient.high\"?"),
        ("rail.logic.ripple=6", "\"6\" has no unit; write \"6 V\""),
        ("rail.logik.ripple=6 mV", "did you mean \"logic\"?"),
        ("builds", "has no equals sign"),
    ] {
        check(
            &["pick", SUPPLY, "--set", setting],
            2,
            "",
            &format!("--set {setting}: "),
        );
        check(&["rank", SUPPLY, "--set", setting], 2, "", problem);
    }
    let output = check(&["pick", SUPPLY, "--set", "builds=0", "--format", "json"], 2, "", "");
    let document: serde_json::Value = serde_json::from_slice(&output.stderr).unwrap();
    assert_eq!(document["errors"][0]["column"], "--set builds=0");
    assert_eq!(document["errors"][0]["file"], "");
}

/// What would have to give: it does, and not one digit nearer.
#[test]
fn what_would_have_to_give() {
    let hot = ["--set", "ambient.high=75 degC"];
    let output = check(
        &[&["pick", SUPPLY], &hot[..]].concat(),
        1,
        "It would pass with any one of these",
        "",
    );
    let table = String::from_utf8(output.stdout).unwrap();
    let output = check(&[&["rank", SUPPLY, "--format", "json"], &hot[..]].concat(), 1, "", "");
    let document: serde_json::Value = serde_json::from_slice(&output.stdout).unwrap();
    let relax = document["relax"].as_array().unwrap();
    assert_eq!(relax[0]["requirement"], "ambient.high");
    assert_eq!(relax[0]["from"], "75 degC");
    let to = relax[0]["to"].as_str().unwrap();
    assert!(table.contains(to), "{table}");
    let number: f64 = to.strip_suffix(" degC").unwrap().parse().unwrap();
    check(
        &["pick", SUPPLY, "--set", &format!("ambient.high={to}")],
        0,
        "proved cheapest",
        "",
    );
    let nearer = format!("ambient.high={:.1} degC", number + 0.1);
    let would = format!("it would pass with ambient.high {:.1} degC -> {to}", number + 0.1);
    check(
        &["pick", SUPPLY, "--set", &nearer, "--format", "csv"],
        1,
        "slot,limit",
        &would,
    );
}

/// What requirements cost: in every form, and a build that carries it reads back.
#[test]
fn prices_of_requirements() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("build.json").display().to_string();
    let output = check(
        &["pick", SUPPLY, "--prices", "--save", &path],
        0,
        "What each requirement costs",
        "",
    );
    let saved: serde_json::Value = serde_json::from_str(&fs::read_to_string(&path).unwrap()).unwrap();
    let prices = saved["prices"].as_array().unwrap();
    assert!(!prices.is_empty());
    let text = String::from_utf8(output.stdout).unwrap();
    for price in prices {
        let [requirement, to] = ["requirement", "to"].map(|key| price[key].as_str().unwrap());
        assert!(text.contains(requirement) && text.contains(to), "{price}");
        if requirement.starts_with("stock.") {
            continue;
        }
        let output = check(
            &[
                "pick",
                SUPPLY,
                "--set",
                &format!("{requirement}={to}"),
                "--format",
                "json",
            ],
            0,
            "",
            "",
        );
        let better: serde_json::Value = serde_json::from_slice(&output.stdout).unwrap();
        let saves = saved["cost_per_unit"].as_f64().unwrap() - better["cost_per_unit"].as_f64().unwrap();
        assert!(
            (saves - price["saves"].as_f64().unwrap()).abs() < 1e-9,
            "{price}: {saves}"
        );
    }
    check(&["audit", &path], 0, "passes: all ", "");
    check(
        &["pick", SUPPLY, "--prices", "--format", "csv"],
        0,
        "qty_for_run",
        " saves 0.",
    );
    check(&["pick", SUPPLY, "--prices", "--by", "heat"], 0, "mW", "");
}

/// The roomiest build is no worse than the asked share, and says so.
#[test]
fn room_within_a_share() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("build.json").display().to_string();
    // Without the transformers' core flux, which no choice changes, there is room to find.
    let set = ["--set", "mains.high=250 V", "--room", "5%"];
    let output = check(
        &[&["pick", SUPPLY, "--save", &path, "--format", "json"], &set[..]].concat(),
        0,
        "",
        "",
    );
    let document: serde_json::Value = serde_json::from_slice(&output.stdout).unwrap();
    let number = |key: &str| document["room"][key].as_f64().unwrap();
    assert_eq!(document["proof"]["status"], "proved");
    assert_eq!(document["room"]["share"], 0.05);
    let cost = document["cost_per_unit"].as_f64().unwrap();
    assert!(cost > number("best") && cost <= number("best") * 1.05, "{cost}");
    let margins = document["margins"].as_array().unwrap();
    let tightness = |m: &serde_json::Value| m["margin"].as_f64().unwrap() / m["bound"].as_f64().unwrap().abs().max(1.0);
    let least = margins.iter().map(tightness).fold(f64::INFINITY, f64::min);
    assert!((least - number("tightness")).abs() < 1e-12);
    check(&["audit", &path], 0, "passes: all ", "");
    check(
        &[&["pick", SUPPLY], &set[..]].concat(),
        0,
        "proved roomiest within 5 % of the cheapest: ",
        "",
    );
    for (share, problem) in [
        ("5", "has no unit"),
        ("101%", "out of range"),
        ("-1%", "out of range"),
        ("x", "not a number"),
    ] {
        check(&["pick", SUPPLY, &format!("--room={share}")], 2, "", problem);
    }
    check(
        &["pick", SUPPLY, "--room", "2%", "--prices"],
        2,
        "",
        "cannot be used with",
    );
}
