//! Second sources, substitutes, why a part stays out, and the shelf, against brute force on small random cases.
//!
//! A failure prints the whole case. ORACLE_SEEDS=a..b in the environment runs other seeds.
#![allow(clippy::unwrap_used, clippy::print_stdout, unreachable_pub)]

#[path = "common/brute_force.rs"]
mod brute_force;
#[path = "common/choices.rs"]
mod choices;
mod common;
#[path = "common/layouts.rs"]
mod layouts;
#[path = "common/oracle_run.rs"]
mod oracle_run;
#[path = "common/own_rules.rs"]
mod own_rules;
#[path = "common/small_case.rs"]
mod small_case;
#[path = "common/small_maker.rs"]
mod small_maker;
#[path = "common/small_parts.rs"]
mod small_parts;

use std::collections::{BTreeMap, BTreeSet};

use binrail::audit::{Limit, audit};
use binrail::build::Build;
use binrail::catalogue::{Catalogue, Part, PartId, Slot, Status};
use binrail::optimise::{Found, Question, companies, optimise};
use binrail::screen::Objective;
use binrail::study::each::each;
use binrail::study::shelf::shelf;
use binrail::study::swap::{Loss, Old, Swap, swap, swap_each};
use binrail::study::why::{Verdict, why};
use binrail::supply::Supply;

use brute_force::{Brute, Judged, Wish};
use common::Random;
use oracle_run::{OBJECTIVES, Tally, over_kind, question};
use own_rules::{Bill, apart, price};
use small_case::{Case, Kind};

/// Cost, heat, text.
type Key = (i64, i64, String);

fn key(found: &Found) -> Key {
    (found.key.cost, found.key.heat, found.key.text.clone())
}

fn key_of(judged: &Judged) -> Key {
    (judged.cost, judged.heat, judged.fields.join("\0"))
}

fn name(catalogue: &Catalogue, id: PartId) -> &str {
    &catalogue.parts().find(|p| p.id == id).unwrap().name
}

fn enough(tally: &Tally, what: &str, least: usize) {
    println!("{what}: {}", tally.of(what));
    assert!(
        std::env::var("ORACLE_SEEDS").is_ok() || tally.of(what) >= least,
        "{what}: {tally:#?}"
    );
}

/// Works through cases of one, two and three rails, some about dual pairs, floating rails and named sections.
fn everywhere(work: impl Fn(&Case) + Sync) {
    over_kind(Kind::Any, [20, 20, 8], &work);
    over_kind(Kind::Dual, [0, 6, 4], &work);
    over_kind(Kind::Floating, [0, 4, 2], &work);
    over_kind(Kind::Pinned, [0, 4, 2], &work);
}

/// For every part of every slot the best build around it, in order, and nothing where brute force has nothing.
#[test]
fn the_best_build_around_each_part_is_that_of_brute_force() {
    let tally = Tally::default();
    everywhere(|case| {
        let (catalogue, supply) = (case.catalogue(), case.supply());
        let brute = Brute::new(&supply, &catalogue);
        let mut random = Random::new(case.seed);
        let all: Vec<&Part> = catalogue.parts().collect();
        let out = random.pick(&all).id;
        for (objective, without) in [
            (Objective::Cost, BTreeSet::new()),
            (Objective::Heat, BTreeSet::from([out])),
        ] {
            let asked = Question {
                without: without.clone(),
                ..question(&supply, &catalogue, objective, 1)
            };
            let best = optimise(&asked).unwrap();
            for slot in Slot::ALL {
                let (got, _) = each(&asked, slot, &best).unwrap();
                let usable = |p: &&Part| p.slot == slot && p.status != Status::Withdrawn && !without.contains(&p.id);
                let with = |part: PartId| {
                    let wish = Wish {
                        without: without.clone(),
                        with: vec![(part, None)],
                    };
                    brute.list(&catalogue, objective, &wish).first().map(|j| key_of(j))
                };
                let mut wanted: Vec<(&str, Option<Key>)> = (catalogue.parts().filter(usable))
                    .map(|p| (p.name.as_str(), with(p.id)))
                    .collect();
                let order = |key: &Option<Key>| {
                    key.clone().map_or((1, 0, 0, String::new()), |(cost, heat, text)| {
                        let (first, second) = objective.order(cost, heat);
                        (0, first, second, text)
                    })
                };
                wanted.sort_by_key(|(_, key)| order(key));
                let got: Vec<(&str, Option<Key>)> = got
                    .iter()
                    .map(|each| (each.part.name.as_str(), each.outcome.builds.first().map(key)))
                    .collect();
                tally.add("with a build", wanted.iter().filter(|w| w.1.is_some()).count());
                tally.add("without one", wanted.iter().filter(|w| w.1.is_none()).count());
                assert_eq!(
                    got,
                    wanted,
                    "{} by {objective:?} without {without:?}\n{case}",
                    slot.word()
                );
            }
        }
    });
    enough(&tally, "with a build", 400);
    enough(&tally, "without one", 400);
}

