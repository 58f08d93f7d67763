//! Owns the walk over one rail's combinations, best first: raw sections are solved on demand, columns come out in the
//! order of their least possible key.
//!
//! Entries share one heap, each with a lower bound on the key of all that may still come of it: a pair (source,
//! rectifier) not yet opened; an opened pair with the next of its banks; a section with the next of its devices; a
//! solved section and device with the next sink. So nothing is solved that is dearer (or hotter) than the answer.

mod stack;

use std::cmp::Reverse;
use std::collections::BinaryHeap;

use crate::audit::{Check, Corner, Known, Raw, SectionHeat, Site, Stage, rectifier, reservoir, whole};
use crate::build::pieces_of_rectifier;
use crate::catalogue::{Rectifier, Sink};
use crate::screen::bounds::{HeatBound, least_bank_f, least_rms_a, let_through_v, source_reaches};
use crate::screen::column::Column;
use crate::screen::prices::FloorPrices;
use crate::screen::reach::{Reach, Source, bare_circuit, carries};
use crate::screen::shelf::{Bank, Shelf};
use crate::screen::solved::{Losses, Solved};
use crate::screen::stop::Stop;
use crate::screen::{Counts, Objective};

/// A source with a rectifier; its banks once opened.
struct Pair {
    source: usize,
    rectifier: usize,
    /// Bank and lower bound of the key of all that comes of it, rising.
    banks: Vec<(usize, (i64, i64))>,
}

/// A section that some device may stand behind.
struct Section {
    pair: usize,
    bank: usize,
    /// Least cost without the device.
    cost: i64,
    /// Least heat.
    heat: i64,
    /// Its steady states by load.
    solved: Vec<Solved>,
}

/// A solved section with one device and one rectifier sink: only the pass sink is open.
struct Stack<'c> {
    column: Column<'c>,
    /// Sinks that hold, cheapest first; `None` = free-standing.
    sinks: Vec<Option<&'c Sink>>,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
enum Entry {
    Pair(usize),
    Bank(usize, usize),
    Device(usize, usize),
    Stack(usize, usize),
}

/// Lower bound of a heat in whole microwatts, below any rounding of the sums it enters.
#[allow(clippy::cast_possible_truncation)]
fn heat_floor(watts: f64) -> i64 {
    (watts * 1e6 - 1e-3).floor() as i64
}

/// The walk of one rail.
pub struct Walk<'s, 'c> {
    site: &'s Site<'c>,
    shelf: Shelf<'c>,
    objective: Objective,
    prices: FloorPrices,
    sources: Vec<Source<'c>>,
    pairs: Vec<Pair>,
    sections: Vec<Section>,
    stacks: Vec<Stack<'c>>,
    /// Banks by least price.
    by_price: Vec<(usize, i64)>,
    /// Lower bound of every open entry; the entry itself makes the order total.
    heap: BinaryHeap<Reverse<((i64, i64), Entry)>>,
    steps: u64,
}

