//! Owns the build that is a part's best company, for one part at a time.

use super::aisle::{Aisle, Bank, Source};
use super::ledger::{Choice, Company, Ledger};
use super::search::Search;
use crate::audit::{Site, audit};
use crate::build::{Build, Instance, RailChoice, Section, section_id, transformer_id};
use crate::catalogue::{Catalogue, Part, PartId, Sink};
use crate::optimise::Question;
use crate::supply::Supply;

/// A build of one rail alone.
#[derive(Debug, Clone)]
pub struct Alone<'c> {
    /// Place of the rail in the supply.
    pub rail: usize,
    /// The supply with no other rail: what the build is to be audited by.
    pub supply: Supply,
    /// The choice.
    pub build: Build<'c>,
    /// Its tightest limit.
    pub company: Company,
}

/// The best company of one part, each rail alone in turn: of all builds with at least one piece of it, feasible or not,
/// one whose least tightness is greatest; the first that is met where one is. `None`: it is in no build of any rail
/// alone. Second: whether the search came to its end.
#[must_use]
pub fn best_company<'c>(question: &Question<'c>, part: PartId) -> (Option<Alone<'c>>, bool) {
    let rails = &question.supply.rails;
    let mut ledger = Ledger::watching(part, question.catalogue.parts().count(), rails.len());
    let mut best = None;
    let mut complete = true;
    for (place, rail) in rails.iter().enumerate() {
        let supply = Supply {
            rails: vec![rail.clone()],
            ..question.supply.clone()
        };
        let found = {
            let site = Site::new(&supply);
            Aisle::new(&site, question).and_then(|aisle| {
                let rail = ledger.rail(place);
                complete &= Search::new(&aisle, rail, &mut ledger).run(&question.stop) == f64::NEG_INFINITY;
                let (company, choice) = ledger.watched()?;
                let choice = if company.met { choice } else { aisle.eased(choice, part) };
                Some((company, of_catalogue(&aisle.build(choice), question.catalogue)?))
            })
        };
        if let Some((company, build)) = found {
            best = Some(Alone {
                rail: place,
                supply,
                build,
                company,
            });
        }
    }
    (best, complete)
}

impl<'s> Aisle<'s, 's> {
    /// The build that a choice is.
    fn build(&self, choice: Choice) -> Build<'s> {
        let sink = |sink: Option<usize>| sink.map(|k| self.sinks[k].part);
        let Source {
            transformer,
            hookup,
            path,
            ..
        } = &self.sources[choice.source];
        let Bank { can, cans, .. } = self.banks[choice.bank];
        Build {
            transformers: vec![Instance {
                id: transformer_id(0),
                part: transformer,
            }],
            sections: vec![Section {
                id: section_id(0),
                transformer: 0,
                hookup: (**hookup).clone(),
                path: *path,
                pair: None,
                rectifier: self.rectifiers[choice.rectifier].part,
                rectifier_sink: sink(choice.rectifier_sink),
                reservoir: can,
                cans,
                rails: vec![0],
            }],
            rails: vec![RailChoice {
                section: 0,
                pass: self.devices[choice.device].stage.device,
                sink: sink(choice.sink),
            }],
        }
    }

    /// A choice that is as good company, made better in its other limits by exchanging one thing after the other while
    /// that helps: what still fails is then mostly the part's own doing. Whatever holds the part stays.
    fn eased(&self, choice: Choice, part: PartId) -> Choice {
        let mut best = choice;
        let mut failing = self.failing(best);
        loop {
            let before = best;
            for other in self.neighbours(before) {
                if failing.len() <= 1 {
                    return best;
                }
                let build = self.build(other);
                if build.uses().any(|(used, _)| used.id == part) {
                    let fails = self.failing(other);
                    if easier(&fails, &failing) {
                        (best, failing) = (other, fails);
                    }
                }
            }
            if best == before {
                return best;
            }
        }
    }

    /// Tightness of the limits that a choice fails, the tightest first.
    fn failing(&self, choice: Choice) -> Vec<f64> {
        let verdict = audit(self.site.supply, &self.build(choice));
        let unmet = verdict.margins.iter().map(|m| m.check).filter(|check| !check.met());
        let mut failing: Vec<f64> = unmet.map(|check| check.tightness()).collect();
        failing.sort_by(f64::total_cmp);
        failing
    }

    /// Every choice with another source, bank, rectifier, device or sink; where a sink does not take the new part, with
    /// the coolest that does.
    fn neighbours(&self, choice: Choice) -> Vec<Choice> {
        let keeps = |sink: Option<usize>, sinks: &super::aisle::Sinks| {
            sink.filter(|k| sinks.all.contains(k)).or(sinks.best.first().copied())
        };
        let mut found = Vec::new();
        let sources = (0..self.sources.len()).filter(|&source| self.pieces(source, choice.rectifier) > 0);
        found.extend(sources.map(|source| Choice { source, ..choice }));
        found.extend((0..self.banks.len()).map(|bank| Choice { bank, ..choice }));
        let rectifiers = (0..self.rectifiers.len()).filter(|&rectifier| self.pieces(choice.source, rectifier) > 0);
        found.extend(rectifiers.map(|rectifier| Choice {
            rectifier,
            rectifier_sink: keeps(choice.rectifier_sink, &self.rectifiers[rectifier].sinks),
            ..choice
        }));
        found.extend((0..self.devices.len()).map(|device| Choice {
            device,
            sink: keeps(choice.sink, &self.devices[device].sinks),
            ..choice
        }));
        let or_none = |sinks: &[usize]| -> Vec<Option<usize>> {
            std::iter::once(None).chain(sinks.iter().map(|&k| Some(k))).collect()
        };
        let on_rectifier = or_none(&self.rectifiers[choice.rectifier].sinks.all);
        found.extend(on_rectifier.into_iter().map(|rectifier_sink| Choice {
            rectifier_sink,
            ..choice
        }));
        let on_device = or_none(&self.devices[choice.device].sinks.all);
        found.extend(on_device.into_iter().map(|sink| Choice { sink, ..choice }));
        found
    }
}

