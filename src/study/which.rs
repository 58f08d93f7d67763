//! Owns which levers help, and how far each must be moved.
//!
//! What asks for less can be tried together: where a supply has no wanted build with many requirements at their far
//! ends, it has none with one of them there. Only groups that have one are looked into, and often the audit of their
//! build says that one lever would have done.

use std::collections::BTreeMap;
use std::collections::BTreeSet;

use super::lever::{Lever, Moves, Shape, changed, keys, restocked};
use super::wish::Answer::{Fails, Holds, Open};
use super::wish::{Answer, Passing, Solved, Wish, written};
use crate::catalogue::{Part, Status};
use crate::optimise::Disagreement;

/// The levers that help, each with its nearest place; and whether none was left open.
pub(super) struct Helping {
    pub(super) levers: Vec<(Lever, Solved)>,
    pub(super) complete: bool,
}

/// Builds that pass by place in the list of levers.
type Starts = BTreeMap<usize, Passing>;

impl Wish<'_, '_> {
    /// Every lever that alone makes the wish come true, in the order of the table, stock last by part.
    pub(super) fn helping(&self) -> Result<Helping, Disagreement> {
        let mut levers = keys(self.question.supply);
        levers.extend(self.stocks());
        let of = |shape: Shape| -> Vec<usize> { (0..levers.len()).filter(|&k| levers[k].shape == shape).collect() };
        let mut starts = Starts::new();
        let mut complete = self.together(&levers, of(Shape::Straight), &mut starts)?;
        complete &= self.waves(&levers, of(Shape::Wavy), &mut starts)?;
        for k in of(Shape::Slow) {
            complete &= self.together(&levers, vec![k], &mut starts)?;
        }
        let mut found = Vec::new();
        for (k, lever) in levers.into_iter().enumerate() {
            let nearest = match (lever.shape, starts.remove(&k)) {
                (Shape::Run, _) => self.smaller_run(&lever)?,
                (_, Some(start)) => self.nearest(&lever, start, 0)?,
                (_, None) => Fails,
            };
            match nearest {
                Holds(solved) => found.push((lever, solved)),
                Fails => {}
                Open => complete = false,
            }
        }
        Ok(Helping {
            levers: found,
            complete,
        })
    }

    /// Parts of which there are fewer than some build could take.
    fn stocks(&self) -> Vec<Lever> {
        let question = self.question;
        let most = self.most_of_a_unit() * question.supply.builds;
        let named = |part: &Part| question.with.iter().any(|&(id, _)| id == part.id);
        let usable =
            |part: &Part| !question.without.contains(&part.id) && (part.status != Status::Withdrawn || named(part));
        (question.catalogue.parts().filter(|part| usable(part)))
            .filter_map(|part| Some((part, part.stock.filter(|&stock| stock < most)?)))
            .map(|(part, stock)| Lever::of_stock(part, stock, most))
            .collect()
    }

    /// No unit takes more pieces of one part: of a section four diodes or all cans, of a rail its two sinks.
    fn most_of_a_unit(&self) -> u64 {
        let supply = self.question.supply;
        supply.rails.len() as u64 * u64::from(supply.caps.cans).max(4)
    }

    /// Finds those levers of a group that help; whether none was left open.
    fn together(&self, levers: &[Lever], mut group: Vec<usize>, starts: &mut Starts) -> Result<bool, Disagreement> {
        if group.is_empty() {
            return Ok(true);
        }
        let places: Vec<(usize, i64)> = group.iter().map(|&k| (k, levers[k].last)).collect();
        let alone = match self.with_all(levers, &places)? {
            Holds(alone) => alone,
            Fails => return Ok(true),
            Open => return Ok(false),
        };
        if alone.is_empty() {
            // Its build needs several: what helps alone, if anything does, is in one half or in both.
            let upper = group.split_off(group.len() / 2);
            let lower = self.together(levers, group, starts)?;
            return Ok(self.together(levers, upper, starts)? && lower);
        }
        group.retain(|k| !alone.contains_key(k));
        starts.extend(alone);
        self.together(levers, group, starts)
    }

