//! The `[sweep]` section: which values of the scenario are varied.

use super::fields::{self, Fields};
use super::path::{self, PathMistake};
use super::schema::Shape;
use super::structure;
use super::tree::{Content, Node};

/// Largest number of values of one axis.
const LONGEST_AXIS: usize = 10_000;
/// Share of a step by which rounding may fall short of the end of an axis.
const STEP_TOLERANCE: f64 = 1e-9;

/// What is varied, and where a method's breaking point is looked for.
#[derive(Debug, Clone, PartialEq)]
pub struct Sweep {
    /// One or two axes; the first varies slowest.
    pub axes: Vec<Axis>,
    /// The method whose breaking point along the first axis is sought.
    pub break_point: Option<BreakPoint>,
}

/// One value of the scenario that is varied.
#[derive(Debug, Clone, PartialEq)]
pub struct Axis {
    /// Path of the value, for [`Scenario::with_value`](super::Scenario::with_value).
    pub path: String,
    /// Values that it takes, at least one.
    pub values: AxisValues,
}

/// Values of an axis.
#[derive(Debug, Clone, PartialEq)]
pub enum AxisValues {
    /// The values themselves.
    Values(Vec<toml::Value>),
    /// Shares of the planned units that the number of analysis coefficients is to be.
    ShareOfUnits(Vec<f64>),
}

/// The method whose breaking point is sought, by names as the scenario spells them.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct BreakPoint {
    /// Method label.
    pub method: String,
    /// Estimand, or every one when absent.
    pub estimand: Option<String>,
    /// Truth, or every one when absent.
    pub truth: Option<String>,
}

/// Reads the section; mistakes go to the sink of `fields`.
pub(super) fn read(root: &Node, fields: &Fields<'_>) -> Option<Sweep> {
    let help = "write axes = [ { path = \"...\", values = [...] } ]";
    let node = fields.required("axes", help)?;
    let Content::List(nodes) = &node.content else {
        return None;
    };
    if !(1..=2).contains(&nodes.len()) {
        fields.report(
            "axes",
            format!("the sweep has {} axes", nodes.len()),
            "it must have one or two",
        );
    }
    let axes: Vec<Axis> = nodes
        .iter()
        .enumerate()
        .filter_map(|(index, node)| {
            let fields = Fields::of(node, format!("axis {}", index + 1), fields.sink())?;
            axis(root, &fields)
        })
        .collect();
    if let [first, second] = axes.as_slice()
        && first.path == second.path
    {
        fields.report(
            "axes",
            format!("both axes vary `{}`", first.path),
            "vary two different values",
        );
    }
    let break_point = fields.table("break_point").and_then(|fields| {
        fields.required("method", "name the method, as method = \"least-squares\"");
        Some(BreakPoint {
            method: fields.text("method")?.to_owned(),
            estimand: fields.text("estimand").map(str::to_owned),
            truth: fields.text("truth").map(str::to_owned),
        })
    });
    Some(Sweep { axes, break_point })
}

fn axis(root: &Node, fields: &Fields<'_>) -> Option<Axis> {
    fields.required("path", "name the value to vary, as path = \"batch.2.size\"");
    let forms = ["values", "step", "points", "share_of_units"];
    let given: Vec<&str> = forms.into_iter().filter(|form| fields.has(form)).collect();
    let [form] = given.as_slice() else {
        fields.sink().report(
            fields.own_place(),
            format!("{} says its values {} times", fields.title(), given.len()),
            Some("give one of: values, from/to/step, from/to/points, share_of_units".to_owned()),
        );
        return None;
    };
    let form = *form;
    let path = fields.text("path")?;
    let mut copy = root.clone();
    let shape = match path::reach(&mut copy, path) {
        Ok((_, shape)) => shape,
        Err(PathMistake { message, help }) => {
            fields.report("path", message, help);
            return None;
        }
    };
    let values = match form {
        "values" => {
            fields.only(&["path", "values"], "an axis with values");
            AxisValues::Values(listed(root, path, fields)?)
        }
        "share_of_units" => {
            fields.only(&["path", "share_of_units"], "an axis by share of units");
            if !matches!(shape, Shape::Count) {
                fields.report(
                    "path",
                    format!("`{path}` is no count"),
                    "share_of_units varies a number of covariates, as `population.covariates.NAME.count`",
                );
            }
            AxisValues::ShareOfUnits(shares(fields)?)
        }
        "step" => {
            fields.only(&["path", "from", "to", "step"], "an axis with a step");
            AxisValues::Values(spelled(&stepped(fields)?, shape))
        }
        _ => {
            let keys = ["path", "from", "to", "points", "spacing"];
            fields.only(&keys, "an axis with points");
            AxisValues::Values(spelled(&spaced(fields)?, shape))
        }
    };
    let empty = match &values {
        AxisValues::Values(values) => values.is_empty(),
        AxisValues::ShareOfUnits(shares) => shares.is_empty(),
    };
    if empty {
        fields.report(form, "the axis has no value", "give at least one");
        return None;
    }
    Some(Axis {
        path: path.to_owned(),
        values,
    })
}

