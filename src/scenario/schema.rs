//! Which keys a scenario may hold, and what kind of value each takes.
//!
//! The description is the ground for three things: unknown keys are found and the nearest known
//! one is offered, values of the wrong kind are found, and a path of a sweep can name a key that
//! the file leaves at its default.

/// Kind of value.
#[derive(Debug)]
pub(crate) enum Shape {
    /// Text, possibly of several lines.
    Text,
    /// A name: one line of text without blanks at its ends.
    Name,
    /// A finite number.
    Number,
    /// A number or positive infinity.
    NumberOrInfinity,
    /// A whole number from 0 to [`LARGEST_COUNT`].
    Count,
    /// A whole number from 0 to the largest 64-bit signed integer.
    Seed,
    /// Text, number, or anything else that some other key may take.
    Any,
    /// A list whose members have one shape.
    List(&'static Shape),
    /// A table with keys of the author's choice.
    Map(&'static Shape),
    /// A table with known keys.
    Table(&'static [Key]),
    /// One of several shapes, told apart by the kind of value.
    Either(&'static [Shape]),
}

/// A known key.
#[derive(Debug)]
pub(crate) struct Key {
    pub(crate) name: &'static str,
    pub(crate) shape: Shape,
}

/// Largest size, count or number of trials that is read.
pub(crate) const LARGEST_COUNT: i64 = 1_000_000_000;

const fn key(name: &'static str, shape: Shape) -> Key {
    Key { name, shape }
}

/// The whole file.
pub(crate) static SCENARIO: Shape = Shape::Table(&[
    key("format", Shape::Count),
    key(
        "study",
        Shape::Table(&[key("title", Shape::Name), key("aim", Shape::Text)]),
    ),
    key(
        "population",
        Shape::Table(&[
            key("covariates", Shape::List(&COVARIATE)),
            key(
                "correlation",
                Shape::Table(&[
                    key("kind", Shape::Name),
                    key("rho", Shape::Number),
                    key("values", Shape::List(&Shape::List(&Shape::Number))),
                ]),
            ),
            key(
                "roster",
                Shape::Table(&[
                    key("file", Shape::Name),
                    key("id", Shape::Name),
                    key("covariates", Shape::List(&Shape::Name)),
                    key("outcome", Shape::Name),
                ]),
            ),
        ]),
    ),
    key(
        "arms",
        Shape::Table(&[key("names", Shape::List(&Shape::Name))]),
    ),
    key(
        "outcome",
        Shape::Table(&[
            key("family", Shape::Name),
            key("intercept", Shape::Number),
            key("coefficients", COEFFICIENTS),
            key("noise", NOISE),
            key("drift", DRIFT),
            key("delay", Shape::Count),
        ]),
    ),
    key("truth", Shape::List(&TRUTH)),
    key(
        "analysis",
        Shape::Table(&[
            key("regressors", Shape::List(&Shape::Name)),
            key("level", Shape::Number),
        ]),
    ),
    key("batch", Shape::List(&BATCH)),
    key("estimand", Shape::List(&ESTIMAND)),
    key("method", Shape::List(&METHOD)),
    key(
        "verdict",
        Shape::Table(&[
            key("tolerance", Shape::Number),
            key("confidence", Shape::Number),
            key("reference", Shape::Name),
        ]),
    ),
    key("require", Shape::List(&REQUIRE)),
    key(
        "precision",
        Shape::Table(&[
            key("trials", Shape::Count),
            key("seed", Shape::Seed),
            key("pilot_trials", Shape::Count),
        ]),
    ),
    key(
        "sweep",
        Shape::Table(&[
            key("axes", Shape::List(&AXIS)),
            key(
                "break_point",
                Shape::Table(&[
                    key("method", Shape::Name),
                    key("estimand", Shape::Name),
                    key("truth", Shape::Name),
                ]),
            ),
        ]),
    ),
]);

static COVARIATE: Shape = Shape::Table(&[
    key("name", Shape::Name),
    key("law", Shape::Name),
    key("count", Shape::Count),
    key("mean", Shape::Number),
    key("sd", Shape::Number),
    key("low", Shape::Number),
    key("high", Shape::Number),
    key("log_mean", Shape::Number),
    key("log_sd", Shape::Number),
    key("shape", Shape::Number),
    key("scale", Shape::Number),
    key("df", Shape::Number),
    key("location", Shape::Number),
    key("probability", Shape::Number),
    key("levels", Shape::List(&Shape::Name)),
    key("probabilities", Shape::List(&Shape::Number)),
]);

const COEFFICIENTS: Shape = Shape::Map(&Shape::Either(&[
    Shape::Number,
    Shape::Table(&[
        key("value", Shape::Number),
        key("nonzero", Shape::Count),
        key("first", Shape::Number),
        key("ratio", Shape::Number),
        key("norm", Shape::Number),
        key("seed", Shape::Seed),
    ]),
]));

const NOISE: Shape = Shape::Table(&[
    key("law", Shape::Name),
    key("sd", Shape::Number),
    key("df", Shape::Number),
    key("log_sd", Shape::Number),
    key(
        "log_sd_slope",
        Shape::Table(&[key("covariate", Shape::Name), key("slope", Shape::Number)]),
    ),
]);

const DRIFT: Shape = Shape::Table(&[
    key("kind", Shape::Name),
    key("total", Shape::Number),
    key("from", Shape::Count),
    key("size", Shape::Number),
]);

static TRUTH: Shape = Shape::Table(&[
    key("name", Shape::Name),
    key("reason", Shape::Text),
    key("seed", Shape::Seed),
    key("intercept", Shape::Number),
    key("coefficients", COEFFICIENTS),
    key("noise", NOISE),
    key("drift", DRIFT),
    key("delay", Shape::Count),
]);

const SELECT: Shape = Shape::Table(&[
    key("share", Shape::Number),
    key("rule", Shape::Name),
    key("fraction", Shape::Number),
    key("candidates", Shape::Count),
    key("score", Shape::Name),
    key("arm", Shape::Name),
    key("covariate", Shape::Name),
    key("fit", Shape::Name),
    key("penalty", Shape::Number),
    key("regressors", Shape::List(&Shape::Name)),
    key("threshold", Shape::Number),
    key("strength", Shape::Number),
]);

static BATCH: Shape = Shape::Table(&[
    key("size", Shape::Count),
    key("repeat", Shape::Count),
    key("select", Shape::Either(&[SELECT, Shape::List(&SELECT)])),
    key(
        "allocate",
        Shape::Table(&[
            key("rule", Shape::Name),
            key("shares", Shape::Map(&Shape::Number)),
            key("epsilon", Shape::Number),
            key("variance", Shape::Name),
            key("known_sd", Shape::Number),
            key("prior_mean", Shape::Number),
            key("prior_sd", Shape::NumberOrInfinity),
            key("covariates", Shape::List(&Shape::Name)),
            key("floor", Shape::Number),
            key("draw", Shape::Name),
        ]),
    ),
]);

static ESTIMAND: Shape = Shape::Table(&[
    key("name", Shape::Name),
    key("contrast", Shape::Map(&Shape::Number)),
    key("along", Shape::Name),
    key("null", Shape::Number),
]);

static METHOD: Shape = Shape::Table(&[
    key("kind", Shape::Name),
    key("label", Shape::Name),
    key("variance", Shape::Name),
    key("penalty", Shape::Either(&[Shape::Number, Shape::Name])),
    key("steps", Shape::Name),
    key("error", Shape::Name),
    key("bound", Shape::Number),
    key(
        "weights",
        Shape::Either(&[Shape::Name, Shape::List(&Shape::Number)]),
    ),
]);

static REQUIRE: Shape = Shape::Table(&[
    key("measure", Shape::Name),
    key("method", Shape::Name),
    key("estimand", Shape::Name),
    key("truth", Shape::Name),
    key("at_least", Shape::Number),
    key("at_most", Shape::Number),
]);

static AXIS: Shape = Shape::Table(&[
    key("path", Shape::Name),
    key("values", Shape::List(&Shape::Any)),
    key("from", Shape::Number),
    key("to", Shape::Number),
    key("step", Shape::Number),
    key("points", Shape::Count),
    key("spacing", Shape::Name),
    key("share_of_units", Shape::List(&Shape::Number)),
]);

/// The keys of a table shape by name.
pub(crate) fn find(keys: &'static [Key], name: &str) -> Option<&'static Key> {
    keys.iter().find(|key| key.name == name)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn names(shape: &Shape, found: &mut Vec<&'static str>) {
        match shape {
            Shape::List(shape) | Shape::Map(shape) => names(shape, found),
            Shape::Either(shapes) => shapes.iter().for_each(|shape| names(shape, found)),
            Shape::Table(keys) => {
                for key in *keys {
                    found.push(key.name);
                    names(&key.shape, found);
                }
            }
            _ => {}
        }
    }

    #[test]
    fn every_key_is_documented() {
        let page = include_str!("../../docs/scenario.md");
        let mut keys = Vec::new();
        names(&SCENARIO, &mut keys);
        assert!(keys.len() > 80);
        for key in keys {
            let forms = [format!("`{key}`"), format!("[{key}]"), format!("{key} =")];
            assert!(forms.iter().any(|form| page.contains(form)), "{key}");
        }
    }
}
