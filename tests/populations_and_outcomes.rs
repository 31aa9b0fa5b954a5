//! Populations, outcomes, rules and true values as the scenario describes them.
//!
//! Statistical checks allow 5 standard errors: below 1e-6 false alarm each, with fixed seeds.

mod common;

use common::{assert_within_mc, plan, results, value};
use windage::numerics::distribution::normal_cdf;
use windage::replay::{Study, Worker};
use windage::score::Measure;
use windage::streams::Phase;
use windage::trial::Trial;

/// A one-batch study of `units` units; `population` and `outcome` are the bodies of the sections.
fn one_batch(units: usize, population: &str, outcome: &str, contrast: &str) -> String {
    format!(
        "format = 1\n[study]\ntitle = \"one batch\"\n[population]\n{population}\n[outcome]\n\
         family = \"normal\"\n{outcome}\n[[truth]]\nname = \"only\"\n[[batch]]\nsize = {units}\n\
         [[estimand]]\nname = \"slope\"\ncontrast = {{ {contrast} = 1.0 }}\n[[method]]\n\
         kind = \"least-squares\"\n[precision]\ntrials = 10\nseed = 14\n"
    )
}

fn simulate(text: &str) -> (Study, Trial) {
    let study = Study::without_methods(&plan(text));
    let mut worker = Worker::new(&study);
    worker.simulate(0, Phase::Replay, 0);
    let trial = worker.trial().clone();
    (study, trial)
}

fn column(study: &Study, trial: &Trial, covariate: usize) -> Vec<f64> {
    let stored = study.design().first_covariate() + covariate;
    (0..trial.rows())
        .map(|row| trial.value(row, stored))
        .collect()
}

fn mean(values: &[f64]) -> f64 {
    values.iter().sum::<f64>() / values.len() as f64
}

fn variance(values: &[f64]) -> f64 {
    let centre = mean(values);
    values
        .iter()
        .map(|value| (value - centre).powi(2))
        .sum::<f64>()
        / values.len() as f64
}

fn correlation(a: &[f64], b: &[f64]) -> f64 {
    let (centre_a, centre_b) = (mean(a), mean(b));
    let product: f64 = a
        .iter()
        .zip(b)
        .map(|(x, y)| (x - centre_a) * (y - centre_b))
        .sum();
    product / a.len() as f64 / (variance(a) * variance(b)).sqrt()
}

#[test]
fn marginal_laws_have_their_moments() {
    let units = 40_000;
    let population = r#"covariates = [
  { name = "normal", law = "normal", mean = 2.0, sd = 3.0 },
  { name = "uniform", law = "uniform", low = -1.0, high = 3.0 },
  { name = "lognormal", law = "log-normal", log_mean = 0.5, log_sd = 0.4 },
  { name = "gamma", law = "gamma", shape = 2.5, scale = 0.8 },
  { name = "student", law = "student-t", df = 9, location = 1.0, scale = 2.0 },
  { name = "bernoulli", law = "bernoulli", probability = 0.3 },
  { name = "poisson", law = "poisson", mean = 1.7 },
  { name = "level", law = "categorical", levels = ["a", "b", "c"], probabilities = [0.5, 0.3, 0.2] },
]
correlation = { kind = "exchangeable", rho = 0.2 }"#;
    let (study, trial) = simulate(&one_batch(units, population, "", "normal"));
    let log_variance: f64 = 0.16;
    let log_mean: f64 = (0.5 + log_variance / 2.0).exp();
    for (index, expected_mean, expected_variance) in [
        (0, 2.0, 9.0),
        (1, 1.0, 16.0 / 12.0),
        (2, log_mean, log_mean * log_mean * log_variance.exp_m1()),
        (3, 2.0, 1.6),
        (4, 1.0, 4.0 * 9.0 / 7.0),
        (5, 0.3, 0.21),
        (6, 1.7, 1.7),
        (7, 0.3, 0.21),
        (8, 0.2, 0.16),
    ] {
        let values = column(&study, &trial, index);
        let name = &study.plan().population.columns[index];
        let error = (expected_variance / (units as f64)).sqrt();
        assert_within_mc(name, mean(&values), expected_mean, error, 5.0);
        let fourth: Vec<f64> = values.iter().map(|v| (v - expected_mean).powi(2)).collect();
        let error = (variance(&fourth) / (units as f64)).sqrt();
        assert_within_mc(name, mean(&fourth), expected_variance, error, 5.0);
    }
}

#[test]
fn latent_correlations_are_the_ones_asked_for() {
    let units = 40_000;
    let matrix =
        "{ kind = \"matrix\", values = [[1.0, 0.5, 0.2], [0.5, 1.0, -0.3], [0.2, -0.3, 1.0]] }";
    for (kind, expected) in [
        (
            "{ kind = \"autoregressive\", rho = -0.6 }",
            [-0.6, 0.36, -0.6],
        ),
        ("{ kind = \"exchangeable\", rho = 0.4 }", [0.4, 0.4, 0.4]),
        (matrix, [0.5, 0.2, -0.3]),
    ] {
        let population = format!(
            "covariates = [{{ name = \"x\", law = \"normal\", count = 3 }}]\ncorrelation = {kind}"
        );
        let (study, trial) = simulate(&one_batch(units, &population, "", "x1"));
        let columns: Vec<Vec<f64>> = (0..3).map(|index| column(&study, &trial, index)).collect();
        for ((a, b), rho) in [(0, 1), (0, 2), (1, 2)].into_iter().zip(expected) {
            let error = (1.0 - rho * rho) / (units as f64).sqrt();
            let found = correlation(&columns[a], &columns[b]);
            assert_within_mc(&format!("{kind} {a}{b}"), found, rho, error, 5.0);
        }
    }
}