/// Values given one by one, each of the kind that the path takes.
fn listed(root: &Node, path: &str, fields: &Fields<'_>) -> Option<Vec<toml::Value>> {
    let nodes = fields.list("values")?;
    for node in nodes {
        let mut copy = root.clone();
        if let Ok((target, shape)) = path::reach(&mut copy, path) {
            target.content = node.content.clone();
            target.place = node.place.clone();
            structure::check(target, shape, "the value", fields.sink());
        }
    }
    nodes.iter().map(Node::to_value).collect()
}

fn shares(fields: &Fields<'_>) -> Option<Vec<f64>> {
    let mut shares = Vec::new();
    for node in fields.list("share_of_units")? {
        let share = fields::number(node)?;
        if !(share > 0.0 && share < 1.0) {
            fields.sink().report(
                &node.place,
                format!("the share {share} is out of range"),
                Some("it must be above 0 and below 1".to_owned()),
            );
        }
        shares.push(share);
    }
    Some(shares)
}

fn ends(fields: &Fields<'_>) -> Option<(f64, f64)> {
    fields.required("from", "say where the axis begins, as from = 0.1");
    fields.required("to", "say where the axis ends, as to = 0.9");
    Some((fields.number("from")?, fields.number("to")?))
}

#[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)] // bounded by LONGEST_AXIS
fn stepped(fields: &Fields<'_>) -> Option<Vec<f64>> {
    let ends = ends(fields);
    let step = fields.number_where("step", |step| step != 0.0, "other than 0")?;
    let (from, to) = ends?;
    let steps = ((to - from) / step + STEP_TOLERANCE).floor();
    if steps < 0.0 {
        fields.report(
            "step",
            format!("a step of {step} leads away from {to}"),
            "change its sign, or swap from and to",
        );
        return None;
    }
    if steps >= LONGEST_AXIS as f64 {
        fields.report(
            "step",
            format!("the axis has more than {LONGEST_AXIS} values"),
            "make the step larger",
        );
        return None;
    }
    let last = steps as usize;
    Some((0..=last).map(|index| from + index as f64 * step).collect())
}

fn spaced(fields: &Fields<'_>) -> Option<Vec<f64>> {
    let ends = ends(fields);
    let geometric = fields.choice("spacing", &[("linear", false), ("geometric", true)]);
    let points = fields.count("points", 2, LONGEST_AXIS)?;
    let (from, to) = ends?;
    let geometric = geometric.unwrap_or(false);
    if geometric && !(from > 0.0 && to > 0.0) {
        fields.report(
            "spacing",
            format!("a geometric axis cannot go from {from} to {to}"),
            "both ends must be above 0",
        );
        return None;
    }
    let last = (points - 1) as f64;
    let value = |index: usize| {
        // The ends are met exactly.
        if index == 0 {
            return from;
        }
        if index == points - 1 {
            return to;
        }
        let share = index as f64 / last;
        if geometric {
            from * (to / from).powf(share)
        } else {
            from + share * (to - from)
        }
    };
    Some((0..points).map(value).collect())
}

/// Numbers as the path takes them: where it takes whole numbers they are rounded, and values that
/// become equal are kept once.
#[allow(clippy::cast_possible_truncation)] // saturates, and is then out of range for the key
fn spelled(numbers: &[f64], shape: &Shape) -> Vec<toml::Value> {
    let mut values: Vec<toml::Value> = numbers
        .iter()
        .map(|&number| match shape {
            Shape::Count | Shape::Seed => toml::Value::Integer(number.round() as i64),
            _ => toml::Value::Float(number),
        })
        .collect();
    values.dedup();
    values
}
