//! Every method against its definition, computed in the plainest way with a reference library.

mod common;

use nalgebra::{DMatrix, DVector};
use windage::methods::Answer;
use windage::replay::{Study, Worker};
use windage::score::BlockRecord;
use windage::streams::Phase;
use windage::trial::Trial;

const SCENARIO: &str = r#"
format = 1
[study]
title = "definitions"
[population]
covariates = [
  { name = "x", law = "normal", count = 3 },
  { name = "dose", law = "gamma", shape = 2.0 },
]
correlation = { kind = "exchangeable", rho = 0.3 }
[arms]
names = ["a", "b"]
[outcome]
family = "normal"
intercept = 1.0
noise = { law = "normal", sd = 1.5 }
[[truth]]
name = "effect"
coefficients = { x = 0.2, b = 0.4, "b:x2" = 0.3 }
[analysis]
regressors = ["intercept", "arms", "covariates", "b:x2"]
[[batch]]
size = 30
[[batch]]
size = 24
select = { rule = "top-quantile", fraction = 0.3, score = "predicted-outcome", arm = "b" }
allocate = { rule = "thompson", floor = 0.2 }
[[batch]]
size = 36
select = { rule = "uncertain", fraction = 0.5 }
allocate = { rule = "epsilon-greedy", epsilon = 0.4 }
[[estimand]]
name = "effect"
contrast = { b = 1.0 }
[[estimand]]
name = "mixed"
contrast = { x1 = 1.0, x3 = -2.0, "b:x2" = 0.5 }
[[method]]
kind = "least-squares"
[[method]]
kind = "least-squares"
variance = "HC2"
[[method]]
kind = "ridge"
penalty = 3.0
[[method]]
kind = "first-batch"
[[method]]
kind = "last-batch"
[[method]]
kind = "batch-combined"
[[method]]
kind = "inverse-variance"
[[method]]
kind = "w-decorrelation"
penalty = 4.0
[[method]]
kind = "w-decorrelation"
penalty = 4.0
steps = "batches"
error = "remainder-aware"
[[method]]
kind = "anticipated-decorrelation"
[[method]]
kind = "predictable-pivot"
[[method]]
kind = "self-normalised"
bound = 2.0
penalty = 0.5
[precision]
trials = 10
seed = 6
"#;

const METHODS: usize = 12;

struct Regression {
    coefficients: DVector<f64>,
    inverse: DMatrix<f64>,
    residuals: DVector<f64>,
    degrees: f64,
}

impl Regression {
    fn of(x: &DMatrix<f64>, y: &DVector<f64>) -> Self {
        let inverse = (x.transpose() * x).try_inverse().expect("full rank");
        let coefficients = &inverse * x.transpose() * y;
        let residuals = y - x * &coefficients;
        Self {
            coefficients,
            inverse,
            residuals,
            degrees: (x.nrows() - x.ncols()) as f64,
        }
    }
}

/// Analysis design and outcomes of some rows.
fn rows(
    study: &Study,
    trial: &Trial,
    range: std::ops::Range<usize>,
) -> (DMatrix<f64>, DVector<f64>) {
    let columns = study.analysis();
    let x = DMatrix::from_fn(range.len(), columns.len(), |row, column| {
        trial.value(range.start + row, columns[column])
    });
    (x, DVector::from_column_slice(&trial.outcomes()[range]))
}

/// The matrix W of W-decorrelation, by its own recursion: column `w_i = R_{i-1}x_i/(λ+‖x_i‖²)`,
/// `R_i = R_{i-1} - w_i x_i'`.
fn decorrelating_matrix(x: &DMatrix<f64>, penalty: f64) -> DMatrix<f64> {
    let mut rest = DMatrix::identity(x.ncols(), x.ncols());
    let mut w = DMatrix::zeros(x.ncols(), x.nrows());
    for i in 0..x.nrows() {
        let row = x.row(i).transpose();
        let column = &rest * &row / (penalty + row.norm_squared());
        rest -= &column * row.transpose();
        w.set_column(i, &column);
    }
    w
}

