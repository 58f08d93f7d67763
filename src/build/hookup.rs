//! Owns the ways in which a transformer's secondaries serve a section.

use crate::catalogue::Transformer;
use crate::supply::Path;

/// How k equal secondaries are joined.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum HookupKind {
    /// One winding.
    Single,
    /// Voltages add.
    Series,
    /// Currents add.
    Parallel,
    /// Two halves of a full-wave path.
    CentreTap,
    /// Two halves of a positive and a negative section.
    Dual,
}

impl HookupKind {
    /// All kinds.
    pub const ALL: [HookupKind; 5] = [
        HookupKind::Single,
        HookupKind::Series,
        HookupKind::Parallel,
        HookupKind::CentreTap,
        HookupKind::Dual,
    ];

    /// The word for it in files and reports.
    #[must_use]
    pub fn word(self) -> &'static str {
        match self {
            HookupKind::Single => "single",
            HookupKind::Series => "series",
            HookupKind::Parallel => "parallel",
            HookupKind::CentreTap => "centre-tap",
            HookupKind::Dual => "dual",
        }
    }

    /// Whether that path runs on it.
    #[must_use]
    pub fn takes(self, path: Path) -> bool {
        match path {
            Path::CentreTap => self == HookupKind::CentreTap,
            Path::HalfWave | Path::Bridge => {
                matches!(self, HookupKind::Single | HookupKind::Series | HookupKind::Parallel)
            }
            Path::Dual => self == HookupKind::Dual,
        }
    }
}

/// Some of a transformer's secondaries joined to feed one section.
#[derive(Debug, Clone, PartialEq)]
pub struct Hookup {
    /// How they are joined.
    pub kind: HookupKind,
    /// Their places in secondary_v, counted from 1; empty on the negative half of a dual pair, whose positive one holds
    /// them.
    pub secondaries: Vec<usize>,
    /// Rated voltage of the whole, of one half for centre-tap and dual.
    pub volts_v: f64,
    /// Rated current of the whole, of one half for centre-tap and dual.
    pub amps_a: f64,
}

impl Hookup {
    /// The hook-up of these places (counted from 1); `None` when one is not there or none is named. Whether it may be
    /// joined so is for the rules of assembly to say.
    #[must_use]
    pub fn of_places(kind: HookupKind, places: &[usize], transformer: &Transformer) -> Option<Hookup> {
        let there = |&place: &usize| (1..=transformer.secondaries.len()).contains(&place);
        (!places.is_empty() && places.iter().all(there)).then(|| Hookup::new(kind, places, transformer))
    }

    /// What the negative half of a dual pair holds when the positive one is hooked up like this.
    #[must_use]
    pub fn negative_half(&self) -> Hookup {
        Hookup {
            secondaries: Vec::new(),
            ..self.clone()
        }
    }

    /// Whether it joins secondaries of the same ratings and kind as `other` does, all of them equal.
    pub(super) fn is_like(&self, other: &Hookup, transformer: &Transformer) -> bool {
        let at = |place: &usize| &transformer.secondaries[place - 1];
        let same = |a: usize, b: usize| {
            let (a, b) = (at(&a), at(&b));
            #[allow(clippy::float_cmp)] // equal as written
            let equal = a.volts_v == b.volts_v && a.amps_a == b.amps_a;
            equal && a.tapped.is_some() == b.tapped.is_some()
        };
        let mut places = self.secondaries.clone();
        places.sort_unstable();
        places.dedup();
        places.len() == self.secondaries.len()
            && self.secondaries.iter().all(|&place| same(place, other.secondaries[0]))
            && self
                .secondaries
                .iter()
                .all(|&p| at(&p).tapped == at(&self.secondaries[0]).tapped)
    }

    fn new(kind: HookupKind, secondaries: &[usize], transformer: &Transformer) -> Hookup {
        #[allow(clippy::cast_precision_loss)]
        let count = secondaries.len() as f64;
        let one = &transformer.secondaries[secondaries[0] - 1];
        Hookup {
            kind,
            secondaries: secondaries.to_vec(),
            volts_v: if kind == HookupKind::Series {
                one.volts_v * count
            } else {
                one.volts_v
            },
            amps_a: if kind == HookupKind::Parallel {
                one.amps_a * count
            } else {
                one.amps_a
            },
        }
    }
}

/// Every hook-up of a transformer whose secondaries are all free: of equal secondaries the lowest places are taken.
#[must_use]
pub fn hookups(transformer: &Transformer) -> Vec<Hookup> {
    let mut found = Vec::new();
    for Windings { mut places, tapped } in windings(transformer) {
        // A tapped winding stands by itself, and of equal ones the first stands for all.
        if tapped {
            places.truncate(2);
        }
        let group = places;
        found.push(Hookup::new(HookupKind::Single, &group[..1], transformer));
        for count in 2..=group.len() {
            found.push(Hookup::new(HookupKind::Series, &group[..count], transformer));
            // The two halves of a tapped winding are joined for good.
            if !tapped {
                found.push(Hookup::new(HookupKind::Parallel, &group[..count], transformer));
            }
        }
        if group.len() >= 2 {
            found.push(Hookup::new(HookupKind::CentreTap, &group[..2], transformer));
            found.push(Hookup::new(HookupKind::Dual, &group[..2], transformer));
        }
    }
    found
}

/// Equal windings of a transformer, whose places sections take one after the other.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Windings {
    /// Places in secondary_v, rising. An x-0-x winding has two, side by side.
    pub places: Vec<usize>,
    /// Whether they are x-0-x windings, each of which serves one section (or dual pair) only: its halves share a node.
    pub tapped: bool,
}

impl Windings {
    /// Places that a hook-up of so many secondaries uses up.
    #[must_use]
    pub fn used_up(&self, count: usize) -> usize {
        if self.tapped { 2 } else { count }
    }
}

/// The windings of a transformer by what is equal among them, in the order of their first places.
#[must_use]
pub fn windings(transformer: &Transformer) -> Vec<Windings> {
    let mut found: Vec<Windings> = Vec::new();
    for (index, secondary) in transformer.secondaries.iter().enumerate() {
        let alike = found.iter_mut().find(|windings| {
            let first = &transformer.secondaries[windings.places[0] - 1];
            #[allow(clippy::float_cmp)] // equal as written
            let equal = first.volts_v == secondary.volts_v && first.amps_a == secondary.amps_a;
            equal && first.tapped.is_some() == secondary.tapped.is_some()
        });
        match alike {
            Some(windings) => windings.places.push(index + 1),
            None => found.push(Windings {
                places: vec![index + 1],
                tapped: secondary.tapped.is_some(),
            }),
        }
    }
    found
}
