//! `[analysis]`, and the regressors of working models.

use std::collections::HashMap;

use super::names::Names;
use crate::plan::{Model, Term};
use crate::scenario::Fields;

/// Confidence level where the scenario gives none.
const DEFAULT_LEVEL: f64 = 0.95;

/// Analysis model and confidence level.
pub(super) fn analysis(root: &Fields<'_>, names: &Names) -> (Model, f64) {
    let fields = root.section("analysis");
    let model = fields
        .as_ref()
        .filter(|fields| fields.has("regressors"))
        .map_or_else(|| default_model(names), |fields| read(fields, names));
    let inside = |level: f64| level > 0.0 && level < 1.0;
    let level = fields
        .and_then(|fields| fields.number_where("level", inside, "above 0 and below 1"))
        .unwrap_or(DEFAULT_LEVEL);
    (model, level)
}

/// Intercept, arms and covariates.
fn default_model(names: &Names) -> Model {
    let mut terms = vec![Term::Intercept];
    terms.extend((1..names.arms().len()).map(Term::Arm));
    terms.extend((0..names.columns().len()).map(Term::Covariate));
    model(terms, names)
}

fn model(terms: Vec<Term>, names: &Names) -> Model {
    let term_names = terms.iter().map(|&term| names.name_of(term)).collect();
    Model {
        terms,
        names: term_names,
    }
}

/// Reads `regressors`; what cannot be read is reported and left out.
pub(super) fn read(fields: &Fields<'_>, names: &Names) -> Model {
    let sink = fields.sink();
    let nodes = fields.list("regressors").unwrap_or_default();
    let mut terms = Vec::new();
    let mut origins: HashMap<Term, &str> = HashMap::new();
    for node in nodes {
        let Some(word) = node.as_text() else {
            sink.taint();
            continue;
        };
        if word.split(':').next() == Some("arms") && !names.has_arms() {
            sink.report_missing(
                &node.place,
                "arms",
                format!("\"{word}\" in a study without arms"),
                Some("take it out, or add [arms]".to_owned()),
            );
            continue;
        }
        let expanded = names.terms(word, &node.place, sink).unwrap_or_default();
        let mut repeated = None;
        for term in expanded {
            if let Some(origin) = origins.get(&term) {
                repeated.get_or_insert((names.name_of(term), *origin));
            } else {
                origins.insert(term, word);
                terms.push(term);
            }
        }
        if let Some((name, origin)) = repeated {
            let message = if origin == word {
                format!("\"{word}\" is listed twice")
            } else {
                format!("\"{name}\" is in the model already, through \"{origin}\"")
            };
            sink.report(
                &node.place,
                message,
                Some("every regressor may be listed once".to_owned()),
            );
        }
    }
    if nodes.is_empty() && fields.list("regressors").is_some() {
        fields.report(
            "regressors",
            "the model has no regressor",
            "list at least one, such as \"intercept\"",
        );
    }
    model(terms, names)
}
