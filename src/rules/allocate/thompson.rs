//! Thompson allocation for normal outcomes, without covariates.

use super::ArmSummaries;
use crate::numerics::quadrature::probability_of_being_largest;
use crate::plan::OutcomeVariance;

/// Posterior probability that each arm has the largest mean (Thompson 1933): posterior precision
/// `n/σ² + 1/τ²`, posterior mean the precision-weighted mean of prior and data. With the variance
/// estimated, the pooled within-arm variance takes the place of `σ²`. Arms without outcomes under
/// a flat prior make all arms equally probable.
pub(super) fn probabilities(
    summaries: &mut ArmSummaries,
    variance: OutcomeVariance,
    prior_mean: f64,
    prior_sd: f64,
    out: &mut [f64],
) {
    let variance = match variance {
        OutcomeVariance::Known { sd } => sd * sd,
        OutcomeVariance::Estimated => summaries.pooled_variance(),
    };
    let prior_precision = 1.0 / (prior_sd * prior_sd);
    let undecided =
        variance.is_nan() || (prior_precision == 0.0 && summaries.counts.contains(&0.0));
    if undecided {
        out.fill(1.0 / out.len() as f64);
        return;
    }
    for arm in 0..out.len() {
        let from_outcomes = summaries.counts[arm] / variance;
        let precision = from_outcomes + prior_precision;
        summaries.sds[arm] = (1.0 / precision).sqrt();
        if from_outcomes.is_finite() {
            summaries.means[arm] =
                (from_outcomes * summaries.means[arm] + prior_precision * prior_mean) / precision;
        }
    }
    probability_of_being_largest(&summaries.means, &summaries.sds, out);
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::numerics::distribution::normal_cdf;

    #[test]
    fn two_arms_follow_the_closed_form() {
        let mut summaries = ArmSummaries::new(2);
        summaries.counts = vec![20.0, 30.0];
        summaries.means = vec![0.2, 0.5];
        let mut out = [0.0; 2];
        let known = OutcomeVariance::Known { sd: 1.5 };
        probabilities(&mut summaries, known, 0.0, f64::INFINITY, &mut out);
        let sd = 1.5 * (1.0f64 / 20.0 + 1.0 / 30.0).sqrt();
        assert!((out[1] - normal_cdf(0.3 / sd)).abs() < 1e-12);
        assert!((out[0] + out[1] - 1.0).abs() < 1e-12);
    }

    #[test]
    fn an_unseen_arm_under_a_flat_prior_makes_arms_equal() {
        let mut summaries = ArmSummaries::new(2);
        summaries.counts = vec![20.0, 0.0];
        let mut out = [0.0; 2];
        let known = OutcomeVariance::Known { sd: 1.0 };
        probabilities(&mut summaries, known, 0.0, f64::INFINITY, &mut out);
        assert!((out[0] - 0.5).abs() < 1e-15);
    }
}
