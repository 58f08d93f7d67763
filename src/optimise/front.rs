//! Owns the trade-off curve: every (cost, heat) that no feasible build betters in one without losing in the other.
//!
//! Between two builds of the curve all others lie below the corner that they make. First the line between both is
//! followed down: the build with the least cost + l heat, l the slope, is on the curve too, and parts the rest in two.
//! Where there is none below the line, everything up to the corners of what is found is searched by the same score; a
//! corner shrinks with every build found. What no search can reach any more is proved.

use std::collections::BTreeMap;

use super::best::{Bill, Found, Key, Wanted};
use super::combine::slack;
use super::search::{End, Ground, Search};
use super::{Best, Disagreement, Outcome, Proof, Question, judge, must, placements, search};
use crate::audit::Site;
use crate::build::Build;
use crate::screen::{Counts, Objective, Weights};

/// A search by new weights costs more than the corners that it spares where the lowest build lies less than this share of
/// the score below the line.
const WORTH_PARTING: f64 = 200.0;

/// The builds of the curve so far, by cost; heats fall.
#[derive(Default)]
struct Curve<'c>(BTreeMap<i64, Found<'c>>);

impl<'c> Curve<'c> {
    /// Whether some build is as cheap and as cool, and better in one.
    fn dominates(&self, cost: i64, heat: i64) -> bool {
        // The last of those that are not dearer is the coolest of them.
        let Some((&least, found)) = self.0.range(..=cost).next_back() else {
            return false;
        };
        found.key.heat < heat || (found.key.heat == heat && least < cost)
    }

    fn offer(&mut self, found: Found<'c>) {
        let (cost, heat) = (found.key.cost, found.key.heat);
        if self.dominates(cost, heat) {
            return;
        }
        if let Some(old) = self.0.get(&cost)
            && old.key.heat == heat
            && old.key.text <= found.key.text
        {
            return;
        }
        self.0.retain(|&c, old| c < cost || old.key.heat < heat);
        self.0.insert(cost, found);
    }
}

/// The least score, everything feasible on the way going to the curve.
struct Line<'w, 'c> {
    curve: &'w mut Curve<'c>,
    weights: Weights,
    least: f64,
}

impl<'c> Wanted<'c> for Line<'_, 'c> {
    fn limit(&self) -> f64 {
        self.least
    }

    fn beyond(&self, _cost: i64, _heat: i64, _score: f64) -> bool {
        false
    }

    fn offer(&mut self, _bill: Bill, cost: i64, heat: i64, build: &mut dyn FnMut() -> Build<'c>) {
        let score = self.weights.score(cost, heat);
        if score < self.least {
            self.least = score;
        }
        if !self.curve.dominates(cost, heat) {
            self.curve.offer(found(cost, heat, build()));
        }
    }
}

fn found(cost: i64, heat: i64, build: Build) -> Found {
    let text = build.text();
    Found {
        key: Key { cost, heat, text },
        build,
    }
}

/// Everything of the curve between two of its builds.
struct Window<'w, 'c> {
    curve: &'w mut Curve<'c>,
    weights: Weights,
    /// Most cost and most heat.
    most: (i64, i64),
    /// Corners between neighbours, and the builds themselves: one with the same cost and heat may come before it by its
    /// text. What lies below one of them may be of interest. By cost; kept up as builds are found.
    corners: Vec<(i64, i64, f64)>,
    /// Score of the highest.
    limit: f64,
}

impl<'w, 'c> Window<'w, 'c> {
    fn new(curve: &'w mut Curve<'c>, weights: Weights, most: (i64, i64)) -> Self {
        let mut window = Window {
            curve,
            weights,
            most,
            corners: Vec::new(),
            limit: f64::NEG_INFINITY,
        };
        window.renew();
        window
    }

    fn renew(&mut self) {
        let within = self
            .curve
            .0
            .values()
            .filter(|f| f.key.cost <= self.most.0 && f.key.heat <= self.most.1);
        let keys: Vec<(i64, i64)> = within.map(|f| (f.key.cost, f.key.heat)).collect();
        let between = keys.windows(2).map(|two| (two[1].0 - 1, two[0].1 - 1));
        let mut corners: Vec<(i64, i64)> = keys.iter().copied().chain(between).collect();
        corners.sort_by_key(|&(cost, heat)| (cost, std::cmp::Reverse(heat)));
        let scored = |(cost, heat)| (cost, heat, self.weights.score(cost, heat));
        self.corners = corners.into_iter().map(scored).collect();
        self.limit = self
            .corners
            .iter()
            .map(|&(.., score)| score)
            .fold(f64::NEG_INFINITY, f64::max);
    }
}

