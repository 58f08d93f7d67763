//! Owns the columns of each rail that came of its walk so far.

use std::collections::BTreeMap;

use super::Question;
use super::best::Bill;
use crate::audit::Site;
use crate::catalogue::Part;
use crate::screen::{Column, Counts, FloorPrices, Must, Reach, Shelf, Stop, Walk};

/// Two columns with the same lines whose heats differ by more than this never tie in whole microwatts.
const NEVER_TIES_W: f64 = 1.5e-6;

/// A column ready to be combined.
pub(super) struct Ready<'c> {
    pub(super) column: Column<'c>,
    /// Lower bound of its share of any build's key, by the objective.
    pub(super) key: (i64, i64),
    pub(super) heat_w: f64,
    pub(super) lines: Vec<(&'c Part, u64)>,
}

/// One rail: its walk and the columns that came of it so far, in the order of their keys.
pub(super) struct RailColumns<'s, 'c> {
    pub(super) walk: Walk<'s, 'c>,
    pub(super) ready: Vec<Ready<'c>>,
    /// Least heat by lines: of equal lines only the coolest can matter.
    coolest: BTreeMap<Bill, f64>,
}

impl<'s, 'c> RailColumns<'s, 'c> {
    /// Starts the walks of all rails.
    pub(super) fn start(site: &'s Site<'c>, question: &Question<'c>, must: &Must, counts: &mut Counts) -> Vec<Self> {
        let reaches: Vec<Reach<'c>> = (0..question.supply.rails.len())
            .map(|rail| Reach::new(site, Shelf::new(site, question.catalogue, rail, must)))
            .collect();
        let most: Vec<Vec<u64>> = reaches
            .iter()
            .map(|r| r.most_pieces(site, question.catalogue))
            .collect();
        (reaches.into_iter().enumerate())
            .map(|(rail, reach)| {
                let prices = FloorPrices::new(question.supply.builds, elsewhere(&most, rail));
                RailColumns {
                    walk: Walk::new(site, reach, question.objective, prices, counts),
                    ready: Vec::new(),
                    coolest: BTreeMap::new(),
                }
            })
            .collect()
    }

    /// Asks the walk for the next column up to `most`; false when there is none or it was told to stop.
    pub(super) fn one_more(&mut self, most: i64, stop: &Stop, counts: &mut Counts) -> bool {
        while let Some((column, key)) = self.walk.next(most, stop, counts) {
            let lines = column.lines();
            let heat_w = column.heat_w();
            let bill: Bill = lines.iter().map(|&(part, pieces)| (part.id, pieces)).collect();
            let coolest = self.coolest.entry(bill).or_insert(f64::INFINITY);
            if heat_w <= *coolest + NEVER_TIES_W {
                *coolest = coolest.min(heat_w);
                self.ready.push(Ready {
                    column,
                    key,
                    heat_w,
                    lines,
                });
                return true;
            }
        }
        false
    }

    /// All columns up to `most`.
    pub(super) fn extend(&mut self, most: i64, stop: &Stop, counts: &mut Counts) {
        while self.one_more(most, stop, counts) {}
    }
}

/// By part: the pieces that all rails but this one use at most.
fn elsewhere(most: &[Vec<u64>], rail: usize) -> Vec<u64> {
    let others = || {
        most.iter()
            .enumerate()
            .filter(|&(other, _)| other != rail)
            .map(|(_, most)| most)
    };
    (0..most[rail].len())
        .map(|part| others().map(|most| most[part]).sum())
        .collect()
}

/// Every column of every rail, unpruned: for the second opinion on small catalogues.
#[must_use]
pub fn columns_of<'c>(question: &Question<'c>) -> Vec<Vec<Column<'c>>> {
    let site = Site::new(question.supply);
    let must = Must {
        without: question.without.clone(),
        named: question.with.iter().map(|&(part, _)| part).collect(),
        in_rail: Vec::new(),
    };
    let mut counts = Counts::default();
    let mut rails = RailColumns::start(&site, question, &must, &mut counts);
    for rail in &mut rails {
        rail.extend(i64::MAX, &question.stop, &mut counts);
    }
    rails
        .into_iter()
        .map(|rail| rail.ready.into_iter().map(|r| r.column).collect())
        .collect()
}
