//! Scores of candidates: linear in their covariates.

use crate::numerics::kernels::Kernels;
use crate::plan::{Design, Score, Term};
use crate::population::Pool;
use crate::rules::{Past, WorkingFit};

/// A score ready to be computed.
#[derive(Debug, Clone)]
pub(super) struct Scorer {
    score: Score,
    fit: Option<WorkingFit>,
    columns: Vec<usize>,
    slopes: Vec<f64>,
}

impl Scorer {
    pub(super) fn new(score: &Score, design: &Design, used: &[usize]) -> Self {
        Self {
            score: score.clone(),
            fit: score.fit().map(|fit| WorkingFit::new(fit, design, used)),
            columns: (0..design.covariates).collect(),
            slopes: vec![0.0; design.covariates],
        }
    }

    /// Score of every candidate of the pool.
    pub(super) fn score(
        &mut self,
        past: &Past<'_>,
        pool: &Pool,
        kernels: Kernels,
        scores: &mut Vec<f64>,
    ) {
        let constant = self.update(past, kernels);
        scores.clear();
        scores.resize(pool.count(), constant);
        kernels.add_combination(pool.covariates(), &self.columns, &self.slopes, scores);
    }

    /// Slope of the score on each covariate column, as of the last update.
    pub(super) fn slopes(&self) -> &[f64] {
        &self.slopes
    }

    /// Fits the working model and sets the slopes; returns the constant of the score.
    pub(super) fn update(&mut self, past: &Past<'_>, kernels: Kernels) -> f64 {
        self.slopes.fill(0.0);
        let mut constant = 0.0;
        if let Some(fit) = &mut self.fit {
            fit.update(past, kernels);
        }
        let coefficients = self.fit.iter().flat_map(WorkingFit::coefficients);
        match self.score {
            Score::PredictedOutcome { arm: target, .. } => {
                for (term, value) in coefficients {
                    match term {
                        Term::Intercept => constant += value,
                        Term::Arm(arm) if arm == target => constant += value,
                        Term::Covariate(column) => self.slopes[column] += value,
                        Term::ArmCovariate { arm, column } if arm == target => {
                            self.slopes[column] += value;
                        }
                        Term::Arm(_) | Term::ArmCovariate { .. } => {}
                    }
                }
            }
            Score::PredictedContrast { arm: target, .. } => {
                for (term, value) in coefficients {
                    match term {
                        Term::Arm(arm) if arm == target => constant += value,
                        Term::ArmCovariate { arm, column } if arm == target => {
                            self.slopes[column] += value;
                        }
                        _ => {}
                    }
                }
            }
            Score::Covariate { column } => self.slopes[column] = 1.0,
        }
        constant
    }
}
