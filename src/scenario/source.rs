//! The text of a scenario with its line table.

use std::sync::Arc;

/// Stretch of the source text that a value came from.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub(crate) struct Place {
    /// First byte.
    pub(crate) start: usize,
    /// One past the last byte.
    pub(crate) end: usize,
    /// Path by which the value was replaced after reading, if it was.
    pub(crate) set_by: Option<Arc<str>>,
}

impl Place {
    /// The stretch `start..end` of the text as read.
    pub(crate) fn new(start: usize, end: usize) -> Self {
        Self {
            start,
            end,
            set_by: None,
        }
    }
}

/// Text of one file, able to turn byte offsets into lines and columns.
#[derive(Debug)]
pub(crate) struct SourceText {
    origin: String,
    text: String,
    line_starts: Vec<usize>,
}

impl SourceText {
    /// Indexes a text; `origin` is the file name used in messages.
    pub(crate) fn new(text: &str, origin: &str) -> Self {
        let line_starts = std::iter::once(0)
            .chain(text.match_indices('\n').map(|(offset, _)| offset + 1))
            .collect();
        Self {
            origin: origin.to_owned(),
            text: text.to_owned(),
            line_starts,
        }
    }

    /// File name used in messages.
    pub(crate) fn origin(&self) -> &str {
        &self.origin
    }

    /// The whole text.
    pub(crate) fn text(&self) -> &str {
        &self.text
    }

    /// Number of lines; a text that ends in a line feed has an empty last line.
    pub(crate) fn line_count(&self) -> usize {
        self.line_starts.len()
    }

    /// Zero-based line that holds a byte offset.
    pub(crate) fn line_of(&self, offset: usize) -> usize {
        self.line_starts.partition_point(|&start| start <= offset) - 1
    }

    /// First byte of a zero-based line; the end of the text past the last line.
    pub(crate) fn line_start(&self, line: usize) -> usize {
        self.line_starts
            .get(line)
            .copied()
            .unwrap_or(self.text.len())
    }

    /// A zero-based line without its line ending; empty past the last line.
    pub(crate) fn line(&self, line: usize) -> &str {
        let start = self.line_start(line);
        let end = self.line_start(line + 1);
        self.text[start..end].trim_end_matches(['\n', '\r'])
    }

    /// One-based line and column, in characters, of a byte offset. Offsets inside a character
    /// belong to it.
    pub(crate) fn position(&self, offset: usize) -> (usize, usize) {
        let mut offset = offset.min(self.text.len());
        while !self.text.is_char_boundary(offset) {
            offset -= 1;
        }
        let line = self.line_of(offset);
        let column = self.text[self.line_start(line)..offset].chars().count();
        (line + 1, column + 1)
    }

    /// Characters from `start` to `end` that lie on the line of `start`; at least one.
    pub(crate) fn width(&self, start: usize, end: usize) -> usize {
        let (line, column) = self.position(start);
        let on_line = self.line(line - 1).chars().count();
        let (end_line, end_column) = self.position(end);
        let last = if end_line == line {
            end_column
        } else {
            on_line + 1
        };
        last.saturating_sub(column).max(1)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn positions_count_characters_from_one() {
        let source = SourceText::new("a = 1\r\nnäme = \"ö\"\n", "x.toml");
        let offset = source.text().find("\"ö\"").unwrap();
        assert_eq!(source.position(offset), (2, 8));
        assert_eq!(source.width(offset, offset + 4), 3);
        assert_eq!(source.line(0), "a = 1");
        assert_eq!(source.line(1), "näme = \"ö\"");
        assert_eq!(source.line(7), "");
        assert_eq!(source.line_count(), 3);
    }

    #[test]
    fn stretches_over_several_lines_are_marked_to_the_end_of_the_first() {
        let source = SourceText::new("a = [\n1,\n]", "x.toml");
        assert_eq!(source.width(4, 10), 1);
        assert_eq!(source.position(1000), (3, 2));
    }
}
