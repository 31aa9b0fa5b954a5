//! What the tally needs to know of one block of trials.
//!
//! A summary depends on its block alone. It can therefore be made by any worker, written down and
//! read again; a tally that merges the same summaries in the same order has the same bits.

use crate::methods::Estimate;

use super::cell::{BinKeys, CellMoments, Counts};
use super::distribution::linear_bin;
use super::moments::{CentralMoments, PairMoments};
use super::operating::OperatingMoments;
use super::record::{BlockRecord, Layout};
use super::scored::{Scored, normal_bin, scored};

/// Summary of one cell of one block.
#[derive(Debug, Clone, Default)]
pub(crate) struct CellSummary {
    pub counts: Counts,
    pub moments: CellMoments,
    /// Errors of the estimate, the lower limit and the upper limit; interval widths.
    pub error: BinKeys,
    pub lower_error: BinKeys,
    pub upper_error: BinKeys,
    pub width: BinKeys,
    /// Equiprobable bins of the studentised errors.
    pub normal_bins: Vec<u16>,
    /// Linear bins of the studentised errors.
    pub linear_bins: Vec<u16>,
}

/// Answered trials of the cell at work, one column a quantity.
#[derive(Debug, Clone, Default)]
struct Columns {
    error: Vec<f64>,
    studentised: Vec<f64>,
    squared_standard_error: Vec<f64>,
    lower_error: Vec<f64>,
    upper_error: Vec<f64>,
    width: Vec<f64>,
    own_paired_width: Vec<f64>,
    reference_paired_width: Vec<f64>,
}

impl Columns {
    fn clear(&mut self) {
        for column in [
            &mut self.error,
            &mut self.studentised,
            &mut self.squared_standard_error,
            &mut self.lower_error,
            &mut self.upper_error,
            &mut self.width,
            &mut self.own_paired_width,
            &mut self.reference_paired_width,
        ] {
            column.clear();
        }
    }
}

/// Summary of one block of trials, a function of the block alone.
///
/// Moments are exact to rounding and computed in trial order; everything else is integer counts
/// or bin numbers.
#[derive(Debug, Clone, Default)]
pub struct BlockSummary {
    pub(crate) trials: u64,
    pub(crate) cells: Vec<CellSummary>,
    pub(crate) operating: OperatingMoments,
    columns: Columns,
    /// Width of the reference method in each trial, absent without its answer.
    reference_widths: Vec<Option<f64>>,
    /// Finite values of the operating characteristic at work.
    finite: Vec<f64>,
}

impl BlockSummary {
    /// Summarises a block.
    ///
    /// # Panics
    ///
    /// If the block has not `trials × cells` estimates.
    #[must_use]
    pub fn of(layout: &Layout, block: &BlockRecord) -> Self {
        let mut summary = Self::default();
        summary.refill(layout, block);
        summary
    }

    /// Summarises another block in the memory of this summary.
    ///
    /// # Panics
    ///
    /// If the block has not `trials × cells` estimates.
    pub fn refill(&mut self, layout: &Layout, block: &BlockRecord) {
        assert_eq!(
            block.estimates.len(),
            block.trials * layout.cells(),
            "a block holds one estimate per trial and cell"
        );
        self.trials = block.trials as u64;
        self.cells.resize_with(layout.cells(), CellSummary::default);
        for estimand in 0..layout.estimands {
            let true_value = layout.true_values[estimand];
            let reference_cell = estimand * layout.methods + layout.reference;
            self.reference_widths.clear();
            self.reference_widths
                .extend(
                    cell_estimates(layout, block, reference_cell).map(|estimate| {
                        scored(estimate, true_value)
                            .ok()
                            .map(|scored| scored.answer.width())
                    }),
                );
            for method in 0..layout.methods {
                self.refill_cell(layout, block, estimand, method);
            }
        }
        self.refill_operating(layout, block);
    }

    fn refill_cell(
        &mut self,
        layout: &Layout,
        block: &BlockRecord,
        estimand: usize,
        method: usize,
    ) {
        let index = estimand * layout.methods + method;
        let true_value = layout.true_values[estimand];
        let null = layout.nulls[estimand];
        let columns = &mut self.columns;
        columns.clear();
        let mut counts = Counts::default();
        let estimates = cell_estimates(layout, block, index);
        for (estimate, reference_width) in estimates.zip(&self.reference_widths) {
            let Scored {
                answer,
                error,
                studentised,
            } = match scored(estimate, true_value) {
                Ok(scored) => scored,
                Err(reason) => {
                    counts.fail(reason);
                    continue;
                }
            };
            counts.answered += 1;
            counts.misses_below += u64::from(answer.upper < true_value);
            counts.misses_above += u64::from(answer.lower > true_value);
            counts.rejected_below += u64::from(answer.upper < null);
            counts.rejected_above += u64::from(answer.lower > null);
            columns.error.push(error);
            columns.studentised.push(studentised);
            columns
                .squared_standard_error
                .push(answer.standard_error * answer.standard_error);
            columns.lower_error.push(answer.lower - true_value);
            columns.upper_error.push(answer.upper - true_value);
            columns.width.push(answer.width());
            if let Some(reference_width) = reference_width {
                columns.own_paired_width.push(answer.width());
                columns.reference_paired_width.push(*reference_width);
            }
        }
        counts.hits = counts.answered - counts.misses_below - counts.misses_above;

        let cell = &mut self.cells[index];
        cell.counts = counts;
        cell.moments = CellMoments {
            error: CentralMoments::of(&columns.error),
            squared_standard_error: CentralMoments::of(&columns.squared_standard_error),
            width: CentralMoments::of(&columns.width),
            paired_width: PairMoments::of(
                &columns.own_paired_width,
                &columns.reference_paired_width,
            ),
            studentised: CentralMoments::of(&columns.studentised),
        };
        cell.error.refill(&columns.error);
        cell.lower_error.refill(&columns.lower_error);
        cell.upper_error.refill(&columns.upper_error);
        cell.width.refill(&columns.width);
        cell.normal_bins.clear();
        cell.normal_bins
            .extend(columns.studentised.iter().map(|&z| normal_bin(z)));
        cell.linear_bins.clear();
        cell.linear_bins
            .extend(columns.studentised.iter().map(|&z| linear_bin(z)));
    }

