//! Marginal laws of covariates.

use std::collections::HashSet;

use crate::plan::Marginal;
use crate::scenario::{Fields, number};

/// Allowed distance of probabilities or shares from a sum of one: rounding in the last of six
/// written digits.
pub(super) const SUM_TOLERANCE: f64 = 1e-6;

/// Law of one covariate.
pub(super) struct Covariate {
    /// `None` after a mistake.
    pub(super) marginal: Option<Marginal>,
    /// Levels of a categorical covariate after the first; empty for any other.
    pub(super) levels: Vec<String>,
}

#[derive(Debug, Clone, Copy)]
enum Law {
    Normal,
    Uniform,
    LogNormal,
    Gamma,
    StudentT,
    Bernoulli,
    Categorical,
    Poisson,
}

const LAWS: [(&str, Law); 8] = [
    ("normal", Law::Normal),
    ("uniform", Law::Uniform),
    ("log-normal", Law::LogNormal),
    ("gamma", Law::Gamma),
    ("student-t", Law::StudentT),
    ("bernoulli", Law::Bernoulli),
    ("categorical", Law::Categorical),
    ("poisson", Law::Poisson),
];

/// Reads the law of a covariate and its parameters.
pub(super) fn read(fields: &Fields<'_>) -> Covariate {
    let names: Vec<&str> = LAWS.iter().map(|(name, _)| *name).collect();
    fields.required("law", &format!("known laws are {}", names.join(", ")));
    let mut levels = Vec::new();
    let before = fields.sink().trouble();
    let marginal = fields.choice("law", &LAWS).and_then(|law| {
        check_keys(fields, law);
        if matches!(law, Law::Categorical) {
            let probabilities = categorical(fields, &mut levels)?;
            return Some(Marginal::Categorical { probabilities });
        }
        numeric(fields, law)
    });
    Covariate {
        marginal: marginal.filter(|_| fields.sink().trouble() == before),
        levels,
    }
}

fn check_keys(fields: &Fields<'_>, law: Law) {
    let parameters: &[&str] = match law {
        Law::Normal => &["mean", "sd"],
        Law::Uniform => &["low", "high"],
        Law::LogNormal => &["log_mean", "log_sd"],
        Law::Gamma => &["shape", "scale"],
        Law::StudentT => &["df", "location", "scale"],
        Law::Bernoulli => &["probability"],
        Law::Categorical => &["levels", "probabilities"],
        Law::Poisson => &["mean"],
    };
    let mut keys = parameters.to_vec();
    keys.extend(["name", "law", "count"]);
    let name = fields.text("law").unwrap_or_default();
    fields.only(&keys, &format!("the law \"{name}\""));
}

/// A number above zero.
pub(super) fn positive(fields: &Fields<'_>, key: &str) -> Option<f64> {
    fields.number_where(key, |value| value > 0.0, "above 0")
}

fn numeric(fields: &Fields<'_>, law: Law) -> Option<Marginal> {
    let value = |key, default| fields.number(key).unwrap_or(default);
    let above_zero = |key| positive(fields, key).unwrap_or(1.0);
    Some(match law {
        Law::Normal => Marginal::Normal {
            mean: value("mean", 0.0),
            sd: above_zero("sd"),
        },
        Law::Uniform => {
            let (low, high) = (value("low", 0.0), value("high", 1.0));
            if low >= high || !(high - low).is_finite() {
                fields.report(
                    if fields.has("high") { "high" } else { "low" },
                    format!("the range from {low} to {high} is empty or too wide"),
                    "`low` must be below `high`",
                );
            }
            Marginal::Uniform { low, high }
        }
        Law::LogNormal => Marginal::LogNormal {
            log_mean: value("log_mean", 0.0),
            log_sd: above_zero("log_sd"),
        },
        Law::Gamma => {
            fields.required("shape", "give the shape of the gamma law, above 0");
            Marginal::Gamma {
                shape: positive(fields, "shape")?,
                scale: above_zero("scale"),
            }
        }
        Law::StudentT => {
            fields.required("df", "give the degrees of freedom, above 0");
            Marginal::StudentT {
                df: positive(fields, "df")?,
                location: value("location", 0.0),
                scale: above_zero("scale"),
            }
        }
        Law::Bernoulli => {
            fields.required("probability", "give the probability of a one");
            let inside = |value: f64| value > 0.0 && value < 1.0;
            let condition = "above 0 and below 1, or the covariate is constant";
            Marginal::Bernoulli {
                probability: fields.number_where("probability", inside, condition)?,
            }
        }
        Law::Poisson => {
            fields.required("mean", "give the mean of the Poisson law, above 0");
            Marginal::Poisson {
                mean: positive(fields, "mean")?,
            }
        }
        Law::Categorical => return None,
    })
}

fn categorical(fields: &Fields<'_>, levels: &mut Vec<String>) -> Option<Vec<f64>> {
    fields.required("levels", "list the levels, the reference level first");
    fields.required("probabilities", "give one probability per level");
    let nodes = fields.list("levels")?;
    let mut seen = HashSet::new();
    for node in nodes {
        let name = node.as_text()?;
        if !seen.insert(name) {
            fields.sink().report(
                &node.place,
                format!("the level \"{name}\" is listed twice"),
                Some("levels must differ".to_owned()),
            );
        }
    }
    if nodes.len() < 2 {
        fields.report(
            "levels",
            format!("there are {} levels", nodes.len()),
            "list at least two, the reference level first",
        );
        return None;
    }
    levels.extend(
        nodes[1..]
            .iter()
            .filter_map(|node| node.as_text().map(str::to_owned)),
    );
    let probabilities = fields.list("probabilities")?;
    if probabilities.len() != nodes.len() {
        fields.report(
            "probabilities",
            format!(
                "there are {} probabilities for {} levels",
                probabilities.len(),
                nodes.len()
            ),
            "give one per level",
        );
        return None;
    }
    let mut values = Vec::new();
    for node in probabilities {
        let value = number(node)?;
        if !(value > 0.0 && value < 1.0) {
            fields.sink().report(
                &node.place,
                format!("the probability of a level is {value}"),
                Some("it must be above 0 and below 1".to_owned()),
            );
        }
        values.push(value);
    }
    normalise(&mut values, "the probabilities", "probabilities", fields)?;
    Some(values)
}

/// Checks that numbers sum to one, and makes the sum exact; anything else is reported at `key`.
pub(super) fn normalise(
    values: &mut [f64],
    what: &str,
    key: &str,
    fields: &Fields<'_>,
) -> Option<()> {
    let sum: f64 = values.iter().sum();
    if (sum - 1.0).abs() > SUM_TOLERANCE {
        fields.report(
            key,
            format!("{what} sum to {}", rounded(sum)),
            "they must sum to 1",
        );
        return None;
    }
    for value in values {
        *value /= sum;
    }
    Some(())
}

/// A number without the noise of its last binary digits.
pub(super) fn rounded(value: f64) -> f64 {
    format!("{value:.9}").parse().unwrap_or(value)
}
