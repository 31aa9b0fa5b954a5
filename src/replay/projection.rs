//! True values of the estimands.

use super::{Study, TrueValue};
use crate::numerics::kernels::{Columns, Kernels};
use crate::numerics::least_squares::LeastSquares;
use crate::plan::{Model, Source, Term, Truth};
use crate::population::Pool;
use crate::streams::{Phase, Streams};

/// Units in the projection sample, and in one chunk of it.
const SAMPLE: usize = 1 << 18;
const CHUNK: usize = 1 << 12;

/// True value of every estimand under every truth.
///
/// Where the analysis model holds every term of the truth, the contrast of the true coefficients.
/// Otherwise the contrast of the population projection `argmin E(μ - x'β)²`, units drawn from the
/// unselected population and arms equally likely: `β` plus the projection of the omitted part,
/// estimated from a large sample in streams of its own, with its Monte Carlo standard error. For a
/// roster with recorded outcomes, the least-squares fit on the whole roster.
pub(super) fn true_values(study: &Study) -> Vec<Vec<TrueValue>> {
    let plan = study.plan();
    if let (Some(outcomes), Source::Roster(roster)) =
        (study.recorded_outcomes(), &plan.population.source)
    {
        let coefficients = roster_fit(study, &roster.values, roster.len(), outcomes);
        let values = plan
            .estimands
            .iter()
            .map(|estimand| TrueValue {
                value: combine(&estimand.contrasts[0], &coefficients),
                error: 0.0,
            })
            .collect();
        return vec![values];
    }
    (0..plan.truths.len())
        .map(|truth| under_truth(study, truth))
        .collect()
}

fn combine(contrast: &[f64], coefficients: &[f64]) -> f64 {
    contrast.iter().zip(coefficients).map(|(c, b)| c * b).sum()
}

fn under_truth(study: &Study, index: usize) -> Vec<TrueValue> {
    let plan = study.plan();
    let truth = &plan.truths[index];
    let included: Vec<f64> = plan
        .analysis
        .terms
        .iter()
        .map(|&term| coefficient(truth, term))
        .collect();
    let omitted = omitted_terms(truth, &plan.analysis);
    let (projection, errors) = if omitted.is_empty() {
        (vec![0.0; included.len()], vec![0.0; plan.estimands.len()])
    } else {
        let contrasts: Vec<&[f64]> = plan
            .estimands
            .iter()
            .map(|e| e.contrasts[index].as_slice())
            .collect();
        project(study, &omitted, &contrasts)
    };
    plan.estimands
        .iter()
        .zip(errors)
        .map(|(estimand, error)| {
            let contrast = &estimand.contrasts[index];
            let value = combine(contrast, &included) + combine(contrast, &projection);
            TrueValue { value, error }
        })
        .collect()
}

/// True coefficient of a term.
fn coefficient(truth: &Truth, term: Term) -> f64 {
    match term {
        Term::Intercept => truth.intercept,
        Term::Arm(arm) => truth.arm_effects.get(arm).copied().unwrap_or(0.0),
        Term::Covariate(column) => truth.slopes[column],
        Term::ArmCovariate { arm, column } => truth
            .interactions
            .get(arm)
            .map_or(0.0, |slopes| slopes[column]),
    }
}

/// Terms with a coefficient that the model leaves out.
fn omitted_terms(truth: &Truth, model: &Model) -> Vec<(Term, f64)> {
    let mut terms = vec![Term::Intercept];
    terms.extend((1..truth.arm_effects.len()).map(Term::Arm));
    terms.extend((0..truth.slopes.len()).map(Term::Covariate));
    for (arm, slopes) in truth.interactions.iter().enumerate().skip(1) {
        terms.extend((0..slopes.len()).map(|column| Term::ArmCovariate { arm, column }));
    }
    terms
        .into_iter()
        .map(|term| (term, coefficient(truth, term)))
        .filter(|&(term, value)| value != 0.0 && model.position(term).is_none())
        .collect()
}

/// One population sample in chunks: covariates and a balanced set of arms.
struct Sample<'a> {
    study: &'a Study,
    pool: Pool,
    rows: Vec<f64>,
    part: Vec<f64>,
}

impl<'a> Sample<'a> {
    fn new(study: &'a Study) -> Self {
        let pool = Pool::new(study.design().covariates);
        Self {
            study,
            pool,
            rows: Vec::new(),
            part: Vec::new(),
        }
    }