/// Information per unit of batch 1, shrunk towards a multiple of the identity.
fn information_per_unit(x: &DMatrix<f64>) -> DMatrix<f64> {
    let (n, p) = (x.nrows() as f64, x.ncols() as f64);
    let own = x.transpose() * x / n;
    let level = own.trace() / p;
    let weight = (p / n).min(1.0);
    own * (1.0 - weight) + DMatrix::identity(x.ncols(), x.ncols()) * (weight * level)
}

/// Weights `a_k = X_k(S_k + F_k)^{-1}r` of every batch, one after another, and the last `r`.
fn decorrelating_weights(
    batches: &[DMatrix<f64>],
    c: &DVector<f64>,
    anticipated: impl Fn(usize) -> DMatrix<f64>,
) -> (DVector<f64>, DVector<f64>) {
    let mut rest = c.clone();
    let mut weights = Vec::new();
    for (batch, x) in batches.iter().enumerate() {
        let gram = x.transpose() * x;
        let b = (&gram + anticipated(batch)).try_inverse().unwrap() * &rest;
        weights.extend((x * &b).iter());
        rest -= gram * b;
    }
    (DVector::from_vec(weights), rest)
}

/// The weights of the predictable pivot, from its definition, and the scale they end at.
fn pivot_weights(batches: &[DMatrix<f64>], c: &DVector<f64>) -> (DVector<f64>, f64) {
    let per_unit = information_per_unit(&batches[0]);
    let p = c.len() as f64;
    let mut to_come: f64 = batches.iter().map(|x| x.nrows() as f64).sum();
    let mut reached = DVector::zeros(c.len());
    let (mut left, mut scale, mut weights) = (1.0, 0.0, Vec::new());
    for (batch, x) in batches.iter().enumerate() {
        to_come -= x.nrows() as f64;
        let last = batch + 1 == batches.len();
        let units = if last {
            0.0
        } else {
            (to_come - p - 1.0).max(0.0)
        };
        let gram = x.transpose() * x;
        let inverse = (&gram + &per_unit * units).try_inverse().unwrap();
        let (m_c, m_g) = (&inverse * c, &inverse * &reached);
        let (a, b, g) = (c.dot(&m_c), c.dot(&m_g), reached.dot(&m_g));
        scale = (b + (b * b - a * (g - left)).sqrt()) / a;
        let direction = m_c * scale - m_g;
        let own = x * &direction;
        left -= own.norm_squared();
        assert!(last || left > 0.005, "the cap is not met in this scenario");
        reached += gram * direction;
        weights.extend(own.iter());
    }
    (DVector::from_vec(weights), scale)
}

#[track_caller]
fn assert_answer(label: &str, found: Answer, point: f64, standard_error: f64) {
    let close = |a: f64, b: f64| (a - b).abs() <= 1e-9 * (1.0 + b.abs());
    assert!(
        close(found.point, point),
        "{label}: point {} for {point}",
        found.point
    );
    let error = found.standard_error;
    assert!(
        close(error, standard_error),
        "{label}: standard error {error} for {standard_error}"
    );
    assert!(found.lower < found.point && found.point < found.upper);
    let centre = found.lower.midpoint(found.upper);
    assert!(
        close(centre, found.point),
        "{label}: the interval is symmetric"
    );
}

