//! Smallest allocation probability.

/// Raises every probability below `floor` to it and rescales the others, until none is below.
pub(super) fn clip(probabilities: &mut [f64], floor: f64) {
    if floor <= 0.0 {
        return;
    }
    // Each round fixes at least one more arm, so as many rounds as arms are enough.
    for _ in 0..probabilities.len() {
        if probabilities.iter().all(|&p| p >= floor) {
            return;
        }
        let mut fixed = 0.0;
        let mut free = 0.0;
        for &p in probabilities.iter() {
            if p <= floor {
                fixed += floor;
            } else {
                free += p;
            }
        }
        let scale = if free > 0.0 {
            (1.0 - fixed) / free
        } else {
            0.0
        };
        for p in probabilities.iter_mut() {
            *p = if *p <= floor { floor } else { *p * scale };
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        #[test]
        fn clipped_probabilities_sum_to_one_and_respect_the_floor(
            weights in prop::collection::vec(0.0f64..1.0, 2..7), share in 0.0f64..1.0,
        ) {
            let total: f64 = weights.iter().sum();
            prop_assume!(total > 1e-3);
            let mut p: Vec<f64> = weights.iter().map(|w| w / total).collect();
            let floor = share / p.len() as f64;
            clip(&mut p, floor);
            prop_assert!((p.iter().sum::<f64>() - 1.0).abs() < 1e-12);
            prop_assert!(p.iter().all(|&p| p >= floor * (1.0 - 1e-12)));
        }
    }
}
