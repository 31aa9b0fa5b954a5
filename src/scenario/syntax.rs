//! From text to tree: TOML syntax, with every syntax error of the file.
//!
//! A syntax error can swallow the rest of a file (an unclosed bracket does). Statements that
//! cannot be read are therefore blanked out, one error at a time, until what is left is sound:
//! the errors reported are those that the author made, not their consequences, and the rest of
//! the file is still checked.

use std::ops::Range;

use toml::de::{DeTable, Error};

use super::sink::Sink;
use super::source::{Place, SourceText};
use super::statements::{Statement, statements};
use super::tree::{Content, Node};

/// Bytes that the repair may parse in all; beyond it the rest of the file goes unread.
const REPAIR_BUDGET: usize = 50_000_000;

/// What could be read of a text.
pub(crate) struct Document {
    /// The tree of all readable statements.
    pub(crate) root: Node,
    /// Lines that hold unreadable statements.
    pub(crate) unreadable: Vec<String>,
    /// Whether the whole of the remaining text could be read.
    pub(crate) complete: bool,
}

/// Parses a text and reports its syntax errors.
pub(crate) fn parse(source: &SourceText, sink: &Sink<'_>) -> Document {
    let mut text = source.text().to_owned();
    let mut unreadable = Vec::new();
    let mut budget = REPAIR_BUDGET;
    let mut known: Option<Vec<Statement>> = None;
    loop {
        let (table, errors) = DeTable::parse_recoverable(&text);
        let first = errors
            .iter()
            .filter(|error| !is_duplicate(error))
            .min_by_key(|error| error.span().map_or(0, |span| span.start));
        let Some(error) = first else {
            for error in &errors {
                report(error, source, sink);
            }
            return Document {
                root: Node::document(table.get_ref(), sink),
                unreadable,
                complete: true,
            };
        };
        let statements = known.get_or_insert_with(|| statements(source));
        let lines = blame(source, &text, statements, error, sink);
        let (start, end) = (source.line_start(lines.start), source.line_start(lines.end));
        budget = budget.saturating_sub(text.len());
        if budget == 0 || text[start..end].trim().is_empty() {
            break;
        }
        unreadable.extend(lines.map(|line| source.line(line).to_owned()));
        blank(&mut text, start, end);
    }
    Document {
        root: Node {
            place: Place::default(),
            content: Content::Unusable,
        },
        unreadable,
        complete: false,
    }
}

/// A key given twice does not hinder reading: the first one counts.
fn is_duplicate(error: &Error) -> bool {
    error.message().starts_with("duplicate key")
}

fn report(error: &Error, source: &SourceText, sink: &Sink<'_>) {
    let span = error.span().unwrap_or(0..0);
    let place = Place::new(span.start, span.end);
    let text = source.text();
    if is_duplicate(error) {
        let key = text.get(span).unwrap_or_default();
        let help = "keep one of the two".to_owned();
        sink.report(&place, format!("`{key}` is given twice"), Some(help));
        return;
    }
    let found = text.get(span.start..).and_then(|rest| rest.chars().next());
    let message = error.message();
    let word = message.starts_with("invalid float") && found.is_some_and(char::is_alphabetic);
    let (message, help) = if word || message.starts_with("string values must be quoted") {
        ("this text is not quoted", "write \"...\" around it")
    } else if message.starts_with("key with no value") {
        ("this key has no value", "write key = value")
    } else if message.starts_with("invalid literal string") && found != Some('\'') {
        // What the parser says where it finds nothing that begins a value.
        ("a value is missing here", "write key = value")
    } else {
        (message, "this is not valid TOML")
    };
    sink.report(&place, message, Some(help.to_owned()));
}

/// Reports an error and tells which lines to leave out.
fn blame(
    source: &SourceText,
    text: &str,
    statements: &[Statement],
    error: &Error,
    sink: &Sink<'_>,
) -> Range<usize> {
    let offset = error.span().map_or(0, |span| span.start);
    // An error at the very end belongs to the last line that says something.
    let offset = offset.min(text.trim_end().len().saturating_sub(1));
    let line = source.line_of(offset);
    let blanked = |statement: &Statement| {
        let start = source.line_start(statement.lines.start);
        source.text()[start..].starts_with(|letter: char| !letter.is_whitespace())
            && text[start..].starts_with(char::is_whitespace)
    };
    // A value that never ends swallows what follows, wherever the parser notices.
    let open = statements.iter().find(|statement| {
        statement.unclosed && statement.lines.start <= line && !blanked(statement)
    });
    if let Some(open) = open {
        let help = "a bracket, brace or quote is missing before the next key".to_owned();
        let place = visible(source, open.lines.start);
        sink.report(&place, "this value is never closed", Some(help));
        return open.lines.clone();
    }
    report(error, source, sink);
    let Some(index) = statements
        .iter()
        .rposition(|statement| statement.lines.start <= line)
    else {
        return line..line + 1;
    };
    let statement = &statements[index];
    if statement.header {
        // Without its header a section would be taken for part of the one before.
        let end = statements[index + 1..]
            .iter()
            .find(|later| later.header)
            .map_or(source.line_count(), |later| later.lines.start);
        return statement.lines.start..end;
    }
    if statement.lines.contains(&line) {
        let alone = line..line + 1;
        if line > statement.lines.start && helps(source, text, statement, &alone) {
            return alone;
        }
        return statement.lines.clone();
    }
    line..line + 1
}

/// Whether leaving out some lines of a statement takes its first error away.
fn helps(source: &SourceText, text: &str, statement: &Statement, lines: &Range<usize>) -> bool {
    let start = source.line_start(statement.lines.start);
    let mut rest = text[start..source.line_start(statement.lines.end)].to_owned();
    let (from, to) = (source.line_start(lines.start), source.line_start(lines.end));
    blank(&mut rest, from - start, to - start);
    let (_, errors) = DeTable::parse_recoverable(&rest);
    errors
        .iter()
        .filter_map(Error::span)
        .all(|span| span.start >= to - start)
}

/// The visible part of a line.
fn visible(source: &SourceText, line: usize) -> Place {
    let shown = source.line(line);
    let start = source.line_start(line) + (shown.len() - shown.trim_start().len());
    Place::new(start, source.line_start(line) + shown.trim_end().len())
}

/// Overwrites a stretch with blanks; line feeds stay, so that every offset stays.
fn blank(text: &mut String, start: usize, end: usize) {
    let blanked: String = text[start..end]
        .bytes()
        .map(|byte| if byte == b'\n' { '\n' } else { ' ' })
        .collect();
    text.replace_range(start..end, &blanked);
}
