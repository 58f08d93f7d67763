//! Seeded small catalogues and supplies for the oracle tests, as the rows and keys that the readers take.
//!
//! Rails and parts are drawn around each other (see `small_maker` and `small_parts`), a draw that comes out too big,
//! without any build, or without what its kind is about is drawn again, and a quarter gets a cap on cost or heat that lies
//! among its builds.
#![allow(dead_code)]

use std::collections::BTreeMap;
use std::fmt;
use std::sync::Mutex;

use binrail::audit::audit;
use binrail::catalogue::{Catalogue, Slot, columns, from_cells};
use binrail::supply::{Supply, from_json};
use serde_json::{Value, json};

use crate::choices::{Choices, assemble};
use crate::common::Random;
use crate::layouts::{Layout, Unit, layouts};
use crate::small_maker::draw;

/// Builds of parts that pass section by section: no case has more, so that all of them can be audited.
const MOST_JOINT: u64 = 12_000;
/// Most cases have at least so many.
const LEAST_JOINT: u64 = 8;

/// What a case is to be about.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Kind {
    /// Whatever comes; sharing mostly possible.
    Any,
    /// A rail that could share is isolated.
    Isolated,
    /// Rails that could share name a section, the same or two.
    Pinned,
    /// A negative rail that no negative device serves.
    Floating,
    /// A positive and a negative rail of like voltage and the parts for a pair.
    Dual,
}

/// One row of a catalogue.
#[derive(Debug, Clone)]
pub struct Row {
    pub slot: Slot,
    pub name: String,
    pub cells: Vec<(&'static str, String)>,
}

impl Row {
    pub fn cell(&self, column: &str) -> Option<&str> {
        let (_, text) = self.cells.iter().find(|(c, _)| *c == column)?;
        Some(text)
    }

    /// Replaces or adds a cell.
    pub fn set(&mut self, column: &'static str, text: impl ToString) {
        self.clear(column);
        self.cells.push((column, text.to_string()));
    }

    pub fn clear(&mut self, column: &str) {
        self.cells.retain(|(c, _)| *c != column);
    }
}

/// A catalogue with a supply.
#[derive(Debug, Clone)]
pub struct Case {
    pub seed: u64,
    pub rows: Vec<Row>,
    pub supply: Value,
}

impl fmt::Display for Case {
    /// Everything that a failure needs to be run again, as [`Case::read`] takes it.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        writeln!(f, "seed {}", self.seed)?;
        writeln!(f, "{}", self.supply)?;
        for row in &self.rows {
            let cells: Vec<String> = row.cells.iter().map(|(c, text)| format!("{c}={text}")).collect();
            writeln!(f, "{} {}: {}", row.slot.word(), row.name, cells.join("; "))?;
        }
        Ok(())
    }
}

impl Case {
    pub fn catalogue(&self) -> Catalogue {
        let cells = |row: &Row| {
            row.cells
                .iter()
                .map(|(c, text)| ((*c).to_owned(), text.clone()))
                .collect()
        };
        let rows = self.rows.iter().map(|row| (row.slot, row.name.clone(), cells(row)));
        from_cells(rows.collect(), "oracle", Some("EUR".into())).unwrap_or_else(|faults| panic!("{faults:?} in {self}"))
    }

    pub fn supply(&self) -> Supply {
        from_json(&self.supply, "oracle").unwrap_or_else(|faults| panic!("{faults:?} in {self}"))
    }

    /// A case as a failure prints it.
    pub fn read(text: &str) -> Case {
        let mut lines = text.trim().lines();
        let seed = lines.next().and_then(|line| line.trim().strip_prefix("seed ")).unwrap();
        let supply = serde_json::from_str(lines.next().unwrap()).unwrap();
        let row = |line: &str| {
            let (head, cells) = line.split_once(": ").unwrap();
            let (slot, name) = head.trim().split_once(' ').unwrap();
            let slot = Slot::ALL.into_iter().find(|s| s.word() == slot).unwrap();
            let cell = |cell: &str| {
                let (name, text) = cell.split_once('=').unwrap();
                let column = columns(slot).find(|c| c.name == name).unwrap();
                (column.name, text.to_owned())
            };
            Row {
                slot,
                name: name.to_owned(),
                cells: cells.split("; ").map(cell).collect(),
            }
        };
        Case {
            seed: seed.parse().unwrap(),
            supply,
            rows: lines.map(row).collect(),
        }
    }

