//! Epsilon-greedy allocation.

use super::ArmSummaries;

/// `ε/K` for every arm, and `1 - ε` shared by the arms with the highest mean so far. An arm
/// without outcomes counts as the best, so that every arm is tried.
pub(super) fn probabilities(summaries: &ArmSummaries, epsilon: f64, out: &mut [f64]) {
    let value = |arm: usize| {
        if summaries.counts[arm] > 0.0 {
            summaries.means[arm]
        } else {
            f64::INFINITY
        }
    };
    let arms = out.len();
    let best = (0..arms).map(value).fold(f64::NEG_INFINITY, f64::max);
    let leaders = (0..arms).filter(|&arm| value(arm) >= best).count();
    for (arm, probability) in out.iter_mut().enumerate() {
        let lead = if value(arm) >= best {
            (1.0 - epsilon) / leaders as f64
        } else {
            0.0
        };
        *probability = epsilon / arms as f64 + lead;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn leader_gets_the_greedy_share_and_ties_share_it() {
        let mut summaries = ArmSummaries::new(3);
        summaries.counts = vec![5.0, 5.0, 5.0];
        summaries.means = vec![0.1, 0.7, 0.3];
        let mut out = [0.0; 3];
        probabilities(&summaries, 0.3, &mut out);
        assert!((out[1] - 0.8).abs() < 1e-15 && (out[0] - 0.1).abs() < 1e-15);
        summaries.means[2] = 0.7;
        probabilities(&summaries, 0.3, &mut out);
        assert!((out[1] - 0.45).abs() < 1e-15 && (out[2] - 0.45).abs() < 1e-15);
    }
}
