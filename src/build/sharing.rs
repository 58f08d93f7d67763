//! Owns which rails may share a section, and which sections a dual pair.

use crate::supply::{Path, Supply};

/// Whether one section may feed these rails: one polarity, none isolated, and the key `section` kept, by which rails of
/// one name stay together and those of another stay out.
#[must_use]
pub fn may_share(supply: &Supply, rails: &[usize]) -> bool {
    let own = || rails.iter().map(|&r| &supply.rails[r]);
    let names = || own().filter_map(|rail| rail.section.as_ref());
    let alone = rails.len() == 1;
    let named_apart = names().any(|name| Some(name) != names().next());
    let left_out = |(place, rail): (usize, &crate::supply::Rail)| {
        !rails.contains(&place) && rail.section.is_some() && rail.section.as_ref() == names().next()
    };
    let alone_by_wish = supply.share_never || own().any(|rail| rail.isolated);
    (alone || !alone_by_wish)
        && (own().all(|rail| rail.voltage_v > 0.0) || own().all(|rail| rail.voltage_v < 0.0))
        && !named_apart
        && !supply.rails.iter().enumerate().any(left_out)
}

/// Whether a section with these rails may be one half of a dual pair.
#[must_use]
pub fn may_pair(supply: &Supply, rails: &[usize]) -> bool {
    !supply.share_never
        && rails.iter().all(|&r| {
            let rail = &supply.rails[r];
            !rail.isolated && rail.paths.contains(&Path::Dual)
        })
}
