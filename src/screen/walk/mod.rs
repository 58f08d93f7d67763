//! Owns the walk over the feeds of one outlet, best first: raw sections are solved on demand, feeds come out in the
//! order of their least possible score.
//!
//! Entries share one heap, each with a lower bound on the score of all that may still come of it: a rectifier not yet
//! opened; an opened one with the next of its banks; a section with a choice of devices; a solved section and devices
//! with a choice of sinks. So nothing is solved that is dearer (or hotter) than the answer.

mod apart;
mod choice;
mod devices;
mod stack;

use std::cmp::Reverse;
use std::collections::{BTreeMap, BinaryHeap};

use crate::audit::{Corner, Raw, SectionHeat, Site, Stage, rectifier, reservoir, whole};
use crate::catalogue::{Rectifier, Sink};
use crate::screen::bounds::{HeatBound, least_bank_f, least_rms_a, source_reaches};
use crate::screen::feed::Feed;
use crate::screen::plan::Outlet;
use crate::screen::reach::{Group, Source, bare_circuit, carries};
use crate::screen::shelf::Bank;
use crate::screen::solved::Solved;
use crate::screen::stop::Stop;
use crate::screen::{Counts, Weights};

pub use apart::Apart;
use choice::Choice;

/// A rectifier with its banks once opened.
struct Pair {
    rectifier: usize,
    /// Cost with the cheapest devices and bank.
    base: i64,
    /// Once opened: banks with least cost and heat of all that comes of them, by score.
    banks: Option<Vec<Fitting>>,
}

/// A bank that may do behind a rectifier.
#[derive(Debug, Clone, Copy)]
struct Fitting {
    bank: usize,
    cost: i64,
    heat: i64,
    tried: Tried,
}

/// What came of a section.
#[derive(Debug, Clone, Copy, PartialEq)]
enum Tried {
    NotYet,
    Hopeless,
    /// Its place.
    Section(usize),
}

/// A section that some devices may stand behind.
struct Section {
    pair: usize,
    bank: usize,
    /// Least cost without the devices.
    cost: i64,
    /// Least heat.
    heat: i64,
    /// By rail the devices that have the headroom under the least load, cheapest first, as places in the shelf.
    devices: Vec<Vec<usize>>,
    /// Its steady states by load.
    solved: Vec<Solved>,
    /// By choice of devices, the stack that came of it.
    stacks: BTreeMap<Choice, Option<usize>>,
}

/// A solved section with its devices: only sinks are open.
struct Stack<'c> {
    feed: Feed<'c>,
    /// Sinks that hold, cheapest first, `None` = free-standing: on the rectifier, then by rail.
    sinks: Vec<Vec<Option<&'c Sink>>>,
}

#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord)]
enum Entry {
    Pair(usize),
    Bank(usize, usize),
    Devices(usize, Choice),
    Stack(usize, Choice),
}

/// A score in the order of numbers.
#[derive(Debug, Clone, Copy, PartialEq)]
struct Score(f64);

impl Eq for Score {}

impl PartialOrd for Score {
    fn partial_cmp(&self, other: &Score) -> Option<std::cmp::Ordering> {
        Some(self.cmp(other))
    }
}

impl Ord for Score {
    fn cmp(&self, other: &Score) -> std::cmp::Ordering {
        self.0.total_cmp(&other.0)
    }
}

/// Lower bound of a heat in whole microwatts, below any rounding of the sums it enters.
#[allow(clippy::cast_possible_truncation)]
#[must_use]
pub fn heat_floor(watts: f64) -> i64 {
    (watts * 1e6 - 1e-3).floor() as i64
}

/// The walk of one outlet.
pub struct Walk<'a, 'c> {
    site: &'a Site<'c>,
    group: &'a Group<'c>,
    source: &'a Source<'c>,
    /// Whether secondaries, rectifier and its sink stand on this outlet.
    holds: bool,
    weights: Weights,
    apart: Option<Apart>,
    /// Whether only builds matter that no other betters or equals in cost and heat and betters in one.
    only_best: bool,
    pairs: Vec<Pair>,
    sections: Vec<Section>,
    stacks: Vec<Stack<'c>>,
    /// Lower bound of every open entry; the entry itself makes the order total.
    heap: BinaryHeap<Reverse<(Score, Entry)>>,
    steps: u64,
}

