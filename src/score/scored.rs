//! Which answers can enter the sums of a tally.

use crate::methods::{Answer, Estimate, NoAnswer};
use crate::numerics::distribution::normal_cdf;

use super::moments::real;

/// Equiprobable bins of the standard normal law for the Kolmogorov distance.
pub(crate) const NORMAL_BINS: usize = 4096;

/// Largest magnitude of an estimate or limit: its fourth power must stay finite when summed.
const LARGEST: f64 = 1e70;
/// Smallest standard error: the square of its square must not vanish.
const SMALLEST_STANDARD_ERROR: f64 = 1e-70;
/// Largest studentised error: its eighth power must stay finite when summed.
const LARGEST_STUDENTISED: f64 = 1e35;

/// An answer fit to enter the sums, and its errors.
pub(crate) struct Scored {
    pub answer: Answer,
    pub error: f64,
    pub studentised: f64,
}

/// Checks that an answer can enter the sums.
///
/// An answer whose numbers are not finite, whose limits are in the wrong order, or whose standard
/// error is zero to working precision counts as [`NoAnswer::DegenerateVariance`].
pub(crate) fn scored(estimate: &Estimate, true_value: f64) -> Result<Scored, NoAnswer> {
    let answer = (*estimate)?;
    let error = answer.point - true_value;
    let studentised = error / answer.standard_error;
    // Written so that NaN fails each comparison.
    let in_range = [answer.point, answer.lower, answer.upper]
        .iter()
        .all(|value| value.abs() <= LARGEST)
        && (SMALLEST_STANDARD_ERROR..=LARGEST).contains(&answer.standard_error)
        && studentised.abs() <= LARGEST_STUDENTISED
        && answer.lower <= answer.upper;
    if in_range {
        Ok(Scored {
            answer,
            error,
            studentised,
        })
    } else {
        Err(NoAnswer::DegenerateVariance)
    }
}

/// Equiprobable bin of a finite studentised error.
#[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)] // clamped before the cast
pub(crate) fn normal_bin(studentised: f64) -> u16 {
    let bins = real(NORMAL_BINS as u64);
    (normal_cdf(studentised) * bins)
        .floor()
        .clamp(0.0, bins - 1.0) as u16
}

#[cfg(test)]
mod tests {
    use super::super::moments::CentralMoments;
    use super::*;

    fn error_of(point: f64, standard_error: f64) -> Result<f64, NoAnswer> {
        scored(&Ok(Answer::symmetric(point, standard_error, 2.0)), 1.0).map(|scored| scored.error)
    }

    #[test]
    fn answers_that_would_poison_sums_are_failures() {
        for (point, standard_error) in [
            (f64::NAN, 1.0),
            (f64::INFINITY, 1.0),
            (1.0, f64::NAN),
            (1.0, f64::INFINITY),
            (1.0, 0.0),
            (1.0, -1.0),
            (1.5, 1e-60),
            (1e71, 1e70),
        ] {
            let found = error_of(point, standard_error);
            assert_eq!(
                found,
                Err(NoAnswer::DegenerateVariance),
                "{point} {standard_error}"
            );
        }
        for (lower, upper) in [(2.0, 0.0), (f64::NEG_INFINITY, 2.0), (0.0, f64::NAN)] {
            let answer = Answer {
                point: 1.0,
                standard_error: 1.0,
                lower,
                upper,
            };
            assert!(scored(&Ok(answer), 1.0).is_err(), "{lower} {upper}");
        }
        assert_eq!(error_of(1.25, 0.5), Ok(0.25));
        let reason = Err(NoAnswer::EmptyBatch);
        assert_eq!(scored(&reason, 1.0).err(), Some(NoAnswer::EmptyBatch));
    }

    /// Powers of the most extreme answers allowed stay finite.
    #[test]
    fn extreme_answers_leave_the_sums_finite() {
        for point in [LARGEST, -LARGEST] {
            let extreme = Answer {
                point,
                standard_error: LARGEST,
                lower: point,
                upper: point,
            };
            assert!(scored(&Ok(extreme), 0.0).is_ok());
        }
        let errors = CentralMoments::<4>::of(&[LARGEST, -LARGEST]);
        assert!(errors.central(4).is_finite());
        let studentised = CentralMoments::<8>::of(&[LARGEST_STUDENTISED, -LARGEST_STUDENTISED]);
        assert!(studentised.central(8).is_finite());
    }

    #[test]
    fn equiprobable_bins() {
        assert_eq!(normal_bin(-50.0), 0);
        assert_eq!(normal_bin(50.0), 4095);
        assert_eq!(normal_bin(1e-9), 2048);
        assert_eq!(normal_bin(-1e-9), 2047);
    }
}
