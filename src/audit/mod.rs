//! Owns the verdict: a build in, every limit with value, bound, margin and corner out.
//!
//! Invariant: nothing else in the code decides whether a build holds. The search asks the same functions, limit by
//! limit, about parts of builds; each limit's formula stands once, in the file of the part that it guards.

mod cautions;
mod check;
mod heat;
pub mod pass;
pub mod rectifier;
pub mod reservoir;
mod site;
mod source;
mod thermal;
pub mod transformer;
pub mod whole;

pub use cautions::{SAFETY, cautions, cheaper_to_buy_more};
pub use check::{Check, Corner, Known, Limit, Sense};
pub use heat::{HeatItem, SectionHeat, compared, core_w, total_w};
pub use pass::Stage;
pub use site::{NoWave, Raw, Site, Wave};

use crate::build::{Build, Section};
use crate::physics::raw_section::Waveform;
use crate::physics::winding::WindingLoad;
use crate::supply::Supply;
use crate::units::Money;

/// One limit of the build with the name of what it concerns.
#[derive(Debug, Clone, PartialEq)]
pub struct Margin {
    /// Rail, section or transformer id, "supply" or part.
    pub of: String,
    /// The limit.
    pub check: Check,
}

/// The verdict on one build.
#[derive(Debug, Clone, PartialEq)]
pub struct Audit {
    /// Every limit that applies, by transformer, section, rail, supply, part.
    pub margins: Vec<Margin>,
    /// Cost of one unit.
    pub cost: Money,
    /// Heat of one unit, if every cell that it needs is stated and no section collapses.
    pub heat_w: Option<f64>,
    /// The same by part.
    pub heat: Vec<HeatItem>,
}

impl Audit {
    /// Whether every limit is met.
    #[must_use]
    pub fn passes(&self) -> bool {
        self.margins.iter().all(|m| m.check.met())
    }

    /// The limit with the least tightness; of equal ones the first.
    #[must_use]
    pub fn tightest(&self) -> Option<&Margin> {
        self.margins.iter().reduce(|a, b| {
            if b.check.tightness() < a.check.tightness() {
                b
            } else {
                a
            }
        })
    }
}

/// The waveforms that the limits look at.
#[derive(Debug, Clone, Copy)]
struct Waves {
    low: Known<Waveform>,
    high: Known<Waveform>,
    worn: Known<Waveform>,
}

