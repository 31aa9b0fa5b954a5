//! Operating characteristics of the design with their Monte Carlo standard errors.

use super::measure::OperatingValue;
use super::moments::{CentralMoments, real};

/// Moments of the operating characteristics.
#[derive(Debug, Clone, PartialEq, Default)]
pub(crate) struct OperatingMoments {
    /// Units enrolled.
    pub units: CentralMoments<4>,
    /// Share of each arm among the units of a trial.
    pub arm_shares: Vec<CentralMoments<2>>,
    /// Mean true expected outcome of the enrolled.
    pub mean_outcome: CentralMoments<2>,
}

impl OperatingMoments {
    pub(crate) fn merge(&mut self, part: &Self) {
        self.units.merge(&part.units);
        self.arm_shares
            .resize_with(part.arm_shares.len(), CentralMoments::default);
        for (own, added) in self.arm_shares.iter_mut().zip(&part.arm_shares) {
            own.merge(added);
        }
        self.mean_outcome.merge(&part.mean_outcome);
    }
}

/// Units enrolled (mean and standard deviation), share of each arm, mean outcome.
///
/// An arm's share is the mean over trials of its share of the trial's units; trials that enrolled
/// nobody have no share and no mean outcome. A standard error that the trials cannot give is
/// infinite.
pub(crate) fn operating_values(
    moments: &OperatingMoments,
    arm_names: &[String],
) -> Vec<OperatingValue> {
    let mut values = Vec::new();
    let mut push = |characteristic: &str, subject: String, (value, mcse): (f64, f64), used| {
        if used > 0 && value.is_finite() {
            values.push(OperatingValue {
                characteristic: characteristic.to_owned(),
                subject,
                value,
                mcse: if mcse.is_nan() { f64::INFINITY } else { mcse },
                trials_used: used,
            });
        }
    };
    let units = &moments.units;
    push("units", String::new(), mean(units), units.count());
    push(
        "units-sd",
        String::new(),
        standard_deviation(units),
        units.count(),
    );
    for (arm, share) in moments.arm_shares.iter().enumerate() {
        let name = arm_names
            .get(arm)
            .cloned()
            .unwrap_or_else(|| format!("arm {}", arm + 1));
        push("arm-share", name, mean(share), share.count());
    }
    let outcome = &moments.mean_outcome;
    push(
        "mean-outcome",
        String::new(),
        mean(outcome),
        outcome.count(),
    );
    values
}

fn mean<const ORDER: usize>(moments: &CentralMoments<ORDER>) -> (f64, f64) {
    (moments.mean(), moments.standard_error())
}

/// Sample standard deviation; delta method from the fourth moment, since sizes of studies that
/// may stop are far from normal.
fn standard_deviation(moments: &CentralMoments<4>) -> (f64, f64) {
    let sd = moments.variance().sqrt();
    if sd == 0.0 {
        return (0.0, 0.0);
    }
    let (second, fourth) = (moments.central(2), moments.central(4));
    let variance_of_square = (fourth - second * second).max(0.0) / real(moments.count());
    (sd, variance_of_square.sqrt() / (2.0 * sd))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn two_sizes_by_hand() {
        // Sizes 10, 10, 20, 20: mean 15, sd √(100/3), fourth moment equals the squared second, so
        // the spread of a fair two-point law is known without error.
        let moments = OperatingMoments {
            units: CentralMoments::of(&[10.0, 10.0, 20.0, 20.0]),
            arm_shares: vec![
                CentralMoments::of(&[0.5, 0.7]),
                CentralMoments::of(&[0.5, 0.3]),
            ],
            mean_outcome: CentralMoments::default(),
        };
        let values = operating_values(&moments, &["control".to_owned()]);
        let keys: Vec<_> = values
            .iter()
            .map(|v| (v.characteristic.as_str(), v.subject.as_str()))
            .collect();
        let expected = [
            ("units", ""),
            ("units-sd", ""),
            ("arm-share", "control"),
            ("arm-share", "arm 2"),
        ];
        assert_eq!(keys, expected);
        assert!((values[0].value - 15.0).abs() < 1e-12);
        assert!((values[0].mcse - (100.0_f64 / 3.0 / 4.0).sqrt()).abs() < 1e-12);
        assert!((values[1].value - (100.0_f64 / 3.0).sqrt()).abs() < 1e-12);
        assert!(values[1].mcse.abs() < 1e-12);
        assert!((values[3].value - 0.4).abs() < 1e-12);
        assert!((values[3].mcse - 0.1).abs() < 1e-12);
    }
}
