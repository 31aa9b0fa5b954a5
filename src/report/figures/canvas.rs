//! A page in pixels on top of the SVG backend.

use plotters::prelude::{DrawingBackend, IntoFont, SVGBackend};
use plotters::style::text_anchor::{HPos, Pos, VPos};
use plotters::style::{Color, FontStyle, RGBColor, ShapeStyle, TextStyle};

use super::palette::{INK, Mark, PAPER};

/// Width of every figure in pixels: that of a printed page.
pub(super) const PAGE_WIDTH: f64 = 900.0;

/// The backend knows whole units only; ten of them make a pixel, so that curves stay smooth.
const UNITS: f64 = 10.0;

/// The backend divides font sizes by this.
const FONT_DIVISOR: f64 = 1.24;

/// Smallest font size in pixels.
pub(super) const SMALL: f64 = 12.0;
/// Font size of labels.
pub(super) const NORMAL: f64 = 13.0;
/// Font size of the title.
pub(super) const LARGE: f64 = 16.0;

/// Where the given point lies on a text.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Anchor {
    Start,
    Middle,
    End,
}

/// Look of a text.
#[derive(Debug, Clone, Copy)]
pub(super) struct Type {
    pub(super) size: f64,
    pub(super) colour: RGBColor,
    pub(super) anchor: Anchor,
    pub(super) bold: bool,
}

impl Type {
    /// Upright text of a size, in ink, that starts at its point.
    pub(super) fn of(size: f64) -> Self {
        Self {
            size,
            colour: INK,
            anchor: Anchor::Start,
            bold: false,
        }
    }

    pub(super) fn colour(self, colour: RGBColor) -> Self {
        Self { colour, ..self }
    }

    pub(super) fn anchor(self, anchor: Anchor) -> Self {
        Self { anchor, ..self }
    }

    pub(super) fn bold(self) -> Self {
        Self { bold: true, ..self }
    }
}

/// A page that is being drawn.
pub(super) struct Canvas<'a> {
    backend: SVGBackend<'a>,
}