#[test]
fn noise_spread_follows_its_covariate() {
    let outcome = "noise = { law = \"student-t\", df = 8, sd = 2.0, log_sd_slope = { covariate = \
                   \"x\", slope = 0.5 } }";
    let population = "covariates = [{ name = \"x\", law = \"bernoulli\", probability = 0.5 }]";
    let (study, trial) = simulate(&one_batch(40_000, population, outcome, "x"));
    let x = column(&study, &trial, 0);
    for (level, expected) in [(0.0, 4.0), (1.0, 4.0 * std::f64::consts::E)] {
        let squares: Vec<f64> = (0..trial.rows())
            .filter(|&row| (x[row] - level).abs() < 0.5)
            .map(|row| (trial.outcomes()[row] - trial.expected()[row]).powi(2))
            .collect();
        let error = (variance(&squares) / squares.len() as f64).sqrt();
        assert_within_mc(
            &format!("x = {level}"),
            mean(&squares),
            expected,
            error,
            5.0,
        );
    }
}

const TWO_ARMS: &str = r#"
format = 1
[study]
title = "looks"
[population]
covariates = [{ name = "x", law = "normal" }]
[arms]
names = ["a", "b"]
[outcome]
family = "normal"
delay = DELAY
drift = { kind = "step", from = 2, size = 5.0 }
[[truth]]
name = "effect"
coefficients = { b = 0.3 }
[[batch]]
size = 20
repeat = 2
[[batch]]
size = 20
allocate = { rule = "thompson", variance = "known", known_sd = 1.0 }
[[estimand]]
name = "effect"
contrast = { b = 1.0 }
[[method]]
kind = "least-squares"
[precision]
trials = 10
seed = 2
"#;

/// The logged probability of batch 3 is that of the outcomes that are due, and of no others.
#[test]
fn a_rule_sees_only_outcomes_that_are_due() {
    for (delay, due) in [(0, 40), (1, 20)] {
        let (_, trial) = simulate(&TWO_ARMS.replace("DELAY", &delay.to_string()));
        let arm = |wanted: usize| -> Vec<f64> {
            (0..due)
                .filter(|&row| trial.arms()[row] == wanted)
                .map(|row| trial.outcomes()[row])
                .collect()
        };
        let (a, b) = (arm(0), arm(1));
        let sd = (1.0 / a.len() as f64 + 1.0 / b.len() as f64).sqrt();
        let expected = normal_cdf((mean(&b) - mean(&a)) / sd);
        let logged = trial.allocation_probabilities(45)[1];
        assert!(
            (logged - expected).abs() < 1e-12,
            "delay {delay}: {logged} for {expected}"
        );
    }
}

#[test]
fn a_step_of_drift_shifts_the_later_batches() {
    let (_, trial) = simulate(&TWO_ARMS.replace("DELAY", "0"));
    for row in 0..60 {
        let effect = if trial.arms()[row] == 1 { 0.3 } else { 0.0 };
        let shift = if row >= 20 { 5.0 } else { 0.0 };
        assert!(
            (trial.expected()[row] - effect - shift).abs() < 1e-12,
            "row {row}"
        );
    }
}

/// Leaving out a covariate that is correlated with the one of interest moves the estimand to its
/// population projection, `β₁ + ρβ₂` for standard normals, and least squares is unbiased for that.
#[test]
fn a_misspecified_analysis_has_its_projection_as_the_truth() {
    let text = one_batch(
        200,
        "covariates = [{ name = \"x\", law = \"normal\", count = 2 }]\n\
         correlation = { kind = \"exchangeable\", rho = 0.5 }",
        "coefficients = { x1 = 1.0, x2 = 0.8 }",
        "x1",
    );
    let text = text
        .replace(
            "[[batch]]",
            "[analysis]\nregressors = [\"intercept\", \"x1\"]\n[[batch]]",
        )
        .replace("trials = 10", "trials = 4000");
    let study = Study::prepare(&plan(&text));
    let found = study.true_values(0)[0];
    assert!(
        found.error > 0.0 && found.error < 0.01,
        "it says how exact it is: {found:?}"
    );
    assert_within_mc("projection", found.value, 1.4, found.error, 5.0);
    let (bias, mcse) = value(&results(&text)[0], 0, Measure::Bias);
    assert_within_mc("bias", bias, 0.0, mcse.hypot(found.error), 5.0);
}

/// Every roster unit is enrolled at most once, and the recorded outcome is what the trial sees.
#[test]
fn roster_units_are_drawn_without_replacement() {
    let folder = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("scenarios");
    let text = std::fs::read_to_string(folder.join("diabetes-roster.toml")).unwrap();
    let scenario = windage::scenario::Scenario::parse(&text, "roster.toml", &folder).unwrap();
    let study = Study::prepare(&windage::plan::resolve(&scenario).unwrap());
    let recorded = study.recorded_outcomes().expect("recorded");
    let mut worker = Worker::new(&study);
    for index in 0..20 {
        worker.simulate(0, Phase::Replay, index);
        let trial = worker.trial();
        let mut sources = trial.sources().to_vec();
        for (row, &source) in sources.iter().enumerate() {
            assert!((trial.outcomes()[row] - recorded[source]).abs() < f64::EPSILON);
        }
        sources.sort_unstable();
        sources.dedup();
        assert_eq!(sources.len(), 200);
    }
}
