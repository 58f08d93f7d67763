//! Who shares with whom: every partition of a supply's rails into sections and dual pairs, and of these onto
//! transformers. Knows rails and their keys, no parts.
#![allow(dead_code)]

use std::collections::BTreeSet;

use binrail::supply::{Path, Supply};

/// What takes windings of a transformer: a section, or a positive and a negative one as a dual pair.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord)]
pub struct Unit {
    /// Rails of each section, the positive one first.
    pub sections: Vec<Vec<usize>>,
}

impl Unit {
    pub fn is_dual(&self) -> bool {
        self.sections.len() == 2
    }

    /// All its rails in file order.
    pub fn rails(&self) -> Vec<usize> {
        let rails: BTreeSet<usize> = self.sections.iter().flatten().copied().collect();
        rails.into_iter().collect()
    }
}

/// One way to lay out a supply: for each transformer the units that it feeds.
pub type Layout = Vec<Vec<Unit>>;

/// Every set partition of so many things; blocks in order of their first, things in order.
pub fn set_partitions(things: usize) -> Vec<Vec<Vec<usize>>> {
    let mut found: Vec<Vec<Vec<usize>>> = vec![Vec::new()];
    for thing in 0..things {
        let mut more = Vec::new();
        for partition in &found {
            for block in 0..partition.len() {
                let mut joined = partition.clone();
                joined[block].push(thing);
                more.push(joined);
            }
            let mut apart = partition.clone();
            apart.push(vec![thing]);
            more.push(apart);
        }
        found = more;
    }
    found
}

/// Whether these rails may share a section: one polarity, no isolated one among several, no two section names.
fn may_share(supply: &Supply, block: &[usize]) -> bool {
    let rail = |&r: &usize| &supply.rails[r];
    let signs: BTreeSet<bool> = block.iter().map(|r| rail(r).voltage_v < 0.0).collect();
    let names: BTreeSet<&String> = block.iter().filter_map(|r| rail(r).section.as_ref()).collect();
    let alone = block.iter().any(|r| rail(r).isolated) || supply.share_never;
    signs.len() == 1 && names.len() <= 1 && (block.len() == 1 || !alone)
}

/// Every partition of the rails into sections: as [`may_share`] allows, rails of one section name together.
pub fn partitions(supply: &Supply) -> Vec<Vec<Vec<usize>>> {
    let together = |partition: &Vec<Vec<usize>>| {
        let holders = |name: &String| {
            let holds = |block: &&Vec<usize>| block.iter().any(|&r| supply.rails[r].section.as_ref() == Some(name));
            partition.iter().filter(holds).count()
        };
        (supply.rails.iter())
            .filter_map(|rail| rail.section.as_ref())
            .all(|name| holders(name) == 1)
    };
    set_partitions(supply.rails.len())
        .into_iter()
        .filter(|partition| partition.iter().all(|block| may_share(supply, block)) && together(partition))
        .collect()
}

/// Every way to join positive and negative sections to dual pairs: all rails of both allow dual and none is isolated.
fn pairings(supply: &Supply, sections: &[Vec<usize>]) -> Vec<Vec<Unit>> {
    let Some((first, rest)) = sections.split_first() else {
        return vec![Vec::new()];
    };
    let negative = |section: &[usize]| supply.rails[section[0]].voltage_v < 0.0;
    let dual = |section: &[usize]| {
        let rail = |&r: &usize| !supply.rails[r].isolated && supply.rails[r].paths.contains(&Path::Dual);
        !supply.share_never && section.iter().all(rail)
    };
    let mut found = Vec::new();
    let mut with = |unit: Vec<Vec<usize>>, rest: &[Vec<usize>]| {
        for mut others in pairings(supply, rest) {
            others.insert(0, Unit { sections: unit.clone() });
            found.push(others);
        }
    };
    with(vec![first.clone()], rest);
    for (place, other) in rest.iter().enumerate() {
        if negative(first) != negative(other) && dual(first) && dual(other) {
            let mut pair = vec![first.clone(), other.clone()];
            pair.sort_by_key(|section| negative(section));
            let mut rest = rest.to_vec();
            rest.remove(place);
            with(pair, &rest);
        }
    }
    found
}

/// Every layout of a supply, each once.
pub fn layouts(supply: &Supply) -> Vec<Layout> {
    let mut found = Vec::new();
    for sections in partitions(supply) {
        for units in pairings(supply, &sections) {
            for grouping in set_partitions(units.len()) {
                if supply.share_never && grouping.iter().any(|instance| instance.len() > 1) {
                    continue;
                }
                let instance = |places: &Vec<usize>| places.iter().map(|&place| units[place].clone()).collect();
                found.push(grouping.iter().map(instance).collect());
            }
        }
    }
    found
}