    /// Calls `visit(model rows, omitted part)` for every chunk and arm, always the same sample.
    fn visit(&mut self, omitted: &[(Term, f64)], mut visit: impl FnMut(Columns<'_>, &[f64])) {
        let plan = self.study.plan();
        let arms = plan.arm_count().max(1);
        let roster_rows = match &plan.population.source {
            Source::Roster(roster) => roster.len(),
            Source::Law(_) => 0,
        };
        let chunks = if roster_rows > 0 { 1 } else { SAMPLE / CHUNK };
        for chunk in 0..chunks {
            let streams = Streams::new(plan.precision.seed, Phase::Projection, chunk as u64);
            self.pool.reset(roster_rows);
            let count = if roster_rows > 0 { roster_rows } else { CHUNK };
            self.study
                .sampler()
                .draw(&streams, 0, 0, count, &mut self.pool);
            for arm in 0..arms {
                self.rows.clear();
                for &term in &plan.analysis.terms {
                    let start = self.rows.len();
                    self.rows.resize(start + count, 0.0);
                    add_term(&self.pool, term, arm, 1.0, &mut self.rows[start..]);
                }
                self.part.clear();
                self.part.resize(count, 0.0);
                for &(term, value) in omitted {
                    add_term(&self.pool, term, arm, value, &mut self.part);
                }
                visit(Columns::new(&self.rows, count, 0, count), &self.part);
            }
        }
    }
}

/// Adds `factor × term` to `out` for candidates in arm `own`.
fn add_term(pool: &Pool, term: Term, own: usize, factor: f64, out: &mut [f64]) {
    let column = match term {
        Term::Intercept => None,
        Term::Arm(arm) if arm == own => None,
        Term::ArmCovariate { arm, column } if arm == own => Some(column),
        Term::Covariate(column) => Some(column),
        Term::Arm(_) | Term::ArmCovariate { .. } => return,
    };
    match column {
        None => out.iter_mut().for_each(|value| *value += factor),
        Some(column) => {
            for (value, x) in out.iter_mut().zip(pool.covariates().column(column)) {
                *value += factor * x;
            }
        }
    }
}

/// Coefficients of the omitted part on the analysis model, and the Monte Carlo standard error of
/// each contrast of them.
fn project(study: &Study, omitted: &[(Term, f64)], contrasts: &[&[f64]]) -> (Vec<f64>, Vec<f64>) {
    let kernels: Kernels = study.kernels();
    let p = study.analysis().len();
    let all: Vec<usize> = (0..p).collect();
    let mut factor = vec![0.0; p * p];
    let mut coefficients = vec![0.0; p];
    let (mut gram, mut cross) = (vec![0.0; p * p], vec![0.0; p]);
    let mut sample = Sample::new(study);
    sample.visit(omitted, |rows, part| {
        kernels.gram(rows, &all, &mut gram);
        kernels.cross(rows, &all, part, &mut cross);
        kernels.add_scaled(1.0, &gram, &mut factor);
        kernels.add_scaled(1.0, &cross, &mut coefficients);
    });
    kernels.cholesky(&mut factor, p, f64::EPSILON);
    kernels.solve_lower(&factor, p, &mut coefficients);
    kernels.solve_lower_transposed(&factor, p, &mut coefficients);
    // A whole roster is the population itself: no sampling error.
    if matches!(study.plan().population.source, Source::Roster(_)) {
        return (coefficients, vec![0.0; contrasts.len()]);
    }
    // Variance of c'γ̂ = Σ (c'S^{-1}x_i) r_i by the sandwich formula.
    let directions: Vec<Vec<f64>> = contrasts
        .iter()
        .map(|contrast| {
            let mut direction = contrast.to_vec();
            kernels.solve_lower(&factor, p, &mut direction);
            kernels.solve_lower_transposed(&factor, p, &mut direction);
            direction
        })
        .collect();
    let mut variances = vec![0.0; contrasts.len()];
    let negative: Vec<f64> = coefficients.iter().map(|value| -value).collect();
    let (mut residuals, mut weights) = (Vec::new(), Vec::new());
    sample.visit(omitted, |rows, part| {
        residuals.clear();
        residuals.extend_from_slice(part);
        kernels.add_combination(rows, &all, &negative, &mut residuals);
        for (direction, variance) in directions.iter().zip(&mut variances) {
            weights.clear();
            weights.resize(part.len(), 0.0);
            kernels.add_combination(rows, &all, direction, &mut weights);
            let products = weights
                .iter()
                .zip(&residuals)
                .map(|(w, r)| (w * r) * (w * r));
            *variance += products.sum::<f64>();
        }
    });
    (coefficients, variances.into_iter().map(f64::sqrt).collect())
}

/// Least squares of the recorded outcomes on the analysis model over the whole roster.
fn roster_fit(study: &Study, values: &[f64], rows: usize, outcomes: &[f64]) -> Vec<f64> {
    let terms = &study.plan().analysis.terms;
    let mut design = Vec::with_capacity(rows * terms.len());
    for term in terms {
        match *term {
            Term::Covariate(column) => {
                design.extend_from_slice(&values[column * rows..(column + 1) * rows]);
            }
            // A roster with recorded outcomes has no arms, so the rest is the intercept.
            _ => design.extend(std::iter::repeat_n(1.0, rows)),
        }
    }
    let columns: Vec<usize> = (0..terms.len()).collect();
    let mut fit = LeastSquares::new();
    match fit.fit(&design, rows, rows, &columns, outcomes) {
        Ok(()) => fit.coefficients().to_vec(),
        Err(_) => vec![f64::NAN; terms.len()],
    }
}