impl<'s, 'c> Walk<'s, 'c> {
    /// Starts the walk of one rail.
    #[must_use]
    pub fn new(
        site: &'s Site<'c>,
        mut reach: Reach<'c>,
        objective: Objective,
        prices: FloorPrices,
        counts: &mut Counts,
    ) -> Walk<'s, 'c> {
        let sources = std::mem::take(&mut reach.sources);
        let mut walk = Walk {
            site,
            objective,
            sources,
            pairs: Vec::new(),
            sections: Vec::new(),
            stacks: Vec::new(),
            by_price: Vec::new(),
            heap: BinaryHeap::new(),
            steps: 0,
            shelf: reach.shelf,
            prices,
        };
        counts.sources += walk.sources.len() as u64;
        for place in 0..walk.sources.len() {
            let mut by_price = walk.sources[place].stages.clone();
            by_price.sort_by_key(|&i| (walk.device_cost(&walk.shelf.stages[i]), i));
            walk.sources[place].by_price = by_price;
        }
        walk.by_price = (walk.shelf.banks.iter().enumerate())
            .map(|(i, bank)| (i, walk.prices.cost(&bank.can.part, u64::from(bank.cans)).0))
            .collect();
        walk.by_price.sort_by_key(|&(i, price)| (price, i));
        let Some(&(_, cheapest_bank)) = walk.by_price.first() else {
            return walk;
        };
        for (s, source) in walk.sources.iter().enumerate() {
            for (r, rectifier) in walk.shelf.rectifiers.iter().enumerate() {
                if pieces_of_rectifier(rectifier.kind, source.path) == 0 {
                    continue;
                }
                let cost = walk.pair_cost(source, rectifier) + cheapest_bank;
                walk.heap.push(Reverse((
                    objective.order(cost, heat_floor(source.core_w)),
                    Entry::Pair(walk.pairs.len()),
                )));
                walk.pairs.push(Pair {
                    source: s,
                    rectifier: r,
                    banks: Vec::new(),
                });
            }
        }
        walk
    }

    /// Lower bound of the key of every column to come; `None`: no more will come.
    #[must_use]
    pub fn floor(&self) -> Option<(i64, i64)> {
        self.heap.peek().map(|Reverse((key, _))| *key)
    }

    /// The next column whose key can be at most `most` in its first part; `None` when none is left below, or when told
    /// to stop.
    pub fn next(&mut self, most: i64, stop: &Stop, counts: &mut Counts) -> Option<(Column<'c>, (i64, i64))> {
        while let Some(&Reverse((key, entry))) = self.heap.peek() {
            self.steps += 1;
            if key.0 > most || (self.steps.is_multiple_of(256) && stop.now()) {
                return None;
            }
            self.heap.pop();
            match entry {
                Entry::Pair(pair) => self.open(pair),
                Entry::Bank(pair, place) => {
                    self.push_bank(pair, place + 1);
                    self.try_section(pair, place, counts);
                }
                Entry::Device(section, place) => {
                    self.push_device(section, place + 1);
                    self.try_device(section, place, counts);
                }
                Entry::Stack(stack, place) => {
                    self.push_stack(stack, place + 1);
                    let column = self.column(stack, place);
                    let holds = self
                        .shelf
                        .must_sinks
                        .iter()
                        .all(|&id| column.lines().iter().any(|(p, _)| p.id == id));
                    let stocked = column
                        .lines()
                        .iter()
                        .all(|&(part, pieces)| whole::stock(self.site.supply, part, pieces).is_none_or(|c| c.met()));
                    if holds && stocked {
                        counts.columns += 1;
                        return Some((column, key));
                    }
                }
            }
        }
        None
    }

    /// Least cost of transformer and rectifier.
    fn section_cost(&self, source: &Source, rectifier: &Rectifier) -> i64 {
        let pieces = pieces_of_rectifier(rectifier.kind, source.path);
        (self.prices.cost(&source.transformer.part, 1) + self.prices.cost(&rectifier.part, pieces)).0
    }

    /// The same with the cheapest device on that source.
    fn pair_cost(&self, source: &Source, rectifier: &Rectifier) -> i64 {
        let device = source
            .by_price
            .first()
            .map_or(0, |&i| self.device_cost(&self.shelf.stages[i]));
        self.section_cost(source, rectifier) + device
    }

    fn device_cost(&self, stage: &Stage) -> i64 {
        (self.prices.cost(&stage.device.part, 1) + stage.device.fitted_price).0
    }

    fn raw<'a>(&'a self, pair: &Pair, bank: Bank<'c>) -> Raw<'a> {
        let source = &self.sources[pair.source];
        Raw {
            transformer: source.transformer,
            hookup: &source.hookup,
            path: source.path,
            rectifier: self.shelf.rectifiers[pair.rectifier],
            reservoir: bank.can,
            cans: bank.cans,
        }
    }

