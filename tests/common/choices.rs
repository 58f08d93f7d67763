//! What may feed each section or dual pair of a small supply, and every build that can be put together of it.
//!
//! Drops only what the audit rejects when the section, or the pair, is all that there is: alone on its transformer, with
//! no caps on cost and heat. Other sections on the transformer only lower its voltage and add to its load, and stock
//! only tightens; a cost can fall when breaks are shared. `tests/oracle.rs` holds this against builds with nothing
//! dropped.
#![allow(dead_code)]

use std::collections::BTreeMap;

use binrail::audit::{Limit, audit};
use binrail::build::{Build, Instance, RailChoice, Section, device_serves, sink_takes};
use binrail::catalogue::{
    Catalogue, PartId, PassDevice, Rectifier, RectifierKind, Reservoir, Sink, Status, Transformer,
};
use binrail::supply::{Path, Supply};

use crate::layouts::{Layout, Unit, layouts};
use crate::own_rules::{Group, Take, groups, hookup, pieces_in, runs_on, takes};

/// A device with its sink.
pub type Cooled<'c> = (&'c PassDevice, Option<&'c Sink>);

/// The parts of one unit, alone on its transformer or not.
#[derive(Debug, Clone)]
pub struct Choice<'c> {
    pub transformer: &'c Transformer,
    pub take: Take,
    pub path: Path,
    pub rectifier: &'c Rectifier,
    pub rectifier_sink: Option<&'c Sink>,
    /// Of each section: its bank, and the device of each of its rails.
    pub banks: Vec<(&'c Reservoir, u32)>,
    pub devices: Vec<Vec<Cooled<'c>>>,
}

impl Choice<'_> {
    fn sold(&self) -> bool {
        let sinks = (self.rectifier_sink.iter()).chain(self.devices.iter().flatten().filter_map(|(_, s)| s.as_ref()));
        let parts = [&self.transformer.part, &self.rectifier.part].into_iter();
        let mut parts = parts
            .chain(self.banks.iter().map(|(can, _)| &can.part))
            .chain(self.devices.iter().flatten().map(|(device, _)| &device.part))
            .chain(sinks.map(|sink| &sink.part));
        parts.all(|part| part.status != Status::Withdrawn)
    }
}

/// Every choice of every unit that comes up in a layout.
pub struct Choices<'c> {
    pub layouts: Vec<Layout>,
    pub of_unit: BTreeMap<Unit, Vec<Choice<'c>>>,
    /// Builds that were audited to find them.
    pub audited: usize,
}