    /// The case of a seed, drawn once. Every tenth is taken as it comes, so that some have no build.
    pub fn new(seed: u64, rails: usize, kind: Kind) -> Case {
        static DRAWN: Mutex<BTreeMap<(u64, usize, usize), Case>> = Mutex::new(BTreeMap::new());
        let key = (seed, rails, kind as usize);
        let drawn = DRAWN.lock().unwrap().get(&key).cloned();
        drawn.unwrap_or_else(|| {
            let case = (0..)
                .find_map(|attempt| Case::attempt(seed, rails, kind, attempt))
                .unwrap();
            DRAWN.lock().unwrap().insert(key, case.clone());
            case
        })
    }

    fn attempt(seed: u64, rails: usize, kind: Kind, attempt: u64) -> Option<Case> {
        let start = (seed * 10 + kind as u64) * 1_000_000 + rails as u64 * 100_000 + attempt;
        let mut random = Random::new(start);
        // Some cases of any kind are about pairs, which seldom come up otherwise.
        let about = match kind {
            Kind::Any if rails > 1 && seed % 10 == 6 => Kind::Dual,
            kind => kind,
        };
        let mut case = draw(seed, &mut random, rails, about);
        let (catalogue, supply) = (case.catalogue(), case.supply());
        let as_it_comes = seed % 10 == 9;
        if !as_it_comes && !case.shows(about, &supply, &catalogue) {
            return None;
        }
        let choices = Choices::new(&supply, &catalogue);
        let least = if rails == 1 { LEAST_JOINT } else { LEAST_JOINT * 4 };
        let (all, sold) = (choices.count_all(false), choices.count_all(true));
        if all > MOST_JOINT || sold < least && !as_it_comes {
            return None;
        }
        if seed % 4 == 1 && all > 0 {
            case.cap(&mut random, &supply, &choices, all);
        }
        Some(case)
    }

    /// Whether the layouts that the kind is about have a build, section by section.
    fn shows(&self, kind: Kind, supply: &Supply, catalogue: &Catalogue) -> bool {
        let rails = supply.rails.len();
        let possible =
            |supply: &Supply, layouts: Vec<Layout>| Choices::of(supply, catalogue, layouts, true).count_all(true) > 0;
        let some = |which: &dyn Fn(&Layout) -> bool| {
            possible(
                supply,
                layouts(supply).into_iter().filter(|layout| which(layout)).collect(),
            )
        };
        let shares = |layout: &Layout| {
            layout
                .iter()
                .flatten()
                .flat_map(|unit| &unit.sections)
                .any(|s| s.len() > 1)
        };
        match kind {
            Kind::Dual => some(&|layout| layout.iter().flatten().any(Unit::is_dual)),
            // What the key forbids could be built without it.
            Kind::Isolated | Kind::Pinned => {
                let free = self.without_keys(&["isolated", "section"]).supply();
                let kept = layouts(supply);
                possible(
                    &free,
                    layouts(&free)
                        .into_iter()
                        .filter(|layout| !kept.contains(layout))
                        .collect(),
                )
            }
            Kind::Any if rails > 1 && !supply.share_never => match self.seed % 10 {
                0..=2 => some(&|layout| shares(layout)),
                3..=5 => some(&|layout| layout.len() < rails && !shares(layout)),
                _ => true,
            },
            Kind::Any | Kind::Floating => true,
        }
    }

    /// The same with these keys gone from every rail.
    pub fn without_keys(&self, keys: &[&str]) -> Case {
        let mut free = self.clone();
        for rail in free.supply["rail"].as_array_mut().unwrap() {
            let rail = rail.as_object_mut().unwrap();
            keys.iter().for_each(|&key| {
                rail.shift_remove(key);
            });
        }
        free
    }

    /// Caps cost or heat at what some build of the case has.
    fn cap(&mut self, random: &mut Random, supply: &Supply, choices: &Choices, joint: u64) {
        let rails: Vec<usize> = (0..supply.rails.len()).collect();
        let wanted = random.below(joint as usize);
        let (mut place, mut some) = (0, None);
        for layout in &choices.layouts {
            choices.each(layout, &mut |chosen| {
                if place == wanted {
                    some = Some(audit(supply, &assemble(&rails, chosen)));
                }
                place += 1;
            });
        }
        let some = some.unwrap();
        let caps = &mut self.supply["caps"];
        if random.chance(0.6) {
            caps["cost"] = json!(some.cost.value());
        }
        if caps.get("cost").is_none() || random.chance(0.3) {
            caps["heat"] = json!(format!("{:.3} W", some.heat_w.unwrap()));
        }
    }
}
