//! Owns what feeds a section: the limits of its winding and rectifier, its own or shared with the other half of a dual
//! pair.
//!
//! What both halves load together is told once, on the positive one. When one of them collapses, what hangs on the
//! currents of both cannot be evaluated and is left out, as the load of a transformer with a collapsed section is.

use super::check::{Check, Corner, Known};
use super::site::Site;
use super::{Waves, by_ref, raw_of, rectifier, transformer};
use crate::build::{Build, Section};
use crate::physics::raw_section::Waveform;

/// The waveforms of a section, or the corner at which it collapses.
type Solved = Result<Waves, Corner>;

/// The other half of a dual pair.
fn other_half<'a, 'c>(
    build: &'a Build<'c>,
    solved: &'a [Solved],
    section: &Section,
) -> Option<(&'a Section<'c>, Option<&'a Waves>)> {
    let place = section.pair?;
    Some((&build.sections[place], solved[place].as_ref().ok()))
}

fn rms_a(waves: &Waves) -> Known<f64> {
    by_ref(&waves.high).map(Waveform::source_rms_a)
}

/// What a section adds to the apparent power of its transformer; `None` where a section that it hangs on collapses.
pub(super) fn section_va(build: &Build, solved: &[Solved], place: usize) -> Option<Known<f64>> {
    let section = &build.sections[place];
    let own_a = rms_a(solved[place].as_ref().ok()?);
    Some(match other_half(build, solved, section) {
        None => own_a.map(|a| transformer::section_va(&section.hookup, section.path, a)),
        Some(_) if section.is_negative_half() => Ok(0.0),
        Some((_, waves)) => {
            let other_a = rms_a(waves?);
            own_a.and_then(|a| Ok(transformer::pair_va(&section.hookup, a, other_a?)))
        }
    })
}

/// The limits of winding and rectifier of a section that holds its voltage.
pub(super) fn limits(
    site: &Site,
    build: &Build,
    solved: &[Solved],
    place: usize,
    load_a: Known<f64>,
    mut to: impl FnMut(Check),
) {
    let (section, Ok(waves)) = (&build.sections[place], &solved[place]) else {
        return;
    };
    let other = other_half(build, solved, section);
    if other.is_some() && section.is_negative_half() {
        return;
    }
    let raw = raw_of(build, section);
    let high = by_ref(&waves.high);
    let (surge, loaded) = match other {
        None => (
            rectifier::surge(site, &raw),
            Some((
                transformer::current(raw.hookup, raw.path, rms_a(waves)),
                rectifier::current(&raw, high),
                rectifier::package_loss_w(site, &raw, high),
            )),
        ),
        Some((other, others)) => (
            rectifier::pair_surge(site, &raw, &raw_of(build, other)),
            others.map(|others| {
                let its = by_ref(&others.high);
                (
                    transformer::pair_current(raw.hookup, rms_a(waves), rms_a(others)),
                    rectifier::pair_current(&raw, high, its),
                    rectifier::pair_package_w(site, &raw, high, its),
                )
            }),
        ),
    };
    let idle_v = site.idle_v(raw.transformer, raw.hookup);
    let bias = transformer::bias(raw.transformer, raw.hookup, raw.path, load_a);
    let reverse = rectifier::reverse_voltage(site, raw.rectifier, raw.path, idle_v);
    let junction = |w| rectifier::junction(site, raw.rectifier, w, section.rectifier_sink);
    loaded.map(|(winding, ..)| winding).into_iter().for_each(&mut to);
    bias.into_iter().for_each(&mut to);
    to(reverse);
    loaded.map(|(_, current, _)| current).into_iter().for_each(&mut to);
    to(surge);
    loaded.map(|(.., w)| junction(w)).into_iter().for_each(&mut to);
}
