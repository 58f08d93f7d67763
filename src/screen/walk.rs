//! Owns the walk over one rail's combinations, best first: raw sections are solved on demand, columns come out in the
//! order of their least possible key.
//!
//! Four kinds of entry share one heap, each with a lower bound on the key of all that may still come of it: a pair
//! (source, rectifier) not yet opened; an opened pair with the next of its banks; a solved section with the next sink
//! for one of its devices. So nothing is solved that is dearer (or hotter) than the answer.

use std::cmp::Reverse;
use std::collections::BinaryHeap;
use std::rc::Rc;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};
use std::time::Instant;

use super::bounds::{least_bank_f, least_rms_a, source_reaches};
use super::column::Column;
use super::prices::FloorPrices;
use super::reach::{Reach, Source, bare_circuit, carries};
use super::shelf::{Bank, Shelf};
use super::{Counts, Objective};
use crate::audit::{Check, Corner, Known, NoWave, Raw, SectionHeat, Site, Stage, rectifier, reservoir, whole};
use crate::build::{pieces_of_rectifier, sink_takes};
use crate::catalogue::{Rectifier, RectifierKind, Sink};
use crate::physics::raw_section::Waveform;
use crate::physics::winding::WindingLoad;
use crate::units::Money;

/// When to give up: a deadline, or a signal from the user.
#[derive(Debug, Clone, Default)]
pub struct Stop {
    /// Wall clock to stop at.
    pub deadline: Option<Instant>,
    /// Set by Ctrl-C.
    pub asked: Arc<AtomicBool>,
}

impl Stop {
    /// Whether to give up now.
    #[must_use]
    pub fn now(&self) -> bool {
        self.asked.load(Ordering::Relaxed) || self.deadline.is_some_and(|at| Instant::now() >= at)
    }
}

