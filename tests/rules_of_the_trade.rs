//! Two rules of thumb of the field, shown by their slopes. Common practice, no source.
//!
//! In the two-batch model with a top-quantile second batch, (1) the error of the coefficient
//! vector of least squares keeps the size √(p/n); (2) the bias of the contrast along the
//! coefficients, in standard errors, grows like p/√n, so that it vanishes only when n is much
//! larger than p².

mod common;

use common::{results, value};
use std::fmt::Write as _;
use windage::score::Measure;

const TRIALS: f64 = 4000.0;

fn scenario(p: usize, n: usize) -> String {
    let half = n / 2;
    let mut estimands = String::new();
    for j in 1..=p {
        let _ = writeln!(
            estimands,
            "[[estimand]]\nname = \"x{j}\"\ncontrast = {{ x{j} = 1.0 }}"
        );
    }
    format!(
        r#"
format = 1
[study]
title = "p and n"
[population]
covariates = [{{ name = "x", law = "normal", count = {p} }}]
[outcome]
family = "normal"
noise = {{ law = "normal", sd = 1.0 }}
[analysis]
regressors = ["covariates"]
[[truth]]
name = "unit norm"
coefficients = {{ x = {{ norm = 1.0, seed = 3 }} }}
[[batch]]
size = {half}
[[batch]]
size = {half}
select = {{ rule = "top-quantile", fraction = 0.1, score = "predicted-outcome" }}
[[estimand]]
name = "aligned"
along = "coefficients"
{estimands}
[[method]]
kind = "least-squares"
[precision]
trials = {TRIALS}
seed = 12
"#
    )
}

/// Slope of `y` on `x` by weighted least squares, with its standard error.
fn slope(points: &[(f64, f64, f64)]) -> (f64, f64) {
    let weight: f64 = points.iter().map(|point| point.2.powi(-2)).sum();
    let centre: f64 = points
        .iter()
        .map(|point| point.0 * point.2.powi(-2))
        .sum::<f64>()
        / weight;
    let spread: f64 = points
        .iter()
        .map(|point| (point.0 - centre).powi(2) * point.2.powi(-2))
        .sum();
    let sum: f64 = points
        .iter()
        .map(|point| (point.0 - centre) * point.1 * point.2.powi(-2))
        .sum();
    (sum / spread, spread.sqrt().recip())
}

/// The slopes on logarithmic scales are 1/2 and 1 to leading order. Terms of relative order p/n
/// and 1/p bend the curves on a finite grid, so a systematic deviation of 0.08 and 0.12 is allowed
/// for besides 4 Monte Carlo standard errors (false alarm below 2e-4; the seed is fixed).
#[test]
fn error_and_bias_have_their_slopes() {
    let mut sizes = Vec::new();
    let mut biases = Vec::new();
    for p in [4, 8, 16] {
        for n in [200, 400, 800] {
            let result = &results(&scenario(p, n))[0];
            let mut squares = 0.0;
            let mut variance = 0.0;
            for cell in 1..=p {
                let (rmse, mcse) = value(result, cell, Measure::Rmse);
                squares += rmse * rmse;
                variance += (2.0 * rmse * mcse).powi(2);
            }
            let (p, n) = (p as f64, n as f64);
            // Half the relative error of the squared length; errors of coefficients are taken as
            // uncorrelated, which the near-isotropic design makes them to first order.
            let error = 0.5 * variance.sqrt() / squares;
            sizes.push(((p / n).ln(), 0.5 * squares.ln(), error));
            let (bias, bias_error) = value(result, 0, Measure::Bias);
            let (sd, _) = value(result, 0, Measure::EmpiricalSe);
            println!(
                "p {p}, n {n}: size {:.4}, bias/se {:.3}",
                squares.sqrt(),
                bias / sd
            );
            biases.push((
                (p / n.sqrt()).ln(),
                (-bias / sd).ln(),
                bias_error / bias.abs(),
            ));
        }
    }
    let (size_slope, size_error) = slope(&sizes);
    let (bias_slope, bias_error) = slope(&biases);
    println!("size: {size_slope:.3} ± {size_error:.3}; bias: {bias_slope:.3} ± {bias_error:.3}");
    assert!(
        (size_slope - 0.5).abs() < 0.08 + 4.0 * size_error,
        "size slope {size_slope}"
    );
    assert!(
        (bias_slope - 1.0).abs() < 0.12 + 4.0 * bias_error,
        "bias slope {bias_slope}"
    );
}
