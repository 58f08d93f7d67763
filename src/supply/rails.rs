//! Owns the reading of the rails, and the checks that need two of them.

use super::reader::{Reader, Table};
use super::tree::Value;
use super::{Path, Rail};
use crate::catalogue::DeviceKind;
use crate::units::Wrong;

/// All rails, at least one.
pub(super) fn rails(r: &mut Reader<'_>, top: &Table<'_>, share_never: bool) -> Vec<Rail> {
    let tables = tables(r, top);
    let rails: Vec<Rail> = tables.iter().map(|t| rail(r, t)).collect();
    for (k, rail) in rails.iter().enumerate() {
        if !rail.name.is_empty() && rails[..k].iter().any(|x| x.name == rail.name) {
            let wrong = Wrong::new("is the name of two rails", "give each rail its own name");
            r.fault(&tables[k], "name", wrong);
        }
    }
    sections(r, &tables, &rails, share_never);
    not_yet_offered(r, &tables, &rails);
    rails
}

/// The tables of [[rail]], with the rail's name in their key paths.
fn tables<'a>(r: &mut Reader<'_>, top: &Table<'a>) -> Vec<Table<'a>> {
    let remedy = "write one [[rail]] or more, with its keys below";
    let items = match top.get("rail").map(|n| &n.value) {
        Some(Value::List(items)) if !items.is_empty() => items,
        Some(Value::Table(_)) => {
            r.fault(
                top,
                "rail",
                Wrong::new("is a single table", "write [[rail]] with two brackets"),
            );
            return Vec::new();
        }
        Some(Value::List(_)) | None => {
            r.fault(top, "rail", Wrong::new("is missing", remedy));
            return Vec::new();
        }
        Some(_) => {
            r.fault(top, "rail", Wrong::new("is of another type", remedy));
            return Vec::new();
        }
    };
    let mut found = Vec::new();
    for (k, item) in items.iter().enumerate() {
        let Value::Table(entries) = &item.value else {
            r.item(top, "rail", item, Wrong::new("is not a table", remedy));
            continue;
        };
        let mut table = Table {
            name: "rail",
            path: format!("rail[{}]", k + 1),
            line: item.line,
            entries,
        };
        if let Some(Value::Text(name)) = table.get("name").map(|n| &n.value) {
            table.path = format!("rail.{name}");
        }
        r.check_keys(&table);
        found.push(table);
    }
    found
}

fn rail(r: &mut Reader<'_>, t: &Table<'_>) -> Rail {
    let current = r.number(t, "current");
    let idle = r.number(t, "idle");
    if idle.zip(current).is_some_and(|(i, c)| i > c) {
        r.fault(
            t,
            "idle",
            Wrong::new("is above current", "at most the full-load current"),
        );
    }
    let paths = r.words(t, "paths");
    let devices = r.words(t, "devices");
    Rail {
        name: r.text(t, "name").unwrap_or_default(),
        voltage_v: r.number(t, "voltage").unwrap_or_default(),
        current_a: current.unwrap_or_default(),
        idle_a: idle.unwrap_or_default(),
        accuracy: r.number(t, "accuracy"),
        ripple_v: r.number(t, "ripple"),
        dip_s: r.number(t, "dip"),
        paths: (paths.iter())
            .filter_map(|word| Path::ALL.into_iter().find(|p| p.word() == *word))
            .collect(),
        devices: (devices.iter())
            .filter_map(|word| DeviceKind::ALL.into_iter().find(|k| k.word() == *word))
            .collect(),
        isolated: r.flag(t, "isolated"),
        short_circuit_survive: r.word(t, "short_circuit").is_some(),
        section: r.text(t, "section"),
    }
}

/// For each rail the first one before it that names the same section.
fn sharing(rails: &[Rail]) -> impl Iterator<Item = (usize, usize)> {
    (0..rails.len()).filter_map(|k| {
        let section = rails[k].section.as_ref()?;
        let first = rails[..k].iter().position(|x| x.section.as_ref() == Some(section))?;
        Some((first, k))
    })
}

/// A section has one polarity, and no rail in it may ask to be alone.
fn sections(r: &mut Reader<'_>, tables: &[Table<'_>], rails: &[Rail], share_never: bool) {
    for (first, k) in sharing(rails) {
        let (a, b) = (&rails[first], &rails[k]);
        let named = format!("rail {} names this section too", a.name);
        if a.voltage_v * b.voltage_v < 0.0 {
            let wrong = Wrong::new(
                format!("{named}, with the other polarity"),
                "a section has one polarity",
            );
            r.fault(&tables[k], "section", wrong);
        }
        if a.isolated || b.isolated {
            let wrong = Wrong::new(named.clone(), "an isolated rail shares no section");
            r.fault(&tables[k], "section", wrong);
        }
        if share_never {
            let wrong = Wrong::new(named, "share = \"never\" gives every rail its own section");
            r.fault(&tables[k], "section", wrong);
        }
    }
}

/// What the file format has and this version's search does not: told, never ignored. Each goes when the search can do it.
fn not_yet_offered(r: &mut Reader<'_>, tables: &[Table<'_>], rails: &[Rail]) {
    const NOT_YET: &str = "is not yet offered by this version";
    for (table, rail) in tables.iter().zip(rails) {
        for kind in &rail.devices {
            if !matches!(kind, DeviceKind::Fixed | DeviceKind::Adjustable) {
                let wrong = Wrong::new(format!("{} {NOT_YET}", kind.word()), "write fixed, adjustable, or both");
                r.fault(table, "devices", wrong);
            }
        }
    }
}
