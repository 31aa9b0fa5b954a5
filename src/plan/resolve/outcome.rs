//! Parameters of the outcome, as `[outcome]` and each `[[truth]]` give them.

use super::coefficients::{self, Coefficient};
use super::marginals::positive;
use super::names::Names;
use crate::plan::{Drift, Noise, NoiseLaw};
use crate::scenario::Fields;

/// Largest delay: beyond the number of batches a delay makes no difference.
const LONGEST_DELAY: usize = 1_000_000;

/// Noise of a scenario that says nothing about it.
pub(super) const DEFAULT_NOISE: Noise = Noise {
    law: NoiseLaw::Normal,
    sd: 1.0,
    log_sd_slope: None,
};

/// What a section says about the outcome; what it leaves out is `None` or absent.
#[derive(Debug, Clone, Default)]
pub(super) struct Parameters<'s> {
    pub(super) intercept: Option<f64>,
    pub(super) coefficients: Vec<Coefficient<'s>>,
    pub(super) noise: Option<Noise>,
    pub(super) drift: Option<Drift>,
    pub(super) delay: Option<usize>,
}

impl<'s> Parameters<'s> {
    /// Reads the parameters of one section.
    pub(super) fn read(fields: &Fields<'s>, names: &Names, batches: Option<usize>) -> Self {
        let coefficients = fields
            .table("coefficients")
            .map(|table| coefficients::read(&table, names))
            .unwrap_or_default();
        let within = coefficients.iter().find_map(Coefficient::intercept);
        if within.is_some() && fields.has("intercept") {
            fields.report(
                "intercept",
                format!("the intercept of {} is given twice", fields.title()),
                "give it as `intercept` or among the coefficients, not both",
            );
        }
        Self {
            intercept: fields.number("intercept").or(within),
            coefficients,
            noise: fields.table("noise").and_then(|table| noise(&table, names)),
            drift: fields
                .table("drift")
                .and_then(|table| drift(&table, batches)),
            delay: fields.count("delay", 0, LONGEST_DELAY),
        }
    }

    /// These parameters, with those that `other` gives in their place; coefficients are replaced
    /// name by name.
    pub(super) fn overlaid(&self, other: Self) -> Self {
        let mut coefficients: Vec<Coefficient<'s>> = self
            .coefficients
            .iter()
            .filter(|own| {
                other
                    .coefficients
                    .iter()
                    .all(|theirs| theirs.name != own.name)
            })
            .cloned()
            .collect();
        coefficients.extend(other.coefficients);
        Self {
            intercept: other.intercept.or(self.intercept),
            coefficients,
            noise: other.noise.or_else(|| self.noise.clone()),
            drift: other.drift.or(self.drift),
            delay: other.delay.or(self.delay),
        }
    }
}

#[derive(Debug, Clone, Copy)]
enum Law {
    Normal,
    StudentT,
    Laplace,
    LogNormal,
}

fn noise(fields: &Fields<'_>, names: &Names) -> Option<Noise> {
    let laws = [
        ("normal", Law::Normal),
        ("student-t", Law::StudentT),
        ("laplace", Law::Laplace),
        ("log-normal", Law::LogNormal),
    ];
    let law = if fields.has("law") {
        fields.choice("law", &laws)?
    } else {
        Law::Normal
    };
    let mut keys = vec!["law", "sd", "log_sd_slope"];
    match law {
        Law::StudentT => keys.push("df"),
        Law::LogNormal => keys.push("log_sd"),
        Law::Normal | Law::Laplace => {}
    }
    let word = fields.text("law").unwrap_or("normal");
    fields.only(&keys, &format!("noise of the law \"{word}\""));
    let sd = positive(fields, "sd").unwrap_or(1.0);
    let log_sd_slope = fields.table("log_sd_slope").and_then(|fields| {
        fields.required("covariate", "name the covariate that the sd grows with");
        fields.required("slope", "give the slope of the logarithm of the sd");
        let name = fields.text("covariate")?;
        let column = names.column(name, fields.place("covariate"), fields.sink())?;
        Some((column, fields.number("slope")?))
    });
    let law = match law {
        Law::Normal => NoiseLaw::Normal,
        Law::Laplace => NoiseLaw::Laplace,
        Law::StudentT => {
            fields.required("df", "give the degrees of freedom, above 2");
            let condition = "above 2, or the noise has no variance";
            NoiseLaw::StudentT {
                df: fields.number_where("df", |df| df > 2.0, condition)?,
            }
        }
        Law::LogNormal => {
            fields.required("log_sd", "give the sd of the logarithm, above 0");
            NoiseLaw::CentredLogNormal {
                log_sd: positive(fields, "log_sd")?,
            }
        }
    };
    Some(Noise {
        law,
        sd,
        log_sd_slope,
    })
}

#[derive(Debug, Clone, Copy)]
enum DriftKind {
    None,
    Linear,
    Step,
}

fn drift(fields: &Fields<'_>, batches: Option<usize>) -> Option<Drift> {
    fields.required("kind", "say kind = \"linear\", \"step\" or \"none\"");
    let kinds = [
        ("linear", DriftKind::Linear),
        ("step", DriftKind::Step),
        ("none", DriftKind::None),
    ];
    match fields.choice("kind", &kinds)? {
        DriftKind::None => {
            fields.only(&["kind"], "no drift");
            Some(Drift::None)
        }
        DriftKind::Linear => {
            fields.only(&["kind", "total"], "a linear drift");
            fields.required("total", "give the change from the first batch to the last");
            Some(Drift::Linear {
                total: fields.number("total")?,
            })
        }
        DriftKind::Step => {
            fields.only(&["kind", "from", "size"], "a step");
            fields.required("from", "give the first batch after the step, at least 2");
            fields.required("size", "give the change of the mean");
            let size = fields.number("size");
            let from = fields.count("from", 2, usize::MAX)?;
            if let Some(batches) = batches
                && from > batches
            {
                fields.report(
                    "from",
                    format!("the step comes at batch {from}, but there are {batches}"),
                    "it must come at one of the batches",
                );
            }
            Some(Drift::Step {
                from: from - 1,
                size: size?,
            })
        }
    }
}