#[test]
#[allow(clippy::too_many_lines)] // one definition after the other
fn every_method_computes_its_definition() {
    let study = Study::prepare(&common::plan(SCENARIO));
    let mut worker = Worker::new(&study);
    for index in 0..10 {
        let mut record = BlockRecord::default();
        worker.set_truth(0);
        worker.simulate(0, Phase::Replay, index);
        worker.score_into(&mut record);
        let trial = worker.trial();
        let (x, y) = rows(&study, trial, 0..trial.rows());
        let all = Regression::of(&x, &y);
        let batches: Vec<(Regression, f64)> = (0..3)
            .map(|batch| {
                let range = trial.batch_rows(batch);
                let share = range.len() as f64 / 90.0;
                let (x, y) = rows(&study, trial, range);
                (Regression::of(&x, &y), share)
            })
            .collect();
        for (estimand, named) in study.plan().estimands.iter().enumerate() {
            let c = DVector::from_column_slice(&named.contrasts[0]);
            let answer =
                |method: usize| record.estimates[estimand * METHODS + method].expect("an answer");
            let variance = all.residuals.norm_squared() / all.degrees;
            let unit = c.dot(&(&all.inverse * &c));
            let point = c.dot(&all.coefficients);
            assert_answer("least squares", answer(0), point, (variance * unit).sqrt());
            let a = &x * &all.inverse * &c;
            let hat = &x * &all.inverse * x.transpose();
            let sandwich: f64 = (0..90)
                .map(|i| (a[i] * all.residuals[i]).powi(2) / (1.0 - hat[(i, i)]))
                .sum();
            assert_answer("HC2", answer(1), point, sandwich.sqrt());
            let mut penalty = DMatrix::identity(x.ncols(), x.ncols()) * 3.0;
            penalty[(0, 0)] = 0.0;
            let gram = x.transpose() * &x;
            let inverse = (&gram + penalty).try_inverse().unwrap();
            let ridge = &inverse * x.transpose() * &y;
            let effective = (&inverse * &gram).trace();
            let left = (&y - &x * &ridge).norm_squared() / (90.0 - effective);
            let spread = (&inverse * &gram * &inverse * &c).dot(&c);
            assert_answer("ridge", answer(2), c.dot(&ridge), (left * spread).sqrt());
            for (method, batch) in [(3, 0), (4, 2)] {
                let own = &batches[batch].0;
                let variance = own.residuals.norm_squared() / own.degrees;
                let error = (variance * (&own.inverse * &c).dot(&c)).sqrt();
                assert_answer("one batch", answer(method), c.dot(&own.coefficients), error);
            }
            let squares: f64 = batches
                .iter()
                .map(|batch| batch.0.residuals.norm_squared())
                .sum();
            let degrees: f64 = batches.iter().map(|batch| batch.0.degrees).sum();
            let within = (squares / degrees).sqrt();
            let parts: Vec<(f64, f64, f64)> = batches
                .iter()
                .map(|(own, share)| {
                    (
                        c.dot(&own.coefficients),
                        (&own.inverse * &c).dot(&c),
                        *share,
                    )
                })
                .collect();
            let kappas: f64 = parts.iter().map(|(_, v, q)| (q / v).sqrt()).sum();
            let combined: f64 = parts.iter().map(|(t, v, q)| (q / v).sqrt() * t).sum();
            assert_answer(
                "batch-combined",
                answer(5),
                combined / kappas,
                within / kappas,
            );
            let information: f64 = parts.iter().map(|(_, v, _)| 1.0 / v).sum();
            let weighted: f64 = parts.iter().map(|(t, v, _)| t / v).sum();
            let error = within / information.sqrt();
            assert_answer("inverse variance", answer(6), weighted / information, error);
            let w = decorrelating_matrix(&x, 4.0);
            let weights = w.transpose() * &c;
            let corrected = point + weights.dot(&all.residuals);
            let error = variance.sqrt() * weights.norm();
            assert_answer("W-decorrelation", answer(7), corrected, error);
            let designs: Vec<DMatrix<f64>> = (0..3)
                .map(|k| rows(&study, trial, trial.batch_rows(k)).0)
                .collect();
            let identity = DMatrix::identity(x.ncols(), x.ncols());
            let debiased = |weights: &DVector<f64>, rest: &DVector<f64>, sd: f64| {
                let whole = weights + &x * &all.inverse * rest;
                (point + weights.dot(&all.residuals), sd * whole.norm())
            };
            let (weights, rest) = decorrelating_weights(&designs, &c, |_| &identity * 4.0);
            let (corrected, error) = debiased(&weights, &rest, variance.sqrt());
            assert_answer("W-decorrelation by batches", answer(8), corrected, error);
            let per_unit = information_per_unit(&designs[0]);
            let (weights, rest) = decorrelating_weights(&designs, &c, |batch| {
                let to_come: usize = designs[batch + 1..].iter().map(DMatrix::nrows).sum();
                &per_unit * (to_come as f64 + 90.0 / 16.0)
            });
            let (corrected, error) = debiased(&weights, &rest, within);
            assert_answer("anticipated decorrelation", answer(9), corrected, error);
            let (weights, scale) = pivot_weights(&designs, &c);
            assert!(
                (weights.norm_squared() - 1.0).abs() < 1e-9,
                "the budget is spent"
            );
            let closed = x.transpose() * &weights - &c * scale;
            assert!(
                closed.norm() < 1e-9 * scale,
                "the weights end at the contrast"
            );
            assert_answer(
                "predictable pivot",
                answer(10),
                weights.dot(&y) / scale,
                within / scale,
            );
            let regularised = &gram + &identity * 0.5;
            let inverse = regularised.clone().try_inverse().unwrap();
            let direction = &inverse * &c;
            let error = (variance * (&gram * &direction).dot(&direction)).sqrt();
            let centre = direction.dot(&(x.transpose() * &y));
            assert_answer("self-normalised", answer(11), centre, error);
            let log_ratio = regularised.determinant().ln() - c.len() as f64 * 0.5f64.ln();
            let radius = variance.sqrt() * (log_ratio + 2.0 * 20.0f64.ln()).sqrt();
            let half_width = c.dot(&direction).sqrt() * (radius + 0.5f64.sqrt() * 2.0);
            assert!((answer(11).width() / 2.0 - half_width).abs() < 1e-9 * half_width);
        }
    }
}

