//! Owns settings: keys of a supply given from outside its file, as if they stood in it.
//!
//! They change the document before anything is checked, so that the key table alone decides what a value may be, and a
//! saved build carries them like any other key.

use super::keys::keys;
use super::tree::{Entry, Node, Value};
use super::{Form, Key, Supply};
use crate::catalogue::Missing;
use crate::fault::Fault;
use crate::suggest::{did_you_mean, nearest};
use crate::units::Wrong;

/// Where a key stands.
#[derive(Clone, Copy)]
enum At {
    /// At the top or in the table of that name.
    Table(&'static Key),
    /// In the rail of that place.
    Rail(usize, &'static Key),
}

/// Puts every setting ("KEY=VALUE") into the document, in their order; the faults of those that name no key.
pub(super) fn apply(document: &mut Node, settings: &[String]) -> Vec<Fault> {
    let mut faults = Vec::new();
    for setting in settings {
        // A document that is no table is told by the reader.
        let Value::Table(top) = &mut document.value else {
            break;
        };
        match split(top, setting) {
            Ok((at, value)) => put(top, at, value, setting),
            Err(wrong) => faults.push(Fault {
                column: Some(format!("--set {setting}")),
                text: String::new(),
                problem: wrong.problem,
                allowed: wrong.allowed,
                ..Fault::default()
            }),
        }
    }
    faults
}

/// What a key says: as it is written, or its default, or (mains.low and mains.high) what a tolerance makes of it; `None`
/// where it is not asked.
#[must_use]
pub fn stated(supply: &Supply, key: &str) -> Option<String> {
    let document = Node::from_json(&supply.content);
    let Value::Table(top) = &document.value else {
        return None;
    };
    let at = find(top, key).ok()?;
    if let Some(node) = node(top, at) {
        return Some(node.text().trim().to_owned());
    }
    match (key, at.key().missing) {
        ("mains.low", _) => Some(volts(supply.mains.low_v)),
        ("mains.high", _) => Some(volts(supply.mains.high_v)),
        (_, Missing::Default(text)) => Some(text.to_owned()),
        _ => None,
    }
}

/// The shortest text that reads back as the same number.
fn volts(volts: f64) -> String {
    format!("{volts} V")
}

impl At {
    fn key(self) -> &'static Key {
        match self {
            At::Table(key) | At::Rail(_, key) => key,
        }
    }
}

/// Splits "KEY=VALUE" and finds the key. A rail's name may hold an equals sign, so the first one that ends a key counts.
fn split<'t>(top: &[Entry], setting: &'t str) -> Result<(At, &'t str), Wrong> {
    let mut first = None;
    for (place, _) in setting.match_indices('=') {
        match find(top, setting[..place].trim()) {
            Ok(at) => return Ok((at, setting[place + 1..].trim())),
            Err(wrong) => first = first.or(Some(wrong)),
        }
    }
    Err(first.unwrap_or_else(|| {
        Wrong::new(
            "has no equals sign",
            "write KEY=VALUE, for example ambient.high=\"43 degC\"",
        )
    }))
}

/// The place of a key path.
fn find(top: &[Entry], path: &str) -> Result<At, Wrong> {
    if let Some(rest) = path.strip_prefix("rail.") {
        return find_in_rail(top, rest);
    }
    let (table, name) = path.split_once('.').unwrap_or(("", path));
    match keys(table).find(|k| k.name == name && table != "rail") {
        Some(key) if matches!(key.form, Form::Table | Form::Tables) => {
            let inside: Vec<String> = match key.form {
                Form::Table => keys(key.name).map(|k| format!("{path}.{}", k.name)).collect(),
                _ => rails(top).map(|(_, name)| format!("rail.{name}.KEY")).collect(),
            };
            Err(Wrong::new("is a table", format!("set one of {}", inside.join(", "))))
        }
        Some(key) => Ok(At::Table(key)),
        None => Err(unknown(top, table, name)),
    }
}

