//! From text to tree: TOML syntax, with every syntax error of the file.
//!
//! A syntax error can swallow the rest of a file (an unclosed bracket does). Statements that
//! cannot be read are therefore blanked out, one error at a time, until what is left is sound:
//! the errors reported are those that the author made, not their consequences, and the rest of
//! the file is still checked.

use toml::de::{DeTable, Error};

use super::sink::Sink;
use super::source::{Place, SourceText};
use super::tree::{Content, Node};

/// Bytes that the repair may parse in all; beyond it the rest of the file goes unread.
const REPAIR_BUDGET: usize = 100_000_000;

/// What could be read of a text.
pub(crate) struct Document {
    /// The tree of all readable statements.
    pub(crate) root: Node,
    /// Lines that hold unreadable statements, in file order.
    pub(crate) unreadable: Vec<String>,
    /// Whether the whole of the remaining text could be read.
    pub(crate) complete: bool,
}

/// Parses a text and reports its syntax errors.
pub(crate) fn parse(source: &SourceText, sink: &Sink<'_>) -> Document {
    let mut text = source.text().to_owned();
    let mut unreadable = Vec::new();
    let mut budget = REPAIR_BUDGET;
    loop {
        let (table, errors) = DeTable::parse_recoverable(&text);
        let Some(error) = first(&errors, |error| !is_duplicate(error)) else {
            for error in &errors {
                report(error, source, sink);
            }
            let root = Node::document(table.get_ref(), sink);
            return Document {
                root,
                unreadable,
                complete: true,
            };
        };
        let lines = unreadable_lines(source, &text, error, sink);
        budget = budget.saturating_sub(2 * text.len());
        let (start, end) = (source.line_start(lines.start), source.line_start(lines.end));
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

fn first(errors: &[Error], wanted: impl Fn(&Error) -> bool) -> Option<&Error> {
    errors
        .iter()
        .filter(|error| wanted(error))
        .min_by_key(|error| error.span().map_or(0, |span| span.start))
}

/// A key given twice does not hinder reading: the first one counts.
fn is_duplicate(error: &Error) -> bool {
    error.message().starts_with("duplicate key")
}

fn report(error: &Error, source: &SourceText, sink: &Sink<'_>) {
    let span = error.span().unwrap_or(0..0);
    let place = Place::new(span.start, span.end);
    if is_duplicate(error) {
        let key = source.text().get(span).unwrap_or_default();
        sink.report(
            &place,
            format!("`{key}` is given twice"),
            Some("keep one of the two".to_owned()),
        );
    } else {
        sink.report(
            &place,
            error.message(),
            Some("this is not valid TOML".to_owned()),
        );
    }
}

/// Reports an error and tells which lines to leave out.
fn unreadable_lines(
    source: &SourceText,
    text: &str,
    error: &Error,
    sink: &Sink<'_>,
) -> std::ops::Range<usize> {
    let offset = error.span().map_or(0, |span| span.start).min(text.len());
    // An error at the very end belongs to the last line that says something.
    let offset = offset.min(text.trim_end().len().saturating_sub(1));
    let line = source.line_of(offset);
    if opens_statement(text_line(source, text, line)) {
        // Is the trouble an earlier statement that never ends?
        let begins = (0..line)
            .rev()
            .find(|&before| opens_statement(text_line(source, text, before)));
        if let Some(begins) = begins
            && is_unclosed(&text[source.line_start(begins)..source.line_start(line)])
        {
            sink.report(
                &marked(source, begins),
                "this value is never closed",
                Some("a bracket, brace or quote is missing before the next key".to_owned()),
            );
            return begins..line;
        }
    }
    report(error, source, sink);
    statement_start(source, text, line)..statement_end(source, text, line)
}

/// The text of a line after blanking.
fn text_line<'t>(source: &SourceText, text: &'t str, line: usize) -> &'t str {
    text.get(source.line_start(line)..source.line_start(line + 1))
        .unwrap_or_default()
}

/// The visible part of a line.
fn marked(source: &SourceText, line: usize) -> Place {
    let shown = source.line(line);
    let start = source.line_start(line) + (shown.len() - shown.trim_start().len());
    Place::new(start, source.line_start(line) + shown.trim_end().len())
}

fn is_unclosed(statement: &str) -> bool {
    let (_, errors) = DeTable::parse_recoverable(statement);
    errors.iter().any(|error| {
        error.message().contains("unclosed") || error.message().contains("invalid multi-line")
    })
}

/// The line on which the statement of a line begins.
fn statement_start(source: &SourceText, text: &str, line: usize) -> usize {
    (0..=line)
        .rev()
        .find(|&candidate| opens_statement(text_line(source, text, candidate)))
        .filter(|&begins| {
            // Only an open value reaches over lines; a stray line stands for itself.
            begins == line
                || is_unclosed(&text[source.line_start(begins)..source.line_start(begins + 1)])
        })
        .unwrap_or(line)
}

/// The line after the statement of a line; after a broken header, the next header.
fn statement_end(source: &SourceText, text: &str, line: usize) -> usize {
    let header = text_line(source, text, line).trim_start().starts_with('[')
        && opens_statement(text_line(source, text, line));
    (line + 1..source.line_count())
        .find(|&candidate| {
            let candidate = text_line(source, text, candidate);
            let opens = opens_statement(candidate);
            if header {
                opens && candidate.trim_start().starts_with('[')
            } else {
                opens
            }
        })
        .unwrap_or(source.line_count())
}

/// Whether a line looks like the first line of a statement: `[header]` or `key =`.
fn opens_statement(line: &str) -> bool {
    let line = line.trim();
    if let Some(inner) = line.strip_prefix('[') {
        return inner
            .trim_start_matches('[')
            .starts_with(|letter: char| letter.is_ascii_alphabetic())
            && !line.contains(',');
    }
    let Some((key, _)) = line.split_once('=') else {
        return false;
    };
    let key = key.trim_end();
    key.starts_with(|letter: char| letter.is_ascii_alphanumeric() || "_\"'".contains(letter))
        && !key.contains(['{', '[', ',', '#'])
}

/// Overwrites a stretch with blanks; line feeds stay, so that every offset stays.
fn blank(text: &mut String, start: usize, end: usize) {
    let blanked: String = text[start..end]
        .bytes()
        .map(|byte| if byte == b'\n' { '\n' } else { ' ' })
        .collect();
    text.replace_range(start..end, &blanked);
}
