//! `[[method]]`: what is scored.

use std::collections::HashMap;

use super::marginals::positive;
use crate::plan::{
    BatchWeights, DebiasingError, DebiasingPenalty, DebiasingSteps, Method, MethodKind,
    VarianceForm,
};
use crate::scenario::{Content, Fields, Place, Sink, number};

/// Ridge penalty where the scenario gives none.
const DEFAULT_PENALTY: f64 = 1.0;

/// A method with the place of its kind.
#[derive(Debug, Clone)]
pub(super) struct PlacedMethod {
    pub(super) method: Method,
    /// Kind as the scenario spells it.
    pub(super) kind: String,
    pub(super) place: Place,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Kind {
    LeastSquares,
    Ridge,
    FirstBatch,
    LastBatch,
    BatchCombined,
    InverseVariance,
    WDecorrelation,
    AnticipatedDecorrelation,
    PredictablePivot,
    SelfNormalised,
}

const KINDS: [(&str, Kind); 10] = [
    ("least-squares", Kind::LeastSquares),
    ("ridge", Kind::Ridge),
    ("first-batch", Kind::FirstBatch),
    ("last-batch", Kind::LastBatch),
    ("batch-combined", Kind::BatchCombined),
    ("inverse-variance", Kind::InverseVariance),
    ("w-decorrelation", Kind::WDecorrelation),
    ("anticipated-decorrelation", Kind::AnticipatedDecorrelation),
    ("predictable-pivot", Kind::PredictablePivot),
    ("self-normalised", Kind::SelfNormalised),
];

const VARIANCES: [(&str, VarianceForm); 5] = [
    ("model", VarianceForm::Model),
    ("HC0", VarianceForm::Hc0),
    ("HC1", VarianceForm::Hc1),
    ("HC2", VarianceForm::Hc2),
    ("HC3", VarianceForm::Hc3),
];

const STEPS: [(&str, DebiasingSteps); 2] = [
    ("units", DebiasingSteps::Units),
    ("batches", DebiasingSteps::Batches),
];

const ERRORS: [(&str, DebiasingError); 2] = [
    ("weights", DebiasingError::Weights),
    ("remainder-aware", DebiasingError::RemainderAware),
];

/// Reads every method; `batches` is the number of batches, if it is known.
pub(super) fn read(root: &Fields<'_>, batches: Option<usize>) -> Vec<PlacedMethod> {
    let nodes = root.list("method").unwrap_or_default();
    if nodes.is_empty() && (!root.has("method") || root.list("method").is_some()) {
        root.sink().report_missing(
            root.place("method"),
            "method",
            "the scenario has no method",
            Some("add [[method]] with kind = \"least-squares\", say".to_owned()),
        );
    }
    let mut methods = Vec::new();
    let mut labels: HashMap<String, usize> = HashMap::new();
    for (index, node) in nodes.iter().enumerate() {
        let title = format!("method {}", index + 1);
        let Some(fields) = Fields::of(node, title, root.sink()) else {
            continue;
        };
        let names: Vec<&str> = KINDS.iter().map(|(name, _)| *name).collect();
        fields.required("kind", &format!("known kinds are {}", names.join(", ")));
        // A method with a mistake keeps its label, so that what refers to it stands.
        let kind = fields.choice("kind", &KINDS);
        let options = kind.map(|kind| options(&fields, kind, batches));
        let derived = options.as_ref().map(label);
        let Some(label) = fields.text("label").map(str::to_owned).or(derived) else {
            continue;
        };
        if let Some(earlier) = labels.insert(label.clone(), index) {
            fields.report(
                if fields.has("label") { "label" } else { "kind" },
                format!(
                    "methods {} and {} have the same label \"{label}\"",
                    earlier + 1,
                    index + 1
                ),
                "give one of them another `label`, or take it out",
            );
        }
        let Some(kind) = options else { continue };
        methods.push(PlacedMethod {
            method: Method { label, kind },
            kind: fields.text("kind").unwrap_or_default().to_owned(),
            place: fields.place("kind").clone(),
        });
    }
    methods
}

fn options(fields: &Fields<'_>, kind: Kind, batches: Option<usize>) -> MethodKind {
    let mut keys = vec!["kind", "label"];
    match kind {
        Kind::LeastSquares => keys.push("variance"),
        Kind::Ridge => keys.push("penalty"),
        Kind::WDecorrelation => keys.extend(["penalty", "steps", "error"]),
        Kind::SelfNormalised => keys.extend(["penalty", "bound"]),
        Kind::BatchCombined => keys.push("weights"),
        Kind::FirstBatch
        | Kind::LastBatch
        | Kind::InverseVariance
        | Kind::AnticipatedDecorrelation
        | Kind::PredictablePivot => {}
    }
    let word = fields.text("kind").unwrap_or_default();
    fields.only(&keys, &format!("the method \"{word}\""));
    match kind {
        Kind::LeastSquares => MethodKind::LeastSquares {
            variance: fields
                .choice("variance", &VARIANCES)
                .unwrap_or(VarianceForm::Model),
        },
        Kind::Ridge => MethodKind::Ridge {
            penalty: number_penalty(fields),
        },
        Kind::FirstBatch => MethodKind::FirstBatch,
        Kind::LastBatch => MethodKind::LastBatch,
        Kind::BatchCombined => MethodKind::BatchCombined {
            weights: weights(fields, batches).unwrap_or(BatchWeights::Size),
        },
        Kind::InverseVariance => MethodKind::InverseVariance,
        Kind::WDecorrelation => MethodKind::WDecorrelation {
            penalty: debiasing_penalty(fields),
            steps: fields
                .choice("steps", &STEPS)
                .unwrap_or(DebiasingSteps::Units),
            error: fields
                .choice("error", &ERRORS)
                .unwrap_or(DebiasingError::Weights),
        },
        Kind::AnticipatedDecorrelation => MethodKind::AnticipatedDecorrelation,
        Kind::PredictablePivot => MethodKind::PredictablePivot,
        Kind::SelfNormalised => {
            fields.required("bound", "state a bound on the norm of the coefficients");
            MethodKind::SelfNormalised {
                penalty: number_penalty(fields),
                bound: positive(fields, "bound").unwrap_or(1.0),
            }
        }
    }
}

/// A penalty that is a number above zero.
fn number_penalty(fields: &Fields<'_>) -> f64 {
    if fields.text("penalty").is_some() {
        fields.report(
            "penalty",
            "the penalty is a word",
            "it must be a number above 0",
        );
    }
    positive(fields, "penalty").unwrap_or(DEFAULT_PENALTY)
}

fn debiasing_penalty(fields: &Fields<'_>) -> DebiasingPenalty {
    if fields.text("penalty").is_some() {
        let words = [("replayed", DebiasingPenalty::Replayed)];
        return fields
            .choice("penalty", &words)
            .unwrap_or(DebiasingPenalty::Replayed);
    }
    positive(fields, "penalty").map_or(DebiasingPenalty::Replayed, DebiasingPenalty::Fixed)
}

fn weights(fields: &Fields<'_>, batches: Option<usize>) -> Option<BatchWeights> {
    let node = fields.node("weights")?;
    let Content::List(nodes) = &node.content else {
        return match fields.choice("weights", &[("size", 0), ("equal", 1), ("planned", 2)])? {
            0 => Some(BatchWeights::Size),
            1 => Some(BatchWeights::Equal),
            _ => Some(BatchWeights::Planned),
        };
    };
    if let Some(batches) = batches
        && nodes.len() != batches
    {
        fields.report(
            "weights",
            format!("there are {} weights for {batches} batches", nodes.len()),
            "give one weight per batch, repeats counted",
        );
    }
    let mut weights = Vec::new();
    for node in nodes {
        let weight = number(node)?;
        if weight <= 0.0 {
            fields.sink().report(
                &node.place,
                format!("the weight of a batch is {weight}"),
                Some("it must be above 0".to_owned()),
            );
        }
        weights.push(weight);
    }
    // Only their ratios matter. Scaled by the largest first, so that no sum overflows.
    let largest = weights.iter().copied().fold(0.0, f64::max);
    for weight in &mut weights {
        *weight /= largest;
    }
    let sum: f64 = weights.iter().sum();
    for weight in &mut weights {
        *weight /= sum;
    }
    Some(BatchWeights::Given(weights))
}

/// Label of a method without one: its kind, and the options that differ from the default.
fn label(kind: &MethodKind) -> String {
    match kind {
        MethodKind::LeastSquares { variance } => {
            let name = VARIANCES
                .iter()
                .find(|(_, form)| form == variance)
                .map_or("model", |(name, _)| *name);
            match variance {
                VarianceForm::Model => "least-squares".to_owned(),
                _ => format!("least-squares ({name})"),
            }
        }
        MethodKind::Ridge { penalty } => format!("ridge (penalty {penalty})"),
        MethodKind::FirstBatch => "first-batch".to_owned(),
        MethodKind::LastBatch => "last-batch".to_owned(),
        MethodKind::BatchCombined { weights } => match weights {
            BatchWeights::Size => "batch-combined".to_owned(),
            BatchWeights::Equal => "batch-combined (equal weights)".to_owned(),
            BatchWeights::Planned => "batch-combined (planned weights)".to_owned(),
            BatchWeights::Given(_) => "batch-combined (given weights)".to_owned(),
        },
        MethodKind::InverseVariance => "inverse-variance".to_owned(),
        MethodKind::WDecorrelation {
            penalty,
            steps,
            error,
        } => {
            let mut options = Vec::new();
            if *steps == DebiasingSteps::Batches {
                options.push("by batches".to_owned());
            }
            if let DebiasingPenalty::Fixed(value) = penalty {
                options.push(format!("penalty {value}"));
            }
            if *error == DebiasingError::RemainderAware {
                options.push("remainder-aware".to_owned());
            }
            if options.is_empty() {
                "w-decorrelation".to_owned()
            } else {
                format!("w-decorrelation ({})", options.join(", "))
            }
        }
        MethodKind::AnticipatedDecorrelation => "anticipated-decorrelation".to_owned(),
        MethodKind::PredictablePivot => "predictable-pivot".to_owned(),
        MethodKind::SelfNormalised { .. } => "self-normalised".to_owned(),
    }
}

/// A method by its label, or by its kind where only one is of that kind; anything else is
/// reported.
pub(super) fn find(
    name: &str,
    methods: &[PlacedMethod],
    place: &Place,
    sink: &Sink<'_>,
) -> Option<usize> {
    let labelled = methods
        .iter()
        .position(|method| method.method.label == name);
    if labelled.is_some() {
        return labelled;
    }
    let mut of_kind = (0..methods.len()).filter(|&index| methods[index].kind == name);
    match (of_kind.next(), of_kind.next()) {
        (Some(index), None) => return Some(index),
        (Some(_), Some(_)) => {
            sink.report(
                place,
                format!("several methods are of the kind \"{name}\""),
                Some("name one by its label".to_owned()),
            );
            return None;
        }
        (None, _) => {}
    }
    let labels: Vec<&str> = methods
        .iter()
        .map(|method| method.method.label.as_str())
        .collect();
    super::closing::unknown("method", name, &labels, place, sink);
    None
}