/// Whether the first failures are less grave: the first that differs decides, and fewer are better than more.
fn easier(fails: &[f64], than: &[f64]) -> bool {
    let differs = fails.iter().zip(than).find(|(a, b)| a.total_cmp(b).is_ne());
    match differs {
        Some((a, b)) => a > b,
        None => fails.len() < than.len(),
    }
}

/// The same build in the catalogue's own lifetime; there is none only if the catalogue is not the one that was searched.
fn of_catalogue<'c>(build: &Build, catalogue: &'c Catalogue) -> Option<Build<'c>> {
    fn find<'c, T>(list: &'c [T], wanted: &Part, part: impl Fn(&T) -> &Part) -> Option<&'c T> {
        list.iter().find(|x| part(x).id == wanted.id)
    }
    let sink = |wanted: Option<&Sink>| match wanted {
        Some(wanted) => find(&catalogue.sinks, &wanted.part, |s| &s.part).map(Some),
        None => Some(None),
    };
    let instance = |i: &Instance| {
        Some(Instance {
            id: i.id.clone(),
            part: find(&catalogue.transformers, &i.part.part, |t| &t.part)?,
        })
    };
    let section = |s: &Section| {
        Some(Section {
            id: s.id.clone(),
            hookup: s.hookup.clone(),
            rectifier: find(&catalogue.rectifiers, &s.rectifier.part, |r| &r.part)?,
            rectifier_sink: sink(s.rectifier_sink)?,
            reservoir: find(&catalogue.reservoirs, &s.reservoir.part, |c| &c.part)?,
            rails: s.rails.clone(),
            transformer: s.transformer,
            path: s.path,
            pair: s.pair,
            cans: s.cans,
        })
    };
    let rail = |r: &RailChoice| {
        Some(RailChoice {
            section: r.section,
            pass: find(&catalogue.pass_devices, &r.pass.part, |d| &d.part)?,
            sink: sink(r.sink)?,
        })
    };
    Some(Build {
        transformers: build.transformers.iter().map(instance).collect::<Option<_>>()?,
        sections: build.sections.iter().map(section).collect::<Option<_>>()?,
        rails: build.rails.iter().map(rail).collect::<Option<_>>()?,
    })
}