    /// With several levers moved at once: those of them that would do alone for the build found.
    fn with_all(&self, levers: &[Lever], places: &[(usize, i64)]) -> Result<Answer<Starts>, Disagreement> {
        let moved: Vec<(&Lever, i64)> = places.iter().map(|&(k, place)| (&levers[k], place)).collect();
        let Some(supply) = changed(self.question.supply, &moved) else {
            return Ok(Fails);
        };
        let stocks: BTreeMap<_, u64> = (moved.iter())
            .filter_map(|(lever, place)| match lever.moves {
                Moves::Stock(part) => Some((part, lever.count(*place))),
                Moves::Key(_) => None,
            })
            .collect();
        let catalogue = restocked(self.question.catalogue, |p| stocks.get(&p.id).copied().or(p.stock));
        self.ask(&supply, &catalogue, |found, objective| {
            let solved = |place| Solved {
                place,
                value: found.key.objective(objective),
            };
            let alone = places.iter().filter_map(|&(k, place)| {
                // Of one lever alone this is its optimum.
                let itself = places.len() == 1;
                let from = self.passes_from(&levers[k], &found.build, 0, place);
                let passing = Passing {
                    place: from.or(itself.then_some(place))?,
                    solved: itself.then(|| solved(place)),
                    text: written(&found.build),
                };
                Some((k, passing))
            });
            alone.collect()
        })
    }

    /// Levers whose far end may ask for more of something else, and is far from what is mostly enough: together at places
    /// that grow fourfold, the far end last, and each alone where together they do.
    fn waves(&self, levers: &[Lever], mut left: Vec<usize>, starts: &mut Starts) -> Result<bool, Disagreement> {
        let mut complete = true;
        let mut place = 1;
        while !left.is_empty() {
            let places: Vec<(usize, i64)> = left.iter().map(|&k| (k, place.min(levers[k].last))).collect();
            match self.with_all(levers, &places)? {
                Fails => {}
                Open => complete = false,
                Holds(alone) => {
                    starts.extend(alone);
                    for &(k, place) in places.iter().filter(|_| places.len() > 1) {
                        if starts.contains_key(&k) {
                            continue;
                        }
                        match self.with_all(levers, &[(k, place)])? {
                            Holds(alone) => starts.extend(alone),
                            Fails => {}
                            Open => complete = false,
                        }
                    }
                }
            }
            left.retain(|&k| place < levers[k].last && !starts.contains_key(&k));
            place *= 4;
        }
        Ok(complete)
    }

    /// The largest run that is small enough. Between two sizes at which some stock suffices for one piece more in each
    /// unit, a smaller run is never better: prices per unit only rise. So only those sizes come into question, and a
    /// stretch of them can be ruled out at once by the stocks of its smallest at the prices of its largest.
    fn smaller_run(&self, lever: &Lever) -> Result<Answer<Solved>, Disagreement> {
        let builds = self.question.supply.builds;
        let mut places: BTreeSet<i64> = BTreeSet::new();
        for stock in self.question.catalogue.parts().filter_map(|p| p.stock) {
            let enough = (1..=self.most_of_a_unit()).map(|qty| stock / qty);
            places.extend(
                enough
                    .filter(|&n| (1..builds).contains(&n))
                    .map(|n| lever.place_below(n)),
            );
        }
        let places: Vec<i64> = places.into_iter().filter(|&p| (1..=lever.last).contains(&p)).collect();
        let found = match self.nearest_run(lever, &places)? {
            Holds(passing) => passing,
            Fails => return Ok(Fails),
            Open => return Ok(Open),
        };
        // One digit nearer does not hold: that is solved too.
        let place = found.place;
        let fails = match self.at(lever, place - 1)? {
            Fails => place - 1,
            Holds(_) => 0,
            Open => return Ok(Open),
        };
        self.nearest(lever, found, fails)
    }

    /// Asks at a place; the requirement as it stands is known to fail.
    fn at(&self, lever: &Lever, place: i64) -> Result<Answer<Passing>, Disagreement> {
        if place < 1 {
            return Ok(Fails);
        }
        self.probe(lever, place, place - 1)
    }

    /// The nearest of some places of a run that holds.
    fn nearest_run(&self, lever: &Lever, places: &[i64]) -> Result<Answer<Passing>, Disagreement> {
        let (Some(&near), Some(&far)) = (places.first(), places.last()) else {
            return Ok(Fails);
        };
        if near == far {
            return self.at(lever, near);
        }
        let (most, least) = (lever.count(near), lever.count(far));
        let Some(supply) = lever.supply(self.question.supply, near) else {
            return Ok(Fails);
        };
        let catalogue = restocked(self.question.catalogue, |p| Some((p.stock? / least.max(1)) * most));
        match self.ask(&supply, &catalogue, |_, _| ())? {
            Holds(()) => {}
            Fails => return Ok(Fails),
            Open => return Ok(Open),
        }
        let (nearer, farther) = places.split_at(places.len() / 2);
        match self.nearest_run(lever, nearer)? {
            Fails => self.nearest_run(lever, farther),
            answer => Ok(answer),
        }
    }
}
