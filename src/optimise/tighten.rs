//! Owns the tighter bound on scores: which feeds of a frame can still take part in a build of at most so much.
//!
//! A frame has one list for each transformer (with one entry) and one for each outlet. The least price of an entry
//! assumes that every other list shares every part of it. But a list that shares a part pays for that: it must take an
//! entry that holds the part, which is dearer than its cheapest. For an entry c of list i and any build with it, let S_p
//! be the lists that share part p with it. Then
//!
//! ```text
//! cost >= sum over p of q_p u(q_p + most that S_p use) + sum over lists j of (min_j + max over shared p of extra_j(p))
//! ```
//!
//! with min_j the least entry of list j and extra_j(p) what its least entry with p costs more. The maximum is at least
//! the mean over the parts that could gain, so each part may be charged its share and the best S_p found part by part.
//! A charge on heat adds the same to an entry whatever the others take, as fitted values do.

use super::view::Ready;
use crate::catalogue::Part;
use crate::screen::{Weights, heat_floor};
use crate::units::Money;

/// Lists beyond which subsets are no longer tried one by one.
const MOST_SUBSET_LISTS: usize = 6;

/// Entries of every list, by place, that a build with a score of at most `most` can still hold, each with its least
/// score given what the others can share. For scores in which cost counts once.
pub(super) fn tighten(
    lists: &[&[Ready]],
    kept: Vec<Vec<(usize, i64)>>,
    parts: usize,
    builds: u64,
    weights: Weights,
    most: i64,
) -> Vec<Vec<(usize, i64)>> {
    let mut kept = kept;
    let rails = lists;
    let fixed = |ready: &Ready| ready.fitted.0 + heat_share(ready, weights);
    let floor = |ready: &Ready, list: usize, uses: &[Uses]| floor(ready, list, uses, builds) + fixed(ready);
    let shared_bound =
        |ready: &Ready, list: usize, uses: &[Uses]| shared_bound(ready, list, uses, builds) + fixed(ready);
    loop {
        let before: usize = kept.iter().map(Vec::len).sum();
        let uses: Vec<Uses> = rails
            .iter()
            .zip(&kept)
            .map(|(ready, kept)| Uses::new(ready, kept, parts))
            .collect();
        let floors: Vec<Vec<i64>> = (rails.iter().zip(&kept).enumerate())
            .map(|(i, (ready, kept))| kept.iter().map(|&(place, _)| floor(&ready[place], i, &uses)).collect())
            .collect();
        for (kept, floors) in kept.iter_mut().zip(floors) {
            kept.iter_mut().zip(floors).for_each(|(entry, floor)| entry.1 = floor);
        }
        // The least entry of each list under the sharper floors, and what entries with each part cost more.
        let uses: Vec<Uses> = rails
            .iter()
            .zip(&kept)
            .map(|(ready, kept)| Uses::new(ready, kept, parts))
            .collect();
        for (i, (ready, kept)) in rails.iter().zip(&mut kept).enumerate() {
            let others: i64 = uses
                .iter()
                .enumerate()
                .filter(|&(j, _)| j != i)
                .map(|(_, u)| u.least)
                .sum();
            kept.retain(|&(place, floor)| {
                floor + others <= most && shared_bound(&ready[place], i, &uses) + others <= most
            });
            if kept.is_empty() {
                return vec![Vec::new(); rails.len()];
            }
        }
        if kept.iter().map(Vec::len).sum::<usize>() == before {
            break;
        }
    }
    for kept in &mut kept {
        kept.sort_by_key(|&(place, floor)| (floor, place));
    }
    kept
}

/// What the charge on heat adds to an entry, rounded down.
#[allow(clippy::cast_precision_loss, clippy::cast_possible_truncation)]
pub(super) fn heat_share(ready: &Ready, weights: Weights) -> i64 {
    (weights.heat * heat_floor(ready.heat_w) as f64).floor() as i64
}

