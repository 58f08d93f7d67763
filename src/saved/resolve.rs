//! Owns the step from names to parts and places.

use super::document::{Document, Section as Named, fault};
use crate::build::{Build, Hookup, HookupKind, Instance, RailChoice, Section, pieces_of_rectifier};
use crate::catalogue::{Catalogue, Part, Sink, Slot};
use crate::fault::Fault;
use crate::suggest::did_you_mean;
use crate::supply::{Path, Supply};

/// Looks everything up; collects every fault.
pub(super) fn resolve<'c>(
    document: &Document,
    supply: &Supply,
    catalogue: &'c Catalogue,
    file: &str,
) -> Result<Build<'c>, Vec<Fault>> {
    let mut to = Resolver {
        catalogue,
        file,
        faults: Vec::new(),
    };
    to.unique("transformers", document.transformers.iter().map(|t| t.id.as_str()));
    to.unique("sections", document.sections.iter().map(|s| s.id.as_str()));
    let transformers: Vec<Option<Instance<'c>>> = document
        .transformers
        .iter()
        .map(|t| {
            let part = to.find(&t.part, Slot::Transformer, &catalogue.transformers, |t| &t.part)?;
            Some(Instance { id: t.id.clone(), part })
        })
        .collect();
    let rail_place = |name: &str| supply.rails.iter().position(|r| r.name == name);
    let mut sections = Vec::new();
    for named in &document.sections {
        let column = format!("sections.{}", named.id);
        let transformer = document.transformers.iter().position(|t| t.id == named.transformer);
        if transformer.is_none() {
            to.say(
                &column,
                &named.transformer,
                "is no transformer of this build",
                "name one of its ids",
            );
        }
        let mut rails = Vec::new();
        for name in &named.rails {
            match rail_place(name) {
                Some(place) => rails.push(place),
                None => to.say(&column, name, "is no rail of the supply", "name its rails"),
            }
            if !document.rails.iter().any(|r| &r.name == name && r.section == named.id) {
                to.say(&column, name, "does not name this section in rails", "both must agree");
            }
        }
        if named.rails.is_empty() {
            to.say(&column, "", "feeds no rail", "name one");
        }
        let place = Placed {
            column: &column,
            transformer,
            instance: transformer.and_then(|place| transformers[place].as_ref()),
            pair: to.pair(document, named, &column),
            rails,
        };
        sections.push(to.section(document, named, place));
    }
    let mut rails: Vec<Option<RailChoice<'c>>> = vec![None; supply.rails.len()];
    for named in &document.rails {
        let column = format!("rails.{}", named.name);
        let section = document.sections.iter().position(|s| s.id == named.section);
        match section {
            None => to.say(
                &column,
                &named.section,
                "is no section of this build",
                "name one of its ids",
            ),
            Some(place) if !document.sections[place].rails.contains(&named.name) => {
                to.say(&column, &named.section, "does not name this rail", "both must agree");
            }
            Some(_) => {}
        }
        let pass = to.find(&named.pass, Slot::Pass, &catalogue.pass_devices, |d| &d.part);
        let sink = named.sink.as_ref().map(|sink| to.sink(sink));
        match rail_place(&named.name) {
            None => to.say(&column, &named.name, "is no rail of the supply", "name its rails"),
            Some(place) if rails[place].is_some() => to.say(&column, &named.name, "comes twice", "once each"),
            Some(place) => {
                if let (Some(section), Some(pass)) = (section, pass) {
                    rails[place] = Some(RailChoice {
                        section,
                        pass,
                        sink: sink.flatten(),
                    });
                }
            }
        }
    }
    for rail in &supply.rails {
        if !document.rails.iter().any(|r| r.name == rail.name) {
            to.say(
                "rails",
                &rail.name,
                "is missing",
                "every rail of the supply has a device",
            );
        }
    }
    for (place, t) in document.transformers.iter().enumerate() {
        if !sections.iter().flatten().any(|s| s.transformer == place)
            && document.sections.iter().all(|s| s.transformer != t.id)
        {
            to.say(
                &format!("transformers.{}", t.id),
                &t.part,
                "feeds no section",
                "leave it out",
            );
        }
    }
    let whole = || {
        Some(Build {
            transformers: transformers.into_iter().collect::<Option<_>>()?,
            sections: sections.into_iter().collect::<Option<_>>()?,
            rails: rails.into_iter().collect::<Option<_>>()?,
        })
    };
    match whole() {
        Some(build) if to.faults.is_empty() => Ok(build),
        _ => Err(to.faults),
    }
}

/// Where a section stands: what its document's other parts have told of it.
struct Placed<'a, 'c> {
    column: &'a str,
    transformer: Option<usize>,
    instance: Option<&'a Instance<'c>>,
    pair: Option<usize>,
    rails: Vec<usize>,
}

struct Resolver<'c, 'a> {
    catalogue: &'c Catalogue,
    file: &'a str,
    faults: Vec<Fault>,
}

