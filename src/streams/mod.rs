//! Counter-based random streams.
//!
//! Every random number of a run has an address: seed and phase (the `ChaCha` key), trial (the
//! stream), purpose (part of the key), batch and column (the position). Methods, truths and sweep
//! points that ask for the same address get the same number, and nothing depends on the order in
//! which trials are replayed.

use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, StandardNormal};

/// A random stream positioned at one address.
pub type Stream = ChaCha8Rng;

/// Part of a run; phases share no randomness.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Phase {
    /// The trials that are scored.
    Replay,
    /// The pilot replay that fixes tuning constants before the scored trials.
    Pilot,
    /// The sample that gives the population projection of a misspecified analysis.
    Projection,
}

/// What random numbers are for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Purpose {
    /// Covariates of candidates.
    Candidates,
    /// Noise of outcomes.
    Noise,
    /// Random choices of a selection rule.
    Selection,
    /// Random choices of an allocation rule.
    Allocation,
}

/// The streams of one trial.
#[derive(Debug, Clone, Copy)]
pub struct Streams {
    seed: u64,
    phase: Phase,
    trial: u64,
}

/// Words reserved for one column of one part of one batch: 2^28 words are 2^27 numbers.
const COLUMN_BITS: u32 = 28;
/// Columns reserved for one part of a batch.
const PART_BITS: u32 = 18;
/// Bits for the part and column of a batch; the remaining 16 bits of the 68-bit word position
/// address 65 536 batches.
const BATCH_BITS: u32 = 24;

impl Streams {
    /// Streams of trial `trial` in phase `phase` of the run with seed `seed`.
    #[must_use]
    pub fn new(seed: u64, phase: Phase, trial: u64) -> Self {
        Self { seed, phase, trial }
    }

    /// The stream for one purpose, batch, part of the batch and column.
    #[must_use]
    pub fn open(&self, purpose: Purpose, batch: usize, part: usize, column: usize) -> Stream {
        let mut key = [0u8; 32];
        key[..8].copy_from_slice(&self.seed.to_le_bytes());
        key[8] = match self.phase {
            Phase::Replay => 0,
            Phase::Pilot => 1,
            Phase::Projection => 2,
        };
        key[9] = match purpose {
            Purpose::Candidates => 0,
            Purpose::Noise => 1,
            Purpose::Selection => 2,
            Purpose::Allocation => 3,
        };
        key[16..].copy_from_slice(b"windage stream 1");
        let mut stream = ChaCha8Rng::from_seed(key);
        stream.set_stream(self.trial);
        let address =
            ((batch as u128) << BATCH_BITS) | ((part as u128) << PART_BITS) | column as u128;
        stream.set_word_pos(address << COLUMN_BITS);
        stream
    }
}

/// Fills `out` with independent standard normals (ziggurat, Marsaglia & Tsang 2000, in the form
/// of Doornik 2005).
pub fn fill_standard_normal<R: Rng>(stream: &mut R, out: &mut [f64]) {
    for value in out {
        *value = StandardNormal.sample(stream);
    }
}

/// A uniform number in the open interval (0, 1): an odd multiple of `2^-53`.
pub fn open_uniform<R: Rng>(stream: &mut R) -> f64 {
    const SCALE: f64 = 1.0 / (1u64 << 53) as f64;
    ((stream.next_u64() >> 11) | 1) as f64 * SCALE
}

/// A uniform integer in `0..bound`, unbiased (Lemire 2019), `bound >= 1`.
#[allow(clippy::cast_possible_truncation)] // the high word is below `bound`
pub fn uniform_index<R: Rng>(stream: &mut R, bound: usize) -> usize {
    let bound = bound as u64;
    let mut product = u128::from(stream.next_u64()) * u128::from(bound);
    if (product as u64) < bound {
        let threshold = bound.wrapping_neg() % bound;
        while (product as u64) < threshold {
            product = u128::from(stream.next_u64()) * u128::from(bound);
        }
    }
    (product >> 64) as usize
}

/// Shuffles in place (Fisher & Yates).
pub fn shuffle<R: Rng, T>(stream: &mut R, items: &mut [T]) {
    for last in (1..items.len()).rev() {
        items.swap(last, uniform_index(stream, last + 1));
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn addresses_do_not_collide_and_do_not_depend_on_order() {
        let streams = Streams::new(7, Phase::Replay, 3);
        let mut seen = std::collections::HashSet::new();
        for purpose in [
            Purpose::Candidates,
            Purpose::Noise,
            Purpose::Selection,
            Purpose::Allocation,
        ] {
            for batch in 0..5 {
                for (part, column) in (0..2).flat_map(|part| (0..20).map(move |c| (part, c))) {
                    assert!(seen.insert(streams.open(purpose, batch, part, column).next_u64()));
                }
            }
        }
        assert!(
            seen.insert(
                Streams::new(7, Phase::Pilot, 3)
                    .open(Purpose::Candidates, 0, 0, 0)
                    .next_u64()
            )
        );
        assert!(
            seen.insert(
                Streams::new(7, Phase::Replay, 4)
                    .open(Purpose::Candidates, 0, 0, 0)
                    .next_u64()
            )
        );
        assert!(!seen.insert(streams.open(Purpose::Noise, 4, 1, 19).next_u64()));
    }

    #[test]
    fn uniforms_stay_inside_the_open_interval() {
        let mut stream = Streams::new(1, Phase::Replay, 0).open(Purpose::Selection, 0, 0, 0);
        for _ in 0..10_000 {
            let value = open_uniform(&mut stream);
            assert!(value > 0.0 && value < 1.0);
        }
    }

    /// Chi-squared test with 5 degrees of freedom at 6000 draws; the threshold 30 is exceeded
    /// with probability 1.5e-5 by a correct generator, and the seed is fixed.
    #[test]
    fn indices_are_uniform() {
        let mut stream = Streams::new(2, Phase::Replay, 0).open(Purpose::Selection, 0, 0, 0);
        let mut counts = [0i32; 6];
        for _ in 0..6000 {
            counts[uniform_index(&mut stream, 6)] += 1;
        }
        let statistic: f64 = counts
            .iter()
            .map(|&count| f64::from(count - 1000).powi(2) / 1000.0)
            .sum();
        assert!(statistic < 30.0, "{counts:?}");
    }
}
