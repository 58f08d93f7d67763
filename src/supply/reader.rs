//! Owns the reading of one key: finds it, parses it by the key table, keeps the faults.

use super::Form;
use super::keys::{Key, keys};
use super::tree::{Entry, Node, Value};
use crate::catalogue::Missing;
use crate::fault::Fault;
use crate::suggest::did_you_mean;
use crate::units::Wrong;

/// The file and what was found wrong in it.
pub(super) struct Reader<'a> {
    /// File for faults.
    pub(super) file: &'a str,
    /// Collected so far.
    pub(super) faults: Vec<Fault>,
}

/// One table of the file, empty where the file does not have it.
#[derive(Clone)]
pub(super) struct Table<'a> {
    /// Its name in the key table, "" = the top.
    pub(super) name: &'static str,
    /// Key path for faults, "" = the top.
    pub(super) path: String,
    /// Line at which it starts.
    pub(super) line: Option<u64>,
    /// What stands in it.
    pub(super) entries: &'a [Entry],
}

impl<'a> Table<'a> {
    /// The value of a key, if the file states it.
    pub(super) fn get(&self, key: &str) -> Option<&'a Node> {
        self.entries.iter().find(|e| e.key == key).map(|e| &e.node)
    }

    /// "mains.low".
    fn path_of(&self, key: &str) -> String {
        if self.path.is_empty() {
            key.to_owned()
        } else {
            format!("{}.{key}", self.path)
        }
    }
}

