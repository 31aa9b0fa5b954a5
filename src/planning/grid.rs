//! The grid of a sweep: one plan for every combination of axis values.

use crate::plan::{self, Plan};
use crate::scenario::{Axis, AxisValues, Diagnostics, Scenario, Sweep};

/// One combination of axis values.
#[derive(Debug, Clone)]
pub struct GridPoint {
    /// Value of each axis, in the order of the sweep's axes.
    pub values: Vec<toml::Value>,
    /// The plan there.
    pub plan: Plan,
}

/// Every point of a sweep, the first axis varying slowest.
///
/// # Errors
/// All mistakes of the first point that cannot be planned. Nothing is replayed before every
/// point is known to be sound.
pub fn grid(scenario: &Scenario, sweep: &Sweep) -> Result<Vec<GridPoint>, Diagnostics> {
    let first = sweep.axes.first().map_or(0, axis_length);
    let mut points = Vec::new();
    for outer in 0..first {
        match sweep.axes.get(1) {
            None => points.push(indexed(scenario, sweep, &[outer])?),
            Some(second) => {
                for inner in 0..axis_length(second) {
                    points.push(indexed(scenario, sweep, &[outer, inner])?);
                }
            }
        }
    }
    Ok(points)
}

fn axis_length(axis: &Axis) -> usize {
    match &axis.values {
        AxisValues::Values(values) => values.len(),
        AxisValues::ShareOfUnits(shares) => shares.len(),
    }
}

/// The point at the given index of each axis. Shares of the planned units are turned into counts
/// last, since the other axis may change the number of units.
fn indexed(
    scenario: &Scenario,
    sweep: &Sweep,
    indices: &[usize],
) -> Result<GridPoint, Diagnostics> {
    let mut scenario = scenario.clone();
    let mut values: Vec<Option<toml::Value>> = vec![None; indices.len()];
    for (place, (axis, &index)) in sweep.axes.iter().zip(indices).enumerate() {
        if let AxisValues::Values(list) = &axis.values {
            scenario = scenario.with_value(&axis.path, list[index].clone())?;
            values[place] = Some(list[index].clone());
        }
    }
    for (place, (axis, &index)) in sweep.axes.iter().zip(indices).enumerate() {
        if let AxisValues::ShareOfUnits(shares) = &axis.values {
            let plan = plan::resolve(&scenario)?;
            let count = plan::count_for_share(&scenario, &plan, &axis.path, shares[index]);
            // The reader accepts shares only for a path that is a count; one is its least value.
            let count = count
                .and_then(|count| i64::try_from(count).ok())
                .unwrap_or(1);
            let value = toml::Value::Integer(count);
            scenario = scenario.with_value(&axis.path, value.clone())?;
            values[place] = Some(value);
        }
    }
    let plan = plan::resolve(&scenario)?;
    Ok(GridPoint {
        values: values.into_iter().flatten().collect(),
        plan,
    })
}

/// The point at given values of the axes.
///
/// # Errors
/// All mistakes of the scenario with these values.
pub fn point(
    scenario: &Scenario,
    sweep: &Sweep,
    values: &[toml::Value],
) -> Result<GridPoint, Diagnostics> {
    let mut scenario = scenario.clone();
    for (axis, value) in sweep.axes.iter().zip(values) {
        scenario = scenario.with_value(&axis.path, value.clone())?;
    }
    let plan = plan::resolve(&scenario)?;
    Ok(GridPoint {
        values: values.to_vec(),
        plan,
    })
}
