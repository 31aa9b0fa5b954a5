//! Which lines of a broken file belong together.

use std::ops::Range;

use toml::de::DeTable;

use super::source::SourceText;

/// A table header, a key with its value, or a line that is neither.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) struct Statement {
    /// Zero-based lines.
    pub(crate) lines: Range<usize>,
    /// Whether it is a table header.
    pub(crate) header: bool,
    /// Whether its value does not end before the next statement begins.
    pub(crate) unclosed: bool,
}

/// Splits a text into statements; blank lines and comments belong to none.
///
/// A value may reach over several lines. It is taken to end where a line looks like the beginning
/// of a statement and is indented no more than the line on which the value began: members of a
/// table that is written over several lines look like statements, but are indented.
pub(crate) fn statements(source: &SourceText) -> Vec<Statement> {
    let mut statements = Vec::new();
    let count = source.line_count();
    let mut line = 0;
    while line < count {
        let text = source.line(line);
        let first = line;
        line += 1;
        if text.trim().is_empty() || text.trim_start().starts_with('#') {
            continue;
        }
        let header = is_header(text);
        let mut unclosed = false;
        if !header && is_key(text) && is_unclosed(text) {
            while line < count {
                let next = source.line(line);
                if (is_header(next) || is_key(next)) && indent(next) <= indent(text) {
                    break;
                }
                line += 1;
            }
            unclosed =
                is_unclosed(&source.text()[source.line_start(first)..source.line_start(line)]);
        }
        statements.push(Statement {
            lines: first..line,
            header,
            unclosed,
        });
    }
    statements
}

fn indent(line: &str) -> usize {
    line.len() - line.trim_start().len()
}

/// Whether a line looks like `[name]` or `[[name]]`, complete or not.
fn is_header(line: &str) -> bool {
    let Some(inner) = line.trim_start().strip_prefix('[') else {
        return false;
    };
    inner
        .trim_start_matches(['[', ' '])
        .starts_with(|letter: char| letter.is_ascii_alphabetic())
        && !inner.contains(',')
}

/// Whether a line looks like `key = ...`.
fn is_key(line: &str) -> bool {
    let Some((key, _)) = line.split_once('=') else {
        return false;
    };
    let key = key.trim();
    key.starts_with(|letter: char| letter.is_ascii_alphanumeric() || "_\"'".contains(letter))
        && !key.contains(['{', '[', ',', '#'])
}

/// Whether the text ends within a value.
fn is_unclosed(text: &str) -> bool {
    let (_, errors) = DeTable::parse_recoverable(text);
    errors.iter().any(|error| {
        error.message().contains("unclosed") || error.message().contains("invalid multi-line")
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn values_reach_over_lines_until_the_next_statement() {
        let text =
            "a = 1\nstray\n[b]\nc = [\n  1,\n]\nd = {\n  e = 1,\n  f = 2\n}\ng = [1,\n[[h]]\n";
        let source = SourceText::new(text, "f");
        let found: Vec<(Range<usize>, bool, bool)> = statements(&source)
            .into_iter()
            .map(|statement| (statement.lines, statement.header, statement.unclosed))
            .collect();
        assert_eq!(
            found,
            [
                (0..1, false, false),
                (1..2, false, false),
                (2..3, true, false),
                (3..6, false, false),
                (6..10, false, false),
                (10..11, false, true),
                (11..12, true, false),
            ]
        );
    }
}