/// What the kept entries of one list use.
struct Uses {
    /// Least floor.
    least: i64,
    /// By part: most pieces, and by how much the least entry with it exceeds the least of all.
    by_part: Vec<(u64, i64)>,
}

impl Uses {
    fn new(ready: &[Ready], kept: &[(usize, i64)], parts: usize) -> Uses {
        let least = kept.iter().map(|&(_, floor)| floor).min().unwrap_or(0);
        let mut by_part = vec![(0, i64::MAX); parts];
        for &(place, floor) in kept {
            for &(part, pieces) in &ready[place].lines {
                let (most, extra) = &mut by_part[part.id.0 as usize];
                *most = pieces.max(*most);
                *extra = (floor - least).min(*extra);
            }
        }
        Uses { least, by_part }
    }
}

/// Price of an entry when every other list shares all that it can.
fn floor(ready: &Ready, rail: usize, uses: &[Uses], builds: u64) -> i64 {
    let others = |part: &Part| -> u64 {
        let id = part.id.0 as usize;
        uses.iter()
            .enumerate()
            .filter(|&(j, _)| j != rail)
            .map(|(_, u)| u.by_part[id].0)
            .sum()
    };
    let parts: Money = ready
        .lines
        .iter()
        .map(|&(part, q)| part.least_cost(q, (q + others(part)) * builds))
        .sum();
    parts.0
}

/// A part of an entry that gets cheaper when others share it.
struct Gaining<'c> {
    part: &'c Part,
    pieces: u64,
    /// Cost when nobody shares it.
    own: Money,
    /// The lists that can share it, as (pieces, extra).
    sharing: Vec<(u64, i64)>,
}

/// Price of an entry when sharing is charged for; see the module head.
fn shared_bound(ready: &Ready, rail: usize, uses: &[Uses], builds: u64) -> i64 {
    let mut alone = Money(0);
    let mut gaining: Vec<Gaining> = Vec::new();
    for &(part, pieces) in &ready.lines {
        let own = part.least_cost(pieces, pieces * builds);
        alone = alone + own;
        let id = part.id.0 as usize;
        let sharing: Vec<(u64, i64)> = (uses.iter().enumerate())
            .filter(|&(j, u)| j != rail && u.by_part[id].0 > 0)
            .map(|(_, u)| u.by_part[id])
            .collect();
        let all: u64 = sharing.iter().map(|&(most, _)| most).sum();
        if part.least_cost(pieces, (pieces + all) * builds) < own {
            gaining.push(Gaining {
                part,
                pieces,
                own,
                sharing,
            });
        }
    }
    let share = i64::try_from(gaining.len()).unwrap_or(1).max(1);
    alone.0 - gaining.iter().map(|part| part.most_gain(share, builds)).sum::<i64>()
}

impl Gaining<'_> {
    /// The most that sharing this part can save, each list charged 1/`share` of what it pays for it (rounded down,
    /// which only lets more through).
    fn most_gain(&self, share: i64, builds: u64) -> i64 {
        let gain = |more: u64, charged: i64| {
            self.own.0 - self.part.least_cost(self.pieces, (self.pieces + more) * builds).0 - charged
        };
        if self.sharing.len() > MOST_SUBSET_LISTS {
            // Whoever shares, at least one list pays, and no more pieces than all of them can join.
            let least = self.sharing.iter().map(|&(_, extra)| extra / share).min().unwrap_or(0);
            return gain(self.sharing.iter().map(|&(most, _)| most).sum(), least).max(0);
        }
        let subset = |set: u32| {
            let within = self.sharing.iter().enumerate().filter(|&(k, _)| set & (1 << k) != 0);
            let (more, charged) = within.fold((0, 0), |(more, charged), (_, &(most, extra))| {
                (more + most, charged + extra / share)
            });
            gain(more, charged)
        };
        (0..1_u32 << self.sharing.len()).map(subset).max().unwrap_or(0)
    }
}