/// Draws a page of `height` pixels. `name` makes the identifiers of title and description unique
/// on a page that shows several figures.
pub(super) fn draw(
    name: &str,
    title: &str,
    description: &str,
    height: f64,
    paint: impl FnOnce(&mut Canvas<'_>),
) -> String {
    let mut svg = String::new();
    {
        let size = (
            whole(PAGE_WIDTH).unsigned_abs(),
            whole(height).unsigned_abs(),
        );
        let mut canvas = Canvas {
            backend: SVGBackend::with_string(&mut svg, size),
        };
        canvas.rectangle(0.0, 0.0, PAGE_WIDTH, height, PAPER);
        paint(&mut canvas);
        // A backend that draws into a string has nothing that could fail.
        let _ = canvas.backend.present();
    }
    let body = svg.split_once('>').map_or("", |(_, body)| body);
    let (title, description) = (escaped(title), escaped(description));
    format!(
        "<svg width=\"{PAGE_WIDTH}\" height=\"{height}\" viewBox=\"0 0 {} {}\" \
         xmlns=\"http://www.w3.org/2000/svg\" role=\"img\" \
         aria-labelledby=\"{name}-title {name}-description\">\n\
         <title id=\"{name}-title\">{title}</title>\n\
         <desc id=\"{name}-description\">{description}</desc>{body}",
        PAGE_WIDTH * UNITS,
        height * UNITS,
    )
}

impl Canvas<'_> {
    pub(super) fn line(&mut self, from: (f64, f64), to: (f64, f64), colour: RGBColor, width: f64) {
        let _ = self
            .backend
            .draw_line(units(from), units(to), &stroke(colour, width));
    }

    /// A polyline with a dash pattern in pixels; the empty pattern is solid.
    pub(super) fn curve(
        &mut self,
        points: &[(f64, f64)],
        colour: RGBColor,
        width: f64,
        dash: &[f64],
    ) {
        let style = stroke(colour, width);
        for part in dashed(points, dash) {
            let _ = self.backend.draw_path(part.into_iter().map(units), &style);
        }
    }

    pub(super) fn rectangle(
        &mut self,
        left: f64,
        top: f64,
        right: f64,
        bottom: f64,
        colour: RGBColor,
    ) {
        let corners = (units((left, top)), units((right, bottom)));
        let _ = self
            .backend
            .draw_rect(corners.0, corners.1, &colour.filled(), true);
    }

    /// A filled polygon of some opacity.
    pub(super) fn area(&mut self, points: &[(f64, f64)], colour: RGBColor, opacity: f64) {
        let style = colour.mix(opacity).filled();
        let _ = self
            .backend
            .fill_polygon(points.iter().copied().map(units), &style);
    }

    /// A mark of `radius` pixels.
    pub(super) fn mark(&mut self, at: (f64, f64), mark: Mark, colour: RGBColor, radius: f64) {
        let (x, y) = at;
        let corner = |dx: f64, dy: f64| (x + radius * dx, y + radius * dy);
        match mark {
            Mark::Disc => self.disc(at, colour, radius),
            Mark::Ring => {
                self.disc(at, colour, radius);
                self.disc(at, PAPER, 0.55 * radius);
            }
            Mark::Square => {
                let (left, top) = corner(-0.85, -0.85);
                let (right, bottom) = corner(0.85, 0.85);
                self.rectangle(left, top, right, bottom, colour);
            }
            Mark::Triangle => {
                let corners = [corner(0.0, -1.15), corner(1.05, 0.75), corner(-1.05, 0.75)];
                self.area(&corners, colour, 1.0);
            }
            Mark::Diamond => {
                let corners = [
                    corner(0.0, -1.2),
                    corner(1.2, 0.0),
                    corner(0.0, 1.2),
                    corner(-1.2, 0.0),
                ];
                self.area(&corners, colour, 1.0);
            }
        }
    }

    fn disc(&mut self, at: (f64, f64), colour: RGBColor, radius: f64) {
        let radius = whole(radius).unsigned_abs();
        let _ = self
            .backend
            .draw_circle(units(at), radius, &colour.filled(), true);
    }

    /// Text whose vertical middle is at the point.
    pub(super) fn text(&mut self, text: &str, at: (f64, f64), kind: Type) {
        if text.is_empty() {
            return;
        }
        let style = if kind.bold {
            FontStyle::Bold
        } else {
            FontStyle::Normal
        };
        let font = ("sans-serif", kind.size * UNITS * FONT_DIVISOR)
            .into_font()
            .style(style);
        let horizontal = match kind.anchor {
            Anchor::Start => HPos::Left,
            Anchor::Middle => HPos::Center,
            Anchor::End => HPos::Right,
        };
        let style = TextStyle::from(font)
            .color(&kind.colour)
            .pos(Pos::new(horizontal, VPos::Center));
        let _ = self.backend.draw_text(&printable(text), &style, units(at));
    }
}

fn stroke(colour: RGBColor, width: f64) -> ShapeStyle {
    colour.stroke_width(whole(width).unsigned_abs())
}

fn units((x, y): (f64, f64)) -> (i32, i32) {
    (whole(x), whole(y))
}

/// Pixels as whole backend units; what lies absurdly far outside is pulled to the edge.
#[allow(clippy::cast_possible_truncation)] // clamped to ±1e6
fn whole(pixels: f64) -> i32 {
    (UNITS * pixels).round().clamp(-1e6, 1e6) as i32
}

/// Cuts a polyline into the strokes of a dash pattern.
fn dashed(points: &[(f64, f64)], dash: &[f64]) -> Vec<Vec<(f64, f64)>> {
    if dash.is_empty() || points.len() < 2 {
        return vec![points.to_vec()];
    }
    let mut parts = Vec::new();
    let mut part = vec![points[0]];
    let (mut step, mut left) = (0, dash[0]);
    for pair in points.windows(2) {
        let (mut from, to) = (pair[0], pair[1]);
        let mut length = (to.0 - from.0).hypot(to.1 - from.1);
        while length > left {
            let share = left / length;
            from = (
                from.0 + share * (to.0 - from.0),
                from.1 + share * (to.1 - from.1),
            );
            length -= left;
            if step % 2 == 0 {
                part.push(from);
                parts.push(std::mem::take(&mut part));
            } else {
                part = vec![from];
            }
            step += 1;
            left = dash[step % dash.len()];
        }
        left -= length;
        if step % 2 == 0 {
            part.push(to);
        }
    }
    if part.len() > 1 {
        parts.push(part);
    }
    parts
}

