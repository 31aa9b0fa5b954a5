//! Allocation rules: which arm each unit of a batch gets.
//!
//! A rule gives exact probabilities; the units are then drawn from these very probabilities, so
//! that what is logged is what was done.

mod draw;
mod epsilon_greedy;
mod floor;
mod thompson;
mod thompson_linear;

use super::Past;
use crate::numerics::kernels::{Columns, Kernels};
use crate::plan::{Allocation, AllocationRule, Design, Draw};
use crate::streams::Stream;
use thompson_linear::ArmRegressions;

/// The allocation of one batch, ready to be drawn.
#[derive(Debug, Clone)]
pub struct Allocator {
    allocation: Allocation,
    arm_count: usize,
    regressions: Option<ArmRegressions>,
    summaries: ArmSummaries,
    /// `unit * arms + arm`.
    probabilities: Vec<f64>,
    arms: Vec<usize>,
    order: Vec<usize>,
}

impl Allocator {
    /// Prepares an allocation to `arm_count` arms.
    #[must_use]
    pub fn new(allocation: &Allocation, arm_count: usize, design: &Design) -> Self {
        let regressions = match &allocation.rule {
            AllocationRule::ThompsonLinear {
                variance,
                prior_sd,
                columns,
            } => Some(ArmRegressions::new(
                *variance, *prior_sd, columns, arm_count, design,
            )),
            _ => None,
        };
        Self {
            allocation: allocation.clone(),
            arm_count,
            regressions,
            summaries: ArmSummaries::new(arm_count),
            probabilities: Vec::new(),
            arms: Vec::new(),
            order: Vec::new(),
        }
    }

    /// Draws an arm for each row of `batch` (stored design columns of the new units).
    pub fn allocate(
        &mut self,
        past: &Past<'_>,
        batch: Columns<'_>,
        stream: &mut Stream,
        kernels: Kernels,
    ) {
        let units = batch.rows();
        let arms = self.arm_count;
        self.probabilities.clear();
        self.probabilities.resize(units * arms, 0.0);
        self.arms.clear();
        self.arms.resize(units, 0);
        if units == 0 {
            return;
        }
        if let Some(regressions) = &mut self.regressions {
            regressions.fit(past, kernels);
            for unit in 0..units {
                let out = &mut self.probabilities[unit * arms..(unit + 1) * arms];
                regressions.probabilities(batch, unit, kernels, out);
                floor::clip(out, self.allocation.floor);
            }
        } else {
            let first = &mut self.probabilities[..arms];
            match &self.allocation.rule {
                AllocationRule::Fixed { shares } => first.copy_from_slice(shares),
                AllocationRule::EpsilonGreedy { epsilon } => {
                    self.summaries.update(past);
                    epsilon_greedy::probabilities(&self.summaries, *epsilon, first);
                }
                AllocationRule::Thompson {
                    variance,
                    prior_mean,
                    prior_sd,
                } => {
                    self.summaries.update(past);
                    let summaries = &mut self.summaries;
                    thompson::probabilities(summaries, *variance, *prior_mean, *prior_sd, first);
                }
                AllocationRule::Equal | AllocationRule::ThompsonLinear { .. } => {
                    first.fill(1.0 / arms as f64);
                }
            }
            floor::clip(first, self.allocation.floor);
            let (first, rest) = self.probabilities.split_at_mut(arms);
            for unit in rest.chunks_exact_mut(arms) {
                unit.copy_from_slice(first);
            }
        }
        let unit_specific = self.regressions.is_some();
        match (&self.allocation.rule, self.allocation.draw) {
            (AllocationRule::Equal, _) => draw::permuted_blocks(stream, arms, &mut self.arms),
            (_, Draw::Quota) if !unit_specific => {
                draw::quotas(stream, &self.probabilities[..arms], &mut self.arms);
            }
            (_, Draw::Quota) if arms == 2 => {
                draw::systematic(stream, &self.probabilities, &mut self.order, &mut self.arms);
            }
            _ => draw::independent(stream, &self.probabilities, arms, &mut self.arms),
        }
    }

    /// Arms drawn by the last call of [`Self::allocate`].
    #[must_use]
    pub fn arms(&self) -> &[usize] {
        &self.arms
    }

    /// Probability of every arm for every unit, `unit * arms + arm`, of the last call.
    #[must_use]
    pub fn probabilities(&self) -> &[f64] {
        &self.probabilities
    }
}

/// Count, mean and sum of squared deviations of the outcomes seen in each arm.
#[derive(Debug, Clone)]
pub(super) struct ArmSummaries {
    counts: Vec<f64>,
    means: Vec<f64>,
    squares: Vec<f64>,
    /// Scratch: posterior sd of each arm mean.
    sds: Vec<f64>,
}

impl ArmSummaries {
    fn new(arms: usize) -> Self {
        Self {
            counts: vec![0.0; arms],
            means: vec![0.0; arms],
            squares: vec![0.0; arms],
            sds: vec![0.0; arms],
        }
    }

    /// Running means and squares (Welford 1962).
    fn update(&mut self, past: &Past<'_>) {
        self.counts.fill(0.0);
        self.means.fill(0.0);
        self.squares.fill(0.0);
        for (&arm, &outcome) in past.arms().iter().zip(past.outcomes()) {
            self.counts[arm] += 1.0;
            let deviation = outcome - self.means[arm];
            self.means[arm] += deviation / self.counts[arm];
            self.squares[arm] += deviation * (outcome - self.means[arm]);
        }
    }

    /// Variance pooled within arms; NaN without a residual degree of freedom.
    fn pooled_variance(&self) -> f64 {
        let total: f64 = self.counts.iter().sum();
        let seen: f64 = self.counts.iter().map(|count| count.min(1.0)).sum();
        let squares: f64 = self.squares.iter().sum();
        if total > seen {
            squares / (total - seen)
        } else {
            f64::NAN
        }
    }
}
