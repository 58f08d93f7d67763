//! Substitutes on every part of every example: what comes out is saved, read again and audited; the shelf's drop-ins are
//! no better than the substitute.
#![allow(clippy::unwrap_used, clippy::print_stdout)]

use std::collections::BTreeSet;
use std::path::Path;

use binrail::audit::audit;
use binrail::build::{Build, Place, distance, places};
use binrail::catalogue::{Catalogue, load};
use binrail::optimise::{Proof, Question, optimise};
use binrail::report::{Report, json};
use binrail::saved;
use binrail::screen::Objective;
use binrail::study::shelf::shelf;
use binrail::study::swap::{Old, swap_each};
use binrail::supply::{Supply, read};

/// How many (rail, place) pairs hold a part, and what a build costs.
fn held(supply: &Supply, build: &Build, part: &str) -> usize {
    let holds = |(place, text): (Place, &String)| {
        let text = text.as_str();
        place != Place::Wiring && (text == part || text.split_once(" x ").is_some_and(|(_, name)| name == part))
    };
    (places(supply, build).iter())
        .map(|rail| Place::ALL.into_iter().zip(rail).filter(|&pair| holds(pair)).count())
        .sum()
}

fn substitutes(name: &str, objective: Objective, catalogue: &Catalogue) -> usize {
    let supply = read(Path::new(&format!("examples/{name}/supply.toml"))).unwrap();
    let question = Question::new(&supply, catalogue, objective);
    let outcome = optimise(&question).unwrap();
    let document = json::build(&Report::found(&question, &outcome, &outcome.builds[0]));
    let saved = saved::from_value(&document, name).unwrap();
    let then = saved.own_catalogue().unwrap().unwrap();
    let build = saved.build(&then).unwrap();
    let old = Old::new(&supply, &build, catalogue);
    assert_eq!(old.cost.0, outcome.builds[0].key.cost);
    let shelf = shelf(&supply, catalogue, &outcome.builds[0].build, &BTreeSet::new());
    let mut found = 0;
    for ((part, swap), line) in swap_each(&question, &old, false).unwrap().iter().zip(&shelf.lines) {
        let what = format!("{name} without {}", part.name);
        assert_eq!(line.part, part.name);
        assert_eq!(swap.outcome.proof, Proof::Proved, "{what}");
        let least = held(&supply, &build, &part.name);
        assert!(swap.distance.is_none_or(|d| d >= least), "{what}");
        assert!(line.drop_ins.is_empty() || swap.distance == Some(least), "{what}");
        let Some(new) = swap.outcome.builds.first() else {
            continue;
        };
        found += 1;
        let document = json::build(&Report::found(&question, &swap.outcome, new));
        let saved = saved::from_value(&document, &what).unwrap();
        let own = saved.own_catalogue().unwrap().unwrap();
        let again = saved.build(&own).unwrap();
        let verdict = audit(&saved.supply, &again);
        assert!(verdict.passes(), "{what}: {:?}", verdict.tightest());
        assert_eq!(verdict.cost.0, new.key.cost, "{what}");
        assert!(again.uses().all(|(used, _)| used.name != part.name), "{what}");
        assert_eq!(Some(distance(&supply, &build, &again)), swap.distance, "{what}");
        if let Some(first) = line.drop_ins.first() {
            // Every drop-in in its place is a build that the search may choose.
            let text = serde_json::to_string(&json::build(&Report::found(&question, &outcome, &outcome.builds[0])));
            let text = text
                .unwrap()
                .replace(&format!("\"{}\"", part.name), &format!("\"{first}\""));
            let mut document: serde_json::Value = serde_json::from_str(&text).unwrap();
            document.as_object_mut().unwrap().remove("parts");
            let by_hand = saved::from_value(&document, "by hand").unwrap();
            let verdict = audit(&supply, &by_hand.build(catalogue).unwrap());
            assert!(verdict.passes(), "{what}: drop-in {first}");
            let (cost, heat) = (verdict.cost.0, (verdict.heat_w.unwrap() * 1e6).round() as i64);
            assert!(
                objective.order(new.key.cost, new.key.heat) <= objective.order(cost, heat),
                "{what}: {first}"
            );
        }
    }
    println!("{name}: {found} of {} parts have a substitute", shelf.lines.len());
    found
}

#[test]
fn every_part_of_every_example_is_lost_once() {
    let loaded = load(Path::new("catalog"));
    assert!(loaded.faults.is_empty());
    let mut examples = 0;
    for entry in std::fs::read_dir("examples").unwrap() {
        let folder = entry.unwrap().path();
        if folder.is_dir() {
            let name = folder.file_name().unwrap().to_str().unwrap();
            assert!(substitutes(name, Objective::Cost, &loaded.catalogue) >= 3, "{name}");
            examples += 1;
        }
    }
    assert!(examples >= 3);
    assert!(substitutes("tide-gauge", Objective::Heat, &loaded.catalogue) >= 3);
}