/// For each transformer of a build the units that it feeds with what each is made of.
pub type Chosen<'a, 'c> = Vec<Vec<(&'a Unit, &'a Choice<'c>)>>;

impl<'c> Choices<'c> {
    /// The choices that pass alone.
    pub fn new(supply: &Supply, catalogue: &'c Catalogue) -> Choices<'c> {
        Choices::of(supply, catalogue, layouts(supply), true)
    }

    /// All that the rules of assembly allow, whatever the audit says.
    pub fn unsifted(supply: &Supply, catalogue: &'c Catalogue) -> Choices<'c> {
        Choices::of(supply, catalogue, layouts(supply), false)
    }

    /// What may feed the units of these layouts.
    pub fn of(supply: &Supply, catalogue: &'c Catalogue, layouts: Vec<Layout>, sift: bool) -> Choices<'c> {
        let mut choices = Choices {
            layouts,
            of_unit: BTreeMap::new(),
            audited: 0,
        };
        for unit in choices.layouts.iter().flatten().flatten() {
            if !choices.of_unit.contains_key(unit) {
                let mut maker = Maker::new(supply, catalogue, unit, sift);
                maker.circuits();
                choices.audited += maker.audited;
                choices.of_unit.insert(unit.clone(), maker.found);
            }
        }
        choices
    }

    /// How many builds [`Choices::each`] gives; of parts on sale only, if asked.
    pub fn count(&self, layout: &Layout, sold: bool) -> u64 {
        // Choices that take the same windings of the same transformer count together.
        type Alike<'c> = BTreeMap<(PartId, usize, usize), (&'c Transformer, u64)>;
        let alike = |unit: &Unit| {
            let mut alike = Alike::new();
            for choice in self.of_unit[unit].iter().filter(|c| !sold || c.sold()) {
                let key = (choice.transformer.part.id, choice.take.group, choice.take.windings);
                alike.entry(key).or_insert((choice.transformer, 0)).1 += 1;
            }
            alike
        };
        fn ways(units: &[Alike], taken: &mut Vec<(PartId, usize, usize)>) -> u64 {
            let Some((first, rest)) = units.split_first() else {
                return 1;
            };
            let mut sum = 0u64;
            for (&key, &(transformer, count)) in first {
                if taken.first().is_some_and(|t| t.0 != key.0) {
                    continue;
                }
                taken.push(key);
                let used: usize = taken.iter().filter(|t| t.1 == key.1).map(|t| t.2).sum();
                if used <= groups(transformer)[key.1].windings.len() {
                    sum = sum.saturating_add(count.saturating_mul(ways(rest, taken)));
                }
                taken.pop();
            }
            sum
        }
        layout
            .iter()
            .map(|instance| ways(&instance.iter().map(alike).collect::<Vec<_>>(), &mut Vec::new()))
            .fold(1, u64::saturating_mul)
    }

    /// The sum of [`Choices::count`] over all layouts.
    pub fn count_all(&self, sold: bool) -> u64 {
        let counts = self.layouts.iter().map(|layout| self.count(layout, sold));
        counts.fold(0, u64::saturating_add)
    }

    /// Every build of a layout: one choice for each unit, those on one transformer with the same part and no more
    /// windings than it has.
    pub fn each<'a>(&'a self, layout: &'a Layout, work: &mut dyn FnMut(&Chosen<'a, 'c>)) {
        let units: Vec<(usize, &Unit)> = (layout.iter().enumerate())
            .flat_map(|(instance, units)| units.iter().map(move |unit| (instance, unit)))
            .collect();
        self.rest(&units, &mut vec![Vec::new(); layout.len()], work);
    }

    fn rest<'a>(
        &'a self,
        units: &[(usize, &'a Unit)],
        chosen: &mut Chosen<'a, 'c>,
        work: &mut dyn FnMut(&Chosen<'a, 'c>),
    ) {
        let Some((&(instance, unit), rest)) = units.split_first() else {
            work(chosen);
            return;
        };
        for choice in &self.of_unit[unit] {
            let on_it = &chosen[instance];
            if on_it
                .first()
                .is_some_and(|(_, first)| first.transformer.part.id != choice.transformer.part.id)
            {
                continue;
            }
            let same = on_it.iter().filter(|(_, c)| c.take.group == choice.take.group);
            let taken: usize = same.map(|(_, c)| c.take.windings).sum();
            if taken + choice.take.windings > groups(choice.transformer)[choice.take.group].windings.len() {
                continue;
            }
            chosen[instance].push((unit, choice));
            self.rest(rest, chosen, work);
            chosen[instance].pop();
        }
    }
}

/// The build of some rails of a supply (in order; their places become 0, 1, ...), all that there is.
pub fn assemble<'c>(rails: &[usize], chosen: &Chosen<'_, 'c>) -> Build<'c> {
    struct Half {
        first: usize,
        instance: usize,
        unit: usize,
        half: usize,
    }
    let mut halves = Vec::new();
    for (instance, units) in chosen.iter().enumerate() {
        for (unit, (it, _)) in units.iter().enumerate() {
            for (half, section) in it.sections.iter().enumerate() {
                let first = *section.iter().min().unwrap();
                halves.push(Half {
                    first,
                    instance,
                    unit,
                    half,
                });
            }
        }
    }
    halves.sort_by_key(|half| half.first);
    let mut instances: Vec<usize> = Vec::new();
    for half in &halves {
        if !instances.contains(&half.instance) {
            instances.push(half.instance);
        }
    }
    let transformers = instances.iter().enumerate().map(|(place, &instance)| Instance {
        id: format!("T{}", place + 1),
        part: chosen[instance][0].1.transformer,
    });
    let local = |rail: usize| rails.iter().position(|&r| r == rail).unwrap();
    let mut taken: BTreeMap<(usize, usize), usize> = BTreeMap::new();
    let mut of_rail: Vec<Option<RailChoice<'c>>> = vec![None; rails.len()];
    let mut sections = Vec::new();
    for (place, at) in halves.iter().enumerate() {
        let (unit, choice) = chosen[at.instance][at.unit];
        let group: &Group = &groups(choice.transformer)[choice.take.group];
        let negative_half = at.half == 1;
        let mut hookup_here = hookup(choice.take, group, 0);
        if negative_half {
            hookup_here.secondaries.clear();
        } else {
            let taken = taken.entry((at.instance, choice.take.group)).or_default();
            hookup_here = hookup(choice.take, group, *taken);
            *taken += choice.take.windings;
        }
        let other = |other: &Half| (other.instance, other.unit) == (at.instance, at.unit) && other.half != at.half;
        let (reservoir, cans) = choice.banks[at.half];
        let section_rails = &unit.sections[at.half];
        for (&rail, &(pass, sink)) in section_rails.iter().zip(&choice.devices[at.half]) {
            let section = place;
            of_rail[local(rail)] = Some(RailChoice { section, pass, sink });
        }
        sections.push(Section {
            id: char::from(b'A' + place as u8).to_string(),
            transformer: instances.iter().position(|&i| i == at.instance).unwrap(),
            hookup: hookup_here,
            path: choice.path,
            pair: halves.iter().position(other),
            rectifier: choice.rectifier,
            rectifier_sink: choice.rectifier_sink.filter(|_| !negative_half),
            reservoir,
            cans,
            rails: section_rails.iter().map(|&rail| local(rail)).collect(),
        });
    }
    Build {
        transformers: transformers.collect(),
        sections,
        rails: of_rail.into_iter().map(Option::unwrap).collect(),
    }
}

/// Lists the choices of one unit.
struct Maker<'a, 'c> {
    supply: &'a Supply,
    catalogue: &'c Catalogue,
    unit: &'a Unit,
    /// The supply of this unit's rails only.
    alone: Supply,
    rails: Vec<usize>,
    sift: bool,
    found: Vec<Choice<'c>>,
    audited: usize,
}

impl<'a, 'c> Maker<'a, 'c> {
    fn new(supply: &'a Supply, catalogue: &'c Catalogue, unit: &'a Unit, sift: bool) -> Self {
        let rails = unit.rails();
        let mut alone = supply.clone();
        alone.rails = rails.iter().map(|&rail| supply.rails[rail].clone()).collect();
        (alone.caps.cost, alone.caps.heat_w) = (None, None);
        Maker {
            supply,
            catalogue,
            unit,
            alone,
            rails,
            sift,
            found: Vec::new(),
            audited: 0,
        }
    }

    /// Transformers, hook-ups, paths that every rail allows, rectifiers; then [`Maker::banks`].
    fn circuits(&mut self) {
        for transformer in &self.catalogue.transformers {
            for take in takes(&groups(transformer)) {
                for path in [Path::HalfWave, Path::CentreTap, Path::Bridge, Path::Dual] {
                    let allowed = self.alone.rails.iter().all(|rail| rail.paths.contains(&path));
                    if !allowed || !runs_on(path, take.kind) || (path == Path::Dual) != self.unit.is_dual() {
                        continue;
                    }
                    for rectifier in self.catalogue.rectifiers.iter().filter(|r| pieces_in(r, path) > 0) {
                        self.banks(&Choice {
                            transformer,
                            take,
                            path,
                            rectifier,
                            rectifier_sink: None,
                            banks: Vec::new(),
                            devices: Vec::new(),
                        });
                    }
                }
            }
        }
    }

    /// Reservoirs and devices of each section.
    fn banks(&mut self, circuit: &Choice<'c>) {
        let (catalogue, cans) = (self.catalogue, self.supply.caps.cans);
        let bank = |can: &'c Reservoir| (1..=cans).map(move |cans| (can, cans));
        let banks: Vec<(&Reservoir, u32)> = catalogue.reservoirs.iter().flat_map(bank).collect();
        let devices: Vec<Vec<Cooled>> = (self.unit.sections.iter())
            .flat_map(|section| section.iter().map(|&rail| (rail, section.len() == 1)))
            .map(|(rail, alone)| {
                let floats = alone && circuit.path != Path::Dual;
                let serves = |d: &&PassDevice| device_serves(d, &self.supply.rails[rail], floats);
                catalogue
                    .pass_devices
                    .iter()
                    .filter(serves)
                    .map(|d| (d, None))
                    .collect()
            })
            .collect();
        for banks in product(&vec![banks; self.unit.sections.len()]) {
            for devices in product(&devices) {
                let mut devices = devices.into_iter();
                let of = |section: &Vec<usize>| devices.by_ref().take(section.len()).collect();
                let choice = Choice {
                    banks: banks.clone(),
                    devices: self.unit.sections.iter().map(of).collect(),
                    ..circuit.clone()
                };
                self.sinks(choice);
            }
        }
    }

    /// Sinks of a choice that has none yet. A sink cools its own part and does nothing else but stand there.
    fn sinks(&mut self, bare: Choice<'c>) {
        if self.sift {
            let junctions = [Limit::RectifierJunction, Limit::PassJunction];
            if self.fails(&bare, &|limit, _| !junctions.contains(&limit)) {
                return;
            }
        }
        let module = bare.rectifier.kind == RectifierKind::Bridge;
        let rectifier_sinks = self.sinks_for(bare.rectifier.case.as_deref().filter(|_| module));
        let mut coolings = vec![self.cooling(
            &bare,
            rectifier_sinks,
            Limit::RectifierJunction,
            None,
            |choice, sink| {
                choice.rectifier_sink = sink;
            },
        )];
        for section in 0..bare.devices.len() {
            for place in 0..bare.devices[section].len() {
                let rail = self.unit.sections[section][place];
                let sinks = self.sinks_for(bare.devices[section][place].0.case.as_deref());
                coolings.push(
                    self.cooling(&bare, sinks, Limit::PassJunction, Some(rail), |choice, sink| {
                        choice.devices[section][place].1 = sink;
                    }),
                );
            }
        }
        for sinks in product(&coolings) {
            let mut choice = bare.clone();
            choice.rectifier_sink = sinks[0];
            let devices = choice.devices.iter_mut().flatten();
            devices.zip(&sinks[1..]).for_each(|(device, &sink)| device.1 = sink);
            if !self.sift || !self.fails(&choice, &|_, _| true) {
                self.found.push(choice);
            }
        }
    }

    /// The sinks, or none, with which a part of a choice stays cool enough.
    fn cooling(
        &mut self,
        bare: &Choice<'c>,
        sinks: Vec<Option<&'c Sink>>,
        limit: Limit,
        rail: Option<usize>,
        put: impl Fn(&mut Choice<'c>, Option<&'c Sink>),
    ) -> Vec<Option<&'c Sink>> {
        let name = rail.map(|rail| self.supply.rails[rail].name.clone());
        let about = |at: Limit, of: &str| at == limit && name.as_ref().is_none_or(|name| name == of);
        let mut good = sinks;
        good.retain(|&sink| {
            let mut choice = bare.clone();
            put(&mut choice, sink);
            !self.sift || !self.fails(&choice, &about)
        });
        good
    }

    fn sinks_for(&self, case: Option<&str>) -> Vec<Option<&'c Sink>> {
        let fitting = self.catalogue.sinks.iter().filter(|s| sink_takes(s, case)).map(Some);
        std::iter::once(None).chain(fitting).collect()
    }

    /// Whether the audit of this choice alone fails a limit about which `about` says yes.
    fn fails(&mut self, choice: &Choice<'c>, about: &dyn Fn(Limit, &str) -> bool) -> bool {
        self.audited += 1;
        let build = assemble(&self.rails, &vec![vec![(self.unit, choice)]]);
        let verdict = audit(&self.alone, &build);
        verdict
            .margins
            .iter()
            .any(|m| !m.check.met() && about(m.check.limit, &m.of))
    }
}

/// Every way to take one of each list, the last changing first.
pub fn product<T: Clone>(lists: &[Vec<T>]) -> Vec<Vec<T>> {
    let mut found = vec![Vec::new()];
    for list in lists {
        found = (found.iter())
            .flat_map(|head: &Vec<T>| {
                list.iter()
                    .map(move |item| [head.as_slice(), std::slice::from_ref(item)].concat())
            })
            .collect();
    }
    found
}