    /// Opens a pair: drops it when no bank can do, else lists its banks by their least key.
    fn open(&mut self, place: usize) {
        let pair = &self.pairs[place];
        let source = &self.sources[pair.source];
        let rectifier = self.shelf.rectifiers[pair.rectifier];
        let fits = |check: Option<Check>| check.is_none_or(|c| c.met());
        let pieces = pieces_of_rectifier(rectifier.kind, source.path);
        if !rectifier::reverse_voltage(self.site, rectifier, source.path, source.idle_v).met()
            || !fits(whole::stock(self.site.supply, &rectifier.part, pieces))
        {
            return;
        }
        // The kindest device for each demand: least load, lowest level.
        let stages = || source.stages.iter().map(|&i| &self.shelf.stages[i]);
        let least = |f: &dyn Fn(&Stage) -> Known<f64>| stages().filter_map(|s| f(s).ok()).min_by(f64::total_cmp);
        let (Some(load_a), Some(level_v), Some(floor_v)) = (
            least(&|s| s.load_a()),
            least(&|s| s.valley_wanted_v(self.site).map(let_through_v)),
            least(&|s| s.floor_v.map(let_through_v)),
        ) else {
            return;
        };
        let Ok(low) = bare_circuit(self.site, source, Some(rectifier), Corner::Low, load_a) else {
            return;
        };
        if !source_reaches(&low, level_v) {
            return;
        }
        let dip_s = self.site.supply.rails[self.shelf.rail].dip_s.unwrap_or(0.0);
        let least_f = least_bank_f(&low, level_v, floor_v, dip_s);
        let base = self.pair_cost(source, rectifier);
        let banks_that_do: Vec<(usize, i64)> = (self.by_price.iter().copied())
            .filter(|&(b, _)| {
                let bank = self.shelf.banks[b];
                self.site.can_f(bank.can, Corner::Low) * f64::from(bank.cans) >= least_f
                    && reservoir::voltage(self.site, bank.can, source.idle_v).met()
            })
            .collect();
        // At the high corner u (see Solved::hope) lies above that of the low corner: more crest, less drop, and its
        // least value rises with C. (Were it lower with more C, start the smaller bank at that least value: it ends the
        // period no higher than it began, though below its own periodic state it must rise.) At the low corner u is at
        // least the wanted valley less what the load drops in the aged resistance.
        let esr_ohm = (banks_that_do.iter())
            .map(|&(b, _)| self.shelf.banks[b])
            .filter_map(|bank| Some(self.site.can_esr_ohm(bank.can, Corner::Low).ok()? / f64::from(bank.cans)))
            .fold(0.0, f64::max);
        let Ok(high) = bare_circuit(self.site, source, Some(rectifier), Corner::High, load_a) else {
            return;
        };
        let rms_a = least_rms_a(&high, level_v - esr_ohm * load_a);
        if !carries(source.transformer, &source.hookup, source.path, Ok(rms_a), load_a) {
            return;
        }
        let rail = &self.site.supply.rails[self.shelf.rail];
        let heat = match self.objective {
            Objective::Cost => None,
            Objective::Heat => Some(HeatBound::new(&high, esr_ohm, rail.voltage_v.abs() * rail.current_a)),
        };
        let mut banks: Vec<(usize, (i64, i64))> = (banks_that_do.into_iter())
            .map(|(b, price)| {
                let bank = self.shelf.banks[b];
                let bank_f = self.site.can_f(bank.can, Corner::High) * f64::from(bank.cans);
                let heat_w = source.core_w + heat.as_ref().map_or(0.0, |bound| bound.least_w(bank_f));
                (b, self.objective.order(base + price, heat_floor(heat_w)))
            })
            .collect();
        banks.sort_by_key(|&(b, key)| (key, b));
        self.pairs[place].banks = banks;
        self.push_bank(place, 0);
    }

