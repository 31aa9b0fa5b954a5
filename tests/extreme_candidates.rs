//! Drawing only the extreme candidates has the same law as drawing them all.

mod common;

use common::{assert_within_mc, plan, run, value};
use windage::replay::Study;
use windage::score::Measure;

/// Both paths on independent seeds, for top and bottom selection under three correlation kinds;
/// bias, spread, coverage, width and the true mean of the enrolled within 4.5 standard errors of
/// their difference: below 3e-4 false alarm over the 42 comparisons, and the seeds are fixed.
#[test]
fn short_cut_and_plain_path_agree_in_law() {
    let matrix =
        "{ kind = \"matrix\", values = [[1.0, 0.3, 0.1], [0.3, 1.0, -0.4], [0.1, -0.4, 1.0]] }";
    for (rule, correlation) in [
        ("top-quantile", "{ kind = \"autoregressive\", rho = -0.5 }"),
        ("bottom-quantile", "{ kind = \"exchangeable\", rho = 0.4 }"),
        ("top-quantile", matrix),
    ] {
        let text = |seed: u64| {
            format!(
                r#"
format = 1
[study]
title = "two paths"
[population]
covariates = [
  {{ name = "x", law = "normal", mean = 1.0, sd = 2.0 }},
  {{ name = "z", law = "normal", count = 2 }},
]
correlation = {correlation}
[outcome]
family = "normal"
intercept = 0.5
noise = {{ law = "normal", sd = 1.0 }}
[[truth]]
name = "slopes"
coefficients = {{ x = 0.2, z = -0.1 }}
[[batch]]
size = 20
[[batch]]
size = 20
select = {{ rule = "{rule}", fraction = 0.1, score = "predicted-outcome" }}
[[estimand]]
name = "slope of x"
contrast = {{ x = 1.0 }}
[[method]]
kind = "least-squares"
[[method]]
kind = "batch-combined"
[precision]
trials = 20000
seed = {seed}
"#
            )
        };
        let short = Study::prepare(&plan(&text(1)));
        let plain = Study::prepare(&plan(&text(2))).with_every_candidate_drawn();
        assert!(short.draws_extremes() && !plain.draws_extremes());
        let (short, plain) = (&run(&short, 0)[0], &run(&plain, 0)[0]);
        for cell in 0..2 {
            for measure in [
                Measure::Bias,
                Measure::EmpiricalSe,
                Measure::ModelSe,
                Measure::Coverage,
                Measure::MissesAbove,
                Measure::MeanWidth,
            ] {
                let (a, a_error) = value(short, cell, measure);
                let (b, b_error) = value(plain, cell, measure);
                let label = format!("{rule}, {correlation}, {measure:?}, method {cell}");
                assert_within_mc(&label, a, b, a_error.hypot(b_error), 4.5);
            }
        }
        let mean = |result: &windage::replay::TruthResult| {
            let found = result.measures.operating.iter();
            let found = found
                .clone()
                .find(|value| value.characteristic == "mean-outcome");
            found
                .map(|value| (value.value, value.mcse))
                .expect("scored")
        };
        let ((a, a_error), (b, b_error)) = (mean(short), mean(plain));
        assert_within_mc("mean outcome", a, b, a_error.hypot(b_error), 4.5);
    }
}