/// A feasible build at random as it was when all its parts could be had.
fn some<'b, 'c>(random: &mut Random, brute: &'b Brute<'c>, catalogue: &Catalogue) -> Option<&'b Judged<'c>> {
    let sold = brute.allowed(catalogue, &Wish::default());
    (!sold.is_empty()).then(|| *random.pick(&sold))
}

/// The substitute held against the list of brute force.
fn check_swap(case: &Case, what: &str, got: &Swap, wanted: Option<(usize, &Judged)>, old: &Build) {
    let found = got.outcome.builds.first();
    assert_eq!(
        found.map(|found| (apart(old, &found.build), key(found))),
        wanted.map(|(distance, judged)| (distance, key_of(judged))),
        "{what}\n{case}"
    );
    assert_eq!(got.distance, wanted.map(|(distance, _)| distance), "{what}\n{case}");
}

/// Without any of its parts, and without two, a build is redone as brute force would.
#[test]
fn the_nearest_build_without_a_part_is_that_of_brute_force() {
    let tally = Tally::default();
    everywhere(|case| {
        let (catalogue, supply) = (case.catalogue(), case.supply());
        let brute = Brute::new(&supply, &catalogue);
        let mut random = Random::new(case.seed);
        for objective in OBJECTIVES {
            let Some(old) = some(&mut random, &brute, &catalogue) else {
                return;
            };
            let from = Old::new(&supply, &old.build, &catalogue);
            assert_eq!(
                (from.cost.0, from.heat_w.map(|w| (w * 1e6).round() as i64)),
                (old.cost, Some(old.heat))
            );
            assert!(from.losses(&supply, &BTreeSet::new()).is_empty());
            let plain = question(&supply, &catalogue, objective, 1);
            let each = swap_each(&plain, &from, false).unwrap();
            assert_eq!(each.len(), old.bill.len());
            for (part, got) in each {
                let wish = Wish {
                    without: BTreeSet::from([part.id]),
                    with: Vec::new(),
                };
                let wanted = brute.nearest(&catalogue, &old.build, objective, &wish);
                check_swap(
                    case,
                    &format!("without {} by {objective:?}", part.name),
                    &got,
                    wanted,
                    &old.build,
                );
                tally.add("swaps", 1);
                tally.add("no substitute", usize::from(wanted.is_none()));
                tally.add("more than one place", usize::from(wanted.is_some_and(|w| w.0 > 1)));
                let best = brute.list(&catalogue, objective, &wish).first().map(|j| key_of(j));
                tally.add("not the best", usize::from(best != wanted.map(|w| key_of(w.1))));
            }
            let ids: Vec<PartId> = old.bill.keys().copied().collect();
            let without = BTreeSet::from([*random.pick(&ids), *random.pick(&ids)]);
            let wish = Wish {
                without: without.clone(),
                with: Vec::new(),
            };
            let asked = Question {
                without,
                ..plain.clone()
            };
            let what = format!("{:?} by {objective:?}", wish.without);
            let wanted = brute.nearest(&catalogue, &old.build, objective, &wish);
            check_swap(case, &what, &swap(&asked, &from, false).unwrap(), wanted, &old.build);
            // Freely: the best of all.
            let wanted = (brute.list(&catalogue, objective, &wish).first())
                .map(|judged| (apart(&old.build, &judged.build), *judged));
            check_swap(case, &what, &swap(&asked, &from, true).unwrap(), wanted, &old.build);
            // Nothing is lost: the build itself, or what has the same places and a lower key.
            let wanted = brute.nearest(&catalogue, &old.build, objective, &Wish::default());
            assert_eq!(wanted.unwrap().0, 0);
            check_swap(
                case,
                "nothing",
                &swap(&plain, &from, false).unwrap(),
                wanted,
                &old.build,
            );
        }
    });
    enough(&tally, "swaps", 400);
    enough(&tally, "no substitute", 40);
    enough(&tally, "more than one place", 40);
    enough(&tally, "not the best", 100);
}

