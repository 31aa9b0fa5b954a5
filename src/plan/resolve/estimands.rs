//! `[[estimand]]`: contrasts of the analysis coefficients.

use std::collections::HashSet;

use super::names::Names;
use crate::plan::{Estimand, Model, Term, Truth};
use crate::scenario::{Fields, number};

/// Reads every estimand; `None` for one with a mistake. Contrasts are made for every truth.
pub(super) fn read(
    root: &Fields<'_>,
    names: &Names,
    analysis: &Model,
    truths: &[Truth],
    analysis_sound: bool,
) -> Vec<Option<Estimand>> {
    let nodes = root.list("estimand").unwrap_or_default();
    if nodes.is_empty() && (!root.has("estimand") || root.list("estimand").is_some()) {
        root.sink().report_missing(
            root.place("estimand"),
            "estimand",
            "the scenario has no estimand",
            Some("add [[estimand]] with a name and a contrast".to_owned()),
        );
    }
    let mut seen = HashSet::new();
    let mut estimands = Vec::new();
    for (index, node) in nodes.iter().enumerate() {
        let title = match node.entry("name").and_then(|entry| entry.node.as_text()) {
            Some(name) => format!("estimand \"{name}\""),
            None => format!("estimand {}", index + 1),
        };
        let Some(fields) = Fields::of(node, title, root.sink()) else {
            estimands.push(None);
            continue;
        };
        fields.required("name", "give the estimand a name");
        let name = fields.text("name").unwrap_or_default();
        if !name.is_empty() && !seen.insert(name) {
            fields.report(
                "name",
                format!("two estimands are named \"{name}\""),
                "names of estimands must differ",
            );
        }
        let contrasts = contrasts(&fields, names, analysis, truths, analysis_sound);
        estimands.push(contrasts.map(|contrasts| Estimand {
            name: name.to_owned(),
            contrasts,
            null: fields.number("null").unwrap_or(0.0),
        }));
    }
    estimands
}

fn contrasts(
    fields: &Fields<'_>,
    names: &Names,
    analysis: &Model,
    truths: &[Truth],
    analysis_sound: bool,
) -> Option<Vec<Vec<f64>>> {
    match (fields.has("contrast"), fields.has("along")) {
        (true, false) => {
            let contrast = stated(fields, names, analysis, analysis_sound)?;
            Some(vec![contrast; truths.len()])
        }
        (false, true) => {
            fields.choice("along", &[("coefficients", ())])?;
            along_coefficients(fields, analysis, truths, analysis_sound)
        }
        (given, _) => {
            let found = if given {
                "both a contrast and `along`"
            } else {
                "neither a contrast nor `along`"
            };
            fields.sink().report_missing(
                fields.own_place(),
                "contrast",
                format!("{} has {found}", fields.title()),
                Some(
                    "give contrast = { NAME = 1.0 }, or along = \"coefficients\" for the direction of each truth's own coefficients"
                        .to_owned(),
                ),
            );
            None
        }
    }
}

fn stated(
    fields: &Fields<'_>,
    names: &Names,
    analysis: &Model,
    analysis_sound: bool,
) -> Option<Vec<f64>> {
    let sink = fields.sink();
    let table = fields.table("contrast")?;
    let before = sink.trouble();
    let mut contrast = vec![0.0; analysis.len()];
    for entry in table.entries() {
        let value = number(&entry.node);
        if value.is_none() {
            sink.taint();
        }
        match analysis.names.iter().position(|name| *name == entry.key) {
            Some(position) => contrast[position] = value.unwrap_or(0.0),
            // What is in the model is unknown after a mistake there.
            None if !analysis_sound && names.terms_exist(&entry.key) => sink.taint(),
            None => unknown(&table, names, analysis, &entry.key, &entry.key_place),
        }
    }
    if sink.trouble() != before {
        return None;
    }
    if contrast.iter().all(|&weight| weight == 0.0) {
        fields.report(
            "contrast",
            "the contrast gives no coefficient any weight",
            "give at least one coefficient of the analysis model a weight other than 0",
        );
        return None;
    }
    Some(contrast)
}

fn unknown(
    table: &Fields<'_>,
    names: &Names,
    analysis: &Model,
    name: &str,
    place: &crate::scenario::Place,
) {
    let sink = table.sink();
    if let Some(columns) = names.columns_of(name)
        && columns.len() != 1
    {
        let member = columns
            .clone()
            .next()
            .map_or("", |column| names.columns()[column].as_str());
        sink.report(
            place,
            format!("\"{name}\" stands for {} covariates", columns.len()),
            Some(format!(
                "a contrast weighs single coefficients, such as \"{member}\""
            )),
        );
        return;
    }
    if names.terms_exist(name) {
        sink.report(
            place,
            format!("\"{name}\" is not in the analysis model"),
            Some("add it to the regressors of [analysis]".to_owned()),
        );
        return;
    }
    if sink
        .nearest(name, analysis.names.iter().map(String::as_str))
        .is_some()
        || !names.is_complete()
    {
        names.unknown("coefficient", name, place, sink);
        return;
    }
    let shown: Vec<&str> = analysis.names.iter().take(12).map(String::as_str).collect();
    let more = if analysis.len() > shown.len() {
        ", ..."
    } else {
        ""
    };
    sink.report_missing(
        place,
        name,
        format!("unknown coefficient \"{name}\""),
        Some(format!("the analysis model has {}{more}", shown.join(", "))),
    );
}

/// The unit vector along each truth's own covariate coefficients; along the first covariate where
/// they are all zero, so that a null truth has an estimand too.
fn along_coefficients(
    fields: &Fields<'_>,
    analysis: &Model,
    truths: &[Truth],
    analysis_sound: bool,
) -> Option<Vec<Vec<f64>>> {
    let covariates: Vec<(usize, usize)> = analysis
        .terms
        .iter()
        .enumerate()
        .filter_map(|(position, term)| match term {
            Term::Covariate(column) => Some((position, *column)),
            _ => None,
        })
        .collect();
    let Some(&(first, _)) = covariates.first() else {
        if analysis_sound {
            fields.report(
                "along",
                "the analysis model has no covariate to define a direction",
                "add covariates to the regressors of [analysis], or give a contrast",
            );
        } else {
            fields.sink().taint();
        }
        return None;
    };
    let contrasts = truths.iter().map(|truth| {
        let mut contrast = vec![0.0; analysis.len()];
        // Scaled by the largest slope first, so that no square overflows or vanishes.
        let largest = covariates
            .iter()
            .map(|&(_, column)| truth.slopes[column].abs())
            .fold(0.0, f64::max);
        if largest == 0.0 {
            contrast[first] = 1.0;
            return contrast;
        }
        for &(position, column) in &covariates {
            contrast[position] = truth.slopes[column] / largest;
        }
        let norm = contrast
            .iter()
            .map(|weight| weight * weight)
            .sum::<f64>()
            .sqrt();
        for weight in &mut contrast {
            *weight /= norm;
        }
        contrast
    });
    Some(contrasts.collect())
}
