//! Owns the requirements that may give: the one table of them, and for each the values that it may take, nearest first.

use super::ladder::Ladder;
use crate::catalogue::{Catalogue, Part, PartId};
use crate::supply::{self, Supply, stated};
use crate::units::number_and_unit;

/// Which way a requirement gives.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Way {
    Up,
    Down,
}
use Way::{Down, Up};

/// What lies between the requirement and the far end of its range.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Shape {
    /// What holds at one value holds at all that ask for less.
    Straight,
    /// Mostly so; but cooler copper and a lighter load raise currents and voltages a little.
    Wavy,
    /// As straight, but its far end takes long to solve: not one to try with others.
    Slow,
    /// Fewer units need less stock, and each of them costs more.
    Run,
}

/// A row of the table: key ("rail.*" stands for every rail), way, shape.
type Row = (&'static str, Way, Shape);

/// Every requirement that may give, but for stock. The reader of the supply says how far: to the end of the key's
/// range, and mains.low to the nominal voltage, ambient.high to ambient.low, a rail's current to what it takes idle.
/// Cans and currents end before: see [`MOST_CANS`], [`LEAST_CURRENT`].
const ROWS: &[Row] = &[
    ("ambient.high", Down, Shape::Wavy),
    ("mains.low", Up, Shape::Straight),
    ("margins.headroom", Down, Shape::Straight),
    ("margins.reservoir", Down, Shape::Straight),
    ("margins.reverse", Down, Shape::Straight),
    ("margins.junction", Down, Shape::Straight),
    ("ageing.capacitance_loss", Down, Shape::Straight),
    ("ageing.esr_rise", Down, Shape::Straight),
    ("ageing.life", Down, Shape::Straight),
    ("caps.cost", Up, Shape::Straight),
    ("caps.heat", Up, Shape::Straight),
    ("caps.height", Up, Shape::Straight),
    ("caps.cans", Up, Shape::Slow),
    ("builds", Down, Shape::Run),
    ("rail.*.ripple", Up, Shape::Straight),
    ("rail.*.current", Down, Shape::Wavy),
    ("rail.*.accuracy", Up, Shape::Straight),
    ("rail.*.dip", Down, Shape::Straight),
];

/// No more than so many times the cans that were asked for: nobody puts more in parallel for want of a better one, and
/// each one more is one more bank of every can to look at.
const MOST_CANS: f64 = 4.0;
/// No less than this share of a rail's current: a rail that takes less is another rail.
const LEAST_CURRENT: f64 = 1e-3;

/// What a lever moves.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) enum Moves {
    /// A key of the supply.
    Key(String),
    /// The stock of a part.
    Stock(PartId),
}

/// A requirement with the values that it may take. Place 0 is the requirement as it stands, 1 the nearest value of
/// three digits that asks for less, and so on up to the far end.
#[derive(Debug, Clone)]
pub(super) struct Lever {
    /// Its name in reports.
    pub(super) requirement: String,
    /// As it stands.
    pub(super) from: String,
    pub(super) moves: Moves,
    pub(super) shape: Shape,
    /// The far end.
    pub(super) last: i64,
    ladder: Ladder,
    unit: String,
    /// Rung of place 1, and whether places go up the ladder.
    first: i64,
    up: bool,
}

/// All keys that may give, in the order of the table; those that are not asked for or cannot give are left out.
pub(super) fn keys(supply: &Supply) -> Vec<Lever> {
    let mut levers = Vec::new();
    for &(key, way, shape) in ROWS {
        match key.strip_prefix("rail.*.") {
            None => levers.extend(Lever::of_key(supply, key.to_owned(), way, shape)),
            Some(key) => levers.extend(
                (supply.rails.iter())
                    .filter_map(|rail| Lever::of_key(supply, format!("rail.{}.{key}", rail.name), way, shape)),
            ),
        }
    }
    levers
}

