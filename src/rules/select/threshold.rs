//! Candidates whose score exceeds a threshold, in order of arrival.

use super::Choice;

/// Chooses up to `size` candidates above `threshold`.
pub(super) fn choose(scores: &[f64], threshold: f64, size: usize, chosen: &mut Vec<Choice>) {
    let passing = scores
        .iter()
        .enumerate()
        .filter(|&(_, &score)| score > threshold);
    chosen.extend(passing.take(size).map(|(candidate, _)| Choice {
        candidate,
        probability: f64::NAN,
    }));
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn enrols_in_order_and_stops_at_the_size() {
        let mut chosen = Vec::new();
        choose(&[0.5, 2.0, 1.0, 3.0, 4.0], 1.0, 2, &mut chosen);
        assert_eq!(
            chosen.iter().map(|c| c.candidate).collect::<Vec<_>>(),
            [1, 3]
        );
        chosen.clear();
        choose(&[0.5, 0.2], 1.0, 2, &mut chosen);
        assert!(chosen.is_empty());
    }
}
