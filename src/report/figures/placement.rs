//! Where texts go: estimated widths, shortening, pushing labels apart.

/// Estimated width of a text in pixels for a sans-serif font, rather too wide than too narrow:
/// the fonts of the reader are not known.
pub(super) fn text_width(text: &str, size: f64) -> f64 {
    size * text.chars().map(relative_width).sum::<f64>()
}

/// Width of a character over the font size, after the wider of the common sans-serif fonts.
fn relative_width(c: char) -> f64 {
    match c {
        'i' | 'j' | 'l' | 'I' | '.' | ',' | ':' | ';' | '\'' | '|' | '!' | ' ' => 0.34,
        'f' | 't' | 'r' | '(' | ')' | '[' | ']' | '-' | '/' | '"' => 0.44,
        'm' | 'w' | 'M' | 'W' | '@' | '%' | '…' | '—' => 1.0,
        'A'..='Z' | '±' | '≥' | '≤' | '=' | '<' | '>' | '+' | '~' => 0.8,
        c if u32::from(c) >= 0x1100 => 1.05,
        _ => 0.64,
    }
}

/// Shortens a text to a width in pixels by cutting its middle: labels of methods often share
/// their beginning and differ at their end.
pub(super) fn shorten(text: &str, size: f64, width: f64) -> String {
    if text_width(text, size) <= width {
        return text.to_owned();
    }
    let characters: Vec<char> = text.chars().collect();
    let built = |kept: usize| -> String {
        let head = kept.div_ceil(2);
        let tail = characters.len() - (kept - head);
        let head: String = characters[..head].iter().collect();
        let tail: String = characters[tail..].iter().collect();
        format!("{}…{}", head.trim_end(), tail.trim_start())
    };
    (0..characters.len())
        .rev()
        .map(built)
        .find(|text| text_width(text, size) <= width)
        .unwrap_or_else(|| "…".to_owned())
}

/// Breaks a text at blanks and hyphens into at most `most` lines of `width` pixels; what does not
/// fit is shortened.
pub(super) fn fold(text: &str, size: f64, width: f64, most: usize) -> Vec<String> {
    let mut lines: Vec<String> = Vec::new();
    for piece in text.split_inclusive([' ', '-']) {
        let full = lines.len() == most;
        match lines.last_mut() {
            Some(line)
                if full || text_width(&format!("{line}{}", piece.trim_end()), size) <= width =>
            {
                line.push_str(piece);
            }
            _ => lines.push(piece.to_owned()),
        }
    }
    lines
        .iter()
        .map(|line| shorten(line.trim_end(), size, width))
        .collect()
}

/// Moves positions apart so that neighbours are at least `gap` from each other and all lie within
/// `[low, high]` if they can, each as near as possible to where it wants to be (in the least
/// squares sense). Returns the positions in the order given.
pub(super) fn push_apart(wanted: &[f64], gap: f64, low: f64, high: f64) -> Vec<f64> {
    let mut order: Vec<usize> = (0..wanted.len()).collect();
    order.sort_by(|&a, &b| wanted[a].total_cmp(&wanted[b]));
    // Subtracting the gaps turns "at least a gap apart" into "not decreasing", which pooling of
    // adjacent violators solves.
    let mut pools: Vec<(f64, usize)> = Vec::new();
    let mut offset = 0.0;
    for &index in &order {
        let mut pool = (wanted[index] - offset, 1);
        while let Some(&(mean, count)) = pools.last() {
            if mean <= pool.0 {
                break;
            }
            let total = mean * real(count) + pool.0 * real(pool.1);
            pool = (total / real(count + pool.1), count + pool.1);
            pools.pop();
        }
        pools.push(pool);
        offset += gap;
    }
    let top = (high - (offset - gap).max(0.0)).max(low);
    let mut placed = vec![0.0; wanted.len()];
    let flat = pools
        .iter()
        .flat_map(|&(mean, count)| std::iter::repeat_n(mean, count));
    let mut offset = 0.0;
    for (&index, mean) in order.iter().zip(flat) {
        placed[index] = mean.clamp(low, top) + offset;
        offset += gap;
    }
    placed
}

/// A small count as a float.
#[allow(clippy::cast_precision_loss)] // counts of labels, rows and panels
pub(super) fn real(count: usize) -> f64 {
    count as f64
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn labels_are_pushed_apart_and_stay_near() {
        let placed = push_apart(&[50.0, 52.0, 10.0, 51.0], 15.0, 0.0, 100.0);
        assert!(
            (placed[2] - 10.0).abs() < 1e-9,
            "the lonely one does not move"
        );
        assert!((placed[3] - placed[0] - 15.0).abs() < 1e-9);
        assert!((placed[1] - placed[3] - 15.0).abs() < 1e-9);
        assert!(
            (placed[3] - 51.0).abs() < 1e-9,
            "the group is centred on its mean"
        );
    }

    #[test]
    fn labels_keep_within_the_limits() {
        let placed = push_apart(&[99.0, 98.0, 97.0], 10.0, 0.0, 100.0);
        assert!(placed[0] <= 100.0 + 1e-9 && placed[2] >= 79.0, "{placed:?}");
        // Too many to fit: they begin at the low end, still apart.
        let placed = push_apart(&[5.0, 5.0, 5.0], 10.0, 0.0, 15.0);
        assert!((placed[0], placed[2]) == (0.0, 20.0), "{placed:?}");
        assert!(push_apart(&[], 10.0, 0.0, 15.0).is_empty());
    }

    #[test]
    fn shortening_keeps_both_ends() {
        let text = shorten("least-squares with the HC3 variance", 12.0, 120.0);
        assert!(
            text.starts_with("least") && text.ends_with("iance"),
            "{text}"
        );
        assert!(text_width(&text, 12.0) <= 120.0);
        assert_eq!(shorten("short", 12.0, 120.0), "short");
        let lines = fold(
            "least-squares with the HC3 variance and more",
            12.0,
            100.0,
            2,
        );
        assert_eq!(lines.len(), 2);
        assert!(
            lines.iter().all(|line| text_width(line, 12.0) <= 100.0),
            "{lines:?}"
        );
    }
}