impl Lever {
    fn of_key(supply: &Supply, key: String, way: Way, shape: Shape) -> Option<Lever> {
        let from = stated(supply, &key)?;
        let (value, unit) = number_and_unit(&from)?;
        let ladder = match key.as_str() {
            "builds" | "caps.cans" => Ladder::WHOLE,
            _ => Ladder::around(value),
        };
        let up = way == Up;
        let mut lever = Lever {
            requirement: key.clone(),
            unit: unit.to_owned(),
            moves: Moves::Key(key),
            shape,
            last: 0,
            ladder,
            first: ladder.next(value, up),
            up,
            from,
        };
        // The farthest place that the reader takes: out in doubling steps, then between the last two.
        let taken = |place: i64| {
            let reached = lever.ladder.value(lever.rung(place)) / value;
            let sensible = match shape {
                Shape::Slow => reached <= MOST_CANS,
                Shape::Wavy if lever.requirement.ends_with(".current") => reached >= LEAST_CURRENT,
                _ => true,
            };
            sensible && lever.supply(supply, place).is_some()
        };
        let (mut known, mut step) = (0, 1);
        while taken(known + step) {
            known += step;
            step *= 2;
        }
        while step > 1 {
            step /= 2;
            if taken(known + step) {
                known += step;
            }
        }
        lever.last = known;
        (lever.last > 0).then_some(lever)
    }

    /// The stock of a part, up to so many pieces or a little above.
    #[allow(clippy::cast_precision_loss)] // both below 2^53
    pub(super) fn of_stock(part: &Part, stock: u64, most: u64) -> Lever {
        let ladder = Ladder::WHOLE;
        let first = ladder.next(stock as f64, true);
        Lever {
            requirement: format!("stock.{}", part.name),
            from: stock.to_string(),
            moves: Moves::Stock(part.id),
            shape: Shape::Straight,
            last: (ladder.next(most as f64, true) - first + 1).max(1),
            ladder,
            unit: String::new(),
            first,
            up: true,
        }
    }

    /// The requirement at a place, as in the supply file.
    pub(super) fn text(&self, place: i64) -> String {
        let number = self.ladder.text(self.rung(place));
        if self.unit.is_empty() {
            number
        } else {
            format!("{number} {}", self.unit)
        }
    }

    /// The number at a place of a whole-numbered lever.
    #[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)] // whole, and not below zero
    pub(super) fn count(&self, place: i64) -> u64 {
        self.ladder.value(self.rung(place)) as u64
    }

    /// The nearest place at which a whole number is at most `most`.
    #[allow(clippy::cast_precision_loss)] // below 2^53
    pub(super) fn place_below(&self, most: u64) -> i64 {
        self.first - self.ladder.next(most as f64 + 0.5, false) + 1
    }

    fn rung(&self, place: i64) -> i64 {
        let out = place - 1;
        self.first + if self.up { out } else { -out }
    }

    /// The supply with this lever at a place; `None` where the reader does not take it.
    pub(super) fn supply(&self, supply: &Supply, place: i64) -> Option<Supply> {
        changed(supply, &[(self, place)])
    }
}

/// The supply with levers at places, but for their stocks; `None` where the reader does not take one of them.
pub(super) fn changed(supply: &Supply, moved: &[(&Lever, i64)]) -> Option<Supply> {
    let setting = |(lever, place): &(&Lever, i64)| match &lever.moves {
        Moves::Key(key) => Some(format!("{key}={}", lever.text(*place))),
        Moves::Stock(_) => None,
    };
    supply::changed(supply, &moved.iter().filter_map(setting).collect::<Vec<_>>()).ok()
}

/// A catalogue with other stocks.
pub(super) fn restocked(catalogue: &Catalogue, stock: impl Fn(&Part) -> Option<u64>) -> Catalogue {
    let mut catalogue = catalogue.clone();
    for part in catalogue.parts_mut() {
        part.stock = stock(part);
    }
    catalogue
}
