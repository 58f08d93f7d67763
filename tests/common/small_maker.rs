//! Draws the rows and keys of a small case.
#![allow(dead_code)]

use std::collections::BTreeSet;

use binrail::catalogue::Slot;
use serde_json::{Value, json};

use crate::common::Random;
use crate::small_case::{Case, Kind, Row};
use crate::small_parts::{Ask, VOLTS, shared_transformer};

/// A case as it comes.
pub fn draw(seed: u64, random: &mut Random, rails: usize, kind: Kind) -> Case {
    let mut maker = Maker::new(random, rails, kind);
    let (sizes, copies, cans) = maker.sizes();
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

struct Maker<'r> {
    random: &'r mut Random,
    kind: Kind,
    builds: u64,
    mains_v: u32,
    /// One for each rail.
    asks: Vec<Ask>,
    /// Rails that are written like an earlier one.
    like: Vec<Option<usize>>,
    names: BTreeSet<String>,
    rows: Vec<Row>,
}

impl<'r> Maker<'r> {
    fn new(random: &'r mut Random, rails: usize, kind: Kind) -> Maker<'r> {
        let (mut asks, mut like): (Vec<Ask>, Vec<Option<usize>>) = (Vec::new(), Vec::new());
        for rail in 0..rails {
            let copied = rail > 0 && random.chance(0.12);
            like.push(copied.then(|| random.below(rail)));
            asks.push(match like[rail] {
                Some(other) => asks[other],
                None => ask(random, asks.first(), kind),
            });
        }
        if let (Kind::Dual | Kind::Floating, true) = (kind, rails > 1) {
            let negative = random.below(2);
            like[1] = None;
            asks[1].negative = negative == 1;
            asks[0].negative = negative == 0;
            if kind == Kind::Floating {
                asks[negative].floating = true;
            } else if random.chance(0.8) {
                asks[1].out_v = asks[0].out_v;
            }
        } else if kind == Kind::Floating {
            (asks[0].negative, asks[0].floating) = (true, true);
        }
        if let (Kind::Isolated | Kind::Pinned, true) = (kind, rails > 1) {
            asks[1].negative = asks[0].negative;
        }
        Maker {
            builds: *random.pick(&[1, 1, 7, 50]),
            mains_v: *random.pick(&[230, 230, 120]),
            random,
            kind,
            asks,
            like,
            names: BTreeSet::new(),
            rows: Vec::new(),
        }
    }

    /// Rows of each slot, copies of rows, most cans.
    fn sizes(&mut self) -> ([usize; 5], usize, u64) {
        let r = &mut self.random;
        match self.asks.len() {
            1 => (
                [3, 3, 2 + r.below(2), 3, 2 + r.below(2)],
                r.below(3),
                2 + r.below(2) as u64,
            ),
            2 => ([2 + r.below(2), 2, 1 + r.below(2), 3, 1 + r.below(2)], r.below(3), 2),
            _ => (
                [2 + r.below(2), 1 + r.below(2), 1 + r.below(2), 3, 1],
                r.below(2),
                1 + r.below(2) as u64,
            ),
        }
    }

    /// What the next part is made for: the rails in turn, then any; in front of a device now and then what several
    /// rails of one sign take together.
    fn ask(&mut self, slot: Slot) -> Ask {
        let made = self.rows.iter().filter(|row| row.slot == slot).count();
        let any = self.random.below(self.asks.len());
        let one = *self.asks.get(made).unwrap_or(&self.asks[any]);
        if matches!(slot, Slot::Pass | Slot::Sink) || !self.random.chance(0.6) {
            return one;
        }
        let with: Vec<Ask> = (self.asks.iter().copied())
            .filter(|ask| ask.negative == one.negative)
            .collect();
        Ask::joined(&with)
    }

    /// Sections that a shared transformer may feed: rails one by one, or those of one sign together.
    fn sections(&mut self) -> Vec<Ask> {
        let mut sections: Vec<Ask> = Vec::new();
        let apart = self.random.chance(0.5);
        for &ask in &self.asks {
            match sections.iter_mut().find(|s| s.negative == ask.negative) {
                Some(same) if !apart => *same = Ask::joined(&[*same, ask]),
                _ => sections.push(ask),
            }
        }
        sections
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
        let shared = if self.kind == Kind::Dual { 0.75 } else { 0.5 };
        let (cells, tenths) = if slot == Slot::Transformer && self.asks.len() > 1 && self.random.chance(shared) {
            let sections = self.sections();
            let cells = shared_transformer(self.random, &sections, self.mains_v);
            (cells, 22 + self.random.below(16))
        } else {
            let ask = self.ask(slot);
            ask.part(self.random, slot, self.mains_v)
        };
        let name = self.name(slot);
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
        let mut rails: Vec<Value> = Vec::new();
        for place in 0..self.asks.len() {
            let mut rail = match self.like[place] {
                Some(other) => rails[other].clone(),
                None => self.rail(place),
            };
            rail["name"] = json!(["main", "bias", "aux"][place]);
            rails.push(rail);
        }
        let several = self.asks.len() > 1;
        let never = several && self.kind == Kind::Any && self.random.chance(0.12);
        if several && !never {
            self.who_shares(&mut rails);
        }
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
        if never {
            supply["share"] = json!("never");
        }
        supply
    }

    /// Isolated rails and section names, such as the reader takes.
    fn who_shares(&mut self, rails: &mut [Value]) {
        let (kind, r) = (self.kind, &mut *self.random);
        let isolated = match kind {
            Kind::Isolated => true,
            Kind::Any => r.chance(0.12),
            _ => false,
        };
        if isolated {
            let most = if kind == Kind::Isolated { 2 } else { rails.len() };
            rails[r.below(most)]["isolated"] = json!(true);
        }
        let pinned = match kind {
            Kind::Pinned => true,
            Kind::Any => r.chance(0.15),
            _ => false,
        };
        if !pinned {
            return;
        }
        let names: &[&str] = if r.chance(0.6) {
            &["S", "S", "S"]
        } else {
            &["S", "R", "S"]
        };
        for place in 0..rails.len() {
            let clash = |&other: &usize| {
                rails[other]["section"] == names[place]
                    && (self.asks[other].negative != self.asks[place].negative
                        || rails[other]["isolated"] == true
                        || rails[place]["isolated"] == true)
            };
            if (0..place).any(|other| clash(&other)) || place > 1 && r.chance(0.5) {
                continue;
            }
            rails[place]["section"] = json!(names[place]);
        }
    }

    fn rail(&mut self, place: usize) -> Value {
        let ask = self.asks[place];
        let r = &mut self.random;
        let sign = if ask.negative { "-" } else { "" };
        let mut rail = json!({
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
        if r.chance(0.2) {
            rail["idle"] = json!(format!("{} A", ask.amps / 2.0));
        }
        match r.below(9) {
            0 | 1 => rail["paths"] = json!(["bridge", "half-wave"]),
            _ if ask.half_wave => rail["paths"] = json!(["half-wave"]),
            2 => rail["paths"] = json!(["half-wave", "centre-tap", "dual"]),
            3 => rail["paths"] = json!(["bridge"]),
            4 => rail["paths"] = json!(["dual", "bridge"]),
            _ => {}
        }
        if self.kind == Kind::Dual && place < 2 {
            match r.below(3) {
                0 => rail["paths"] = json!(["dual"]),
                1 => rail["paths"] = json!(["dual", "centre-tap", "bridge"]),
                _ => {
                    rail.as_object_mut().unwrap().remove("paths");
                }
            }
        }
        if r.chance(0.15) {
            rail["devices"] = json!([*r.pick(&["fixed", "adjustable"])]);
        }
        rail
    }
}

/// A rail, mostly of the first one's voltage or the next to it.
fn ask(random: &mut Random, first: Option<&Ask>, kind: Kind) -> Ask {
    let half_wave = kind != Kind::Dual && random.chance(0.12);
    let amps: &[f64] = if half_wave {
        &[0.1, 0.2]
    } else {
        &[0.2, 0.5, 0.5, 0.8, 1.0]
    };
    let out_v = match first {
        Some(first) if random.chance(0.5) => first.out_v,
        Some(first) if random.chance(0.75) => {
            let place = VOLTS.iter().position(|v| v.to_bits() == first.out_v.to_bits()).unwrap();
            VOLTS[if place > 0 { place - 1 } else { 1 }]
        }
        _ => *random.pick(&VOLTS),
    };
    Ask {
        out_v,
        negative: random.chance(0.3),
        floating: false,
        amps: *random.pick(amps),
        half_wave,
    }
}
