//! The parsed document as a tree in which every key and value knows where it stands, whether that
//! is the file or an override laid over it.

use std::ops::Range;

use toml::Spanned;
use toml::de::{DeTable, DeValue};

/// Source number of the file itself; overrides count from one.
pub(super) const FILE: usize = 0;

/// A stretch of bytes in a source.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub(super) struct Mark {
    pub source: usize,
    pub start: usize,
    pub end: usize,
}

impl Mark {
    pub fn new(source: usize, span: Range<usize>) -> Self {
        Mark {
            source,
            start: span.start,
            end: span.end,
        }
    }

    /// Whether it stands in an override and not in the file.
    pub fn is_override(&self) -> bool {
        self.source != FILE
    }
}

/// A value and where it stands.
#[derive(Clone, Debug)]
pub(super) struct Node {
    pub mark: Mark,
    pub value: Value,
}

#[derive(Clone, Debug)]
pub(super) enum Value {
    Text(String),
    /// A number as decimal text, so that it is rounded once, by `units`.
    Number(String),
    Boolean,
    Date,
    List(Vec<Node>),
    Table(Table),
    /// What a broken line states, which has been told: nothing more is said of it.
    Unread,
}

impl Value {
    /// What it is, for a sentence.
    pub fn noun(&self) -> &'static str {
        match self {
            Value::Text(_) => "text",
            Value::Number(_) => "a number",
            Value::Boolean => "true or false",
            Value::Date => "a date",
            Value::List(_) => "a list",
            Value::Table(_) => "a table",
            Value::Unread => "a broken line",
        }
    }
}

/// A key with its value.
#[derive(Clone, Debug)]
pub(super) struct Entry {
    pub key: String,
    pub mark: Mark,
    pub node: Node,
}

/// A table with its entries in the order written.
#[derive(Clone, Debug, Default)]
pub(super) struct Table {
    pub entries: Vec<Entry>,
}

impl Table {
    pub fn get(&self, key: &str) -> Option<&Entry> {
        self.entries.iter().find(|e| e.key == key)
    }

    pub fn get_mut(&mut self, key: &str) -> Option<&mut Entry> {
        self.entries.iter_mut().find(|e| e.key == key)
    }

    /// Sets a key, replacing what stood there.
    pub fn set(&mut self, entry: Entry) {
        match self.get_mut(&entry.key) {
            Some(old) => *old = entry,
            None => self.entries.push(entry),
        }
    }

    /// The dotted name of the entry whose key stands at a place of the file. An element goes by its
    /// own name, or by its number where it has none.
    pub fn name_at(&self, start: usize) -> Option<String> {
        self.entries.iter().find_map(|entry| {
            if entry.mark == Mark::new(FILE, start..entry.mark.end) {
                return Some(entry.key.clone());
            }
            match &entry.node.value {
                Value::Table(t) => Some(format!("{}.{}", entry.key, t.name_at(start)?)),
                Value::List(items) => items.iter().enumerate().find_map(|(i, item)| {
                    let Value::Table(t) = &item.value else {
                        return None;
                    };
                    let rest = t.name_at(start)?;
                    Some(match t.get("name").map(|e| &e.node.value) {
                        Some(Value::Text(name))
                            if entry.key == "element" || entry.key == "sensor" =>
                        {
                            format!("{name}.{rest}")
                        }
                        _ => format!("{}.{}.{rest}", entry.key, i + 1),
                    })
                }),
                _ => None,
            }
        })
    }

    /// Where the last statement of a key before a place of the file stands.
    pub fn latest_before(&self, key: &str, before: usize) -> Option<&Mark> {
        let here = self.get(key).map(|e| &e.mark).filter(|m| m.start < before);
        let inner = self.entries.iter().filter_map(|e| match &e.node.value {
            Value::Table(t) => t.latest_before(key, before),
            Value::List(items) => items
                .iter()
                .filter_map(|n| match &n.value {
                    Value::Table(t) => t.latest_before(key, before),
                    _ => None,
                })
                .max(),
            _ => None,
        });
        inner.chain(here).max()
    }

    /// The table under a key, made empty where the key is absent; `None` where something else
    /// stands there.
    pub fn table_at(&mut self, key: &str, mark: &Mark) -> Option<&mut Table> {
        if self.get(key).is_none() {
            let node = Node {
                mark: mark.clone(),
                value: Value::Table(Table::default()),
            };
            self.entries.push(Entry {
                key: key.to_owned(),
                mark: mark.clone(),
                node,
            });
        }
        match &mut self.get_mut(key)?.node.value {
            Value::Table(t) => Some(t),
            _ => None,
        }
    }
}

/// The tree of a parsed table.
pub(super) fn table(parsed: &DeTable<'_>, source: usize) -> Table {
    let mut entries: Vec<Entry> = parsed
        .iter()
        .map(|(key, value)| Entry {
            key: key.get_ref().to_string(),
            mark: Mark::new(source, key.span()),
            node: node(value, source),
        })
        .collect();
    entries.sort_by(|a, b| a.mark.cmp(&b.mark));
    Table { entries }
}

/// The tree of a parsed value.
pub(super) fn node(parsed: &Spanned<DeValue<'_>>, source: usize) -> Node {
    let value = match parsed.get_ref() {
        DeValue::String(s) => Value::Text(s.to_string()),
        DeValue::Integer(i) if i.radix() == 10 => Value::Number(i.as_str().to_owned()),
        DeValue::Integer(i) => Value::Number(
            i128::from_str_radix(i.as_str(), i.radix())
                .map_or_else(|_| i.to_string(), |n| n.to_string()),
        ),
        DeValue::Float(f) => Value::Number(f.as_str().to_owned()),
        DeValue::Boolean(_) => Value::Boolean,
        DeValue::Datetime(_) => Value::Date,
        DeValue::Array(items) => Value::List(items.iter().map(|n| node(n, source)).collect()),
        DeValue::Table(t) => Value::Table(table(t, source)),
    };
    Node {
        mark: Mark::new(source, parsed.span()),
        value,
    }
}