impl<'c> Wanted<'c> for Window<'_, 'c> {
    fn limit(&self) -> f64 {
        self.limit
    }

    fn beyond(&self, cost: i64, heat: i64, score: f64) -> bool {
        // As costs rise, heats fall.
        let from = self.corners.partition_point(|&(c, ..)| c < cost);
        let to = self.corners.partition_point(|&(_, h, _)| h >= heat);
        from >= to || !self.corners[from..to].iter().any(|&(.., s)| s + slack(s) >= score)
    }

    fn offer(&mut self, _bill: Bill, cost: i64, heat: i64, build: &mut dyn FnMut() -> Build<'c>) {
        if !self.beyond(cost, heat, self.weights.score(cost, heat)) {
            self.curve.offer(found(cost, heat, build()));
            self.renew();
        }
    }
}

/// All (cost, heat) pairs that no feasible build dominates, one build each, cheapest first. The objective of the
/// question plays no part.
///
/// # Errors
/// When the audit rejects a build that the search found: a bug to report.
pub fn front<'c>(question: &Question<'c>) -> Result<Outcome<'c>, Disagreement> {
    let mut curve = Curve::default();
    let mut counts = Counts::default();
    let mut whole = true;
    let site = Site::new(question.supply).with_tightness(question.tightness);
    for in_rail in placements(question) {
        let ground = Ground::new(&site, question.catalogue, &must(question, in_rail));
        whole &= on_ground(&ground, question, &mut curve, &mut counts);
    }
    let builds: Vec<Found<'c>> = curve.0.into_values().collect();
    for found in &builds {
        judge(question.supply, &found.build)?;
    }
    let proof = if whole { Proof::Proved } else { Proof::Open { bound: 0 } };
    Ok(Outcome { builds, proof, counts })
}

/// Adds what one ground has to the curve; whether it is complete.
fn on_ground<'c>(ground: &Ground<'_, 'c>, question: &Question<'c>, curve: &mut Curve<'c>, counts: &mut Counts) -> bool {
    let mut ends = Vec::new();
    for objective in [Objective::Cost, Objective::Heat] {
        let question = Question {
            objective,
            top: 1,
            most: None,
            ..question.clone()
        };
        let mut best = Best::new(objective, 1, super::ceiling(&question));
        if search(ground, &question, &mut best, counts).is_some() {
            return false;
        }
        let Some(end) = best.into_builds().pop() else {
            return true;
        };
        ends.push((end.key.cost, end.key.heat));
        curve.offer(end);
    }
    let mut open = vec![(ends[0], ends[1])];
    let mut search: Option<Search<'_, 'c>> = None;
    while let Some((left, right)) = open.pop() {
        if left.0 >= right.0 || left.1 <= right.1 {
            continue;
        }
        #[allow(clippy::cast_precision_loss)]
        let heat = (right.0 - left.0) as f64 / (left.1 - right.1) as f64;
        let weights = Weights { cost: 1.0, heat };
        let line = weights.score(left.0, left.1);
        let search = match &mut search {
            Some(search) => {
                search.go_by(weights, counts);
                search
            }
            None => search.insert(Search::start(ground, question, weights, true, counts)),
        };
        let mut wanted = Line {
            curve,
            weights,
            least: line,
        };
        if let End::Stopped { .. } = search.run(&mut wanted, counts) {
            return false;
        }
        if wanted.least < line - line / WORTH_PARTING {
            // Of the builds on the lowest line any parts the rest.
            let lowest = |f: &&Found| weights.score(f.key.cost, f.key.heat) <= wanted.least + slack(line);
            let between = |f: &&Found| f.key.cost > left.0 && f.key.cost < right.0;
            let point = curve
                .0
                .values()
                .filter(between)
                .find(lowest)
                .map(|f| (f.key.cost, f.key.heat));
            if let Some(point) = point {
                open.push((point, right));
                open.push((left, point));
                continue;
            }
        }
        let mut window = Window::new(curve, weights, (right.0, left.1));
        if let End::Stopped { .. } = search.run(&mut window, counts) {
            return false;
        }
    }
    true
}
