//! Owns the shape of a build document: its keys and what each may hold. Names are not looked up here.

use serde_json::{Map, Value};

use super::SCHEMA;
use crate::catalogue::Slot;
use crate::fault::Fault;
use crate::suggest::did_you_mean;

/// Keys of the document; those after the first four are written by the tool and not needed.
const TOP: [&str; 20] = [
    "supply",
    "transformers",
    "sections",
    "rails",
    "schema",
    "catalogue",
    "objective",
    "proof",
    "cost_per_unit",
    "currency",
    "heat_w",
    "lines",
    "fitted",
    "fitted_cost",
    "margins",
    "cautions",
    "parts",
    "room",
    "prices",
    "shelf",
];
const TRANSFORMER: [&str; 2] = ["id", "part"];
const SECTION: [&str; 13] = [
    "id",
    "transformer",
    "windings",
    "secondaries",
    "hookup",
    "path",
    "pair",
    "rectifier",
    "rectifier_qty",
    "rectifier_sink",
    "reservoir",
    "reservoir_qty",
    "rails",
];
const RAIL: [&str; 4] = ["name", "section", "pass", "sink"];

/// A build with names instead of parts.
#[derive(Debug)]
pub(super) struct Document {
    pub(super) transformers: Vec<Transformer>,
    pub(super) sections: Vec<Section>,
    pub(super) rails: Vec<Rail>,
}

#[derive(Debug)]
pub(super) struct Transformer {
    pub(super) id: String,
    pub(super) part: String,
}

#[derive(Debug)]
pub(super) struct Section {
    pub(super) id: String,
    pub(super) transformer: String,
    pub(super) windings: Option<u64>,
    pub(super) secondaries: Vec<u64>,
    pub(super) hookup: String,
    pub(super) path: String,
    pub(super) pair: Option<String>,
    pub(super) rectifier: String,
    pub(super) rectifier_qty: Option<u64>,
    pub(super) rectifier_sink: Option<String>,
    pub(super) reservoir: String,
    pub(super) reservoir_qty: u64,
    pub(super) rails: Vec<String>,
}

#[derive(Debug)]
pub(super) struct Rail {
    pub(super) name: String,
    pub(super) section: String,
    pub(super) pass: String,
    pub(super) sink: Option<String>,
}

impl Document {
    /// Reads the shape; `None` when faults keep it from being whole.
    pub(super) fn read(value: &Value, file: &str, faults: &mut Vec<Fault>) -> Option<Document> {
        let Some(top) = value.as_object() else {
            faults.push(fault(file, "", "the document", "is not an object", SCHEMA));
            return None;
        };
        let before = faults.len();
        match top.get("schema") {
            None => {}
            Some(schema) if schema == SCHEMA => {}
            Some(schema) => {
                faults.push(fault(
                    file,
                    &schema.to_string(),
                    "schema",
                    "is not a build this version reads",
                    SCHEMA,
                ));
                return None;
            }
        }
        let mut reader = Reader { file, faults };
        reader.known(top, "", &TOP);
        if !top.contains_key("supply") {
            reader.missing("supply", "the supply file's content");
        }
        let transformers = reader.list(top, "transformers", |r, at, item| {
            r.known(item, at, &TRANSFORMER);
            Some(Transformer {
                id: r.text(item, at, "id")?,
                part: r.text(item, at, "part")?,
            })
        });
        let sections = reader.list(top, "sections", |r, at, item| {
            r.known(item, at, &SECTION);
            let section = (
                r.text(item, at, "id"),
                r.text(item, at, "transformer"),
                r.numbers(item, at, "secondaries"),
                r.text(item, at, "hookup"),
                r.text(item, at, "path"),
                r.text(item, at, "rectifier"),
                r.text(item, at, "reservoir"),
                r.number(item, at, "reservoir_qty"),
                r.texts(item, at, "rails"),
            );
            Some(Section {
                id: section.0?,
                transformer: section.1?,
                windings: r.optional_number(item, at, "windings"),
                secondaries: section.2?,
                hookup: section.3?,
                path: section.4?,
                pair: r.optional_text(item, at, "pair"),
                rectifier: section.5?,
                rectifier_qty: r.optional_number(item, at, "rectifier_qty"),
                rectifier_sink: r.optional_text(item, at, "rectifier_sink"),
                reservoir: section.6?,
                reservoir_qty: section.7?,
                rails: section.8?,
            })
        });
        let rails = reader.list(top, "rails", |r, at, item| {
            r.known(item, at, &RAIL);
            let rail = (
                r.text(item, at, "name"),
                r.text(item, at, "section"),
                r.text(item, at, "pass"),
            );
            Some(Rail {
                name: rail.0?,
                section: rail.1?,
                pass: rail.2?,
                sink: r.optional_text(item, at, "sink"),
            })
        });
        (faults.len() == before).then_some(Document {
            transformers,
            sections,
            rails,
        })
    }

