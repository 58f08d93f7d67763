//! Owns a document as a tree with line numbers, so that TOML files and saved JSON go one way from here.

use toml::Spanned;
use toml::de::{DeInteger, DeTable, DeValue};

use crate::text::line_at;

/// A value and where it stands.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Node {
    /// Line counted from 1, none in JSON.
    pub(super) line: Option<u64>,
    /// The setting that put it here, as it was given; none: it stands in the document.
    pub(super) setting: Option<String>,
    /// What stands there.
    pub(super) value: Value,
}

/// What a document is made of.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Value {
    /// A string.
    Text(String),
    /// A number as written, not yet binary: "nan" and "1e999" are told like any other bad text.
    Number(String),
    /// true or false.
    Flag(bool),
    /// A list.
    List(Vec<Node>),
    /// A table, in the order written.
    Table(Vec<Entry>),
    /// What no key takes: dates, null.
    Other(String),
}

/// A key with its value.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Entry {
    /// The key.
    pub(super) key: String,
    /// Line of the key.
    pub(super) line: Option<u64>,
    /// Its value.
    pub(super) node: Node,
}

impl Node {
    /// The document of a TOML file.
    ///
    /// # Errors
    /// Line and message of a syntax error.
    pub(super) fn from_toml(text: &str) -> Result<Node, (Option<u64>, String)> {
        match DeTable::parse(text) {
            Ok(table) => Ok(table_node(text, table.span().start, table.get_ref())),
            Err(e) => Err((
                e.span().map(|s| line_at(text, s.start)),
                e.message().trim().replace('\n', "; "),
            )),
        }
    }

    /// The document of a saved build.
    pub(super) fn from_json(value: &serde_json::Value) -> Node {
        use serde_json::Value as Json;
        let value = match value {
            Json::String(s) => Value::Text(s.clone()),
            Json::Number(n) => Value::Number(n.to_string()),
            Json::Bool(b) => Value::Flag(*b),
            Json::Array(items) => Value::List(items.iter().map(Node::from_json).collect()),
            Json::Object(map) => Value::Table(
                map.iter()
                    .map(|(key, value)| Entry {
                        key: key.clone(),
                        line: None,
                        node: Node::from_json(value),
                    })
                    .collect(),
            ),
            Json::Null => Value::Other("null".into()),
        };
        Node::from(value)
    }

    /// A TOML value alone, as it stands behind an equals sign.
    pub(super) fn from_toml_value(text: &str) -> Option<Node> {
        let value = DeValue::parse(text).ok()?;
        Some(value_node(text, &value).without_lines())
    }

    /// The same without lines: it stands in no file.
    fn without_lines(self) -> Node {
        let value = match self.value {
            Value::List(items) => Value::List(items.into_iter().map(Node::without_lines).collect()),
            // No key takes a table inside a value.
            value => value,
        };
        Node::from(value)
    }

    /// The same document as JSON. Only read once the document has no fault, so every number is finite.
    pub(super) fn to_json(&self) -> serde_json::Value {
        match &self.value {
            Value::Text(s) | Value::Other(s) => s.clone().into(),
            Value::Flag(b) => (*b).into(),
            Value::Number(text) => (text.parse::<i64>().map(Into::into))
                .or_else(|_| text.parse::<f64>().map(Into::into))
                .unwrap_or_default(),
            Value::List(items) => items.iter().map(Node::to_json).collect(),
            Value::Table(entries) => (entries.iter()).map(|e| (e.key.clone(), e.node.to_json())).collect(),
        }
    }

    /// The text of a plain value, for messages.
    pub(super) fn text(&self) -> String {
        match &self.value {
            Value::Text(s) | Value::Number(s) | Value::Other(s) => s.clone(),
            Value::Flag(b) => b.to_string(),
            Value::List(_) | Value::Table(_) => String::new(),
        }
    }
}

impl From<Value> for Node {
    fn from(value: Value) -> Node {
        Node {
            line: None,
            setting: None,
            value,
        }
    }
}

fn table_node(text: &str, start: usize, table: &DeTable<'_>) -> Node {
    let mut entries: Vec<_> = table.iter().collect();
    // toml sorts by key: put the order written back, so that a saved build shows the file as it was.
    entries.sort_by_key(|(key, _)| key.span().start);
    let entry = |(key, value): (&Spanned<_>, &Spanned<DeValue<'_>>)| {
        let key: (&std::borrow::Cow<'_, str>, usize) = (key.get_ref(), key.span().start);
        Entry {
            key: key.0.to_string(),
            line: Some(line_at(text, key.1)),
            node: value_node(text, value),
        }
    };
    Node {
        line: Some(line_at(text, start)),
        setting: None,
        value: Value::Table(entries.into_iter().map(entry).collect()),
    }
}

fn value_node(text: &str, value: &Spanned<DeValue<'_>>) -> Node {
    let start = value.span().start;
    let node = match value.get_ref() {
        DeValue::Table(table) => return table_node(text, start, table),
        DeValue::String(s) => Value::Text(s.to_string()),
        DeValue::Integer(n) => Value::Number(integer(n)),
        DeValue::Float(x) => Value::Number(x.as_str().to_owned()),
        DeValue::Boolean(b) => Value::Flag(*b),
        DeValue::Datetime(d) => Value::Other(d.to_string()),
        DeValue::Array(items) => Value::List(items.iter().map(|v| value_node(text, v)).collect()),
    };
    Node {
        line: Some(line_at(text, start)),
        setting: None,
        value: node,
    }
}

/// In decimal, whatever base it was written in.
fn integer(n: &DeInteger<'_>) -> String {
    match i128::from_str_radix(n.as_str(), n.radix()) {
        Ok(value) => value.to_string(),
        Err(_) => n.as_str().to_owned(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_toml_document_keeps_order_lines_and_numbers() {
        let text = "z = 1_000\na = 2.50\nh = 0x10\n\n[mains]\nvoltage = \"230 V\"\n\n[[rail]]\nname = 'x'\n[[rail]]\nname = 'y'\n";
        let node = Node::from_toml(text).unwrap();
        assert_eq!(
            serde_json::to_string(&node.to_json()).unwrap(),
            r#"{"z":1000,"a":2.5,"h":16,"mains":{"voltage":"230 V"},"rail":[{"name":"x"},{"name":"y"}]}"#
        );
        let Value::Table(entries) = node.value else {
            panic!("no table");
        };
        let lines: Vec<_> = entries.iter().map(|e| e.line).collect();
        assert_eq!(lines, [Some(1), Some(2), Some(3), Some(5), Some(8)]);
        let Value::List(rails) = &entries[4].node.value else {
            panic!("no list");
        };
        assert_eq!((rails[0].line, rails[1].line), (Some(8), Some(10)));
    }

    #[test]
    fn a_syntax_error_has_its_line() {
        let (line, message) = Node::from_toml("a = 1\nb = \n").unwrap_err();
        assert_eq!(line, Some(2));
        assert!(!message.contains('\n'), "{message}");
    }
}
