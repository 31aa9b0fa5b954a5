//! The values of a scenario, each with the place it came from.

use toml::de::{DeTable, DeValue};

use super::sink::Sink;
use super::source::Place;

/// A value and its place.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Node {
    pub(crate) place: Place,
    pub(crate) content: Content,
}

/// What a value is.
#[derive(Debug, Clone, PartialEq)]
pub(crate) enum Content {
    Text(String),
    Integer(i64),
    Float(f64),
    Boolean(bool),
    Date,
    List(Vec<Node>),
    /// Entries in the order of the file.
    Table(Vec<Entry>),
    /// A value whose mistake is already reported; whoever meets it stays silent.
    Unusable,
}

/// A key with its value.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Entry {
    pub(crate) key: String,
    pub(crate) key_place: Place,
    pub(crate) node: Node,
}

impl Node {
    /// The entry of a table by key.
    pub(crate) fn entry(&self, key: &str) -> Option<&Entry> {
        match &self.content {
            Content::Table(entries) => entries.iter().find(|entry| entry.key == key),
            _ => None,
        }
    }

    /// The text, if it is one.
    pub(crate) fn as_text(&self) -> Option<&str> {
        match &self.content {
            Content::Text(text) => Some(text),
            _ => None,
        }
    }

    /// What was found, for messages.
    pub(crate) fn found(&self) -> String {
        match &self.content {
            Content::Text(text) => format!("the text {text:?}"),
            Content::Integer(value) => value.to_string(),
            Content::Float(value) => value.to_string(),
            Content::Boolean(value) => value.to_string(),
            Content::Date => "a date".to_owned(),
            Content::List(_) => "a list".to_owned(),
            Content::Table(_) => "a table".to_owned(),
            Content::Unusable => "unreadable".to_owned(),
        }
    }

    /// The value as TOML, for sweeps.
    pub(crate) fn to_value(&self) -> Option<toml::Value> {
        Some(match &self.content {
            Content::Text(text) => toml::Value::String(text.clone()),
            Content::Integer(value) => toml::Value::Integer(*value),
            Content::Float(value) => toml::Value::Float(*value),
            Content::Boolean(value) => toml::Value::Boolean(*value),
            Content::List(nodes) => {
                toml::Value::Array(nodes.iter().map(Self::to_value).collect::<Option<_>>()?)
            }
            Content::Table(entries) => toml::Value::Table(
                entries
                    .iter()
                    .map(|entry| Some((entry.key.clone(), entry.node.to_value()?)))
                    .collect::<Option<_>>()?,
            ),
            Content::Date | Content::Unusable => return None,
        })
    }

    /// A TOML value put at a place.
    pub(crate) fn from_value(value: &toml::Value, place: &Place) -> Self {
        let content = match value {
            toml::Value::String(text) => Content::Text(text.clone()),
            toml::Value::Integer(value) => Content::Integer(*value),
            toml::Value::Float(value) => Content::Float(*value),
            toml::Value::Boolean(value) => Content::Boolean(*value),
            toml::Value::Datetime(_) => Content::Date,
            toml::Value::Array(values) => Content::List(
                values
                    .iter()
                    .map(|value| Self::from_value(value, place))
                    .collect(),
            ),
            toml::Value::Table(table) => Content::Table(
                table
                    .iter()
                    .map(|(key, value)| Entry {
                        key: key.clone(),
                        key_place: place.clone(),
                        node: Self::from_value(value, place),
                    })
                    .collect(),
            ),
        };
        Self {
            place: place.clone(),
            content,
        }
    }

    /// The tree of a parsed document.
    pub(crate) fn document(table: &DeTable<'_>, sink: &Sink<'_>) -> Self {
        Self {
            place: Place::new(0, 0),
            content: Content::Table(entries(table, sink)),
        }
    }
}

fn entries(table: &DeTable<'_>, sink: &Sink<'_>) -> Vec<Entry> {
    let mut entries: Vec<Entry> = table
        .iter()
        .map(|(key, value)| {
            let span = key.span();
            Entry {
                key: key.get_ref().to_string(),
                key_place: Place::new(span.start, span.end),
                node: node(value, sink),
            }
        })
        .collect();
    // The parser keeps tables in alphabetical order; the scenario is read in its own.
    entries.sort_by_key(|entry| entry.key_place.start);
    entries
}

fn node(value: &toml::Spanned<DeValue<'_>>, sink: &Sink<'_>) -> Node {
    let span = value.span();
    let place = Place::new(span.start, span.end);
    let content = match value.get_ref() {
        DeValue::String(text) => Content::Text(text.to_string()),
        DeValue::Integer(integer) => {
            if let Ok(value) = i64::from_str_radix(integer.as_str(), integer.radix()) {
                Content::Integer(value)
            } else {
                let digits = integer.as_str();
                let message = if digits.bytes().any(|digit| digit.is_ascii_alphanumeric()) {
                    format!("the integer {digits} does not fit in 64 bits")
                } else {
                    "this is not a number".to_owned()
                };
                sink.report(
                    &place,
                    message,
                    Some("write a smaller whole number".to_owned()),
                );
                Content::Unusable
            }
        }
        DeValue::Float(float) => match float.as_str().parse::<f64>() {
            Ok(value) if value.is_infinite() && !float.as_str().contains("inf") => {
                sink.report(
                    &place,
                    format!("the number {} is too large", float.as_str()),
                    Some("numbers go up to about 1.8e308".to_owned()),
                );
                Content::Unusable
            }
            Ok(value) => Content::Float(value),
            Err(_) => {
                sink.report(
                    &place,
                    format!("`{}` is not a number", float.as_str()),
                    None,
                );
                Content::Unusable
            }
        },
        DeValue::Boolean(value) => Content::Boolean(*value),
        DeValue::Datetime(_) => Content::Date,
        DeValue::Array(values) => {
            Content::List(values.iter().map(|value| node(value, sink)).collect())
        }
        DeValue::Table(table) => Content::Table(entries(table, sink)),
    };
    Node { place, content }
}
