//! Text in a terminal: widths, wrapping, padding, emphasis.

use std::fmt::Write as _;

use super::text_table::{Align, NARROWEST};

/// Adds a line without blanks at its end, in an ANSI style if one is given.
pub(super) fn push_line(text: &mut String, line: &str, style: Option<&str>) {
    let line = line.trim_end();
    match style {
        Some(code) if !line.is_empty() => {
            let _ = writeln!(text, "\u{1b}[{code}m{line}\u{1b}[0m");
        }
        _ => {
            text.push_str(line);
            text.push('\n');
        }
    }
}

/// Dim text.
pub(super) fn dimmed(text: &str) -> String {
    if text.trim().is_empty() {
        text.to_owned()
    } else {
        format!("\u{1b}[2m{text}\u{1b}[0m")
    }
}

/// Bold text when asked for.
pub(super) fn bold(text: &str, ansi: bool) -> String {
    if ansi {
        format!("\u{1b}[1m{text}\u{1b}[0m")
    } else {
        text.to_owned()
    }
}

/// Replaces control characters, so that a name can neither break a line nor command a terminal.
pub(super) fn clean(text: &str) -> String {
    text.chars()
        .map(|c| if c.is_control() { ' ' } else { c })
        .collect()
}

/// Terminal columns that a text takes: combining marks take none, East Asian wide characters and
/// emoji take two, everything else one.
pub(super) fn display_width(text: &str) -> usize {
    text.chars().map(char_width).sum()
}

fn char_width(c: char) -> usize {
    match u32::from(c) {
        0x0300..=0x036F | 0x1AB0..=0x1AFF | 0x20D0..=0x20FF | 0x200B..=0x200F | 0xFE00..=0xFE0F => {
            0
        }
        0x1100..=0x115F
        | 0x2E80..=0x303E
        | 0x3041..=0xA4CF
        | 0xAC00..=0xD7A3
        | 0xF900..=0xFAFF
        | 0xFE30..=0xFE6F
        | 0xFF00..=0xFF60
        | 0xFFE0..=0xFFE6
        | 0x1F300..=0x1FAFF
        | 0x20000..=0x3FFFD => 2,
        _ => 1,
    }
}

/// Fills a text up to `width` columns.
pub(super) fn pad(text: &str, width: usize, align: Align) -> String {
    let blank = " ".repeat(width.saturating_sub(display_width(text)));
    match align {
        Align::Left => format!("{text}{blank}"),
        Align::Right => format!("{blank}{text}"),
    }
}

/// Cuts a text to `width` columns, the last of them an ellipsis if anything is lost.
pub(super) fn cut(text: &str, width: usize) -> String {
    if display_width(text) <= width {
        return text.to_owned();
    }
    let mut kept = String::new();
    let mut used = 0;
    for c in text.chars() {
        if used + char_width(c) + 1 > width {
            break;
        }
        used += char_width(c);
        kept.push(c);
    }
    format!("{}…", kept.trim_end())
}

/// Breaks a text at blanks and after hyphens into at most `most` lines of `width` columns; the
/// last line ends in an ellipsis if the text does not fit.
pub(super) fn wrap(text: &str, width: usize, most: usize) -> Vec<String> {
    let mut lines: Vec<String> = vec![String::new()];
    for piece in text.split_inclusive([' ', '-']) {
        let last = lines.last_mut().map(|line| {
            let fits = display_width(line) + display_width(piece.trim_end()) <= width;
            if fits || line.is_empty() {
                line.push_str(piece);
            }
            fits || *line == piece
        });
        if last == Some(false) {
            lines.push(piece.to_owned());
        }
    }
    let mut lines: Vec<String> = lines
        .iter()
        .map(|line| line.trim_end().to_owned())
        .collect();
    if lines.len() > most {
        let rest = lines.split_off(most - 1);
        lines.push(rest.join(" "));
        if let Some(last) = lines.last_mut() {
            // Something was lost even if the joined rest happens to fit the width.
            *last = cut(&format!("{last}……"), width);
        }
    }
    lines.iter().map(|line| cut(line, width)).collect()
}

/// A paragraph wrapped to `width`, its lines ended by line breaks.
pub(super) fn paragraph(text: &str, width: usize) -> String {
    let mut out = String::new();
    for line in wrap(&clean(text), width.max(NARROWEST), usize::MAX) {
        push_line(&mut out, &line, None);
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn labels_wrap_and_end_in_an_ellipsis() {
        assert_eq!(
            wrap("least-squares on all units", 14, 3),
            ["least-squares", "on all units"]
        );
        assert_eq!(wrap("one two three four", 5, 2), ["one", "two…"]);
        assert_eq!(wrap("supercalifragilistic", 8, 3), ["superca…"]);
        assert_eq!(wrap("", 8, 3), [""]);
        assert_eq!(display_width("e\u{301}té 効果"), 8);
        assert_eq!(clean("a\u{1b}[31m\nb"), "a [31m b");
    }
}
