//! Compares a tree with the known keys and kinds of value.

use super::schema::{Key, LARGEST_COUNT, Shape, find};
use super::sink::Sink;
use super::tree::{Content, Entry, Node};

/// What the whole tree is called in messages.
pub(crate) const ROOT: &str = "the scenario";
/// Longest name that is read, in characters.
const LONGEST_NAME: usize = 200;
/// Largest integer below which every integer is a floating-point number.
const EXACT_INTEGERS: u64 = 1 << 53;

/// Reports every unknown key and every value of the wrong kind.
///
/// A misspelt key whose nearest known key is absent is renamed to it, and a value of the wrong
/// kind becomes [`Content::Unusable`], so that one mistake is reported once.
pub(crate) fn check(node: &mut Node, shape: &'static Shape, label: &str, sink: &Sink<'_>) {
    if node.content == Content::Unusable {
        return;
    }
    let fits = match shape {
        Shape::Any => true,
        Shape::Either(shapes) => {
            if let Some(shape) = shapes.iter().find(|shape| same_kind(node, shape)) {
                return check(node, shape, label, sink);
            }
            false
        }
        _ => same_kind(node, shape),
    };
    if !fits {
        sink.report(
            &node.place,
            format!("{label} is {}", node.found()),
            Some(format!("it must be {}", wanted(shape))),
        );
        node.content = Content::Unusable;
        return;
    }
    if let Err((message, help)) = check_value(node, shape, label) {
        sink.report(&node.place, message, Some(help));
        node.content = Content::Unusable;
        return;
    }
    match (&mut node.content, shape) {
        (Content::List(nodes), Shape::List(shape)) => {
            for (index, node) in nodes.iter_mut().enumerate() {
                let number = index + 1;
                let label = if label.starts_with("[[") {
                    format!("{label} {number}")
                } else {
                    format!("member {number} of {label}")
                };
                check(node, shape, &label, sink);
            }
        }
        (Content::Table(entries), Shape::Map(shape)) => {
            for entry in entries {
                if let Err((message, help)) = check_name(&entry.key) {
                    sink.report(
                        &entry.key_place,
                        format!("a key of {label} {message}"),
                        Some(help),
                    );
                }
                check(&mut entry.node, shape, &format!("`{}`", entry.key), sink);
            }
        }
        (Content::Table(entries), Shape::Table(keys)) => {
            check_keys(entries, keys, label, sink);
            for entry in entries {
                if let Some(key) = find(keys, &entry.key) {
                    let label = match (&key.shape, label) {
                        (Shape::Table(_), ROOT) => format!("[{}]", key.name),
                        (Shape::List(_), ROOT) => format!("[[{}]]", key.name),
                        _ => format!("`{}`", key.name),
                    };
                    check(&mut entry.node, &key.shape, &label, sink);
                }
            }
        }
        _ => {}
    }
}

fn check_keys(entries: &mut Vec<Entry>, keys: &'static [Key], label: &str, sink: &Sink<'_>) {
    let mut absent: Vec<&str> = keys.iter().map(|key| key.name).collect();
    absent.retain(|name| entries.iter().all(|entry| entry.key != *name));
    for entry in entries.iter_mut() {
        let word = entry.key.clone();
        if find(keys, &word).is_some() {
            continue;
        }
        let names = || keys.iter().map(|key| key.name);
        let replacement = sink.nearest(&word, absent.iter().copied());
        let help = match replacement.or_else(|| sink.nearest(&word, names())) {
            Some(name) => format!("did you mean `{name}`?"),
            None => format!("known here: {}", names().collect::<Vec<_>>().join(", ")),
        };
        let place = &entry.key_place;
        sink.report(
            place,
            format!("unknown key `{word}` in {label}"),
            Some(help),
        );
        if let Some(name) = replacement {
            name.clone_into(&mut entry.key);
            absent.retain(|other| *other != name);
        }
    }
    // What could not be repaired is reported and out of the way.
    entries.retain(|entry| find(keys, &entry.key).is_some());
}

