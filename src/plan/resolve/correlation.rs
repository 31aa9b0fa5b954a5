//! Correlation of covariates on the scale of their latent normals.

use nalgebra::DMatrix;

use crate::plan::CorrelationFactor;
use crate::scenario::{Content, Fields, Node, number};

/// Largest order of an explicit factor: 4000² numbers take 128 MB.
const LARGEST_FACTOR: usize = 4_000;
/// Allowed distance of a correlation matrix from symmetry and unit diagonal.
const MATRIX_TOLERANCE: f64 = 1e-9;

#[derive(Debug, Clone, Copy)]
enum Kind {
    Autoregressive,
    Exchangeable,
    Matrix,
}

/// Reads `correlation` for `count` covariates, if their number is known. `None` after a mistake.
pub(super) fn read(population: &Fields<'_>, count: Option<usize>) -> Option<CorrelationFactor> {
    if !population.has("correlation") {
        return Some(CorrelationFactor::Identity);
    }
    let fields = population.table("correlation")?;
    let help = "say kind = \"autoregressive\", \"exchangeable\" or \"matrix\"";
    fields.required("kind", help);
    let kinds = [
        ("autoregressive", Kind::Autoregressive),
        ("exchangeable", Kind::Exchangeable),
        ("matrix", Kind::Matrix),
    ];
    match fields.choice("kind", &kinds)? {
        Kind::Autoregressive => {
            fields.only(&["kind", "rho"], "an autoregressive correlation");
            fields.required("rho", "give the correlation of neighbours");
            let inside = |rho: f64| rho > -1.0 && rho < 1.0;
            let rho = fields.number_where("rho", inside, "above -1 and below 1")?;
            Some(CorrelationFactor::Autoregressive(rho))
        }
        Kind::Exchangeable => {
            fields.only(&["kind", "rho"], "an exchangeable correlation");
            fields.required("rho", "give the correlation of any two covariates");
            exchangeable(&fields, count)
        }
        Kind::Matrix => {
            fields.only(&["kind", "values"], "a correlation matrix");
            fields.required("values", "give the matrix, row by row");
            matrix(&fields, count)
        }
    }
}

fn exchangeable(fields: &Fields<'_>, count: Option<usize>) -> Option<CorrelationFactor> {
    let rho = fields.number("rho")?;
    let count = count?;
    // Positive definite: -1/(m - 1) < rho < 1.
    let least = if count > 1 {
        -1.0 / (count as f64 - 1.0)
    } else {
        -1.0
    };
    if !(rho > least && rho < 1.0) {
        fields.report(
            "rho",
            format!("`rho` is {rho}"),
            format!(
                "for {count} covariates it must be above {} and below 1",
                super::marginals::rounded(least)
            ),
        );
        return None;
    }
    check_order(count, "kind", fields)?;
    // Below the diagonal, every column of the factor is constant.
    let mut factor = DMatrix::zeros(count, count);
    let mut squares = 0.0;
    for column in 0..count {
        let diagonal = (1.0f64 - squares).sqrt();
        let below = (rho - squares) / diagonal;
        factor[(column, column)] = diagonal;
        for row in column + 1..count {
            factor[(row, column)] = below;
        }
        squares += below * below;
    }
    Some(CorrelationFactor::Lower(factor))
}

fn check_order(count: usize, key: &str, fields: &Fields<'_>) -> Option<()> {
    if count <= LARGEST_FACTOR {
        return Some(());
    }
    fields.report(
        key,
        format!("the correlation matrix would be {count} × {count}"),
        format!("use kind = \"autoregressive\", or at most {LARGEST_FACTOR} covariates"),
    );
    None
}

fn matrix(fields: &Fields<'_>, count: Option<usize>) -> Option<CorrelationFactor> {
    let rows = fields.list("values")?;
    let order = rows.len();
    check_order(order, "values", fields)?;
    let sink = fields.sink();
    let before = sink.trouble();
    let mut values = DMatrix::zeros(order, order);
    for (row, node) in rows.iter().enumerate() {
        let Content::List(cells) = &node.content else {
            sink.taint();
            continue;
        };
        if cells.len() != order {
            sink.report(
                &node.place,
                format!("row {} has {} values", row + 1, cells.len()),
                Some(format!(
                    "every row must have {order}, as many as there are rows"
                )),
            );
            continue;
        }
        for (column, cell) in cells.iter().enumerate() {
            values[(row, column)] = correlation(cell, row, column, fields)?;
        }
    }
    if let Some(count) = count
        && count != order
    {
        fields.report(
            "values",
            format!("the correlation matrix has {order} rows for {count} covariates"),
            "every covariate, and every member of a block, has a row; a categorical one has one",
        );
    }
    if sink.trouble() != before {
        return None;
    }
    for row in 0..order {
        for column in 0..row {
            if f64::abs(values[(row, column)] - values[(column, row)]) > MATRIX_TOLERANCE {
                let place = cell(rows, row, column).map_or(fields.own_place(), |node| &node.place);
                sink.report(
                    place,
                    format!(
                        "the correlation matrix is not symmetric: row {}, column {} is {}, but row {}, column {} is {}",
                        row + 1,
                        column + 1,
                        values[(row, column)],
                        column + 1,
                        row + 1,
                        values[(column, row)]
                    ),
                    Some("give the same value on both sides of the diagonal".to_owned()),
                );
            }
        }
    }
    if sink.trouble() != before {
        return None;
    }
    let factor = values.cholesky().map(|cholesky| cholesky.l());
    let degenerate = |factor: &DMatrix<f64>| {
        (0..order).any(|index| factor[(index, index)].powi(2) <= MATRIX_TOLERANCE)
    };
    if let Some(factor) = factor.filter(|factor| !degenerate(factor)) {
        return Some(CorrelationFactor::Lower(factor));
    }
    fields.report(
        "values",
        "the correlation matrix is not positive definite",
        "no set of variables has these correlations; bring them closer to 0",
    );
    None
}

fn cell(rows: &[Node], row: usize, column: usize) -> Option<&Node> {
    match &rows.get(row)?.content {
        Content::List(cells) => cells.get(column),
        _ => None,
    }
}

fn correlation(node: &Node, row: usize, column: usize, fields: &Fields<'_>) -> Option<f64> {
    let Some(value) = number(node) else {
        fields.sink().taint();
        return None;
    };
    let (right, help) = if row == column {
        let unit = (value - 1.0).abs() <= MATRIX_TOLERANCE;
        (unit, "the diagonal of a correlation matrix is 1")
    } else {
        (value.abs() < 1.0, "a correlation lies above -1 and below 1")
    };
    if !right {
        fields.sink().report(
            &node.place,
            format!(
                "row {}, column {} of the correlation matrix is {value}",
                row + 1,
                column + 1
            ),
            Some(help.to_owned()),
        );
    }
    Some(value)
}
