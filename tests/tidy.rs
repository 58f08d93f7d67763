//! Invariants of the source: which way imports run, where printing and the solver live, what documents repeat.
#![allow(clippy::unwrap_used)]

use std::collections::BTreeMap;
use std::fs;
use std::path::{Path, PathBuf};

/// Modules in the order of the data flow: one may use those before it and its equals of the first two ranks.
const RANKS: [&[&str]; 10] = [
    &["units", "fault", "suggest", "text"],
    &["catalogue"],
    &["supply", "physics"],
    &["build"],
    &["audit", "saved"],
    &["screen"],
    &["optimise"],
    &["study"],
    &["report"],
    &["cli"],
];

fn sources(folder: &Path, found: &mut Vec<PathBuf>) {
    for entry in fs::read_dir(folder).unwrap() {
        let path = entry.unwrap().path();
        if path.is_dir() {
            sources(&path, found);
        } else if path.extension().is_some_and(|e| e == "rs") {
            found.push(path);
        }
    }
    found.sort();
}

fn all() -> Vec<(PathBuf, String)> {
    let mut found = Vec::new();
    sources(Path::new("src"), &mut found);
    found
        .into_iter()
        .map(|path| (path.clone(), fs::read_to_string(path).unwrap()))
        .collect()
}

fn module(path: &Path) -> String {
    path.components()
        .nth(1)
        .unwrap()
        .as_os_str()
        .to_str()
        .unwrap()
        .trim_end_matches(".rs")
        .to_owned()
}

/// Source without its unit tests.
fn code(text: &str) -> &str {
    text.split("#[cfg(test)]").next().unwrap()
}

#[test]
fn data_flows_one_way() {
    let rank: BTreeMap<&str, usize> = RANKS
        .iter()
        .enumerate()
        .flat_map(|(rank, names)| names.iter().map(move |name| (*name, rank)))
        .collect();
    for (path, text) in all() {
        let own = module(&path);
        if ["lib", "main"].contains(&own.as_str()) {
            continue;
        }
        let own_rank = rank.get(own.as_str()).unwrap_or_else(|| panic!("{own} has no rank"));
        for used in code(&text).split("crate::").skip(1) {
            let used: String = used.chars().take_while(|c| c.is_alphanumeric() || *c == '_').collect();
            let Some(used_rank) = rank.get(used.as_str()) else {
                continue;
            };
            // The one document schema's name is the saved build's.
            let fine = used == own || used_rank < own_rank || (*own_rank == 0 && *used_rank == 0);
            assert!(fine, "{}: {own} may not use {used}", path.display());
        }
    }
}

#[test]
fn physics_knows_no_parts_and_one_file_knows_the_solver() {
    for (path, text) in all() {
        if module(&path) == "physics" {
            assert!(!code(&text).contains("crate::catalogue"), "{}", path.display());
        }
        if !path.ends_with("optimise/milp.rs") {
            assert!(!text.contains("good_lp::"), "{}", path.display());
        }
    }
}

#[test]
fn every_formula_names_its_source() {
    for (path, text) in all().iter().filter(|(path, _)| module(path) == "physics") {
        let mut comment = String::new();
        for line in code(text).lines() {
            if let Some(doc) = line.strip_prefix("/// ") {
                comment += doc;
            } else if line.starts_with("pub fn ") {
                assert!(comment.contains("Source:"), "{}: {line}", path.display());
                comment.clear();
            } else if line.is_empty() {
                comment.clear();
            }
        }
    }
}

#[test]
fn files_stay_short_and_say_what_they_own() {
    for (path, text) in all() {
        let lines = code(&text).lines().count();
        assert!(lines <= 450, "{}: {lines} lines", path.display());
        assert!(text.starts_with("//! "), "{}", path.display());
        if !["lib.rs", "main.rs"].contains(&path.file_name().unwrap().to_str().unwrap()) {
            assert!(text.contains("Owns "), "{}: what does it own?", path.display());
        }
    }
    assert!(fs::read_to_string("src/main.rs").unwrap().lines().count() <= 30);
}

#[test]
fn the_schema_lists_every_limit() {
    let schema: serde_json::Value = serde_json::from_str(binrail::report::schema::DOCUMENTS).unwrap();
    let listed: Vec<&str> = schema["$defs"]["margin"]["properties"]["limit"]["enum"]
        .as_array()
        .unwrap()
        .iter()
        .map(|v| v.as_str().unwrap())
        .collect();
    let limits: Vec<&str> = binrail::audit::Limit::ALL.iter().map(|l| l.word()).collect();
    assert_eq!(listed, limits);
}

#[test]
fn the_schema_lists_every_place() {
    let schema: serde_json::Value = serde_json::from_str(binrail::report::schema::DOCUMENTS).unwrap();
    let listed = &schema["$defs"]["swap"]["properties"]["changes"]["items"]["properties"]["place"]["enum"];
    let listed: Vec<&str> = listed.as_array().unwrap().iter().map(|v| v.as_str().unwrap()).collect();
    assert_eq!(listed, binrail::build::Place::ALL.map(binrail::build::Place::word));
}