/// Names may hold points: of all rails whose name begins the path the longest counts.
fn find_in_rail(top: &[Entry], rest: &str) -> Result<At, Wrong> {
    let mut known: Vec<(usize, &str)> = rails(top).collect();
    known.sort_by_key(|(_, name)| std::cmp::Reverse(name.len()));
    let key = |name: &str| {
        let key = rest.strip_prefix(name)?.strip_prefix('.')?;
        keys("rail").find(|k| k.name == key)
    };
    if let Some(at) = (known.iter()).find_map(|&(place, name)| Some(At::Rail(place, key(name)?))) {
        return Ok(at);
    }
    // A rail, and no key of it.
    if let Some(&(_, name)) = known.iter().find(|&&(_, name)| rest == name) {
        let inside: Vec<String> = keys("rail").map(|k| format!("rail.{name}.{}", k.name)).collect();
        return Err(Wrong::new("is a table", format!("set one of {}", inside.join(", "))));
    }
    let begins = |name: &str| rest.strip_prefix(name).is_some_and(|rest| rest.starts_with('.'));
    if let Some(&(_, name)) = known.iter().find(|&&(_, name)| begins(name)) {
        return Err(unknown(top, &format!("rail.{name}"), &rest[name.len() + 1..]));
    }
    let (named, _) = rest.rsplit_once('.').unwrap_or((rest, ""));
    let hint = did_you_mean(named, known.iter().map(|&(_, name)| name));
    let names: Vec<&str> = rails(top).map(|(_, name)| name).collect();
    let hint = if hint.is_empty() {
        format!("the rails are {}", names.join(", "))
    } else {
        hint
    };
    Err(Wrong::new(format!("names no rail: \"{named}\""), hint))
}

/// The nearest key: of the same table, else the same key of another one, else whatever is like the whole path.
fn unknown(top: &[Entry], table: &str, key: &str) -> Wrong {
    let nested = |form| matches!(form, Form::Table | Form::Tables);
    let mut all: Vec<(String, &str)> = vec![(String::new(), "")];
    all.extend((keys("").filter(|k| k.form == Form::Table)).map(|k| (k.name.to_owned(), k.name)));
    all.extend(rails(top).map(|(_, name)| (format!("rail.{name}"), "rail")));
    let paths: Vec<(&str, &str, String)> = (all.iter())
        .flat_map(|(path, table)| {
            let point = if path.is_empty() { "" } else { "." };
            (keys(table).filter(|k| !nested(k.form)))
                .map(move |k| (path.as_str(), k.name, format!("{path}{point}{}", k.name)))
        })
        .collect();
    let beside: Vec<&(&str, &str, String)> = paths.iter().filter(|(path, ..)| *path == table).collect();
    let whole = |(.., path): &(&str, &str, String)| format!("did you mean \"{path}\"?");
    let same_key = || paths.iter().find(|(_, name, _)| *name == key).map(whole);
    let hint = if beside.is_empty() {
        let path = format!("{table}.{key}");
        let guess = did_you_mean(&path, paths.iter().map(|(.., path)| path.as_str()));
        Some(guess).filter(|guess| !guess.is_empty()).or_else(same_key)
    } else {
        (nearest(key, beside.iter().map(|(_, name, _)| *name)))
            .and_then(|guess| beside.iter().find(|(_, name, _)| *name == guess))
            .map(|found| whole(found))
            .or_else(same_key)
    };
    let hint = hint.unwrap_or_else(|| {
        let example = [
            "the keys of the supply file: builds",
            "ambient.high",
            "rail.NAME.ripple",
        ]
        .map(str::to_owned)
        .to_vec();
        let known = if table.is_empty() || beside.is_empty() {
            example
        } else {
            beside.iter().map(|(.., path)| path.clone()).collect()
        };
        format!("known are {}", known.join(", "))
    });
    Wrong::new("is not a known key", hint)
}

/// Rails that have a name, with their places in the list.
fn rails(top: &[Entry]) -> impl Iterator<Item = (usize, &str)> {
    let list = top.iter().find(|e| e.key == "rail").map(|e| &e.node.value);
    let items = match list {
        Some(Value::List(items)) => items.as_slice(),
        _ => &[],
    };
    items.iter().enumerate().filter_map(|(place, item)| {
        let Value::Table(entries) = &item.value else {
            return None;
        };
        match &entries.iter().find(|e| e.key == "name")?.node.value {
            Value::Text(name) => Some((place, name.as_str())),
            _ => None,
        }
    })
}