/// Every limit of a build, at every corner, with the full physics.
#[must_use]
pub fn audit(supply: &Supply, build: &Build) -> Audit {
    let site = Site::new(supply);
    let stages: Vec<Stage> = supply
        .rails
        .iter()
        .zip(&build.rails)
        .map(|(rail, c)| Stage::new(rail, c.pass))
        .collect();
    let load_of = |section: &Section| -> Known<f64> {
        section
            .rails
            .iter()
            .try_fold(0.0, |sum, &rail| Ok(sum + stages[rail].load_a()?))
    };
    // Loads of all sections of a transformer, which its primary sees at once.
    let loads_on = |place: usize| -> Known<Vec<WindingLoad>> {
        let on_it = build.sections.iter().filter(|s| s.transformer == place);
        on_it
            .map(|s| {
                Ok(WindingLoad {
                    volts_v: s.hookup.volts_v,
                    load_a: load_of(s)?,
                })
            })
            .collect()
    };

    let mut margins: Vec<Margin> = Vec::new();
    let mut heat: Vec<HeatItem> = Vec::new();
    let mut heat_sum: Known<Vec<f64>> = Ok(Vec::new());
    let mut waves_of: Vec<Result<Waves, Corner>> = Vec::new();
    for section in &build.sections {
        let raw = raw_of(build, section);
        let all = loads_on(section.transformer);
        let all = all.as_ref().map(Vec::as_slice).map_err(|&column| column);
        waves_of.push(waves(&site, &raw, load_of(section), all));
    }

    for (place, instance) in build.transformers.iter().enumerate() {
        let mut to = |check| {
            margins.push(Margin {
                of: instance.id.clone(),
                check,
            })
        };
        transformer::by_itself(&site, instance.part)
            .into_iter()
            .for_each(&mut to);
        // Not to be evaluated where one of its sections collapses.
        let va = (build.sections.iter().enumerate())
            .filter(|(_, s)| s.transformer == place)
            .try_fold(Ok(0.0), |sum: Known<f64>, (k, _)| {
                let va = source::section_va(build, &waves_of, k)?;
                Some(sum.and_then(|sum| Ok(sum + va?)))
            });
        if let Some(va) = va {
            to(transformer::load(instance.part, va));
        }
        let core_w = core_w(&site, instance.part);
        heat.push(HeatItem {
            of: instance.id.clone(),
            what: "core",
            part: instance.part.part.name.clone(),
            heat_w: core_w,
        });
        heat_sum = heat_sum.map(|mut sum| {
            sum.push(core_w);
            sum
        });
    }

    for (place, section) in build.sections.iter().enumerate() {
        let raw = raw_of(build, section);
        let mut to = |check| {
            margins.push(Margin {
                of: section.id.clone(),
                check,
            })
        };
        let load_a = load_of(section);
        let waves = match &waves_of[place] {
            Ok(waves) => waves,
            Err(corner) => {
                to(Check::collapse(*corner));
                continue;
            }
        };
        let high = by_ref(&waves.high);
        let idle_v = site.idle_v(raw.transformer, raw.hookup);
        source::limits(&site, build, &waves_of, place, load_a, &mut to);
        to(reservoir::voltage(&site, raw.reservoir, idle_v));
        reservoir::wear(&site, raw.reservoir, raw.path, reservoir::ripple_a(&raw, high))
            .into_iter()
            .for_each(&mut to);
        let loss = SectionHeat::new(&site, &raw, load_a, high);
        heat_sum = heat_sum.and_then(|mut sum| {
            sum.push(loss?.sum_w());
            Ok(sum)
        });
        if let Ok(loss) = loss {
            let names = [
                &raw.transformer.part.name,
                &raw.rectifier.part.name,
                &raw.reservoir.part.name,
            ];
            let watts = [loss.winding_w, loss.rectifier_w, loss.reservoir_w];
            for ((what, part), heat_w) in ["winding", "rectifier", "reservoir"].into_iter().zip(names).zip(watts) {
                heat.push(HeatItem {
                    of: section.id.clone(),
                    what,
                    part: part.clone(),
                    heat_w,
                });
            }
        }
    }

    for (place, (stage, choice)) in stages.iter().zip(&build.rails).enumerate() {
        let section = &build.sections[choice.section];
        let Ok(waves) = &waves_of[choice.section] else {
            continue;
        };
        let raw = raw_of(build, section);
        let mut to = |check| {
            margins.push(Margin {
                of: stage.rail.name.clone(),
                check,
            })
        };
        let (low, high, worn) = (by_ref(&waves.low), by_ref(&waves.high), by_ref(&waves.worn));
        to(stage.headroom(&site, low));
        stage
            .ride_through(&site, &raw, load_of(section), low)
            .into_iter()
            .for_each(&mut to);
        stage.input(site.idle_v(raw.transformer, raw.hookup), &mut to);
        to(stage.current());
        let full_w = stage.loss_w(high);
        let mut junction = stage.junction(&site, Corner::High, full_w, choice.sink);
        if section.rails.len() > 1 {
            let alone_a = section.rails.iter().try_fold(0.0, |sum, &other| {
                Ok(sum
                    + if other == place {
                        stages[other].load_a()?
                    } else {
                        stages[other].idle_a()?
                    })
            });
            let wave = known(raw.wave(&site, Corner::Alone, alone_a, Ok(&[])));
            let alone = stage.junction(&site, Corner::Alone, stage.loss_w(by_ref(&wave)), choice.sink);
            junction = junction.or_tighter(alone);
        }
        to(junction);
        stage.ripple(low, high, worn).into_iter().for_each(&mut to);
        stage.accuracy(low, high).into_iter().for_each(&mut to);
        heat_sum = heat_sum.and_then(|mut sum| {
            sum.push(full_w?);
            Ok(sum)
        });
        if let Ok(heat_w) = full_w {
            heat.push(HeatItem {
                of: stage.rail.name.clone(),
                what: "pass",
                part: choice.pass.part.name.clone(),
                heat_w,
            });
        }
    }

    let cost = build.cost(supply);
    let heat_w = if waves_of.iter().any(Result::is_err) {
        None
    } else {
        Some(heat_sum.map(|sum| total_w(sum.into_iter())))
    };
    let mut whole = |of: &str, check| {
        margins.push(Margin {
            of: of.to_owned(),
            check,
        })
    };
    let heights = build.uses().filter_map(|(part, _)| whole::height(supply, part));
    if let Some(tallest) = heights.reduce(Check::or_tighter) {
        whole("supply", tallest);
    }
    whole::cost(supply, cost).into_iter().for_each(|c| whole("supply", c));
    heat_w
        .and_then(|w| whole::heat(supply, w))
        .into_iter()
        .for_each(|c| whole("supply", c));
    for line in build.lines(supply) {
        whole::stock(supply, line.part, line.qty)
            .into_iter()
            .for_each(|c| whole(&line.part.name, c));
    }
    Audit {
        margins,
        cost,
        heat_w: heat_w.and_then(Result::ok),
        heat,
    }
}

/// The parts of a section as the limits see them.
#[must_use]
pub fn raw_of<'a>(build: &'a Build, section: &'a Section) -> Raw<'a> {
    Raw {
        transformer: build.transformers[section.transformer].part,
        hookup: &section.hookup,
        path: section.path,
        rectifier: section.rectifier,
        reservoir: section.reservoir,
        cans: section.cans,
    }
}

/// The corners whose waveforms the limits look at, in the order in which a collapse is reported.
const WAVE_CORNERS: [Corner; 3] = [Corner::Low, Corner::High, Corner::Worn];

/// The waveforms, each known or missing a cell; an error when the section collapses at one of the corners.
fn waves(site: &Site, raw: &Raw, load_a: Known<f64>, all: Known<&[WindingLoad]>) -> Result<Waves, Corner> {
    let at = |corner| match raw.wave(site, corner, load_a, all) {
        Ok(wave) => Ok(Ok(wave)),
        Err(NoWave::Missing(column)) => Ok(Err(column)),
        Err(NoWave::Collapse(corner)) => Err(corner),
    };
    let [low, high, worn] = WAVE_CORNERS;
    Ok(Waves {
        low: at(low)?,
        high: at(high)?,
        worn: at(worn)?,
    })
}

/// The waveform alone carries less than full load, so it cannot collapse where high did not.
fn known(wave: Wave) -> Known<Waveform> {
    wave.map_err(|why| match why {
        NoWave::Missing(column) => column,
        NoWave::Collapse(_) => "collapse",
    })
}

fn by_ref<T>(known: &Known<T>) -> Known<&T> {
    known.as_ref().map_err(|&column| column)
}