impl<'c> Resolver<'c, '_> {
    fn say(&mut self, column: &str, text: &str, problem: &str, allowed: &str) {
        self.faults.push(fault(self.file, text, column, problem, allowed));
    }

    fn unique<'a>(&mut self, column: &str, ids: impl Iterator<Item = &'a str>) {
        let mut seen = std::collections::BTreeSet::new();
        for id in ids {
            if !seen.insert(id) {
                self.say(column, id, "comes twice", "every id once");
            }
        }
    }

    fn find<T>(&mut self, name: &str, slot: Slot, list: &'c [T], part: impl Fn(&T) -> &Part) -> Option<&'c T> {
        let found = list.iter().find(|x| part(x).name == name);
        if found.is_none() {
            let hint = match self.catalogue.find(name) {
                Some(other) => format!("it is listed as {}", other.slot.word()),
                None => did_you_mean(name, list.iter().map(|x| part(x).name.as_str())),
            };
            self.say(slot.word(), name, "is not in the catalogue", &hint);
        }
        found
    }

    fn sink(&mut self, name: &str) -> Option<&'c Sink> {
        let catalogue = self.catalogue;
        self.find(name, Slot::Sink, &catalogue.sinks, |s| &s.part)
    }

    /// Place of the section that is named as the other half of a dual pair.
    fn pair(&mut self, document: &Document, named: &Named, column: &str) -> Option<usize> {
        let pair = named.pair.as_ref()?;
        let place = document.sections.iter().position(|s| &s.id == pair);
        if place.is_none() {
            self.say(
                &format!("{column}.pair"),
                pair,
                "is no section of this build",
                "name the other half of the dual pair, or null",
            );
        }
        place
    }

    /// The hook-up that a section names; the negative half of a dual pair has that of the positive one.
    fn hookup(
        &mut self,
        document: &Document,
        named: &Named,
        place: &Placed<'_, 'c>,
        kind: HookupKind,
    ) -> Option<Hookup> {
        let instance = place.instance?;
        let half = kind == HookupKind::Dual && named.secondaries.is_empty();
        // A pair that leads nowhere is told already.
        if half && named.pair.is_some() && place.pair.is_none() {
            return None;
        }
        let holder = match place.pair {
            Some(pair) if half => &document.sections[pair],
            _ => named,
        };
        let places: Vec<usize> = (holder.secondaries.iter())
            .filter_map(|&p| usize::try_from(p).ok())
            .collect();
        let hookup = Hookup::of_places(kind, &places, instance.part);
        match hookup {
            Some(_) => {}
            None if half => self.say(
                place.column,
                "",
                "has no secondaries, nor has a pair of it on this transformer",
                "the negative half of a dual pair names the positive one, which holds two",
            ),
            None => {
                let there = instance.part.secondaries.len();
                self.say(
                    place.column,
                    &format!("{places:?}"),
                    "are not its secondaries",
                    &format!("places 1 to {there}"),
                );
            }
        }
        hookup.map(|hookup| if half { hookup.negative_half() } else { hookup })
    }

    fn section(&mut self, document: &Document, named: &Named, place: Placed<'_, 'c>) -> Option<Section<'c>> {
        let (catalogue, column) = (self.catalogue, place.column);
        let kind = word(&named.hookup, &HookupKind::ALL, |k| k.word());
        if kind.is_none() {
            self.say(
                column,
                &named.hookup,
                "is not a hook-up",
                &HookupKind::ALL.map(HookupKind::word).join(", "),
            );
        }
        let path = word(&named.path, &Path::ALL, |p| p.word());
        if path.is_none() {
            self.say(
                column,
                &named.path,
                "is not a path",
                &Path::ALL.map(Path::word).join(", "),
            );
        }
        let rectifier = self.find(&named.rectifier, Slot::Rectifier, &catalogue.rectifiers, |r| &r.part);
        let reservoir = self.find(&named.reservoir, Slot::Reservoir, &catalogue.reservoirs, |r| &r.part);
        let rectifier_sink = named.rectifier_sink.as_ref().map(|sink| self.sink(sink));
        if named.windings.is_some_and(|n| n != named.secondaries.len() as u64) {
            self.say(
                column,
                "windings",
                "is not the number of secondaries",
                "make both agree or leave it out",
            );
        }
        if let (Some(qty), Some(rectifier), Some(path)) = (named.rectifier_qty, rectifier, path) {
            let half = path == Path::Dual && named.secondaries.is_empty();
            let pieces = if half {
                0
            } else {
                pieces_of_rectifier(rectifier.kind, path)
            };
            if qty != pieces {
                self.say(
                    &format!("{column}.rectifier_qty"),
                    &qty.to_string(),
                    if half {
                        "is counted on the positive half of the pair"
                    } else {
                        "is not what the path takes"
                    },
                    &format!("{pieces}, or leave it out"),
                );
            }
        }
        let cans = u32::try_from(named.reservoir_qty).ok();
        if cans.is_none() {
            self.say(
                column,
                &named.reservoir_qty.to_string(),
                "is too many capacitors",
                "1 to the cap on cans",
            );
        }
        let hookup = kind.and_then(|kind| self.hookup(document, named, &place, kind));
        Some(Section {
            id: named.id.clone(),
            transformer: place.transformer?,
            hookup: hookup?,
            path: path?,
            pair: place.pair,
            rectifier: rectifier?,
            rectifier_sink: rectifier_sink.flatten(),
            reservoir: reservoir?,
            cans: cans?,
            rails: place.rails,
        })
    }
}

fn word<T: Copy>(text: &str, all: &[T], of: impl Fn(T) -> &'static str) -> Option<T> {
    all.iter().copied().find(|&x| of(x) == text)
}