impl Reader<'_> {
    /// A fault at a key, or at the table where the key is missing.
    pub(super) fn fault(&mut self, table: &Table<'_>, key: &str, wrong: Wrong) {
        let node = table.get(key);
        let mut fault = Fault {
            file: self.file.to_owned(),
            line: node.map_or(table.line, |n| n.line),
            column: Some(table.path_of(key)),
            part: None,
            text: node.map(Node::text).unwrap_or_default(),
            problem: wrong.problem,
            allowed: wrong.allowed,
        };
        // What the caller set is a fault of the call, not of the file.
        if let Some(setting) = node.and_then(|n| n.setting.as_ref()) {
            (fault.file, fault.line, fault.column) = (String::new(), None, Some(format!("--set {setting}")));
        }
        self.faults.push(fault);
    }

    /// Faults every key that the table does not know.
    pub(super) fn check_keys(&mut self, table: &Table<'_>) {
        for entry in table.entries {
            if keys(table.name).any(|k| k.name == entry.key) {
                continue;
            }
            let guess = did_you_mean(&entry.key, keys(table.name).map(|k| k.name));
            self.faults.push(Fault {
                file: self.file.to_owned(),
                line: entry.line,
                column: Some(table.path_of(&entry.key)),
                part: None,
                text: entry.key.clone(),
                problem: "is not a known key".into(),
                allowed: guess,
            });
        }
    }

    /// A table at the top of the file; its keys are checked.
    pub(super) fn table<'a>(&mut self, top: &Table<'a>, name: &'static str) -> Table<'a> {
        let mut table = Table {
            name,
            path: name.to_owned(),
            line: None,
            entries: &[],
        };
        match top.get(name).map(|n| (n.line, &n.value)) {
            Some((line, Value::Table(entries))) => {
                table.line = line;
                table.entries = entries;
                self.check_keys(&table);
            }
            Some(_) => self.fault(
                top,
                name,
                Wrong::new("is not a table", format!("write [{name}] and its keys below")),
            ),
            None => {}
        }
        table
    }

    /// A quantity; `None` also where it is faulty.
    pub(super) fn number(&mut self, table: &Table<'_>, name: &str) -> Option<f64> {
        self.read(table, name, Form::number)
    }

    /// A count.
    pub(super) fn count(&mut self, table: &Table<'_>, name: &str) -> Option<u64> {
        self.read(table, name, Form::count)
    }

    /// One word.
    pub(super) fn word(&mut self, table: &Table<'_>, name: &str) -> Option<&'static str> {
        self.read(table, name, Form::word)
    }

    /// true or false.
    pub(super) fn flag(&mut self, table: &Table<'_>, name: &str) -> bool {
        self.read(table, name, |_, text| Ok(text == "true")).unwrap_or_default()
    }

    /// Text of one line; blank only where that is the default.
    pub(super) fn text(&mut self, table: &Table<'_>, name: &str) -> Option<String> {
        let may_be_blank = find(table, name).is_some_and(|k| k.missing == Missing::Default(""));
        self.read(table, name, |_, text| {
            if text.trim().is_empty() && !may_be_blank {
                Err(Wrong::new("is blank", "write a text, or leave the key out"))
            } else if text.chars().any(char::is_control) {
                Err(Wrong::new("has a control character", "write one line of text"))
            } else {
                Ok(text.to_owned())
            }
        })
    }

    /// A list of words: not empty, no repeats.
    pub(super) fn words(&mut self, table: &Table<'_>, name: &str) -> Vec<&'static str> {
        let Some(key) = find(table, name) else {
            return Vec::new();
        };
        let mut found = Vec::new();
        match table.get(name).map(|n| &n.value) {
            Some(Value::List(items)) => {
                for item in items {
                    let word = match &item.value {
                        Value::Text(text) => key.form.word(text),
                        _ => Err(Wrong::new("is not a word", key.form.example())),
                    };
                    match word {
                        Ok(word) if found.contains(&word) => {
                            self.item(table, name, item, Wrong::new("is listed twice", "list each word once"))
                        }
                        Ok(word) => found.push(word),
                        Err(wrong) => self.item(table, name, item, wrong),
                    }
                }
                if items.is_empty() {
                    self.fault(table, name, Wrong::new("is empty", key.form.example()));
                }
            }
            Some(_) => self.fault(table, name, Wrong::new("is not a list", key.form.example())),
            None => {
                if let Missing::Default(text) = key.missing {
                    found.extend(text.split(", ").filter_map(|w| key.form.word(w).ok()));
                }
            }
        }
        found
    }

    /// A fault at one item of a list.
    pub(super) fn item(&mut self, table: &Table<'_>, name: &str, item: &Node, wrong: Wrong) {
        self.fault(table, name, wrong);
        if let Some(fault) = self.faults.last_mut() {
            fault.line = item.line;
            fault.text = item.text();
        }
    }

    /// Parses a key or its default by its form; a required one must be there.
    fn read<T>(
        &mut self,
        table: &Table<'_>,
        name: &str,
        parse: impl FnOnce(Form, &str) -> Result<T, Wrong>,
    ) -> Option<T> {
        let key = find(table, name)?;
        let value = match (table.get(name), key.missing) {
            (Some(node), _) => plain(key.form, node).and_then(|text| parse(key.form, &text)),
            (None, Missing::Default(text)) => parse(key.form, text),
            (None, Missing::Required) => Err(Wrong::new("is missing", format!("write {}", key.form.example()))),
            (None, Missing::Blank | Missing::Derived(_)) => return None,
        };
        value.map_err(|wrong| self.fault(table, name, wrong)).ok()
    }
}

fn find(table: &Table<'_>, name: &str) -> Option<&'static Key> {
    keys(table.name).find(|k| k.name == name)
}

/// The text of a value of the type that the form takes.
fn plain(form: Form, node: &Node) -> Result<String, Wrong> {
    match (form, &node.value) {
        // A number without a unit goes on too: the message then says how to write it.
        (Form::Quantity(m), Value::Text(text) | Value::Number(text)) if !m.unit.is_empty() => Ok(text.clone()),
        (Form::Quantity(_) | Form::Count(..), Value::Number(text)) => Ok(text.clone()),
        (Form::Text | Form::Word(_), Value::Text(text)) => Ok(text.clone()),
        (Form::Flag, Value::Flag(flag)) => Ok(flag.to_string()),
        _ => Err(Wrong::new("is of another type", format!("write {}", form.example()))),
    }
}
