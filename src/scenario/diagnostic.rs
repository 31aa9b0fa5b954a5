//! What is wrong with a scenario, shown with the line it is wrong on.

use std::fmt;

use super::source::{Place, SourceText};

/// Longest piece of a source line that is shown, in characters.
const SHOWN_WIDTH: usize = 110;
/// Characters kept in front of the marked stretch when a long line is cut.
const SHOWN_BEFORE: usize = 40;
/// Mistakes that are shown in full; a file with more is rarely one that was meant as a scenario.
const SHOWN_MISTAKES: usize = 200;

/// One mistake: what was found, where, and what would be right.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Diagnostic {
    /// What was found.
    pub message: String,
    /// What would be right.
    pub help: Option<String>,
    /// File name as given.
    pub file: String,
    /// Line, counted from one; 0 when the mistake is about the file as a whole.
    pub line: usize,
    /// Column in characters, counted from one; 0 when the mistake is about the file as a whole.
    pub column: usize,
    /// Number of characters marked; 0 when the mistake is about the file as a whole.
    pub width: usize,
    /// The line that is marked.
    pub source_line: String,
    /// Name that the mistake misses, by which a consequence of an unreadable line is known.
    pub(crate) missing: Option<String>,
}

impl Diagnostic {
    /// A mistake at a place of the source.
    pub(crate) fn new(
        source: &SourceText,
        place: &Place,
        message: String,
        help: Option<String>,
    ) -> Self {
        let (line, column) = source.position(place.start);
        let message = match &place.set_by {
            Some(path) => format!("{message} (set through `{path}`)"),
            None => message,
        };
        Self {
            message,
            help,
            file: source.origin().to_owned(),
            line,
            column,
            width: source.width(place.start, place.end),
            source_line: source.line(line - 1).to_owned(),
            missing: None,
        }
    }

    /// A mistake about a file as a whole.
    pub(crate) fn of_file(file: &str, message: String, help: Option<String>) -> Self {
        Self {
            message,
            help,
            file: file.to_owned(),
            line: 0,
            column: 0,
            width: 0,
            source_line: String::new(),
            missing: None,
        }
    }
}

impl fmt::Display for Diagnostic {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        if self.line == 0 {
            writeln!(formatter, "{}: {}", self.file, printable(&self.message))?;
        } else {
            writeln!(
                formatter,
                "{}:{}:{}: {}",
                self.file,
                self.line,
                self.column,
                printable(&self.message)
            )?;
            let (shown, offset, marked) = self.excerpt();
            writeln!(formatter, "{:>6} | {shown}", self.line)?;
            writeln!(
                formatter,
                "       | {}{}",
                " ".repeat(offset),
                "^".repeat(marked)
            )?;
        }
        if let Some(help) = &self.help {
            writeln!(formatter, "         {}", printable(help))?;
        }
        Ok(())
    }
}

impl Diagnostic {
    /// The shown piece of the source line, the characters before the mark, and its width.
    fn excerpt(&self) -> (String, usize, usize) {
        let characters: Vec<char> = self.source_line.chars().collect();
        let column = self.column - 1;
        let first = if characters.len() <= SHOWN_WIDTH {
            0
        } else {
            column.saturating_sub(SHOWN_BEFORE)
        };
        let last = (first + SHOWN_WIDTH).min(characters.len());
        let mut shown: String = characters
            .get(first..last)
            .unwrap_or_default()
            .iter()
            .map(|&character| {
                if character.is_control() {
                    ' '
                } else {
                    character
                }
            })
            .collect();
        let mut offset = column - first;
        if first > 0 {
            shown.insert(0, '…');
            offset += 1;
        }
        if last < characters.len() {
            shown.push('…');
        }
        let marked = self.width.min(SHOWN_WIDTH.saturating_sub(offset)).max(1);
        (shown, offset, marked)
    }
}

/// Control characters never reach the terminal.
fn printable(text: &str) -> String {
    let mut shown = String::with_capacity(text.len());
    for character in text.chars() {
        if character.is_control() {
            shown.extend(character.escape_default());
        } else {
            shown.push(character);
        }
    }
    shown
}

/// Every mistake of a scenario, in the order of the file; at least one.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Diagnostics {
    list: Vec<Diagnostic>,
}

impl Diagnostics {
    /// Sorts mistakes by position; `None` when there is none.
    pub(crate) fn from_list(mut list: Vec<Diagnostic>) -> Option<Self> {
        list.sort_by_key(|diagnostic| (diagnostic.line, diagnostic.column));
        (!list.is_empty()).then_some(Self { list })
    }

    /// A single mistake.
    pub(crate) fn one(diagnostic: Diagnostic) -> Self {
        Self {
            list: vec![diagnostic],
        }
    }

    /// The mistakes in the order of the file.
    pub fn iter(&self) -> std::slice::Iter<'_, Diagnostic> {
        self.list.iter()
    }

    /// Number of mistakes, at least one.
    #[must_use]
    #[allow(clippy::len_without_is_empty)] // never empty
    pub fn len(&self) -> usize {
        self.list.len()
    }
}

impl<'a> IntoIterator for &'a Diagnostics {
    type Item = &'a Diagnostic;
    type IntoIter = std::slice::Iter<'a, Diagnostic>;

    fn into_iter(self) -> Self::IntoIter {
        self.iter()
    }
}

impl fmt::Display for Diagnostics {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        for diagnostic in self.list.iter().take(SHOWN_MISTAKES) {
            writeln!(formatter, "{diagnostic}")?;
        }
        let hidden = self.list.len().saturating_sub(SHOWN_MISTAKES);
        if hidden > 0 {
            writeln!(formatter, "({hidden} more are not shown)\n")?;
        }
        let plural = if self.list.len() == 1 { "" } else { "s" };
        let file = self
            .list
            .first()
            .map_or("", |diagnostic| diagnostic.file.as_str());
        write!(formatter, "{} mistake{plural} in {file}", self.list.len())
    }
}

impl std::error::Error for Diagnostics {}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_mistake_is_shown_with_its_line_and_mark() {
        let source = SourceText::new("a = 1\n\tfraction = 0 # none\n", "plots.toml");
        let start = source.text().find("0 #").unwrap();
        let list = vec![Diagnostic::new(
            &source,
            &Place::new(start, start + 1),
            "`fraction` is 0".to_owned(),
            Some("it must be above 0 and at most 1".to_owned()),
        )];
        let diagnostics = Diagnostics::from_list(list).unwrap();
        let expected = "plots.toml:2:13: `fraction` is 0
     2 |  fraction = 0 # none
       |             ^
         it must be above 0 and at most 1

1 mistake in plots.toml";
        assert_eq!(diagnostics.to_string(), expected);
    }

    #[test]
    fn long_lines_are_cut_around_the_mark() {
        let text = format!("{}x{}", "a".repeat(500), "b".repeat(500));
        let source = SourceText::new(&text, "long.toml");
        let place = Place::new(500, 501);
        let shown = Diagnostic::new(&source, &place, "m".to_owned(), None).to_string();
        let lines: Vec<&str> = shown.lines().collect();
        assert!(lines.iter().all(|line| line.chars().count() < 130));
        let mark = lines[2].chars().position(|character| character == '^');
        let marked = lines[1].chars().nth(mark.unwrap());
        assert_eq!(marked, Some('x'));
    }

    #[test]
    fn control_characters_are_escaped() {
        let diagnostic = Diagnostic::of_file("f", "bell \u{7}".to_owned(), None);
        assert_eq!(diagnostic.to_string(), "f: bell \\u{7}\n");
    }
}
