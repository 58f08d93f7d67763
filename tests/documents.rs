//! Documents that run: the README's commands, the tables of columns and keys, the examples' golden output.
//!
//! With UPDATE_GOLDEN=1 the generated files are rewritten instead; read the change before you commit it. Golden output
//! proves sameness, not truth: truth is held by the oracle and reference tests.
#![allow(clippy::unwrap_used)]

use std::fs;
use std::path::Path;
use std::process::Command;

fn update() -> bool {
    std::env::var_os("UPDATE_GOLDEN").is_some()
}

#[track_caller]
fn same_as_file(path: &str, wanted: &str) {
    if update() {
        fs::write(path, wanted).unwrap();
    }
    let found = fs::read_to_string(path).unwrap_or_default();
    assert!(
        found == wanted,
        "{path} is out of date (UPDATE_GOLDEN=1 rewrites it)\n--- file\n{found}\n--- now\n{wanted}"
    );
}

fn binrail(arguments: &[&str]) -> String {
    let output = Command::new(env!("CARGO_BIN_EXE_binrail"))
        .args(arguments)
        .env_remove("COLUMNS")
        .output()
        .unwrap();
    let text = String::from_utf8(output.stdout).unwrap();
    assert!(
        output.status.success(),
        "{arguments:?}\n{text}{}",
        String::from_utf8_lossy(&output.stderr)
    );
    text
}

fn blocks<'a>(text: &'a str, language: &str) -> Vec<&'a str> {
    let fence = format!("```{language}\n");
    text.split(&fence)
        .skip(1)
        .map(|rest| rest.split("```").next().unwrap())
        .collect()
}

/// A command line as a shell parts it: double quotes keep spaces together.
fn words(line: &str) -> Vec<String> {
    let mut words = vec![String::new()];
    let mut quoted = false;
    for letter in line.chars() {
        match letter {
            '"' => quoted = !quoted,
            ' ' if !quoted => words.push(String::new()),
            other => words.last_mut().unwrap().push(other),
        }
    }
    words
}

#[test]
fn the_readme_s_commands_run() {
    let readme = fs::read_to_string("README.md").unwrap();
    // The README saves a build there; with CARGO_TARGET_DIR set it may not exist yet.
    fs::create_dir_all("target").unwrap();
    let mut commands = 0;
    let mut last = String::new();
    // Blocks are the odd pieces; what a command prints is shown in the block after it.
    for block in readme.split("```").skip(1).step_by(2) {
        let (language, text) = block.split_once('\n').unwrap();
        for line in text.lines().filter(|&line| language == "sh" && line != "cargo test") {
            let arguments = line
                .strip_prefix("cargo run --release -- ")
                .unwrap_or_else(|| panic!("{line}"));
            last = binrail(&words(arguments).iter().map(String::as_str).collect::<Vec<_>>());
            commands += 1;
        }
        if language == "text" {
            assert!(
                last.starts_with(text),
                "the README shows\n{text}\nbut the command prints\n{last}"
            );
        }
    }
    assert!(commands >= 18, "{commands}");
    let example = fs::read_to_string("examples/tide-gauge/supply.toml").unwrap();
    for shown in blocks(&readme, "toml") {
        assert!(example.ends_with(shown), "{shown}");
    }
    for name in ["catalog/README.md", "examples/README.md", "DEVELOPERS.md", "LICENSE"] {
        assert!(readme.contains(name) && Path::new(name).exists(), "{name}");
    }
}

#[test]
fn the_table_of_columns_is_the_code_s() {
    let head = "# The demo catalogue, and every column\n\n\
        The five files here are an invented demo catalogue: no part in them exists. `binrail vet` checks a folder.\n\
        This page is made from the code's own table, which also reads the files.\n\n";
    same_as_file(
        "catalog/README.md",
        &format!("{head}{}", binrail::catalogue::markdown()),
    );
}

#[test]
fn the_table_of_keys_is_the_code_s() {
    let head = "# The examples, and every key of a supply file\n\n\
        Four supplies of the ferry landing of Quellsund, an invented place: `tide-gauge` (one rail, 230 V 50 Hz),\n\
        `ramp-beacon` (two rails, 120 V 60 Hz), `fog-signal` (two rails that share\n\
        a reservoir) and `berth-console` (+3.3, +5, +15 and -15 V, 230 V 50 Hz). Beside each\n\
        stands what `pick` prints for it. The table is made from the code's own, which also reads the files.\n\n";
    same_as_file("examples/README.md", &format!("{head}{}", binrail::supply::markdown()));
}

#[test]
fn the_examples_print_what_they_printed() {
    for name in ["tide-gauge", "ramp-beacon", "fog-signal", "berth-console"] {
        let supply = format!("examples/{name}/supply.toml");
        same_as_file(
            &format!("examples/{name}/expected.txt"),
            &binrail(&["pick", &supply, "--width", "100"]),
        );
    }
}