/// A part that is gone from today's catalogue, one that is withdrawn, one that is short for the run.
#[test]
fn what_is_lost_goes_and_the_rest_stays_where_it_can() {
    let tally = Tally::default();
    everywhere(|case| {
        let (then, supply) = (case.catalogue(), case.supply());
        let mut random = Random::new(case.seed);
        let before = Brute::new(&supply, &then);
        let Some(old) = some(&mut random, &before, &then) else {
            return;
        };
        let mut names: Vec<&str> = old.bill.keys().map(|&id| name(&then, id)).collect();
        let mut take = |random: &mut Random| names.remove(random.below(names.len()));
        let (gone, withdrawn, short) = (take(&mut random), take(&mut random), take(&mut random));
        let mut lost: Vec<(&str, Loss)> = Vec::new();
        let mut today = case.clone();
        if random.chance(0.6) {
            today.rows.retain(|row| row.name != gone);
            lost.push((gone, Loss::Gone));
        }
        if random.chance(0.6) {
            let row = today.rows.iter_mut().find(|row| row.name == withdrawn).unwrap();
            row.set("status", "withdrawn");
            lost.push((withdrawn, Loss::Withdrawn));
        }
        if random.chance(0.6) {
            let needed = supply.builds * old.bill[&then.find(short).unwrap().id];
            let row = today.rows.iter_mut().find(|row| row.name == short).unwrap();
            row.set("stock", needed - 1);
            lost.push((
                short,
                Loss::Short {
                    needed,
                    stock: needed - 1,
                },
            ));
        }
        let now = today.catalogue();
        let from = Old::new(&supply, &old.build, &now);
        let losses = from.losses(&supply, &BTreeSet::new());
        let mut told: Vec<(&str, Loss)> = losses.iter().map(|&(part, loss)| (part.name.as_str(), loss)).collect();
        told.sort_by_key(|(name, _)| *name);
        lost.sort_by_key(|(name, _)| *name);
        assert_eq!(told, lost, "{case}");

        // Today's price where there is one, else that of then.
        let (mut priced_now, mut priced_then) = (Bill::new(), Bill::new());
        for (&id, &count) in &old.bill {
            match now.find(name(&then, id)) {
                Some(part) => priced_now.insert(part.id, count),
                None => priced_then.insert(id, count),
            };
        }
        let fitted: i64 = old.build.rails.iter().map(|r| r.pass.fitted_price.0).sum();
        let cost = price(&supply, &now, &priced_now) + price(&supply, &then, &priced_then) + fitted;
        assert_eq!(from.cost.0, cost, "{case}");

        let after = Brute::new(&supply, &now);
        let without: BTreeSet<PartId> = lost
            .iter()
            .filter_map(|(name, _)| now.find(name))
            .map(|p| p.id)
            .collect();
        for objective in OBJECTIVES {
            let asked = Question {
                without: without.clone(),
                ..question(&supply, &now, objective, 1)
            };
            let wish = Wish {
                without: without.clone(),
                with: Vec::new(),
            };
            let wanted = after.nearest(&now, &old.build, objective, &wish);
            check_swap(
                case,
                &format!("{lost:?}"),
                &swap(&asked, &from, false).unwrap(),
                wanted,
                &old.build,
            );
            tally.add("swaps", usize::from(wanted.is_some()));
        }
    });
    enough(&tally, "swaps", 30);
}

