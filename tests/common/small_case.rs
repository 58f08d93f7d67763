//! Seeded small catalogues and supplies for the oracle tests, as the rows and keys that the readers take.
//!
//! Parts are drawn around what the rails need (see `small_parts`), a draw that comes out too big or without any build
//! is drawn again, and a quarter gets a cap on cost or heat that lies among its builds.
#![allow(dead_code)]

use std::collections::BTreeSet;
use std::fmt;

use binrail::audit::audit;
use binrail::build::Build;
use binrail::catalogue::{Catalogue, Slot, Status, columns, from_cells};
use binrail::supply::{Supply, from_json};
use serde_json::{Value, json};

use crate::brute_force::singles;
use crate::common::Random;
use crate::small_parts::{Ask, VOLTS};

/// Combinations of what each rail's own limits allow: no case has more, so that all of them can be audited.
const MOST_JOINT: usize = 12_000;
/// Most cases have at least so many.
const LEAST_JOINT: usize = 8;

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

    /// The case of a seed. Every tenth is taken as it comes, so that some have no build.
    pub fn new(seed: u64, rails: usize) -> Case {
        for attempt in 0.. {
            let mut random = Random::new(seed * 1_000_000 + rails as u64 * 10_000 + attempt);
            let mut case = Case::draw(seed, &mut random, rails);
            let (catalogue, supply) = (case.catalogue(), case.supply());
            let (each, _) = singles(&supply, &catalogue);
            let joint: usize = each.iter().map(Vec::len).product();
            let sold = |build: &&Build| build.uses().all(|(part, _)| part.status != Status::Withdrawn);
            let usual: usize = each.iter().map(|builds| builds.iter().filter(sold).count()).product();
            if joint > MOST_JOINT || usual < LEAST_JOINT && seed % 10 != 9 {
                continue;
            }
            if seed % 4 == 1 && joint > 0 {
                let mut some = (0, 0.0);
                for (rail, builds) in each.iter().enumerate() {
                    let mut alone = supply.clone();
                    alone.rails = vec![supply.rails[rail].clone()];
                    let verdict = audit(&alone, random.pick(builds));
                    some = (some.0 + verdict.cost.0, some.1 + verdict.heat_w.unwrap());
                }
                let caps = &mut case.supply["caps"];
                if random.chance(0.6) {
                    caps["cost"] = json!(some.0 as f64 / 1e6);
                }
                if caps.get("cost").is_none() || random.chance(0.3) {
                    caps["heat"] = json!(format!("{:.3} W", some.1));
                }
            }
            return case;
        }
        unreachable!("attempts do not end")
    }

    fn draw(seed: u64, random: &mut Random, rails: usize) -> Case {
        let mut maker = Maker::new(random, rails);
        let (sizes, copies, cans) = maker.sizes(rails);
        for (slot, size) in Slot::ALL.into_iter().zip(sizes) {
            (0..size).for_each(|_| maker.part(slot));
        }
        (0..copies).for_each(|_| maker.copy());
        Case {
            seed,
            supply: maker.supply(cans),
            rows: maker.rows,
        }
    }
}

struct Maker<'r> {
    random: &'r mut Random,
    builds: u64,
    mains_v: u32,
    asks: Vec<Ask>,
    names: BTreeSet<String>,
    rows: Vec<Row>,
}