/// Control characters have no place in XML, escaped or not.
fn printable(text: &str) -> String {
    text.chars()
        .map(|c| {
            if c.is_control() || matches!(c, '\u{FFFE}' | '\u{FFFF}') {
                ' '
            } else {
                c
            }
        })
        .collect()
}

fn escaped(text: &str) -> String {
    printable(text)
        .replace('&', "&amp;")
        .replace('<', "&lt;")
        .replace('>', "&gt;")
        .replace('"', "&quot;")
}

/// Checks that a text is one well-formed SVG element as far as this module can write it.
#[cfg(test)]
pub(super) fn assert_well_formed(svg: &str) {
    assert!(svg.starts_with("<svg ") && svg.trim_end().ends_with("</svg>"));
    let mut open: Vec<&str> = Vec::new();
    for part in svg.split('<').skip(1) {
        let (tag, text) = part.split_once('>').expect("every tag is closed");
        assert!(!text.contains('>'), "{text}");
        for entity in text.split('&').skip(1).chain(tag.split('&').skip(1)) {
            let known = ["amp;", "lt;", "gt;", "quot;", "apos;"];
            assert!(
                known.iter().any(|name| entity.starts_with(name)),
                "{entity}"
            );
        }
        assert_eq!(tag.matches('"').count() % 2, 0, "{tag}");
        if let Some(name) = tag.strip_prefix('/') {
            assert_eq!(open.pop(), Some(name));
        } else if !tag.ends_with('/') {
            open.push(tag.split(' ').next().unwrap());
        }
    }
    assert!(open.is_empty(), "{open:?}");
    for wanted in ["role=\"img\"", "<title ", "<desc "] {
        assert_eq!(svg.matches(wanted).count(), 1, "{wanted}");
    }
    for part in svg.split("font-size=\"").skip(1) {
        let size: f64 = part.split('"').next().unwrap().parse().unwrap();
        assert!(size >= 12.0 * UNITS - 1e-6, "font of {size} units");
    }
}

/// Checks that no mark or text lies outside the page, texts judged by their estimated width.
#[cfg(test)]
pub(super) fn assert_on_page(svg: &str) {
    let attribute = |part: &str, name: &str| -> f64 {
        let (_, rest) = part.split_once(&format!("{name}=\"")).unwrap();
        rest.split('"').next().unwrap().parse().unwrap()
    };
    let height = attribute(svg, " height");
    for part in svg.split("<text ").skip(1) {
        let text = part
            .split_once('>')
            .unwrap()
            .1
            .split('<')
            .next()
            .unwrap()
            .trim();
        let text = text
            .replace("&lt;", "<")
            .replace("&gt;", ">")
            .replace("&quot;", "\"");
        let size = attribute(part, "font-size") / UNITS;
        let width = super::placement::text_width(&text, size);
        let x = attribute(part, "x") / UNITS;
        let (left, right) = if part.contains("\"start\"") {
            (x, x + width)
        } else if part.contains("\"end\"") {
            (x - width, x)
        } else {
            (x - width / 2.0, x + width / 2.0)
        };
        assert!(
            left >= 0.0 && right <= PAGE_WIDTH,
            "{text}: {left} to {right}"
        );
        let y = attribute(part, "y") / UNITS;
        assert!(
            y >= size / 2.0 && y <= height - size / 2.0,
            "{text}: {y} of {height}"
        );
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_cannot_break_the_document() {
        let hostile = "</svg><script>alert(1)</script> & \"x\" 'y' \u{1}";
        let svg = draw("figure", hostile, hostile, 100.0, |canvas| {
            canvas.text(hostile, (10.0, 50.0), Type::of(NORMAL));
        });
        assert_well_formed(&svg);
        assert!(!svg.contains("<script"));
        assert!(!svg.contains('\u{1}'));
    }

    #[test]
    fn dashes_keep_their_lengths_around_corners() {
        let parts = dashed(&[(0.0, 0.0), (5.0, 0.0), (5.0, 20.0)], &[7.0, 3.0]);
        // Length 25: strokes 0-7, 10-17, 20-25; the first turns the corner at 5.
        assert_eq!(
            parts,
            [
                vec![(0.0, 0.0), (5.0, 0.0), (5.0, 2.0)],
                vec![(5.0, 5.0), (5.0, 12.0)],
                vec![(5.0, 15.0), (5.0, 20.0)]
            ]
        );
    }
}
