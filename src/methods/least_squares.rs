//! Least squares on all units.

use super::workbench::checked;
use super::{Answer, Estimate, NoAnswer, Workbench};
use crate::plan::VarianceForm;
use crate::trial::Trial;

/// Least squares with a t interval.
///
/// Formula: `c'β̂ ± t(n-p) se`, `se² = s² c'(X'X)^{-1}c` with `s² = RSS/(n-p)`, or the sandwich
/// `se² = Σ a_i² ω_i` with `a = X(X'X)^{-1}c` and `ω_i = e_i²` (HC0), `e_i² n/(n-p)` (HC1),
/// `e_i²/(1-h_i)` (HC2), `e_i²/(1-h_i)²` (HC3).
/// Needs: full column rank and, for the model variance, more units than coefficients.
/// Valid when: the design was fixed in advance, or does not depend on earlier outcomes.
/// Fails when: what was collected depends on earlier outcomes; worse as p/n grows.
/// Cost: `O(p²)` per estimand; HC2 and HC3 add `O(np²)` once.
/// Source: `MacKinnon` & White (1985) for the sandwich forms.
pub(super) fn estimate(
    bench: &mut Workbench,
    trial: &Trial,
    estimand: usize,
    variance: VarianceForm,
) -> Estimate {
    bench.pooled.answered()?;
    let degrees = bench.pooled.degrees();
    if degrees == 0 {
        return Err(NoAnswer::NoResidualDegrees);
    }
    let point = bench
        .pooled
        .point(&bench.contrasts[estimand], bench.kernels);
    let squared_error = if variance == VarianceForm::Model {
        let contrast = &bench.contrasts[estimand];
        let unit = bench
            .pooled
            .contrast_variance(contrast, &mut bench.scratch, bench.kernels);
        bench.pooled.residual_squares() / degrees as f64 * unit
    } else {
        bench.fill_contrast_weights(trial, estimand);
        sandwich(
            &bench.weights,
            &bench.residuals,
            &bench.leverages,
            variance,
            degrees,
        )
    };
    let critical = bench.critical.student(degrees);
    checked(Answer::symmetric(point, squared_error.sqrt(), critical))
}

/// `Σ a_i² ω_i`; leverages are read by HC2 and HC3 only. A leverage of one leaves a unit's
/// residual without information and makes the result not finite.
fn sandwich(
    weights: &[f64],
    residuals: &[f64],
    leverages: &[f64],
    variance: VarianceForm,
    degrees: usize,
) -> f64 {
    let pairs = weights.iter().zip(residuals);
    let plain = |(a, e): (&f64, &f64)| (a * e) * (a * e);
    match variance {
        VarianceForm::Hc2 | VarianceForm::Hc3 => pairs
            .zip(leverages)
            .map(|(pair, h)| {
                let left = 1.0 - h;
                let divisor = if variance == VarianceForm::Hc2 {
                    left
                } else {
                    left * left
                };
                plain(pair) / divisor
            })
            .sum(),
        VarianceForm::Hc1 => {
            let sum: f64 = pairs.map(plain).sum();
            sum * residuals.len() as f64 / degrees as f64
        }
        VarianceForm::Hc0 | VarianceForm::Model => pairs.map(plain).sum(),
    }
}
