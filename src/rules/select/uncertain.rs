//! Prediction variance of candidates.

use crate::numerics::kernels::{Columns, Kernels};
use crate::plan::Term;
use crate::population::Pool;
use crate::rules::WorkingFit;

/// `x'(S + λI)^{-1}x` for every candidate, with arm terms at the reference arm.
pub(super) fn score(
    fit: &WorkingFit,
    pool: &Pool,
    kernels: Kernels,
    scratch: &mut Vec<f64>,
    tile: &mut Vec<f64>,
    scores: &mut Vec<f64>,
) {
    let count = pool.count();
    let p = fit.terms().len();
    scratch.clear();
    scratch.resize(count * p, 0.0);
    for (index, term) in fit.terms().iter().enumerate() {
        let target = &mut scratch[index * count..(index + 1) * count];
        match *term {
            Term::Intercept => target.fill(1.0),
            Term::Covariate(column) => {
                target.copy_from_slice(pool.covariates().column(column));
            }
            Term::Arm(_) | Term::ArmCovariate { .. } => {}
        }
    }
    scores.clear();
    scores.resize(count, 0.0);
    if count == 0 {
        return;
    }
    let rows = Columns::new(scratch, count, 0, count);
    kernels.leverages(rows, fit.order(), fit.factor(), tile, scores);
}