/// A source with a rectifier; its banks once opened.
struct Pair {
    source: usize,
    rectifier: usize,
    /// Bank and lower bound of the key of all that comes of it, rising.
    banks: Vec<(usize, (i64, i64))>,
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
            stacks: Vec::new(),
            by_price: Vec::new(),
            heap: BinaryHeap::new(),
            steps: 0,
            shelf: reach.shelf,
            prices,
        };
        counts.sources += walk.sources.len() as u64;
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
                Entry::Pair(pair) => self.open(pair, counts),
                Entry::Bank(pair, place) => {
                    self.push_bank(pair, place + 1);
                    self.solve(pair, place, counts);
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

    /// Least cost of transformer, rectifier and the cheapest device on that source.
    fn pair_cost(&self, source: &Source, rectifier: &Rectifier) -> i64 {
        let pieces = pieces_of_rectifier(rectifier.kind, source.path);
        let device = source
            .stages
            .iter()
            .map(|&i| self.device_cost(&self.shelf.stages[i]))
            .min()
            .unwrap_or(0);
        self.prices.cost(&source.transformer.part, 1).0 + self.prices.cost(&rectifier.part, pieces).0 + device
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
    fn open(&mut self, place: usize, counts: &mut Counts) {
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
            least(&|s| s.valley_wanted_v(self.site)),
            least(&|s| s.floor_v),
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
        // At the high corner the voltage behind the bank's resistance lies above that of the low corner, which is at
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
        let mut banks = Vec::new();
        for (b, price) in banks_that_do {
            let bank = self.shelf.banks[b];
            let heat_w = match self.objective {
                Objective::Cost => source.core_w,
                Objective::Heat => {
                    // Exact for the device with the least load; the others heat more, as loss and current rise with it.
                    match self.least_heat_w(&self.raw(pair, bank), source, load_a, counts) {
                        Some(w) => w,
                        None => continue,
                    }
                }
            };
            banks.push((b, self.objective.order(base + price, heat_floor(heat_w))));
        }
        banks.sort_by_key(|&(b, key)| (key, b));
        self.pairs[place].banks = banks;
        self.push_bank(place, 0);
    }

    /// Heat with the least load that a device here draws, all of the supply's: what the source gives less what the rail
    /// takes. It rises with ground current: more load, less mean voltage, but every ampere is drawn at the crest.
    fn least_heat_w(&self, raw: &Raw, source: &Source, load_a: f64, counts: &mut Counts) -> Option<f64> {
        counts.solves += 1;
        let own = [WindingLoad {
            volts_v: raw.hookup.volts_v,
            load_a,
        }];
        let high = raw.wave(self.site, Corner::High, Ok(load_a), Ok(&own)).ok()?;
        let rail = &self.site.supply.rails[self.shelf.rail];
        let section = SectionHeat::new(self.site, raw, Ok(load_a), Ok(&high)).ok()?;
        let pass_w = high.mean_v() * load_a - rail.voltage_v.abs() * rail.current_a;
        Some(source.core_w + section.sum_w() + pass_w)
    }

    fn push_bank(&mut self, pair: usize, place: usize) {
        if let Some(&(_, key)) = self.pairs[pair].banks.get(place) {
            self.heap.push(Reverse((key, Entry::Bank(pair, place))));
        }
    }

    fn push_stack(&mut self, stack: usize, place: usize) {
        if place < self.stacks[stack].sinks.len() {
            let column = self.column(stack, place);
            let key = self.objective.order(column.floor_cost.0, heat_floor(column.heat_w()));
            self.heap.push(Reverse((key, Entry::Stack(stack, place))));
        }
    }

    fn column(&self, stack: usize, place: usize) -> Column<'c> {
        let Stack { column, sinks } = &self.stacks[stack];
        let sink = sinks[place];
        let sink_cost = sink.map_or(0, |s| self.prices.cost(&s.part, 1).0);
        let mut column = column.clone();
        column.sink = sink;
        column.floor_cost.0 += sink_cost;
        column
    }

    /// Solves one section for every device that may stand behind it, and stacks what holds.
    fn solve(&mut self, pair: usize, place: usize, counts: &mut Counts) {
        counts.sections += 1;
        let pair = &self.pairs[pair];
        let bank = self.shelf.banks[pair.banks[place].0];
        let raw = self.raw(pair, bank);
        let source = &self.sources[pair.source];
        let mut found: Vec<Stack<'c>> = Vec::new();
        let mut solved: Option<Solved> = None;
        if !rectifier::surge(self.site, &raw).met() {
            return;
        }
        for (at, &place) in source.stages.iter().enumerate() {
            let stage = &self.shelf.stages[place];
            let Ok(load_a) = stage.load_a() else { continue };
            // Devices come by load, so equal loads share their steady states.
            #[allow(clippy::float_cmp)]
            if solved.as_ref().is_none_or(|s| s.load_a != load_a) {
                let mut next = Solved::new(load_a);
                // As the load rises, the valley falls and the source current rises at every instant: what fails here
                // for every device left stays so.
                let low = next.wave(self.site, &raw, Corner::Low, counts);
                let hope = source.stages[at..]
                    .iter()
                    .any(|&i| self.shelf.stages[i].headroom(self.site, low).met());
                if !hope || !feeds(&raw, load_a, next.wave(self.site, &raw, Corner::High, counts)) {
                    break;
                }
                solved = Some(next);
            }
            let Some(solved) = &mut solved else { continue };
            if let Some(base) = self.device_holds(&raw, source, stage, solved, counts) {
                self.stack(pair, bank, stage, &base, &mut found);
            }
        }
        for stack in found {
            self.stacks.push(stack);
            self.push_stack(self.stacks.len() - 1, 0);
        }
    }

    /// Everything but the junctions; the losses if it holds.
    fn device_holds(
        &self,
        raw: &Raw,
        source: &Source,
        stage: &Stage,
        solved: &mut Solved,
        counts: &mut Counts,
    ) -> Option<Losses> {
        let site = self.site;
        let load_a = solved.load_a;
        let met = |check: Option<Check>| check.is_none_or(|c| c.met());
        let low = solved.wave(site, raw, Corner::Low, counts);
        if !stage.headroom(site, low).met() || !met(stage.ride_through(site, raw, Ok(load_a), low)) {
            return None;
        }
        let (low, high) = (low.copied(), solved.wave(site, raw, Corner::High, counts).copied());
        let high_ref = high.as_ref().map_err(|&column| column);
        let low_ref = low.as_ref().map_err(|&column| column);
        if solved.collapsed
            || !*solved.lasts.get_or_insert_with(|| lasts(site, raw, high_ref))
            || !met(stage.accuracy(low_ref, high_ref))
        {
            return None;
        }
        if stage.rail.ripple_v.is_some() {
            let worn = solved.wave(site, raw, Corner::Worn, counts);
            if !met(stage.ripple(low_ref, high_ref, worn)) {
                return None;
            }
        }
        Some(Losses {
            core_w: source.core_w,
            section_w: SectionHeat::new(site, raw, Ok(load_a), high_ref).ok()?.sum_w(),
            package_w: rectifier::package_loss_w(site, raw, high_ref).ok()?,
            pass_w: stage.loss_w(high_ref).ok()?,
        })
    }

    /// Stacks every choice of sinks that keeps both junctions.
    fn stack(&self, pair: &Pair, bank: Bank<'c>, stage: &Stage<'c>, losses: &Losses, found: &mut Vec<Stack<'c>>) {
        let source = &self.sources[pair.source];
        let rectifier = self.shelf.rectifiers[pair.rectifier];
        let case = if rectifier.kind == RectifierKind::Bridge {
            rectifier.case.as_deref()
        } else {
            None
        };
        let rectifier_sinks = self.sinks_that(case, |sink| {
            rectifier::junction(self.site, rectifier, Ok(losses.package_w), sink).met()
        });
        let sinks = self.sinks_that(stage.device.case.as_deref(), |sink| {
            stage.junction(self.site, Corner::High, Ok(losses.pass_w), sink).met()
        });
        if sinks.is_empty() {
            return;
        }
        let section_cost = self.prices.cost(&source.transformer.part, 1)
            + self
                .prices
                .cost(&rectifier.part, pieces_of_rectifier(rectifier.kind, source.path))
            + self.prices.cost(&bank.can.part, u64::from(bank.cans));
        for rectifier_sink in rectifier_sinks {
            found.push(Stack {
                column: Column {
                    transformer: source.transformer,
                    hookup: Rc::clone(&source.hookup),
                    path: source.path,
                    rectifier,
                    rectifier_sink,
                    reservoir: bank.can,
                    cans: bank.cans,
                    pass: stage.device,
                    sink: None,
                    core_w: losses.core_w,
                    section_w: losses.section_w,
                    pass_w: losses.pass_w,
                    floor_cost: section_cost + Money(self.device_cost(stage)) + self.sink_cost(rectifier_sink),
                },
                sinks: sinks.clone(),
            });
        }
    }

    fn sink_cost(&self, sink: Option<&Sink>) -> Money {
        sink.map_or(Money(0), |s| self.prices.cost(&s.part, 1))
    }

    /// No sink and every sink for that outline with which the junction holds, cheapest first.
    fn sinks_that(&self, case: Option<&str>, holds: impl Fn(Option<&Sink>) -> bool) -> Vec<Option<&'c Sink>> {
        let fitting = self
            .shelf
            .sinks
            .iter()
            .filter(|s| sink_takes(s, case))
            .map(|&s| Some(s));
        let mut all: Vec<Option<&'c Sink>> = std::iter::once(None).chain(fitting).filter(|&s| holds(s)).collect();
        all.sort_by_key(|&s| (self.sink_cost(s), s.map(|s| s.part.id)));
        all
    }
}

