//! `[precision]`, `[verdict]`, `[[require]]`, and the names that `[sweep]` refers to.

use super::methods::{self, PlacedMethod};
use crate::plan::{Bound, Estimand, Precision, Requirement, Verdicts};
use crate::scenario::{Fields, Place, Sink};
use crate::score::Measure;

/// Pilot trials where the scenario gives no number.
const DEFAULT_PILOT_TRIALS: u64 = 1000;
/// Tolerance of the verdicts where the scenario gives none.
const DEFAULT_TOLERANCE: f64 = 0.01;
/// Simultaneous confidence of the verdicts where the scenario gives none.
const DEFAULT_CONFIDENCE: f64 = 0.95;
/// Requirement on the verdict instead of a measure.
const HONEST: &str = "honest";

/// Reads `[precision]`; the seed is given apart, since truths draw on it.
pub(super) fn precision(root: &Fields<'_>) -> (Option<Precision>, u64) {
    root.required(
        "precision",
        "add [precision] with trials = 10000 and a seed",
    );
    let Some(fields) = root.section("precision") else {
        return (None, 0);
    };
    fields.required("trials", "say how many trials to replay per truth");
    fields.required("seed", "give a whole number as seed, any will do");
    let trials = fields.count("trials", 1, usize::MAX);
    let pilot = fields.count("pilot_trials", 1, usize::MAX);
    let seed = fields.whole("seed");
    let precision = trials.zip(seed).map(|(trials, seed)| Precision {
        trials: trials as u64,
        seed,
        pilot_trials: pilot.map_or(DEFAULT_PILOT_TRIALS, |pilot| pilot as u64),
    });
    (precision, seed.unwrap_or(0))
}

/// What a requirement or a breaking point can refer to.
struct Named<'a> {
    methods: &'a [PlacedMethod],
    /// `None` where the names are unknown after a mistake.
    estimands: Option<Vec<&'a str>>,
    truths: Vec<&'a str>,
}

/// Reads `[verdict]` and `[[require]]`, and checks the names of the sweep's breaking point.
pub(super) fn judgement(
    root: &Fields<'_>,
    methods: &[PlacedMethod],
    estimands: &[Option<Estimand>],
    truths: &[String],
) -> (Option<Verdicts>, Vec<Requirement>) {
    let named = Named {
        methods,
        estimands: estimands
            .iter()
            .map(|estimand| estimand.as_ref().map(|estimand| estimand.name.as_str()))
            .collect(),
        truths: truths.iter().map(String::as_str).collect(),
    };
    let verdicts = verdicts(root, methods);
    let mut requirements = Vec::new();
    for (index, node) in root.list("require").unwrap_or_default().iter().enumerate() {
        let title = format!("requirement {}", index + 1);
        if let Some(fields) = Fields::of(node, title, root.sink()) {
            requirements.extend(requirement(&fields, &named));
        }
    }
    let break_point = root
        .section("sweep")
        .and_then(|fields| fields.table("break_point"));
    if let Some(fields) = break_point {
        named.method(&fields);
        named.estimand(&fields);
        named.truth(&fields);
    }
    (verdicts, requirements)
}

fn verdicts(root: &Fields<'_>, methods: &[PlacedMethod]) -> Option<Verdicts> {
    let default_reference = methods
        .iter()
        .position(|method| method.kind == "least-squares")
        .unwrap_or(0);
    let mut verdicts = Verdicts {
        tolerance: DEFAULT_TOLERANCE,
        confidence: DEFAULT_CONFIDENCE,
        reference: default_reference,
    };
    if !root.has("verdict") {
        return Some(verdicts);
    }
    let fields = root.section("verdict")?;
    let inside = |value: f64| (0.0..1.0).contains(&value);
    if let Some(tolerance) = fields.number_where("tolerance", inside, "at least 0 and below 1") {
        verdicts.tolerance = tolerance;
    }
    let inside = |value: f64| value > 0.0 && value < 1.0;
    if let Some(confidence) = fields.number_where("confidence", inside, "above 0 and below 1") {
        verdicts.confidence = confidence;
    }
    if let Some(name) = fields.text("reference") {
        let place = fields.place("reference");
        verdicts.reference = methods::find(name, methods, place, fields.sink())?;
    }
    Some(verdicts)
}

impl Named<'_> {
    fn method(&self, fields: &Fields<'_>) -> Option<usize> {
        let name = fields.text("method")?;
        methods::find(name, self.methods, fields.place("method"), fields.sink())
    }

    fn estimand(&self, fields: &Fields<'_>) -> Option<usize> {
        let name = fields.text("estimand")?;
        let Some(estimands) = &self.estimands else {
            fields.sink().taint();
            return None;
        };
        find("estimand", name, estimands, fields)
    }

    fn truth(&self, fields: &Fields<'_>) -> Option<usize> {
        find("truth", fields.text("truth")?, &self.truths, fields)
    }
}

fn requirement(fields: &Fields<'_>, named: &Named<'_>) -> Option<Requirement> {
    let sink = fields.sink();
    let before = sink.trouble();
    fields.required(
        "measure",
        "say what is required: \"honest\", \"coverage\", ...",
    );
    let measure = fields.text("measure").map(str::to_owned);
    if let Some(measure) = &measure
        && measure != HONEST
        && Measure::from_key(measure).is_none()
    {
        let mut known: Vec<&str> = Measure::ALL.iter().map(|measure| measure.key()).collect();
        known.push(HONEST);
        unknown("measure", measure, &known, fields.place("measure"), sink);
    }
    let bound = bound(fields, measure.as_deref());
    let requirement = Requirement {
        method: named.method(fields),
        estimand: named.estimand(fields),
        truth: named.truth(fields),
        measure: measure?,
        bound: bound?,
    };
    (sink.trouble() == before).then_some(requirement)
}

fn bound(fields: &Fields<'_>, measure: Option<&str>) -> Option<Bound> {
    let given: Vec<&str> = ["at_least", "at_most"]
        .into_iter()
        .filter(|key| fields.has(key))
        .collect();
    match (measure? == HONEST, given.as_slice()) {
        (true, []) => Some(Bound::Honest),
        (true, [key, ..]) => {
            fields.report(
                key,
                "a bound on a requirement to be honest",
                "take it out: the tolerance stands in [verdict]",
            );
            None
        }
        (false, ["at_least"]) => fields.number("at_least").map(Bound::AtLeast),
        (false, ["at_most"]) => fields.number("at_most").map(Bound::AtMost),
        (false, _) => {
            fields.sink().report_missing(
                fields.own_place(),
                "at_",
                format!("{} has {} bounds", fields.title(), given.len()),
                Some("give one of: at_least, at_most".to_owned()),
            );
            None
        }
    }
}

fn find(key: &str, name: &str, known: &[&str], fields: &Fields<'_>) -> Option<usize> {
    let found = known.iter().position(|candidate| *candidate == name);
    if found.is_none() {
        unknown(key, name, known, fields.place(key), fields.sink());
    }
    found
}

/// Reports a name that is not among the known ones, with the nearest.
pub(super) fn unknown(what: &str, name: &str, known: &[&str], place: &Place, sink: &Sink<'_>) {
    let help = match sink.nearest(name, known.iter().copied()) {
        Some(near) => format!("did you mean \"{near}\"?"),
        None => format!("known: {}", known.join(", ")),
    };
    sink.report_missing(
        place,
        name,
        format!("unknown {what} \"{name}\""),
        Some(help),
    );
}
