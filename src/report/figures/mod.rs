//! Figures, one SVG a file.
//!
//! Every figure carries a title and a description in words for screen readers, labels its marks
//! directly, and can be told apart without colour. The bytes depend on the input alone.

mod canvas;
mod coverage;
mod errors;
mod histogram;
mod palette;
mod placement;
mod scale;
mod sweep;
mod sweep_panel;
mod sweep_points;

pub use coverage::coverage_figure;
pub use errors::{ErrorRow, error_figure};
pub use histogram::ErrorHistogram;
pub use sweep::{
    AxisScale, BreakPoint, CurvePoint, SweepCurve, SweepFigure, SweepPanel, sweep_figure,
};

/// A finished figure.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Figure {
    /// File name without `.svg`: lower-case letters, digits and hyphens.
    pub name: String,
    /// Title.
    pub title: String,
    /// What the figure shows, in words and numbers.
    pub description: String,
    /// The SVG document.
    pub svg: String,
}

/// Longest part of a file name that is made from one name of the scenario.
const SLUG_LENGTH: usize = 40;

/// Lower-case letters, digits and single hyphens made from a name, at most 40 of them.
fn slug(text: &str) -> String {
    let mut slug = String::new();
    for c in text.chars().flat_map(char::to_lowercase) {
        if slug.len() >= SLUG_LENGTH {
            break;
        }
        if c.is_ascii_alphanumeric() {
            slug.push(c);
        } else if !slug.is_empty() && !slug.ends_with('-') {
            slug.push('-');
        }
    }
    slug.trim_end_matches('-').to_owned()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn slugs_are_safe_file_names() {
        assert_eq!(
            slug("Worthwhile effect, \"strong\" drift"),
            "worthwhile-effect-strong-drift"
        );
        assert_eq!(slug("../../etc"), "etc");
        assert_eq!(slug("λ = ½"), "");
        assert!(slug(&"long ".repeat(50)).len() <= SLUG_LENGTH);
    }
}