impl<'r> Maker<'r> {
    fn new(random: &'r mut Random, rails: usize) -> Maker<'r> {
        let first_v = *random.pick(&VOLTS);
        let asks = (0..rails)
            .map(|rail| {
                let half_wave = random.chance(0.15);
                let amps: &[f64] = if half_wave {
                    &[0.1, 0.2]
                } else {
                    &[0.2, 0.5, 0.5, 0.8, 1.0]
                };
                Ask {
                    // Rails of one voltage share most parts.
                    out_v: if rail == 0 || random.chance(0.6) {
                        first_v
                    } else {
                        *random.pick(&VOLTS)
                    },
                    negative: random.chance(0.25),
                    amps: *random.pick(amps),
                    half_wave,
                }
            })
            .collect();
        Maker {
            builds: *random.pick(&[1, 1, 7, 50]),
            mains_v: *random.pick(&[230, 230, 120]),
            random,
            asks,
            names: BTreeSet::new(),
            rows: Vec::new(),
        }
    }

    /// Rows of each slot, copies of rows, most cans.
    fn sizes(&mut self, rails: usize) -> ([usize; 5], usize, u64) {
        let r = &mut self.random;
        match rails {
            1 => (
                [3, 3, 2 + r.below(2), 3, 2 + r.below(2)],
                r.below(3),
                2 + r.below(2) as u64,
            ),
            2 => ([2 + r.below(2), 2, 2, 3, 1 + r.below(2)], r.below(3), 2),
            _ => ([2 + r.below(2), 1 + r.below(2), 1 + r.below(2), 3, 1], r.below(2), 2),
        }
    }

    /// The rail that the next part is made for: in turn, then any.
    fn ask(&mut self, slot: Slot) -> Ask {
        let made = self.rows.iter().filter(|row| row.slot == slot).count();
        let any = self.random.below(self.asks.len());
        *self.asks.get(made).unwrap_or(&self.asks[any])
    }

    /// Short names of unequal length, so that one begins another and bytes are compared to their end.
    fn name(&mut self, slot: Slot) -> String {
        let letter = ["T", "B", "C", "U", "S"][slot as usize];
        loop {
            let most = *self.random.pick(&[10, 200]);
            let name = format!("{letter}{}", self.random.below(most));
            if self.names.insert(name.clone()) {
                return name;
            }
        }
    }

    fn part(&mut self, slot: Slot) {
        let ask = self.ask(slot);
        let name = self.name(slot);
        let (cells, tenths) = ask.part(self.random, slot, self.mains_v);
        let mut row = Row { slot, name, cells };
        self.trade(&mut row, tenths);
        self.rows.push(row);
    }

    /// The data of a row under another name: the same heat, and often the same price.
    fn copy(&mut self) {
        let mut row = self.random.pick(&self.rows).clone();
        row.name = self.name(row.slot);
        if self.random.chance(0.6) {
            let price: f64 = row.cell("price").unwrap().parse().unwrap();
            let tenths = (price * 10.0).round() as usize + self.random.below(2);
            ["breaks", "stock", "status"]
                .iter()
                .for_each(|column| row.clear(column));
            self.trade(&mut row, tenths);
        }
        self.rows.push(row);
    }

    /// Price, breaks that one rail alone seldom reaches, stock that several cannot share, status, height.
    fn trade(&mut self, row: &mut Row, tenths: usize) {
        let price = |tenths: usize| format!("{}.{}", tenths / 10, tenths % 10);
        let r = &mut self.random;
        row.set("price", price(tenths));
        if r.chance(0.45) {
            let first = self.builds * *r.pick(&[2, 2, 2, 3]) - u64::from(self.builds > 1 && r.chance(0.2));
            let deepest = if r.chance(0.2) {
                tenths
            } else {
                tenths.div_ceil(3).min(6)
            };
            let cheaper = tenths - 1 - r.below(deepest);
            let mut breaks = format!("{first}:{}", price(cheaper));
            if r.chance(0.4) && cheaper > 1 {
                breaks += &format!(" {}:{}", first + self.builds * 2, price(cheaper - 1));
            }
            row.set("breaks", breaks);
        }
        if r.chance(0.25) {
            let stock = match r.below(10) {
                0 => 0,
                1..=4 => self.builds,
                5..=7 => self.builds * 2,
                _ => self.builds * 2 + self.builds / 2,
            };
            row.set("stock", stock);
        }
        match r.below(20) {
            0 => row.set("status", "withdrawn"),
            1 | 2 => row.set("status", "last-buy"),
            _ => {}
        }
        if !r.chance(0.1) {
            row.set("height_mm", *r.pick(&[20, 25, 30, 40]));
        }
    }

    fn supply(&mut self, cans: u64) -> Value {
        let rails: Vec<Value> = (0..self.asks.len()).map(|rail| self.rail(rail)).collect();
        let r = &mut self.random;
        let mut supply = json!({
            "builds": self.builds,
            "mains": {
                "voltage": format!("{} V", self.mains_v),
                "tolerance": *r.pick(&["6 %", "10 %"]),
                "frequency": if self.mains_v == 120 { "60 Hz" } else { "50 Hz" },
            },
            "ambient": {
                "low": *r.pick(&["-10 degC", "0 degC", "20 degC"]),
                "high": *r.pick(&["30 degC", "40 degC"]),
                "inside_rise": *r.pick(&["0 K", "5 K"]),
            },
            "caps": { "cans": cans },
            "rail": rails,
        });
        if r.chance(0.5) {
            supply["ageing"] = json!({ "life": *r.pick(&["5000 h", "10000 h"]), "esr_rise": 1.5 });
        }
        if r.chance(0.3) {
            supply["margins"] = json!({ "headroom": "0.5 V", "reverse": "20 %", "junction": "5 K" });
        }
        if r.chance(0.15) {
            supply["caps"]["height"] = json!("30 mm");
        }
        if self.asks.len() > 1 {
            supply["share"] = json!("never");
        }
        supply
    }

    fn rail(&mut self, place: usize) -> Value {
        let ask = self.asks[place];
        let r = &mut self.random;
        let sign = if ask.negative { "-" } else { "" };
        let mut rail = json!({
            "name": format!("rail {}", place + 1),
            "voltage": format!("{sign}{} V", ask.out_v),
            "current": format!("{} A", ask.amps),
        });
        if r.chance(0.3) {
            rail["accuracy"] = json!(*r.pick(&["5 %", "6 %"]));
        }
        if r.chance(0.3) {
            rail["ripple"] = json!(*r.pick(&["5 mV", "10 mV", "20 mV"]));
        }
        if r.chance(0.2) {
            rail["dip"] = json!(*r.pick(&["5 ms", "10 ms"]));
        }
        match r.below(8) {
            0 | 1 => rail["paths"] = json!(["bridge", "half-wave"]),
            _ if ask.half_wave => rail["paths"] = json!(["half-wave"]),
            2 => rail["paths"] = json!(["half-wave", "centre-tap"]),
            3 => rail["paths"] = json!(["bridge"]),
            _ => {}
        }
        if r.chance(0.15) {
            rail["devices"] = json!([*r.pick(&["fixed", "adjustable"])]);
        }
        rail
    }
}
