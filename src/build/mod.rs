//! Owns a build: the full choice of parts for a supply, what may be connected to what, and what it costs.
//!
//! Invariant: says nothing about whether a build holds; that is the audit's alone.

mod distance;
mod hookup;
mod misfits;
mod rules;
mod sharing;

use std::collections::BTreeMap;

pub use distance::{Change, Place, changes, distance, places, wiring};
pub use hookup::{Hookup, HookupKind, Windings, hookups, windings};
pub use misfits::{Misfit, misfits};
pub use rules::{device_serves, diodes_in_path, pieces_of_rectifier, sink_takes};
pub use sharing::{may_pair, may_share};

use crate::catalogue::{Part, PartId, PassDevice, Rectifier, Reservoir, Sink, Transformer};
use crate::supply::{Path, Supply};
use crate::units::Money;

/// A transformer of the build.
#[derive(Debug, Clone, PartialEq)]
pub struct Instance<'c> {
    /// "T1", "T2", ...
    pub id: String,
    /// Which part it is.
    pub part: &'c Transformer,
}

/// Winding hook-up, rectifier and reservoir.
#[derive(Debug, Clone, PartialEq)]
pub struct Section<'c> {
    /// "A", "B", ...
    pub id: String,
    /// Place in [`Build::transformers`].
    pub transformer: usize,
    /// How the secondaries serve it.
    pub hookup: Hookup,
    /// Rectifier circuit.
    pub path: Path,
    /// Place in [`Build::sections`] of the other polarity of a dual pair. Secondaries, the rectifier's pieces and its
    /// sink stand on the positive one; the negative one names the same rectifier.
    pub pair: Option<usize>,
    /// Module or diode.
    pub rectifier: &'c Rectifier,
    /// Its sink, or free-standing.
    pub rectifier_sink: Option<&'c Sink>,
    /// Capacitor.
    pub reservoir: &'c Reservoir,
    /// Capacitors in parallel.
    pub cans: u32,
    /// Places in the supply's rails.
    pub rails: Vec<usize>,
}

/// What one rail takes from its section, and with which device.
#[derive(Debug, Clone, PartialEq)]
pub struct RailChoice<'c> {
    /// Place in [`Build::sections`].
    pub section: usize,
    /// Pass device.
    pub pass: &'c PassDevice,
    /// Its sink, or free-standing.
    pub sink: Option<&'c Sink>,
}

/// A full choice of parts for a supply; `rails` run parallel to the supply's rails.
#[derive(Debug, Clone, PartialEq)]
pub struct Build<'c> {
    /// In the order of their first rail.
    pub transformers: Vec<Instance<'c>>,
    /// In the order of their first rail.
    pub sections: Vec<Section<'c>>,
    /// One for each rail of the supply.
    pub rails: Vec<RailChoice<'c>>,
}

/// One line of the bill of materials, per unit built.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Line<'c> {
    /// Which part.
    pub part: &'c Part,
    /// Pieces per unit built.
    pub qty: u64,
    /// Price of one piece when the whole run is bought at once.
    pub unit_price: Money,
}

impl Line<'_> {
    /// Per unit built.
    #[must_use]
    pub fn cost(&self) -> Money {
        self.unit_price * self.qty
    }
}

impl Section<'_> {
    /// Whether it is the half of a dual pair that holds nothing of what both share.
    #[must_use]
    pub fn is_negative_half(&self) -> bool {
        self.hookup.secondaries.is_empty()
    }

    /// Pieces of its rectifier; 0 on the negative half of a dual pair.
    #[must_use]
    pub fn rectifier_pieces(&self) -> u64 {
        if self.is_negative_half() {
            0
        } else {
            pieces_of_rectifier(self.rectifier.kind, self.path)
        }
    }

    /// Whether nothing ties it to another rail, so that a positive device can serve a negative rail: it feeds that rail
    /// alone, and is no half of a dual pair, whose centre is common to both.
    #[must_use]
    pub fn floats(&self) -> bool {
        self.rails.len() == 1 && self.path != Path::Dual
    }
}

impl<'c> Build<'c> {
    /// Every use of a part with its pieces; a part may come several times.
    pub fn uses(&self) -> impl Iterator<Item = (&'c Part, u64)> {
        let transformers = self.transformers.iter().map(|t| (&t.part.part, 1));
        let sections = self.sections.iter().flat_map(|s| {
            [
                Some((&s.rectifier.part, s.rectifier_pieces())).filter(|&(_, pieces)| pieces > 0),
                s.rectifier_sink.map(|sink| (&sink.part, 1)),
                Some((&s.reservoir.part, u64::from(s.cans))),
            ]
        });
        let rails = self
            .rails
            .iter()
            .flat_map(|r| [Some((&r.pass.part, 1)), r.sink.map(|sink| (&sink.part, 1))]);
        transformers.chain(sections.flatten()).chain(rails.flatten())
    }

    /// The bill of materials in slot order, then by part; prices for the whole run.
    #[must_use]
    pub fn lines(&self, supply: &Supply) -> Vec<Line<'c>> {
        let mut pieces: BTreeMap<PartId, (&'c Part, u64)> = BTreeMap::new();
        for (part, qty) in self.uses() {
            pieces.entry(part.id).or_insert((part, 0)).1 += qty;
        }
        pieces
            .into_values()
            .map(|(part, qty)| Line {
                part,
                qty,
                unit_price: part.unit_price(qty * supply.builds),
            })
            .collect()
    }

    /// Price of the fitted values of its devices, per unit built.
    #[must_use]
    pub fn fitted_cost(&self) -> Money {
        self.rails.iter().map(|r| r.pass.fitted_price).sum()
    }

    /// Cost per unit built.
    #[must_use]
    pub fn cost(&self, supply: &Supply) -> Money {
        self.lines(supply).iter().map(Line::cost).sum::<Money>() + self.fitted_cost()
    }

    /// The last tie-break: the choice written out, compared as bytes. Fields are parted by the lowest byte, so that a
    /// short name sorts before its continuation.
    #[must_use]
    pub fn text(&self) -> String {
        let mut fields: Vec<String> = Vec::new();
        for rail in &self.rails {
            fields.push(self.rail_text(rail));
        }
        for rail in &self.rails {
            let section = &self.sections[rail.section];
            fields.push(format!("{}\0{}", section.id, self.transformers[section.transformer].id));
        }
        fields.join("\0")
    }

    fn rail_text(&self, rail: &RailChoice<'c>) -> String {
        let section = &self.sections[rail.section];
        let name = |sink: Option<&'c Sink>| sink.map_or("", |s| s.part.name.as_str());
        let places: Vec<String> = section.hookup.secondaries.iter().map(ToString::to_string).collect();
        [
            &self.transformers[section.transformer].part.part.name,
            &places.join(","),
            section.hookup.kind.word(),
            section.path.word(),
            &section.rectifier.part.name,
            name(section.rectifier_sink),
            &section.reservoir.part.name,
            &format!("{:03}", section.cans),
            &rail.pass.part.name,
            name(rail.sink),
        ]
        .join("\0")
    }
}

/// Section ids in order: A, B, ..., Z, AA, AB, ...
#[must_use]
pub fn section_id(place: usize) -> String {
    let letter = char::from(b'A' + u8::try_from(place % 26).unwrap_or(0));
    if place < 26 {
        letter.to_string()
    } else {
        format!("{}{letter}", section_id(place / 26 - 1))
    }
}

/// Transformer ids in order: T1, T2, ...
#[must_use]
pub fn transformer_id(place: usize) -> String {
    format!("T{}", place + 1)
}