    /// Every part that it names with the slot in which it is used.
    pub(super) fn used(&self) -> Vec<(Slot, &str)> {
        let mut used: Vec<(Slot, &str)> = self
            .transformers
            .iter()
            .map(|t| (Slot::Transformer, t.part.as_str()))
            .collect();
        for s in &self.sections {
            used.push((Slot::Rectifier, &s.rectifier));
            used.push((Slot::Reservoir, &s.reservoir));
            used.extend(s.rectifier_sink.as_deref().map(|sink| (Slot::Sink, sink)));
        }
        for r in &self.rails {
            used.push((Slot::Pass, &r.pass));
            used.extend(r.sink.as_deref().map(|sink| (Slot::Sink, sink)));
        }
        used
    }
}

pub(super) fn fault(file: &str, text: &str, column: &str, problem: &str, allowed: &str) -> Fault {
    Fault {
        file: file.to_owned(),
        column: Some(column.to_owned()),
        text: text.trim_matches('"').to_owned(),
        problem: problem.to_owned(),
        allowed: allowed.to_owned(),
        ..Fault::default()
    }
}

struct Reader<'a> {
    file: &'a str,
    faults: &'a mut Vec<Fault>,
}

type Object = Map<String, Value>;

impl Reader<'_> {
    fn known(&mut self, object: &Object, at: &str, keys: &[&str]) {
        for key in object.keys().filter(|key| !keys.contains(&key.as_str())) {
            let hint = did_you_mean(key, keys.iter().copied());
            let hint = if hint.is_empty() {
                format!("known are {}", keys.join(", "))
            } else {
                hint
            };
            self.faults
                .push(fault(self.file, "", &format!("{at}{key}"), "is not a known key", &hint));
        }
    }

    fn missing(&mut self, key: &str, wanted: &str) {
        self.faults.push(fault(self.file, "", key, "is missing", wanted));
    }

    fn list<T>(&mut self, top: &Object, key: &str, item: impl Fn(&mut Self, &str, &Object) -> Option<T>) -> Vec<T> {
        let Some(list) = top.get(key).and_then(Value::as_array) else {
            self.missing(key, "a list of objects");
            return Vec::new();
        };
        let mut found = Vec::new();
        for (place, value) in list.iter().enumerate() {
            let at = format!("{key}[{}].", place + 1);
            match value.as_object() {
                Some(object) => found.extend(item(self, &at, object)),
                None => self
                    .faults
                    .push(fault(self.file, &value.to_string(), &at, "is not an object", "{...}")),
            }
        }
        found
    }

    fn of<T>(
        &mut self,
        object: &Object,
        at: &str,
        key: &str,
        wanted: &str,
        read: impl Fn(&Value) -> Option<T>,
    ) -> Option<T> {
        let path = format!("{at}{key}");
        match object.get(key) {
            None | Some(Value::Null) => self.missing(&path, wanted),
            Some(value) => match read(value) {
                Some(read) => return Some(read),
                None => self
                    .faults
                    .push(fault(self.file, &value.to_string(), &path, "does not fit", wanted)),
            },
        }
        None
    }

    fn text(&mut self, object: &Object, at: &str, key: &str) -> Option<String> {
        self.of(object, at, key, "a text", |v| v.as_str().map(str::to_owned))
    }

    fn texts(&mut self, object: &Object, at: &str, key: &str) -> Option<Vec<String>> {
        self.of(object, at, key, "a list of texts", |v| {
            v.as_array()?.iter().map(|v| v.as_str().map(str::to_owned)).collect()
        })
    }

    fn number(&mut self, object: &Object, at: &str, key: &str) -> Option<u64> {
        self.of(object, at, key, "a whole number", Value::as_u64)
    }

    fn numbers(&mut self, object: &Object, at: &str, key: &str) -> Option<Vec<u64>> {
        self.of(object, at, key, "a list of whole numbers", |v| {
            v.as_array()?.iter().map(Value::as_u64).collect()
        })
    }

    fn optional_text(&mut self, object: &Object, at: &str, key: &str) -> Option<String> {
        object.get(key).filter(|v| !v.is_null())?;
        self.text(object, at, key)
    }

    fn optional_number(&mut self, object: &Object, at: &str, key: &str) -> Option<u64> {
        object.get(key).filter(|v| !v.is_null())?;
        self.number(object, at, key)
    }
}