/// Losses of a section with its device at high mains.
struct Losses {
    core_w: f64,
    section_w: f64,
    package_w: f64,
    pass_w: f64,
}

/// The steady states of one section under one load, solved when asked for.
struct Solved {
    load_a: f64,
    waves: [Option<Known<Waveform>>; 3],
    collapsed: bool,
    /// Whether its cans last.
    lasts: Option<bool>,
}

impl Solved {
    fn new(load_a: f64) -> Solved {
        Solved {
            load_a,
            waves: [None; 3],
            collapsed: false,
            lasts: None,
        }
    }

    /// The waveform at low, high or worn.
    fn wave(&mut self, site: &Site, raw: &Raw, corner: Corner, counts: &mut Counts) -> Known<&Waveform> {
        let slot = match corner {
            Corner::Low => 0,
            Corner::High => 1,
            _ => 2,
        };
        if self.waves[slot].is_none() {
            counts.solves += 1;
            let own = [WindingLoad {
                volts_v: raw.hookup.volts_v,
                load_a: self.load_a,
            }];
            self.waves[slot] = Some(
                raw.wave(site, corner, Ok(self.load_a), Ok(&own))
                    .map_err(|why| match why {
                        NoWave::Missing(column) => column,
                        NoWave::Collapse(_) => {
                            self.collapsed = true;
                            COLLAPSED
                        }
                    }),
            );
        }
        match &self.waves[slot] {
            Some(Ok(wave)) => Ok(wave),
            Some(Err(column)) => Err(column),
            None => Err(COLLAPSED),
        }
    }
}

/// Stands for a waveform that does not exist; every limit that needs it then fails.
const COLLAPSED: &str = "collapse";

/// The limits of transformer and rectifier that hang on the source current at the high corner; what fails one fails it
/// at any higher load.
fn feeds(raw: &Raw, load_a: f64, high: Known<&Waveform>) -> bool {
    let rms_a = high.map(Waveform::source_rms_a);
    rectifier::current(raw, high).met() && carries(raw.transformer, raw.hookup, raw.path, rms_a, load_a)
}

/// Whether the cans last at the high corner.
fn lasts(site: &Site, raw: &Raw, high: Known<&Waveform>) -> bool {
    reservoir::wear(site, raw.reservoir, raw.path, reservoir::ripple_a(raw, high))
        .iter()
        .all(Check::met)
}