/// What stands at a place.
fn node(top: &[Entry], at: At) -> Option<&Node> {
    let get = |entries: &'_ [Entry], key: &str| entries.iter().position(|e| e.key == key);
    let (entries, key): (&[Entry], &Key) = match at {
        At::Table(key) if key.table.is_empty() => (top, key),
        At::Table(key) => match &top[get(top, key.table)?].node.value {
            Value::Table(entries) => (entries, key),
            _ => return None,
        },
        At::Rail(place, key) => match &top[get(top, "rail")?].node.value {
            Value::List(items) => match &items.get(place)?.value {
                Value::Table(entries) => (entries, key),
                _ => return None,
            },
            _ => return None,
        },
    };
    Some(&entries[get(entries, key.name)?].node)
}

/// Replaces or adds a value. Where the file has something else than a table it stays, and the reader tells.
fn put(top: &mut Vec<Entry>, at: At, value: &str, setting: &str) {
    let node = Node {
        setting: Some(setting.to_owned()),
        ..parsed(at.key().form, value)
    };
    match at {
        At::Table(key) if key.table.is_empty() => replace(top, key.name, node),
        At::Table(key) => {
            if key.table == "mains" {
                one_form_of_mains(top, key.name, setting);
            }
            if !top.iter().any(|e| e.key == key.table) {
                replace(top, key.table, Node::from(Value::Table(Vec::new())));
            }
            if let Some(Value::Table(entries)) = value_of(top, key.table) {
                replace(entries, key.name, node);
            }
        }
        At::Rail(place, key) => {
            if let Some(Value::List(items)) = value_of(top, "rail")
                && let Some(Value::Table(entries)) = items.get_mut(place).map(|item| &mut item.value)
            {
                replace(entries, key.name, node);
            }
        }
    }
}

fn value_of<'t>(entries: &'t mut [Entry], key: &str) -> Option<&'t mut Value> {
    (entries.iter_mut().find(|e| e.key == key)).map(|e| &mut e.node.value)
}

fn replace(entries: &mut Vec<Entry>, key: &str, node: Node) {
    match entries.iter_mut().find(|e| e.key == key) {
        Some(entry) => entry.node = node,
        None => entries.push(Entry {
            key: key.to_owned(),
            line: None,
            node,
        }),
    }
}

/// The mains' ends are stated by a tolerance or by low and high, never both: the form that is set takes the place of
/// the other one. The end that is not set stays where the tolerance had it.
fn one_form_of_mains(top: &mut [Entry], set: &str, setting: &str) {
    let Some(Value::Table(mains)) = value_of(top, "mains") else {
        return;
    };
    match set {
        "tolerance" => mains.retain(|e| e.key != "low" && e.key != "high"),
        "low" | "high" if !mains.iter().any(|e| e.key == "low" || e.key == "high") => {
            let number = |key: &str| {
                let form = keys("mains").find(|k| k.name == key)?.form;
                form.number(&mains.iter().find(|e| e.key == key)?.node.text()).ok()
            };
            let (Some(nominal), Some(tolerance)) = (number("voltage"), number("tolerance")) else {
                return;
            };
            mains.retain(|e| e.key != "tolerance");
            for (key, end) in [
                ("low", nominal - nominal * tolerance),
                ("high", nominal + nominal * tolerance),
            ] {
                let node = Node {
                    setting: Some(setting.to_owned()),
                    ..Node::from(Value::Text(volts(end)))
                };
                replace(mains, key, node);
            }
        }
        _ => {}
    }
}

/// A TOML value where the text is one of the type that the form takes, else the text itself, which the reader judges.
fn parsed(form: Form, text: &str) -> Node {
    let node = Node::from_toml_value(text);
    let fits = |node: &Node| match form {
        Form::Text | Form::Word(_) => matches!(node.value, Value::Text(_)),
        Form::Quantity(m) if m.unit.is_empty() => matches!(node.value, Value::Number(_)),
        Form::Quantity(_) => matches!(node.value, Value::Text(_) | Value::Number(_)),
        Form::Count(..) => matches!(node.value, Value::Number(_)),
        Form::Flag => matches!(node.value, Value::Flag(_)),
        Form::Words(_) => matches!(node.value, Value::List(_)),
        Form::Table | Form::Tables => false,
    };
    node.filter(fits).unwrap_or_else(|| {
        let text = text.to_owned();
        Node::from(match form {
            // The reader then says that it is not a number, and which are allowed.
            Form::Count(..) => Value::Number(text),
            Form::Quantity(m) if m.unit.is_empty() => Value::Number(text),
            _ => Value::Text(text),
        })
    })
}
