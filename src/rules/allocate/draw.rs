//! Drawing arms from allocation probabilities.

use crate::streams::{Stream, open_uniform, shuffle};

/// Permuted blocks of one unit per arm; the last block may be incomplete.
pub(super) fn permuted_blocks(stream: &mut Stream, arms: usize, out: &mut [usize]) {
    for block in out.chunks_mut(arms) {
        if block.len() == arms {
            for (arm, unit) in block.iter_mut().enumerate() {
                *unit = arm;
            }
            shuffle(stream, block);
        } else {
            // The first units of a shuffled full block, drawn one by one without building it.
            for position in 0..block.len() {
                loop {
                    let arm = crate::streams::uniform_index(stream, arms);
                    if !block[..position].contains(&arm) {
                        block[position] = arm;
                        break;
                    }
                }
            }
        }
    }
}

/// Randomised quotas: the arm counts are the expected counts rounded up or down by systematic
/// sampling of their fractional parts, in random order of the units.
#[allow(
    clippy::cast_precision_loss,
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss
)]
pub(super) fn quotas(stream: &mut Stream, probabilities: &[f64], out: &mut [usize]) {
    let units = out.len();
    let start = open_uniform(stream);
    let mut cumulative = 0.0;
    let mut filled = 0;
    for (arm, probability) in probabilities.iter().enumerate() {
        cumulative += probability * units as f64;
        // Counts up to this arm: whole numbers below cumulative + start; their differences have
        // the right expectation and are within one of it.
        let mut end = (cumulative + start).floor() as usize;
        if arm + 1 == probabilities.len() {
            end = units;
        }
        let end = end.clamp(filled, units);
        out[filled..end].fill(arm);
        filled = end;
    }
    shuffle(stream, out);
}

/// Systematic sampling for two arms with a probability of its own for each unit, in random order.
pub(super) fn systematic(
    stream: &mut Stream,
    probabilities: &[f64],
    order: &mut Vec<usize>,
    out: &mut [usize],
) {
    order.clear();
    order.extend(0..out.len());
    shuffle(stream, order);
    let mut total = open_uniform(stream);
    for &unit in order.iter() {
        let before = total.floor();
        total += probabilities[2 * unit + 1];
        out[unit] = usize::from(total.floor() > before);
    }
}

/// Independent draws.
pub(super) fn independent(
    stream: &mut Stream,
    probabilities: &[f64],
    arms: usize,
    out: &mut [usize],
) {
    for (unit, arm) in out.iter_mut().enumerate() {
        let mut left = open_uniform(stream);
        let own = &probabilities[unit * arms..(unit + 1) * arms];
        *arm = own
            .iter()
            .position(|probability| {
                left -= probability;
                left < 0.0
            })
            .unwrap_or(arms - 1);
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::streams::{Phase, Purpose, Streams};

    fn stream(trial: u64) -> Stream {
        Streams::new(9, Phase::Replay, trial).open(Purpose::Allocation, 0, 0, 0)
    }

    /// Frequencies of each arm for the third unit of seven over 20 000 draws, each within five
    /// standard errors: false alarm below 1e-5 over all cells, and the seed is fixed.
    #[test]
    fn marginal_probabilities_are_exact() {
        let p = [0.13, 0.5, 0.37];
        let draws = 20_000u64;
        for method in 0..4 {
            let mut counts = [0usize; 3];
            for trial in 0..draws {
                let mut stream = stream(trial);
                let mut out = [0usize; 7];
                match method {
                    0 => quotas(&mut stream, &p, &mut out),
                    1 => independent(&mut stream, &p.repeat(7), 3, &mut out),
                    2 => permuted_blocks(&mut stream, 3, &mut out),
                    _ => {
                        let mut order = Vec::new();
                        let pairs: Vec<f64> = (0..7)
                            .flat_map(|i| [1.0 - 0.1 * f64::from(i), 0.1 * f64::from(i)])
                            .collect();
                        systematic(&mut stream, &pairs, &mut order, &mut out);
                    }
                }
                if method == 0 {
                    for (arm, probability) in p.iter().enumerate() {
                        let count = out.iter().filter(|&&a| a == arm).count() as f64;
                        assert!((count - 7.0 * probability).abs() < 1.0, "quota within one");
                    }
                }
                counts[out[6]] += 1;
            }
            let expected = match method {
                2 => [1.0 / 3.0; 3],
                3 => [0.4, 0.6, 0.0],
                _ => p,
            };
            for (count, p) in counts.iter().zip(expected) {
                let error = *count as f64 / draws as f64 - p;
                assert!(error.abs() <= 5.0 * (p * (1.0 - p) / draws as f64).sqrt() + 1e-12);
            }
        }
    }
}