    /// Heat of a section with the least load that a device here draws: what the source gives less what the rail takes.
    /// It rises with ground current: more load raises the source current at every instant, and every ampere is drawn at
    /// a positive source voltage.
    fn least_heat_w(&self, raw: &Raw, source: &Source, solved: &mut Solved, counts: &mut Counts) -> Option<f64> {
        let load_a = solved.load_a;
        let high = solved.wave(self.site, raw, Corner::High, counts).ok()?;
        let rail = &self.site.supply.rails[self.shelf.rail];
        let section = SectionHeat::new(self.site, raw, Ok(load_a), Ok(high)).ok()?;
        let pass_w = high.mean_v() * load_a - rail.voltage_v.abs() * rail.current_a;
        Some(source.core_w + section.sum_w() + pass_w)
    }

    fn push_bank(&mut self, pair: usize, place: usize) {
        if let Some(&(_, key)) = self.pairs[pair].banks.get(place) {
            self.heap.push(Reverse((key, Entry::Bank(pair, place))));
        }
    }

    /// Solves one section under the least load of its devices; if there is hope, its devices come into question, the
    /// cheapest first.
    fn try_section(&mut self, pair: usize, place: usize, counts: &mut Counts) {
        counts.sections += 1;
        let (bank, bank_key) = self.pairs[pair].banks[place];
        let pair_ref = &self.pairs[pair];
        let raw = self.raw(pair_ref, self.shelf.banks[bank]);
        if !rectifier::surge(self.site, &raw).met() {
            return;
        }
        let source = &self.sources[pair_ref.source];
        let stages = || source.stages.iter().map(|&i| &self.shelf.stages[i]);
        let Some(Ok(load_a)) = stages().next().map(Stage::load_a) else {
            return;
        };
        let mut solved = Solved::new(load_a);
        if !solved.hope(self.site, &raw, stages(), counts) {
            return;
        }
        let can = self.shelf.banks[bank];
        let cost = self.section_cost(source, self.shelf.rectifiers[pair_ref.rectifier])
            + self.prices.cost(&can.can.part, u64::from(can.cans)).0;
        let heat = match self.objective {
            Objective::Cost => bank_key.1,
            Objective::Heat => match self.least_heat_w(&raw, source, &mut solved, counts) {
                Some(heat_w) => heat_floor(heat_w),
                None => return,
            },
        };
        self.sections.push(Section {
            pair,
            bank,
            cost,
            heat,
            solved: vec![solved],
        });
        self.push_device(self.sections.len() - 1, 0);
    }

    fn push_device(&mut self, section: usize, place: usize) {
        let open = &self.sections[section];
        let source = &self.sources[self.pairs[open.pair].source];
        if let Some(&device) = source.by_price.get(place) {
            let cost = open.cost + self.device_cost(&self.shelf.stages[device]);
            self.heap.push(Reverse((
                self.objective.order(cost, open.heat),
                Entry::Device(section, place),
            )));
        }
    }

    /// Solves one section for one device, and stacks what holds.
    fn try_device(&mut self, section: usize, place: usize, counts: &mut Counts) {
        let mut solved = std::mem::take(&mut self.sections[section].solved);
        let open = &self.sections[section];
        let pair = &self.pairs[open.pair];
        let source = &self.sources[pair.source];
        let stage = &self.shelf.stages[source.by_price[place]];
        let bank = self.shelf.banks[open.bank];
        let raw = self.raw(pair, bank);
        let mut found = Vec::new();
        if let Ok(load_a) = stage.load_a() {
            // Devices with equal loads share their steady states.
            #[allow(clippy::float_cmp)]
            let known = solved.iter().position(|s| s.load_a == load_a);
            let at = known.unwrap_or_else(|| {
                solved.push(Solved::new(load_a));
                solved.len() - 1
            });
            if let Some(losses) = solved[at].losses(self.site, &raw, stage, counts) {
                self.stack(pair, bank, stage, &losses, &mut found);
            }
        }
        self.sections[section].solved = solved;
        for stack in found {
            self.stacks.push(stack);
            self.push_stack(self.stacks.len() - 1, 0);
        }
    }
}