impl<'a, 'c> Walk<'a, 'c> {
    /// Starts the walk of one outlet; `apart` when only builds close to a given one are wanted;
    /// `only_best`: only builds matter that no other betters or equals in cost and heat and betters in one.
    #[must_use]
    pub fn new(
        site: &'a Site<'c>,
        groups: &'a [Group<'c>],
        outlet: &Outlet<'c>,
        weights: Weights,
        apart: Option<Apart>,
        only_best: bool,
    ) -> Walk<'a, 'c> {
        let group = &groups[outlet.group];
        let source = &group.sources[outlet.source];
        let mut walk = Walk {
            site,
            group,
            source,
            holds: !outlet.hookup.secondaries.is_empty(),
            weights,
            apart,
            only_best,
            pairs: Vec::new(),
            sections: Vec::new(),
            stacks: Vec::new(),
            heap: BinaryHeap::new(),
            steps: 0,
        };
        let Some(&(_, cheapest_bank)) = group.banks.first() else {
            return walk;
        };
        let devices: i64 = (source.by_price.iter().zip(&group.shelf.stages))
            .map(|(by_price, kinds)| walk.device_cost(&kinds[by_price[0]]))
            .sum();
        for (r, rectifier) in group.shelf.rectifiers.iter().enumerate() {
            let fits = outlet.rectifier.is_none_or(|only| only.part.id == rectifier.part.id);
            let pieces = Feed::pieces(rectifier, source.path, true);
            if pieces == 0
                || !fits
                || !site.holds(rectifier::reverse_voltage(site, rectifier, source.path, source.idle_v))
                || !site.holds(whole::stock(site.supply, &rectifier.part, pieces))
                || walk
                    .apart
                    .as_ref()
                    .is_some_and(|a| a.rectifier(rectifier, walk.pieces(rectifier)) > a.most)
            {
                continue;
            }
            walk.pairs.push(Pair {
                rectifier: r,
                base: walk.rectifier_cost(rectifier) + devices + cheapest_bank,
                banks: None,
            });
        }
        walk.go_by(weights);
        walk
    }

    /// Starts again by other weights; what was solved stays solved. Heat counts in all of them or in none.
    pub fn go_by(&mut self, weights: Weights) {
        self.weights = weights;
        self.heap.clear();
        for place in 0..self.pairs.len() {
            if self.pairs[place].banks.is_some() {
                self.sort_banks(place);
                self.push_bank(place, 0);
            } else {
                let score = weights.score(self.pairs[place].base, 0);
                self.heap.push(Reverse((Score(score), Entry::Pair(place))));
            }
        }
    }

    /// Lower bound of the score of every feed to come; `None`: no more will come.
    #[must_use]
    pub fn floor(&self) -> Option<f64> {
        self.heap.peek().map(|Reverse((score, _))| score.0)
    }

    /// The next feed whose score can be at most `most`; `None` when none is left below, or when told to stop.
    pub fn next(&mut self, most: f64, stop: &Stop, counts: &mut Counts) -> Option<(Feed<'c>, f64)> {
        while let Some(Reverse((score, _))) = self.heap.peek() {
            self.steps += 1;
            if score.0 > most || (self.steps.is_multiple_of(256) && stop.now()) {
                return None;
            }
            let Reverse((score, entry)) = self.heap.pop()?;
            match entry {
                Entry::Pair(pair) => self.open(pair),
                Entry::Bank(pair, place) => {
                    self.push_bank(pair, place + 1);
                    self.try_bank(pair, place, counts);
                }
                Entry::Devices(section, choice) => {
                    self.push_more_devices(section, &choice);
                    self.try_devices(section, &choice, counts);
                }
                Entry::Stack(stack, choice) => {
                    self.push_more_sinks(stack, &choice);
                    if let Some(feed) = self.complete(stack, &choice) {
                        counts.columns += 1;
                        return Some((feed, score.0));
                    }
                }
            }
        }
        None
    }

    /// Pieces of a rectifier that stand on this outlet.
    fn pieces(&self, rectifier: &Rectifier) -> u64 {
        Feed::pieces(rectifier, self.source.path, self.holds)
    }

    fn rectifier_cost(&self, rectifier: &Rectifier) -> i64 {
        self.group.prices.cost(&rectifier.part, self.pieces(rectifier)).0
    }

    fn device_cost(&self, stage: &Stage) -> i64 {
        crate::screen::reach::device_cost(&self.group.prices, stage)
    }

    fn raw(&self, pair: &Pair, bank: Bank<'c>) -> Raw<'a>
    where
        'c: 'a,
    {
        Raw {
            transformer: self.source.transformer,
            hookup: &self.source.hookup,
            path: self.source.path,
            rectifier: self.group.shelf.rectifiers[pair.rectifier],
            reservoir: bank.can,
            cans: bank.cans,
        }
    }

    /// Watts that the rails take.
    fn rails_w(&self) -> f64 {
        let rails = self.group.shelf.rails.iter().map(|&r| &self.site.supply.rails[r]);
        rails.map(|rail| rail.voltage_v.abs() * rail.current_a).sum()
    }

    /// Opens a rectifier: drops it when no bank can do, else lists its banks by their least score.
    fn open(&mut self, place: usize) {
        let (site, source, group) = (self.site, self.source, self.group);
        let pair = &self.pairs[place];
        let rectifier = group.shelf.rectifiers[pair.rectifier];
        let load_a = source.load_a;
        let bare = |corner| bare_circuit(site, source, Some(rectifier), corner, load_a, 0.0);
        let (Ok(low), Ok(high)) = (bare(Corner::Low), bare(Corner::High)) else {
            return;
        };
        // The kindest devices of each rail: least load, lowest level.
        let level_v = source.levels.iter().map(|&(level_v, _)| level_v).fold(0.0, f64::max);
        if !source_reaches(&low, level_v) {
            return;
        }
        let rails = group.shelf.rails.iter().zip(&source.levels);
        let least_f = rails
            .map(|(&rail, &(level_v, floor_v))| {
                least_bank_f(&low, level_v, floor_v, site.supply.rails[rail].dip_s.unwrap_or(0.0))
            })
            .fold(0.0, f64::max);
        let changed = self
            .apart
            .as_ref()
            .map(|a| (a, a.rectifier(rectifier, self.pieces(rectifier))));
        let banks_that_do: Vec<(usize, i64)> = (group.banks.iter().copied())
            .filter(|&(b, _)| {
                let bank = group.shelf.banks[b];
                site.can_f(bank.can, Corner::Low) * f64::from(bank.cans) >= least_f
                    && site.holds(reservoir::voltage(site, bank.can, source.idle_v))
                    && changed.is_none_or(|(apart, so_far)| so_far + apart.bank(bank) <= apart.most)
            })
            .collect();
        // At the high corner u (see Solved::hope) lies above that of the low corner: more crest, less drop, and its
        // least value rises with C. (Were it lower with more C, start the smaller bank at that least value: it ends the
        // period no higher than it began, though below its own periodic state it must rise.) At the low corner u is at
        // least the wanted valley less what the load drops in the aged resistance.
        let esr_ohm = (banks_that_do.iter())
            .map(|&(b, _)| group.shelf.banks[b])
            .filter_map(|bank| Some(site.can_esr_ohm(bank.can, Corner::Low).ok()? / f64::from(bank.cans)))
            .fold(0.0, f64::max);
        let rms_a = least_rms_a(&high, level_v - esr_ohm * load_a);
        if !carries(site, source.transformer, &source.hookup, source.path, Ok(rms_a), load_a) {
            return;
        }
        let heat = (self.weights.heat > 0.0).then(|| HeatBound::new(&high, esr_ohm, self.rails_w()));
        let cheapest = group.banks.first().map_or(0, |&(_, price)| price);
        let banks = (banks_that_do.into_iter())
            .map(|(b, price)| {
                let bank = group.shelf.banks[b];
                let bank_f = site.can_f(bank.can, Corner::High) * f64::from(bank.cans);
                let heat_w = heat.as_ref().map_or(0.0, |bound| bound.least_w(bank_f));
                Fitting {
                    bank: b,
                    cost: pair.base - cheapest + price,
                    heat: heat_floor(heat_w),
                    tried: Tried::NotYet,
                }
            })
            .collect();
        self.pairs[place].banks = Some(banks);
        self.sort_banks(place);
        self.push_bank(place, 0);
    }

    fn bank_score(&self, fitting: &Fitting) -> f64 {
        self.weights.score(fitting.cost, fitting.heat)
    }

    fn sort_banks(&mut self, pair: usize) {
        let mut banks = self.pairs[pair].banks.take().unwrap_or_default();
        banks.sort_by(|a, b| {
            let (x, y) = (self.bank_score(a), self.bank_score(b));
            x.total_cmp(&y).then(a.bank.cmp(&b.bank))
        });
        self.pairs[pair].banks = Some(banks);
    }

    fn fitting(&self, pair: usize, place: usize) -> Option<Fitting> {
        self.pairs[pair].banks.as_ref()?.get(place).copied()
    }

    fn push_bank(&mut self, pair: usize, place: usize) {
        if let Some(fitting) = self.fitting(pair, place) {
            let score = self.bank_score(&fitting);
            self.heap.push(Reverse((Score(score), Entry::Bank(pair, place))));
        }
    }

    /// What comes of a bank: a section that devices may stand behind, or nothing.
    fn try_bank(&mut self, pair: usize, place: usize, counts: &mut Counts) {
        let Some(fitting) = self.fitting(pair, place) else {
            return;
        };
        let tried = match fitting.tried {
            Tried::NotYet => self
                .try_section(pair, fitting.bank, counts)
                .map_or(Tried::Hopeless, Tried::Section),
            known => known,
        };
        if let Some(banks) = &mut self.pairs[pair].banks {
            banks[place].tried = tried;
        }
        if let Tried::Section(section) = tried {
            self.push_devices(section, Choice::first(self.group.shelf.rails.len()));
        }
    }

    /// Heat of a section with the least load that devices here draw: what the source gives less what the rails take.
    /// It rises with ground current: more load raises the source current at every instant, and every ampere is drawn at
    /// a positive source voltage.
    fn least_heat_w(&self, raw: &Raw, solved: &mut Solved, counts: &mut Counts) -> Option<f64> {
        let load_a = solved.load_a;
        let high = solved.wave(self.site, raw, Corner::High, counts).ok()?;
        let section = SectionHeat::new(self.site, raw, Ok(load_a), Ok(high)).ok()?;
        Some(section.sum_w() + high.mean_v() * load_a - self.rails_w())
    }

    /// Solves one section under the least load of its devices; its place if there is hope.
    fn try_section(&mut self, pair: usize, bank: usize, counts: &mut Counts) -> Option<usize> {
        counts.sections += 1;
        let can = self.group.shelf.banks[bank];
        let raw = self.raw(&self.pairs[pair], can);
        if !self.site.holds(rectifier::surge(self.site, &raw)) {
            return None;
        }
        let mut solved = Solved::new(self.source.load_a);
        let devices = self.hopeful(&raw, &mut solved, counts)?;
        let rectifier = self.group.shelf.rectifiers[self.pairs[pair].rectifier];
        let cost = self.rectifier_cost(rectifier) + self.group.prices.cost(&can.can.part, u64::from(can.cans)).0;
        let heat = if self.weights.heat > 0.0 {
            heat_floor(self.least_heat_w(&raw, &mut solved, counts)?)
        } else {
            0
        };
        self.sections.push(Section {
            pair,
            bank,
            cost,
            heat,
            devices,
            solved: vec![solved],
            stacks: BTreeMap::new(),
        });
        Some(self.sections.len() - 1)
    }
}