    fn refill_operating(&mut self, layout: &Layout, block: &BlockRecord) {
        self.operating.units = finite_moments(&mut self.finite, block.units.iter().copied());
        self.operating.mean_outcome =
            finite_moments(&mut self.finite, block.mean_outcomes.iter().copied());
        self.operating
            .arm_shares
            .resize_with(layout.arms, CentralMoments::default);
        for (arm, share) in self.operating.arm_shares.iter_mut().enumerate() {
            let arm_units = block.arm_units.iter().skip(arm).step_by(layout.arms);
            // A trial that enrolled nobody has no shares: 0 / 0 is dropped as not finite.
            let shares = arm_units
                .zip(&block.units)
                .map(|(units, total)| units / total);
            *share = finite_moments(&mut self.finite, shares);
        }
    }
}

/// Estimates of one cell in trial order.
fn cell_estimates<'a>(
    layout: &Layout,
    block: &'a BlockRecord,
    cell: usize,
) -> impl Iterator<Item = &'a Estimate> {
    block.estimates.iter().skip(cell).step_by(layout.cells())
}

/// Moments of the finite values of a sequence, in its order.
fn finite_moments<const ORDER: usize>(
    finite: &mut Vec<f64>,
    values: impl Iterator<Item = f64>,
) -> CentralMoments<ORDER> {
    finite.clear();
    finite.extend(values.filter(|value| value.is_finite()));
    CentralMoments::of(finite)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::methods::{Answer, NoAnswer};

    fn layout() -> Layout {
        Layout {
            estimands: 1,
            methods: 1,
            arms: 2,
            reference: 0,
            true_values: vec![1.0],
            nulls: vec![0.0],
            level: 0.95,
        }
    }

    fn block(estimates: Vec<Estimate>) -> BlockRecord {
        let trials = estimates.len();
        BlockRecord {
            trials,
            estimates,
            units: vec![10.0; trials],
            arm_units: [4.0, 6.0].repeat(trials),
            mean_outcomes: vec![0.5; trials],
        }
    }

    fn answer(point: f64, standard_error: f64) -> Answer {
        Answer::symmetric(point, standard_error, 2.0)
    }

    #[test]
    fn closed_intervals_hold_their_limits() {
        let at_limit = Ok(Answer {
            point: 0.5,
            standard_error: 0.5,
            lower: 0.0,
            upper: 1.0,
        });
        let summary = BlockSummary::of(&layout(), &block(vec![at_limit]));
        assert_eq!(summary.cells[0].counts.hits, 1);
        assert_eq!(summary.cells[0].counts.rejected_above, 0);
    }

    #[test]
    fn trials_that_enrolled_nobody_have_no_shares() {
        let mut block = block(vec![Ok(answer(1.0, 1.0)); 2]);
        block.units[1] = 0.0;
        block.arm_units[2] = 0.0;
        block.arm_units[3] = 0.0;
        block.mean_outcomes[1] = f64::NAN;
        let summary = BlockSummary::of(&layout(), &block);
        assert_eq!(summary.operating.units.count(), 2);
        assert_eq!(summary.operating.arm_shares[1].count(), 1);
        assert!((summary.operating.arm_shares[1].mean() - 0.6).abs() < 1e-15);
        assert_eq!(summary.operating.mean_outcome.count(), 1);
    }

    #[test]
    fn refilled_memory_leaves_no_trace() {
        let first = block(vec![Ok(answer(1.0, 1.0)); 5]);
        let second = block(vec![Ok(answer(0.3, 0.4)), Err(NoAnswer::RankDeficient)]);
        let mut reused = BlockSummary::of(&layout(), &first);
        reused.refill(&layout(), &second);
        let fresh = BlockSummary::of(&layout(), &second);
        assert_eq!(format!("{:?}", reused.cells), format!("{:?}", fresh.cells));
        assert_eq!(reused.operating, fresh.operating);
    }
}