/// Methods do not depend on the order of units inside a batch (W-decorrelation does, by design),
/// and scale with the outcome: simulated by scaling every parameter of the truth.
#[test]
fn answers_scale_with_the_outcome() {
    let scaled = SCENARIO
        .replace("intercept = 1.0", "intercept = 10.0")
        .replace("sd = 1.5", "sd = 15.0")
        .replace(
            "x = 0.2, b = 0.4, \"b:x2\" = 0.3",
            "x = 2.0, b = 4.0, \"b:x2\" = 3.0",
        );
    let record = |text: &str| {
        let study = Study::prepare(&common::plan(text));
        let mut worker = Worker::new(&study);
        let mut record = BlockRecord::default();
        worker.simulate(0, Phase::Replay, 3);
        worker.score_into(&mut record);
        record
    };
    let (one, ten) = (record(SCENARIO), record(&scaled));
    for (index, (small, large)) in one.estimates.iter().zip(&ten.estimates).enumerate() {
        if index % METHODS == METHODS - 1 {
            // The bound of the self-normalised ellipsoid is on a scale of its own.
            continue;
        }
        let (small, large) = (small.expect("an answer"), large.expect("an answer"));
        assert!((large.point - 10.0 * small.point).abs() < 1e-8 * (1.0 + large.point.abs()));
        let error = large.standard_error;
        assert!((error - 10.0 * small.standard_error).abs() < 1e-8 * error);
    }
}

/// A batch that cannot identify the contrast is an answer refused, with its reason, and never
/// dropped.
#[test]
fn a_batch_without_the_contrast_is_refused() {
    let text = SCENARIO.replace(
        "allocate = { rule = \"thompson\", floor = 0.2 }",
        "allocate = { rule = \"fixed\", shares = { a = 1.0, b = 0.0 } }",
    );
    let study = Study::prepare(&common::plan(&text));
    let mut worker = Worker::new(&study);
    let mut record = BlockRecord::default();
    worker.simulate(0, Phase::Replay, 0);
    worker.score_into(&mut record);
    let reason = Err(windage::methods::NoAnswer::BatchRankDeficient);
    assert_eq!(record.estimates[5], reason, "batch-combined");
    assert_eq!(record.estimates[6], reason, "inverse variance");
    assert!(record.estimates[0].is_ok() && record.estimates[3].is_ok());
}
