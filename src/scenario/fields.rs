//! Reads the keys of one table, and reports what is wrong with them.
//!
//! Getters answer `None` both for an absent key and for one whose value is already reported: the
//! reader goes on with a default, and no plan comes of a scenario with any mistake.

use super::sink::Sink;
use super::source::Place;
use super::tree::{Content, Entry, Node};

/// The entries of a table, with its name for messages.
#[derive(Debug, Clone)]
pub(crate) struct Fields<'s> {
    entries: &'s [Entry],
    place: &'s Place,
    title: String,
    sink: &'s Sink<'s>,
}

impl<'s> Fields<'s> {
    /// The fields of a node; `None` if it is no table, which is reported already.
    pub(crate) fn of(node: &'s Node, title: impl Into<String>, sink: &'s Sink<'s>) -> Option<Self> {
        if let Content::Table(entries) = &node.content {
            return Some(Self {
                entries,
                place: &node.place,
                title: title.into(),
                sink,
            });
        }
        sink.taint();
        None
    }

    /// Where mistakes go.
    pub(crate) fn sink(&self) -> &'s Sink<'s> {
        self.sink
    }

    /// What the table is called in messages.
    pub(crate) fn title(&self) -> &str {
        &self.title
    }

    /// The entries in file order.
    pub(crate) fn entries(&self) -> &'s [Entry] {
        self.entries
    }

    /// Whether a key is there, readable or not.
    pub(crate) fn has(&self, key: &str) -> bool {
        self.entries.iter().any(|entry| entry.key == key)
    }

    /// The value of a key.
    pub(crate) fn node(&self, key: &str) -> Option<&'s Node> {
        let node = &self.entries.iter().find(|entry| entry.key == key)?.node;
        if node.content == Content::Unusable {
            self.sink.taint();
        }
        Some(node)
    }

    /// The value of a key that must be there; its absence is reported.
    pub(crate) fn required(&self, key: &str, help: &str) -> Option<&'s Node> {
        let node = self.node(key);
        if node.is_none() {
            self.sink.report_missing(
                self.place,
                key,
                format!("`{key}` is missing in {}", self.title),
                Some(help.to_owned()),
            );
        }
        node
    }

    /// Place of a value, or of the table where the key is absent.
    pub(crate) fn place(&self, key: &str) -> &'s Place {
        self.entries
            .iter()
            .find(|entry| entry.key == key)
            .map_or(self.place, |entry| &entry.node.place)
    }

    /// Place of the table.
    pub(crate) fn own_place(&self) -> &'s Place {
        self.place
    }

    /// Notes a mistake at the value of a key.
    pub(crate) fn report(&self, key: &str, message: impl Into<String>, help: impl Into<String>) {
        self.sink
            .report(self.place(key), message, Some(help.into()));
    }

    /// A text.
    pub(crate) fn text(&self, key: &str) -> Option<&'s str> {
        self.node(key)?.as_text()
    }

    /// A number.
    pub(crate) fn number(&self, key: &str) -> Option<f64> {
        number(self.node(key)?)
    }

    /// A number that must satisfy a condition, which `condition` words as in "above 0".
    pub(crate) fn number_where(
        &self,
        key: &str,
        holds: impl Fn(f64) -> bool,
        condition: &str,
    ) -> Option<f64> {
        let value = self.number(key)?;
        if holds(value) {
            return Some(value);
        }
        self.report(
            key,
            format!("`{key}` is {value}"),
            format!("it must be {condition}"),
        );
        None
    }

    /// A whole number from 0.
    pub(crate) fn whole(&self, key: &str) -> Option<u64> {
        match self.node(key)?.content {
            Content::Integer(value) => u64::try_from(value).ok(),
            _ => None,
        }
    }

    /// A count that is at least `least` and at most `most`.
    pub(crate) fn count(&self, key: &str, least: usize, most: usize) -> Option<usize> {
        let value = usize::try_from(self.whole(key)?).ok()?;
        if (least..=most).contains(&value) {
            return Some(value);
        }
        let help = if value < least {
            format!("it must be at least {least}")
        } else {
            format!("it must be at most {most}")
        };
        self.report(key, format!("`{key}` is {value}"), help);
        None
    }

    /// A table within the table.
    pub(crate) fn table(&self, key: &str) -> Option<Self> {
        Self::of(self.node(key)?, format!("`{key}`"), self.sink)
    }

    /// A section of the file.
    pub(crate) fn section(&self, key: &str) -> Option<Self> {
        Self::of(self.node(key)?, format!("[{key}]"), self.sink)
    }

    /// The members of a list.
    pub(crate) fn list(&self, key: &str) -> Option<&'s [Node]> {
        match &self.node(key)?.content {
            Content::List(nodes) => Some(nodes),
            _ => None,
        }
    }

    /// One of several words.
    pub(crate) fn choice<T: Copy>(&self, key: &str, options: &[(&str, T)]) -> Option<T> {
        let word = self.text(key)?;
        let found = options.iter().find(|(name, _)| *name == word);
        if found.is_none() {
            let names = options.iter().map(|(name, _)| *name);
            let all = names.clone().collect::<Vec<_>>().join(", ");
            let help = match self.sink.nearest(word, names) {
                Some(name) => format!("did you mean \"{name}\"? Known: {all}"),
                None => format!("known: {all}"),
            };
            self.report(key, format!("unknown {} \"{word}\"", spoken(key)), help);
        }
        found.map(|(_, value)| *value)
    }

    /// Reports every key that is not among `taken`; `owner` says what does not take it.
    pub(crate) fn only(&self, taken: &[&str], owner: &str) {
        for entry in self.entries {
            let key = entry.key.as_str();
            if taken.contains(&key) {
                continue;
            }
            self.sink.report(
                &entry.key_place,
                format!("{owner} takes no `{key}`"),
                Some(format!("it takes {}", taken.join(", "))),
            );
        }
    }
}

/// A key as it is spoken of.
fn spoken(key: &str) -> String {
    key.replace('_', " ")
}

/// The number of a node.
pub(crate) fn number(node: &Node) -> Option<f64> {
    match node.content {
        #[allow(clippy::cast_precision_loss)] // up to 2^53, by the comparison with the known keys
        Content::Integer(value) => Some(value as f64),
        Content::Float(value) => Some(value),
        _ => None,
    }
}