/// Whether a part fits, at what price; and which kind of answer it gets when it does not.
#[test]
fn why_a_part_stays_out_is_what_brute_force_says() {
    let tally = Tally::default();
    everywhere(|case| {
        let (catalogue, supply) = (case.catalogue(), case.supply());
        let brute = Brute::new(&supply, &catalogue);
        let objective = OBJECTIVES[case.seed as usize % 2];
        let asked = question(&supply, &catalogue, objective, 1);
        let best = brute
            .list(&catalogue, objective, &Wish::default())
            .first()
            .map(|j| key_of(j));
        // By rail, what passes of it alone.
        let alone: Vec<Supply> = (supply.rails.iter())
            .map(|rail| Supply {
                rails: vec![rail.clone()],
                ..supply.clone()
            })
            .collect();
        let passing: Vec<Brute> = alone.iter().map(|supply| Brute::new(supply, &catalogue)).collect();
        let all = companies(&asked);
        for part in catalogue.parts() {
            let what = format!("{} by {objective:?}\n{case}", part.name);
            let wish = Wish {
                with: vec![(part.id, None)],
                ..Wish::default()
            };
            let with = brute.list(&catalogue, objective, &wish).first().map(|j| key_of(j));
            match (why(&asked, part.id).unwrap().verdict, with) {
                (
                    Verdict::Fits {
                        with: got,
                        best: least,
                        rail,
                        proved,
                    },
                    Some(wanted),
                ) => {
                    assert!(proved, "{what}");
                    assert_eq!(key(&got), wanted, "{what}");
                    assert_eq!(least.as_ref().map(key), best, "{what}");
                    assert!(own_rules::part_at(&got.build, rail, part.id), "{what}");
                    tally.add("fits", 1);
                }
                (Verdict::Fails { company, failing }, None) => {
                    let verdict = audit(&company.supply, &company.build);
                    let own = &alone[company.rail];
                    assert_eq!(company.supply.rails, own.rails, "{what}");
                    assert!(company.build.uses().any(|(used, _)| used.id == part.id), "{what}");
                    let unmet = verdict.margins.iter().filter(|m| !m.check.met());
                    assert_eq!(unmet.count(), failing.len(), "{what}");
                    let tightness: Vec<f64> = failing.iter().map(|m| m.check.tightness()).collect();
                    assert!(tightness.is_sorted() && !tightness.is_empty(), "{what}");
                    assert!(
                        !passing.iter().any(|b| !b.list(&catalogue, objective, &wish).is_empty()),
                        "{what}"
                    );
                    if part.status != Status::Withdrawn {
                        let known = all.of[part.id.0 as usize].unwrap();
                        assert!(
                            (known.tightness - tightness[0]).abs() <= 1e-12 * known.tightness.abs(),
                            "{what}"
                        );
                    }
                    tally.add("fails", 1);
                    tally.add("fails by one limit", usize::from(failing.len() == 1));
                }
                (
                    Verdict::Joint {
                        alone: own,
                        others_pass,
                        failing,
                        joint,
                        proved,
                    },
                    None,
                ) => {
                    assert!(proved, "{what}");
                    assert!(audit(&own.supply, &own.build).passes(), "{what}");
                    assert!(own.build.uses().any(|(used, _)| used.id == part.id), "{what}");
                    assert_eq!(others_pass, best.is_some(), "{what}");
                    let limits: BTreeSet<Limit> = failing.iter().map(|m| m.check.limit).collect();
                    let named: BTreeSet<Limit> = joint.iter().map(|j| j.limit).collect();
                    assert!(limits.is_subset(&named), "{limits:?} {named:?} {what}");
                    tally.add("not together", 1);
                }
                (Verdict::NoUse(_), None) => {
                    if part.status != Status::Withdrawn {
                        assert!(all.of[part.id.0 as usize].is_none(), "{what}");
                    }
                    tally.add("no use", 1);
                }
                (got, wanted) => panic!("got {got:?}, wanted {wanted:?}: {what}"),
            }
        }
    });
    enough(&tally, "fits", 200);
    enough(&tally, "fails", 100);
    enough(&tally, "not together", 20);
    enough(&tally, "no use", 15);
}

