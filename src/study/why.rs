//! Owns why a part stays out: what forcing it in would cost, or which limits keep it out in its best company.

use super::hopeless;
use crate::audit::{Margin, audit};
use crate::build::{Build, device_serves, hookups, pieces_of_rectifier, sink_takes};
use crate::catalogue::{PartId, RectifierKind, Slot};
use crate::optimise::{Alone, Disagreement, Found, Joint, Outcome, Proof, Question, best_company, joint, optimise};
use crate::screen::Counts;
use crate::supply::{Path, Rail};

/// What became of the question.
#[derive(Debug, Clone)]
pub enum Verdict<'c> {
    /// A whole build passes with the part.
    Fits {
        /// The best one.
        with: Found<'c>,
        /// The best of all; `None`: nothing passes without it (it is withdrawn, so only the asking lets it in).
        best: Option<Found<'c>>,
        /// Place of the first rail that holds the part.
        rail: usize,
        /// Whether both are proved.
        proved: bool,
    },
    /// No build of any rail alone passes with it.
    Fails {
        /// Its best company.
        company: Box<Alone<'c>>,
        /// The limits that fail there, the furthest from met first.
        failing: Vec<Margin>,
    },
    /// A rail alone passes with it, but no whole supply.
    Joint {
        /// A rail that passes, by place, with its build.
        alone: Box<Alone<'c>>,
        /// The limits that cannot hold together.
        joint: Vec<Joint>,
        /// What fails in the best build without the first of them.
        failing: Vec<Margin>,
        /// Whether a supply passes without the part.
        others_pass: bool,
        /// Whether all of that is proved.
        proved: bool,
    },
    /// It is in no build at all: by which rule of assembly.
    NoUse(String),
    /// Stopped before an answer.
    Open,
}

/// The verdict with the work done.
#[derive(Debug, Clone)]
pub struct Why<'c> {
    /// What became of it.
    pub verdict: Verdict<'c>,
    /// Work done.
    pub counts: Counts,
}

/// Says what keeps a part out, or what it costs to force it in.
///
/// # Errors
/// When search and audit disagree: a bug to report.
pub fn why<'c>(question: &Question<'c>, part: PartId) -> Result<Why<'c>, Disagreement> {
    let plain = Question {
        top: 1,
        ..question.clone()
    };
    let forced = Question {
        with: question.with.iter().copied().chain([(part, None)]).collect(),
        ..plain.clone()
    };
    let with = if hopeless(&forced, part) {
        Outcome {
            builds: Vec::new(),
            proof: Proof::Proved,
            counts: Counts::default(),
        }
    } else {
        optimise(&forced)?
    };
    let mut counts = with.counts;
    let mut best = || -> Result<Outcome<'c>, Disagreement> {
        let best = optimise(&plain)?;
        counts.add(&best.counts);
        Ok(best)
    };
    let proved = with.proof == Proof::Proved;
    let verdict = match with.builds.into_iter().next() {
        Some(with) => {
            let best = best()?;
            Verdict::Fits {
                rail: rail_with(&with.build, part),
                proved: proved && best.proof == Proof::Proved,
                best: best.builds.into_iter().next(),
                with,
            }
        }
        None if !proved => Verdict::Open,
        None => match best_company(&forced, part) {
            (_, false) => Verdict::Open,
            (None, true) => Verdict::NoUse(no_use(&forced, part)),
            (Some(alone), true) if alone.company.met => {
                let best = best()?;
                let together = joint(&forced)?;
                Verdict::Joint {
                    alone: Box::new(alone),
                    others_pass: !best.builds.is_empty(),
                    failing: worst_first(together.failing),
                    joint: together.joint,
                    proved: together.proved && best.proof == Proof::Proved,
                }
            }
            (Some(company), true) => {
                let failing = audit(&company.supply, &company.build).margins;
                Verdict::Fails {
                    failing: worst_first(failing.into_iter().filter(|m| !m.check.met()).collect()),
                    company: Box::new(company),
                }
            }
        },
    };
    Ok(Why { verdict, counts })
}

fn worst_first(mut margins: Vec<Margin>) -> Vec<Margin> {
    margins.sort_by(|a, b| a.check.tightness().total_cmp(&b.check.tightness()));
    margins
}

/// The first rail whose section or device holds the part.
fn rail_with(build: &Build, part: PartId) -> usize {
    let holds = |rail: &crate::build::RailChoice| {
        let section = &build.sections[rail.section];
        let sinks = [section.rectifier_sink, rail.sink];
        [
            build.transformers[section.transformer].part.part.id,
            section.rectifier.part.id,
            section.reservoir.part.id,
            rail.pass.part.id,
        ]
        .into_iter()
        .chain(sinks.into_iter().flatten().map(|sink| sink.part.id))
        .any(|id| id == part)
    };
    build.rails.iter().position(holds).unwrap_or(0)
}

/// The rule of assembly that keeps a part out of every build.
fn no_use(question: &Question, part: PartId) -> String {
    let (supply, catalogue) = (question.supply, question.catalogue);
    let slot = catalogue.parts().find(|p| p.id == part).map(|p| p.slot);
    let paths = || supply.rails.iter().flat_map(|rail| &rail.paths);
    let served = |rail: &&Rail| catalogue.pass_devices.iter().any(|d| device_serves(d, rail, true));
    let rule = match slot {
        Some(Slot::Pass) => {
            let device = catalogue.pass_devices.iter().find(|d| d.part.id == part);
            device
                .filter(|d| !supply.rails.iter().any(|rail| device_serves(d, rail, true)))
                .map(|_| "serves none of the rails: no rail has its output voltage, its polarity and a devices list that names its kind")
        }
        Some(Slot::Transformer) => {
            let transformer = catalogue.transformers.iter().find(|t| t.part.id == part);
            let hooked =
                |path: &Path| transformer.is_some_and(|t| hookups(t).iter().any(|hookup| hookup.kind.takes(*path)));
            (!paths().any(hooked))
                .then_some("serves none of the rails: none of its hook-ups runs a path that a rail names")
        }
        Some(Slot::Rectifier) => {
            let rectifier = catalogue.rectifiers.iter().find(|r| r.part.id == part);
            let served = |path: &Path| rectifier.is_some_and(|r| pieces_of_rectifier(r.kind, *path) > 0);
            (!paths().any(served)).then_some("serves none of the rails: it does not serve a path that a rail names")
        }
        Some(Slot::Sink) => {
            let sink = catalogue.sinks.iter().find(|s| s.part.id == part);
            let takes = |case: Option<&str>| sink.is_some_and(|s| sink_takes(s, case));
            let devices = (catalogue.pass_devices.iter())
                .filter(|d| supply.rails.iter().any(|rail| device_serves(d, rail, true)))
                .any(|d| takes(d.case.as_deref()));
            let modules = (catalogue.rectifiers.iter())
                .filter(|r| r.kind == RectifierKind::Bridge)
                .any(|r| takes(r.case.as_deref()));
            (!devices && !modules).then_some("takes the case of no device that serves a rail, nor of a bridge module")
        }
        Some(Slot::Reservoir) | None => None,
    };
    if let Some(rule) = rule {
        return rule.to_owned();
    }
    // The part is not to blame.
    let bare: Vec<&str> = (supply.rails.iter().filter(|rail| !served(rail)))
        .map(|rail| rail.name.as_str())
        .collect();
    if bare.is_empty() {
        "is in no build of a rail alone: another slot is empty, or its only path needs a second rail".to_owned()
    } else {
        format!(
            "is not to blame: no device in the catalogue has the voltage, polarity and kind of rail {}",
            bare.join(", ")
        )
    }
}