fn same_kind(node: &Node, shape: &Shape) -> bool {
    match (shape, &node.content) {
        (Shape::Any, _) => true,
        (Shape::Text | Shape::Name, content) => matches!(content, Content::Text(_)),
        (Shape::Number | Shape::NumberOrInfinity, content) => {
            matches!(content, Content::Integer(_) | Content::Float(_))
        }
        (Shape::Count | Shape::Seed, content) => matches!(content, Content::Integer(_)),
        (Shape::List(_), content) => matches!(content, Content::List(_)),
        (Shape::Map(_) | Shape::Table(_), content) => matches!(content, Content::Table(_)),
        (Shape::Either(shapes), _) => shapes.iter().any(|shape| same_kind(node, shape)),
    }
}

/// The shape in words.
fn wanted(shape: &Shape) -> String {
    match shape {
        Shape::Text | Shape::Name => "text in quotes".to_owned(),
        Shape::Number | Shape::NumberOrInfinity => "a number".to_owned(),
        Shape::Count | Shape::Seed => "a whole number".to_owned(),
        Shape::Any => "a value".to_owned(),
        Shape::List(member) => match member {
            Shape::Table(_) => "a list of tables".to_owned(),
            Shape::Number => "a list of numbers".to_owned(),
            Shape::Text | Shape::Name => "a list of texts in quotes".to_owned(),
            _ => "a list".to_owned(),
        },
        Shape::Map(_) => "a table of names and values".to_owned(),
        Shape::Table(keys) => {
            let names: Vec<&str> = keys.iter().map(|key| key.name).take(4).collect();
            format!("a table with keys such as {}", names.join(", "))
        }
        Shape::Either(shapes) => shapes.iter().map(wanted).collect::<Vec<_>>().join(", or "),
    }
}

type Mistake = (String, String);

fn check_value(node: &Node, shape: &Shape, label: &str) -> Result<(), Mistake> {
    match (&node.content, shape) {
        (Content::Integer(value), Shape::Count) => whole(*value, LARGEST_COUNT, label),
        (Content::Integer(value), Shape::Seed) => whole(*value, i64::MAX, label),
        (Content::Integer(value), Shape::Number | Shape::NumberOrInfinity) => {
            if value.unsigned_abs() > EXACT_INTEGERS {
                return Err((
                    format!("{label} is {value}"),
                    format!("whole numbers go up to {EXACT_INTEGERS} here; write {value}.0"),
                ));
            }
            Ok(())
        }
        (Content::Float(value), Shape::Number | Shape::NumberOrInfinity) => {
            let infinite = *value == f64::INFINITY && matches!(shape, Shape::NumberOrInfinity);
            if value.is_finite() || infinite {
                return Ok(());
            }
            Err((
                format!("{label} is {value}"),
                "it must be a finite number".to_owned(),
            ))
        }
        (Content::Text(text), Shape::Name) => {
            check_name(text).map_err(|(message, help)| (format!("{label} {message}"), help))
        }
        _ => Ok(()),
    }
}

fn whole(value: i64, largest: i64, label: &str) -> Result<(), Mistake> {
    if (0..=largest).contains(&value) {
        return Ok(());
    }
    Err((
        format!("{label} is {value}"),
        format!("it must be a whole number from 0 to {largest}"),
    ))
}

fn check_name(text: &str) -> Result<(), Mistake> {
    let message = if text.trim().is_empty() {
        "is empty"
    } else if text.chars().any(char::is_control) {
        "holds a line break or control character"
    } else if text.trim() != text {
        "begins or ends with a blank"
    } else if text.chars().count() > LONGEST_NAME {
        "is too long"
    } else {
        return Ok(());
    };
    Err((
        message.to_owned(),
        format!("it must be one line of 1 to {LONGEST_NAME} characters without blanks at its ends"),
    ))
}