/// Drop-ins are the builds of brute force that differ in the name of that part alone; the units are what the audit of a
/// longer run allows.
#[test]
fn the_shelf_is_what_brute_force_says() {
    let tally = Tally::default();
    everywhere(|case| {
        let (catalogue, supply) = (case.catalogue(), case.supply());
        let brute = Brute::new(&supply, &catalogue);
        let mut random = Random::new(case.seed);
        let parts: BTreeMap<&str, &Part> = catalogue.parts().map(|p| (p.name.as_str(), p)).collect();
        for _ in 0..3 {
            let Some(old) = some(&mut random, &brute, &catalogue) else {
                return;
            };
            let got = shelf(&supply, &catalogue, &old.build, &BTreeSet::new());
            assert_eq!(got.lines.len(), old.bill.len());
            // Ids of sections and transformers stand behind ten fields for each rail.
            let names = 10 * supply.rails.len();
            for (line, (&id, &count)) in got.lines.iter().zip(&old.bill) {
                let part = parts[line.part.as_str()];
                assert_eq!(part.id, id);
                assert_eq!(line.units, part.stock.map(|stock| stock / count));
                let swapped = |other: &str| -> Vec<String> {
                    let field = |(place, field): (usize, &String)| {
                        if place < names && *field == part.name {
                            other.to_owned()
                        } else {
                            field.clone()
                        }
                    };
                    old.fields.iter().enumerate().map(field).collect()
                };
                let same_kind = |other: &str| {
                    let kind = |name: &str| {
                        catalogue
                            .rectifiers
                            .iter()
                            .find(|r| r.part.name == name)
                            .map(|r| r.kind)
                    };
                    kind(other) == kind(&part.name)
                };
                let mut wanted: Vec<(i64, &str)> = Vec::new();
                for other in catalogue.parts().filter(|p| p.slot == part.slot && p.id != id) {
                    if other.status == Status::Withdrawn || !same_kind(&other.name) {
                        continue;
                    }
                    let fields = swapped(&other.name);
                    wanted.extend(
                        brute
                            .all
                            .iter()
                            .find(|j| j.fields == fields)
                            .map(|j| (j.cost, other.name.as_str())),
                    );
                }
                wanted.sort_unstable();
                let wanted: Vec<&str> = wanted.into_iter().map(|(_, name)| name).collect();
                tally.add("drop-ins", wanted.len());
                if part.slot == Slot::Transformer {
                    // One wound otherwise may serve from places that are not the lowest of its equal ones.
                    assert!(
                        wanted.iter().all(|name| line.drop_ins.iter().any(|own| own == name)),
                        "{case}"
                    );
                } else {
                    assert_eq!(line.drop_ins, wanted, "{} in {:?}\n{case}", line.part, old.fields);
                }
            }
            let Some(units) = got.units else {
                assert!(got.first.is_none());
                continue;
            };
            let stocked = |builds: u64| -> Vec<String> {
                let longer = Supply {
                    builds,
                    ..supply.clone()
                };
                let verdict = audit(&longer, &old.build);
                let short = verdict
                    .margins
                    .into_iter()
                    .filter(|m| m.check.limit == Limit::Stock && !m.check.met());
                short.map(|m| m.of).collect()
            };
            assert!(units == 0 || stocked(units).is_empty(), "{case}");
            assert_eq!(stocked(units + 1).first(), got.first.as_ref(), "{case}");
            tally.add("limited", 1);
        }
    });
    enough(&tally, "drop-ins", 100);
    enough(&tally, "limited", 50);
}
