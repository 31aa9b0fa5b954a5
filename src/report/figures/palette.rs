//! Colours and marks of methods.

use plotters::style::RGBColor;

/// Text and axes.
pub(super) const INK: RGBColor = RGBColor(0x22, 0x22, 0x22);
/// Secondary text, ticks.
pub(super) const SOFT: RGBColor = RGBColor(0x5A, 0x5A, 0x5A);
/// Grid lines.
pub(super) const FAINT: RGBColor = RGBColor(0xD9, 0xD9, 0xD9);
/// Bands behind the marks.
pub(super) const BAND: RGBColor = RGBColor(0xE4, 0xE4, 0xE4);
/// Paper.
pub(super) const PAPER: RGBColor = RGBColor(0xFF, 0xFF, 0xFF);
/// Bars of histograms.
pub(super) const BAR: RGBColor = RGBColor(0x9F, 0xC5, 0xDF);
/// The one accent of the histograms: the mean.
pub(super) const ACCENT: RGBColor = RGBColor(0xB5, 0x4A, 0x00);

/// Colours that remain apart for the common colour-vision deficiencies, from the set of Okabe &
/// Ito (2008, recalled), in an order in which neighbours also differ in lightness. Their yellow is
/// left out: it does not show on white.
const SERIES: [RGBColor; 7] = [
    RGBColor(0x00, 0x72, 0xB2),
    RGBColor(0xE6, 0x9F, 0x00),
    RGBColor(0x00, 0x00, 0x00),
    RGBColor(0x00, 0x9E, 0x73),
    RGBColor(0xD5, 0x5E, 0x00),
    RGBColor(0x56, 0xB4, 0xE9),
    RGBColor(0xCC, 0x79, 0xA7),
];

/// Shape of a mark.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Mark {
    Disc,
    Square,
    Triangle,
    Diamond,
    Ring,
}

const MARKS: [Mark; 5] = [
    Mark::Disc,
    Mark::Square,
    Mark::Triangle,
    Mark::Diamond,
    Mark::Ring,
];

/// Dash patterns: lengths of stroke and gap in pixels; the empty pattern is a solid line.
const DASHES: [&[f64]; 3] = [&[], &[7.0, 3.0], &[2.0, 3.0]];

/// How the curve of one method is drawn. Colour, mark and dash repeat with different periods, so
/// that no two of the first hundred methods share all three.
#[derive(Debug, Clone, Copy)]
pub(super) struct Series {
    pub(super) colour: RGBColor,
    pub(super) mark: Mark,
    pub(super) dash: &'static [f64],
}

/// The style of the `index`-th method.
pub(super) fn series(index: usize) -> Series {
    Series {
        colour: SERIES[index % SERIES.len()],
        mark: MARKS[index % MARKS.len()],
        dash: DASHES[index % DASHES.len()],
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_first_hundred_styles_differ() {
        let all: Vec<_> = (0..100)
            .map(series)
            .map(|s| (s.colour, s.mark, s.dash))
            .collect();
        for (place, style) in all.iter().enumerate() {
            assert!(!all[..place].contains(style), "{place}");
        }
    }
}
