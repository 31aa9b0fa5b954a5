//! The candidates with the highest or lowest scores.

use super::Choice;
use crate::plan::Tail;

/// Chooses the `size` extreme candidates; among equal scores the earlier arrival goes first.
pub(super) fn choose(
    scores: &[f64],
    tail: Tail,
    size: usize,
    order: &mut Vec<usize>,
    chosen: &mut Vec<Choice>,
) {
    order.clear();
    order.extend(0..scores.len());
    let before = |a: &usize, b: &usize| {
        let by_score = match tail {
            Tail::Top => scores[*b].total_cmp(&scores[*a]),
            Tail::Bottom => scores[*a].total_cmp(&scores[*b]),
        };
        by_score.then(a.cmp(b))
    };
    if size < order.len() {
        order.select_nth_unstable_by(size, before);
        order.truncate(size);
    }
    order.sort_unstable();
    let probability = if size == scores.len() { 1.0 } else { f64::NAN };
    chosen.extend(order.iter().map(|&candidate| Choice {
        candidate,
        probability,
    }));
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        #[test]
        fn nobody_passed_over_scores_better(
            scores in prop::collection::vec(-3i32..4, 1..60), excess in 0usize..60,
        ) {
            let scores: Vec<f64> = scores.into_iter().map(f64::from).collect();
            let size = 1 + excess % scores.len();
            for (tail, sign) in [(Tail::Top, 1.0), (Tail::Bottom, -1.0)] {
                let (mut order, mut chosen) = (Vec::new(), Vec::new());
                choose(&scores, tail, size, &mut order, &mut chosen);
                prop_assert_eq!(chosen.len(), size);
                let inside = |i: usize| chosen.iter().any(|choice| choice.candidate == i);
                let worst = chosen.iter().map(|c| sign * scores[c.candidate])
                    .fold(f64::INFINITY, f64::min);
                for (i, score) in scores.iter().enumerate() {
                    prop_assert!(inside(i) || sign * score <= worst);
                }
                prop_assert!(chosen.windows(2).all(|pair| pair[0].candidate < pair[1].candidate));
            }
        }
    }
}
