//! `[outcome]` and `[[truth]]`: the parameter values to try.

use std::collections::HashSet;

use super::coefficients::{self, DirectionSeeds};
use super::names::Names;
use super::outcome::{DEFAULT_NOISE, Parameters};
use crate::plan::{Drift, Truth};
use crate::scenario::{Content, Fields, Node};

/// Name of the only truth of a roster that supplies its outcomes.
const RECORDED: &str = "recorded outcomes";

/// The entries of `[[truth]]`.
fn entries<'s>(root: &Fields<'s>) -> Vec<Fields<'s>> {
    let nodes: &'s [Node] = root.list("truth").unwrap_or_default();
    nodes
        .iter()
        .enumerate()
        .filter_map(|(index, node)| {
            let title = match node.entry("name").and_then(|entry| entry.node.as_text()) {
                Some(name) => format!("truth \"{name}\""),
                None => format!("truth {}", index + 1),
            };
            Fields::of(node, title, root.sink())
        })
        .collect()
}

/// Names of all truths, those with other mistakes among them.
pub(super) fn names(root: &Fields<'_>, recorded: bool) -> Vec<String> {
    let mut names: Vec<String> = entries(root)
        .iter()
        .map(|fields| fields.text("name").unwrap_or_default().to_owned())
        .collect();
    if recorded && names.is_empty() {
        names.push(RECORDED.to_owned());
    }
    names
}

/// Reads every truth.
pub(super) fn read(
    root: &Fields<'_>,
    names: &Names,
    recorded: bool,
    seed: u64,
    batches: Option<usize>,
) -> Vec<Truth> {
    if recorded {
        return vec![recorded_truth(root, names)];
    }
    let defaults = root
        .section("outcome")
        .map_or_else(Parameters::default, |fields| {
            check_family(&fields);
            Parameters::read(&fields, names, batches)
        });
    let listed = root.has("truth");
    if !listed || matches!(root.list("truth"), Some([])) {
        root.sink().report_missing(
            root.place("truth"),
            "truth",
            "the scenario has no truth",
            Some(
                "add [[truth]] with a name and coefficients; a null truth is worth having"
                    .to_owned(),
            ),
        );
    }
    let mut seen = HashSet::new();
    let mut truths = Vec::new();
    for fields in entries(root) {
        let name = name(&fields, &mut seen);
        let parameters = defaults.overlaid(Parameters::read(&fields, names, batches));
        let truth_seed = fields.whole("seed").unwrap_or(0);
        let mut truth = Truth {
            name,
            reason: fields.text("reason").map(str::to_owned),
            intercept: parameters.intercept.unwrap_or(0.0),
            arm_effects: vec![0.0; names.arms().len()],
            slopes: vec![0.0; names.columns().len()],
            interactions: Vec::new(),
            noise: parameters.noise.unwrap_or(DEFAULT_NOISE),
            drift: parameters.drift.unwrap_or(Drift::None),
            delay: parameters.delay.unwrap_or(0),
        };
        let seeds = DirectionSeeds {
            scenario: seed,
            truth: truth_seed,
        };
        coefficients::apply(&parameters.coefficients, seeds, &mut truth);
        truths.push(truth);
    }
    truths
}

fn check_family(fields: &Fields<'_>) {
    if let Some(family) = fields.text("family")
        && family != "normal"
    {
        fields.report(
            "family",
            format!("the outcome family is \"{family}\""),
            "only family = \"normal\" can be simulated so far: a mean plus noise",
        );
    }
}

fn name<'s>(fields: &Fields<'s>, seen: &mut HashSet<&'s str>) -> String {
    fields.required("name", "give the truth a name");
    let name = fields.text("name").unwrap_or_default();
    if !name.is_empty() && !seen.insert(name) {
        fields.report(
            "name",
            format!("two truths are named \"{name}\""),
            "names of truths must differ",
        );
    }
    name.to_owned()
}

/// The truth that stands for a roster's own outcomes: its values are not used.
fn recorded_truth(root: &Fields<'_>, names: &Names) -> Truth {
    let sink = root.sink();
    let mut delay = 0;
    if let Some(fields) = root.section("outcome") {
        fields.only(&["delay"], "an outcome that the roster supplies");
        delay = Parameters::read(&fields, names, None).delay.unwrap_or(0);
    }
    if root.has("arms") {
        root.report(
            "arms",
            "arms cannot be allocated where the roster supplies the outcomes",
            "a recorded outcome belongs to what the unit was given then; leave [arms] out",
        );
    }
    if let Some(node) = root.node("truth")
        && let Content::List(nodes) = &node.content
        && nodes.len() > 1
    {
        sink.report(
            &nodes[1].place,
            "a second truth where the roster supplies the outcomes",
            Some("the recorded outcomes are the only truth; leave the others out".to_owned()),
        );
    }
    let entries = entries(root);
    let first = entries.first();
    if let Some(fields) = first {
        fields.only(&["name", "reason"], "the truth of recorded outcomes");
    }
    Truth {
        name: first
            .and_then(|fields| fields.text("name"))
            .unwrap_or(RECORDED)
            .to_owned(),
        reason: first
            .and_then(|fields| fields.text("reason"))
            .map(str::to_owned),
        intercept: 0.0,
        arm_effects: Vec::new(),
        slopes: vec![0.0; names.columns().len()],
        interactions: Vec::new(),
        noise: DEFAULT_NOISE,
        drift: Drift::None,
        delay,
    }
}
