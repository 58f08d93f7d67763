//! Owns the best company of every part as far as it is known.

use crate::audit::{Check, Limit};
use crate::catalogue::PartId;

/// The tightest limit of a build: what speaks most against it, or least for it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Company {
    /// Which limit.
    pub limit: Limit,
    /// Margin as a share of the bound.
    pub tightness: f64,
    /// `None`: a cell is missing.
    pub margin: Option<f64>,
    /// Whether the limit, and with it the whole build, is met.
    pub met: bool,
}

impl Company {
    /// Of a build of which no limit was looked at yet.
    pub(super) const OPEN: Company = Company {
        limit: Limit::Stock,
        tightness: f64::INFINITY,
        margin: None,
        met: true,
    };

    /// With one more limit; of equally tight ones the first in report order stays.
    #[must_use]
    pub(super) fn and(self, check: &Check) -> Company {
        self.or_tighter(Company {
            limit: check.limit,
            tightness: check.tightness(),
            margin: check.margin(),
            met: check.met(),
        })
    }

    /// With several more.
    #[must_use]
    pub(super) fn and_all(self, checks: impl IntoIterator<Item = Check>) -> Company {
        checks.into_iter().fold(self, |tightest, check| tightest.and(&check))
    }

    /// The tighter of two.
    #[must_use]
    #[allow(clippy::float_cmp)] // ties are ties to the last bit
    pub(super) fn or_tighter(self, other: Company) -> Company {
        let (own, its) = (self.tightness, other.tightness);
        if its < own || (its == own && other.limit < self.limit) {
            other
        } else {
            self
        }
    }
}

/// A build of one rail alone, by places in its aisle.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Choice {
    pub(super) source: usize,
    pub(super) bank: usize,
    pub(super) rectifier: usize,
    pub(super) device: usize,
    pub(super) rectifier_sink: Option<usize>,
    pub(super) sink: Option<usize>,
}

/// The one part that a search is for, with the build that its best company is.
#[derive(Debug)]
struct Watch {
    part: PartId,
    choice: Option<Choice>,
}

/// The best so far of every part, and of each rail as if it were one.
pub(super) struct Ledger {
    best: Vec<Option<Company>>,
    /// What a build must exceed to be of interest to the part: the tightness of its best, infinite once that is met.
    need: Vec<f64>,
    parts: usize,
    changes: u64,
    watch: Option<Watch>,
}

impl Ledger {
    pub(super) fn new(parts: usize, rails: usize) -> Ledger {
        Ledger {
            best: vec![None; parts + rails],
            need: vec![f64::NEG_INFINITY; parts + rails],
            parts,
            changes: 0,
            watch: None,
        }
    }

    /// For one part alone: nothing else is of interest, and the build itself is kept.
    pub(super) fn watching(part: PartId, parts: usize, rails: usize) -> Ledger {
        let mut ledger = Ledger::new(parts, rails);
        ledger.need.fill(f64::INFINITY);
        ledger.need[part.0 as usize] = f64::NEG_INFINITY;
        ledger.watch = Some(Watch { part, choice: None });
        ledger
    }

    /// The entry that stands for a rail: its best build of all.
    #[allow(clippy::cast_possible_truncation)] // fewer parts and rails than 2^32
    pub(super) fn rail(&self, rail: usize) -> PartId {
        PartId((self.parts + rail) as u32)
    }

    /// What the least tightness of a build must exceed to be of interest to that part.
    pub(super) fn need(&self, part: PartId) -> f64 {
        self.need[part.0 as usize]
    }

    /// Rises whenever an entry changes.
    pub(super) fn changes(&self) -> u64 {
        self.changes
    }

    /// A build with that part.
    pub(super) fn offer(&mut self, part: PartId, company: Company, choice: Choice) {
        let place = part.0 as usize;
        if company.tightness > self.need[place] {
            self.need[place] = if company.met { f64::INFINITY } else { company.tightness };
            self.best[place] = Some(company);
            self.changes += 1;
            if let Some(watch) = self.watch.as_mut().filter(|watch| watch.part == part) {
                watch.choice = Some(choice);
            }
        }
    }

    /// Whether the best build of a rail is met.
    pub(super) fn passes(&self, rail: usize) -> bool {
        self.best[self.parts + rail].is_some_and(|c| c.met)
    }

    /// What the part that was watched found since the last call: its best company so far, if that became better.
    pub(super) fn watched(&mut self) -> Option<(Company, Choice)> {
        let watch = self.watch.as_mut()?;
        let choice = watch.choice.take()?;
        self.best[watch.part.0 as usize].map(|company| (company, choice))
    }

    /// The best by part: of those which nothing that is still `open`, at best so tight, can better.
    pub(super) fn settled(mut self, open: f64) -> Vec<Option<Company>> {
        self.best.truncate(self.parts);
        for (best, need) in self.best.iter_mut().zip(&self.need) {
            if *need < open {
                *best = None;
            }
        }
        self.best
    }
}
