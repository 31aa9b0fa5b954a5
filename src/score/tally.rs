//! The running tally of one truth: bounded memory, fixed order, fixed bits.

use super::cell::{BinKeys, CellMoments, Counts};
use super::distribution::{CellDistribution, Histogram, LINEAR_BINS, rebin, studentised_histogram};
use super::formulas::cell_measures;
use super::measure::TruthMeasures;
use super::operating::{OperatingMoments, operating_values};
use super::record::{BlockRecord, Layout};
use super::scored::NORMAL_BINS;
use super::sketch::Sketch;
use super::summary::{BlockSummary, CellSummary};

/// Everything counted for one estimand and method.
#[derive(Debug, Clone)]
pub(crate) struct CellTally {
    pub counts: Counts,
    pub moments: CellMoments,
    /// Errors of the estimate, the lower limit and the upper limit; interval widths.
    pub error: Sketch,
    pub lower_error: Sketch,
    pub upper_error: Sketch,
    pub width: Sketch,
    /// Studentised errors in equiprobable bins of the standard normal law.
    pub normal_bins: Vec<u64>,
    /// Studentised errors in linear bins.
    pub linear_bins: [u64; LINEAR_BINS],
}

impl Default for CellTally {
    fn default() -> Self {
        Self {
            counts: Counts::default(),
            moments: CellMoments::default(),
            error: Sketch::default(),
            lower_error: Sketch::default(),
            upper_error: Sketch::default(),
            width: Sketch::default(),
            normal_bins: vec![0; NORMAL_BINS],
            linear_bins: [0; LINEAR_BINS],
        }
    }
}

impl CellTally {
    fn merge(&mut self, part: &CellSummary) {
        self.counts.merge(&part.counts);
        self.moments.merge(&part.moments);
        add_keys(&mut self.error, &part.error);
        add_keys(&mut self.lower_error, &part.lower_error);
        add_keys(&mut self.upper_error, &part.upper_error);
        add_keys(&mut self.width, &part.width);
        for &bin in &part.normal_bins {
            self.normal_bins[bin as usize] += 1;
        }
        for &bin in &part.linear_bins {
            self.linear_bins[bin as usize] += 1;
        }
    }
}

fn add_keys(sketch: &mut Sketch, part: &BinKeys) {
    for &key in &part.keys {
        sketch.add_key(key);
    }
    sketch.widen(part.least, part.greatest);
}

/// Tally of the trials of one truth.
///
/// The state depends only on the blocks and their order: [`Tally::absorb`] is
/// [`Tally::merge`] of [`BlockSummary::of`], so summaries made elsewhere and merged in the same
/// order give the same bits. Memory does not grow with the number of trials.
#[derive(Debug, Clone)]
pub struct Tally {
    layout: Layout,
    trials: u64,
    cells: Vec<CellTally>,
    operating: OperatingMoments,
    /// Memory of the summary of the block at work.
    workspace: BlockSummary,
}

impl Tally {
    /// An empty tally.
    #[must_use]
    pub fn new(layout: Layout) -> Self {
        let cells = vec![CellTally::default(); layout.cells()];
        Self {
            layout,
            trials: 0,
            cells,
            operating: OperatingMoments::default(),
            workspace: BlockSummary::default(),
        }
    }

    /// Adds the next block.
    ///
    /// # Panics
    ///
    /// If the block has not `trials × cells` estimates.
    pub fn absorb(&mut self, block: &BlockRecord) {
        let mut summary = std::mem::take(&mut self.workspace);
        summary.refill(&self.layout, block);
        self.merge(&summary);
        self.workspace = summary;
    }

    /// Adds the summary of the next block.
    ///
    /// # Panics
    ///
    /// If the summary was made with a different number of cells.
    pub fn merge(&mut self, summary: &BlockSummary) {
        assert_eq!(
            self.cells.len(),
            summary.cells.len(),
            "tally and summary need the same layout"
        );
        self.trials += summary.trials;
        for (cell, part) in self.cells.iter_mut().zip(&summary.cells) {
            cell.merge(part);
        }
        self.operating.merge(&summary.operating);
    }

    /// Trials absorbed so far.
    #[must_use]
    pub fn trials(&self) -> u64 {
        self.trials
    }

    /// Measures of every cell and the operating characteristics; `truth` is the index to put on
    /// them, `arm_names` names the arms (an arm beyond the list is called by its number).
    #[must_use]
    pub fn measures(&self, truth: usize, arm_names: &[String]) -> TruthMeasures {
        let methods = self.layout.methods;
        let cells = self
            .cells
            .iter()
            .enumerate()
            .map(|(index, cell)| {
                let estimand = index / methods;
                let true_value = self.layout.true_values[estimand];
                cell_measures(cell, self.trials, true_value, estimand, index % methods)
            })
            .collect();
        TruthMeasures {
            truth,
            trials: self.trials,
            cells,
            operating: operating_values(&self.operating, arm_names),
        }
    }

    /// Histogram of the error (estimate minus true value) of cell `estimand * methods + method`
    /// on ascending edges; bins of relative width `2^-8` are divided evenly at the edges.
    ///
    /// # Panics
    ///
    /// If the cell does not exist.
    #[must_use]
    pub fn error_histogram(&self, cell: usize, edges: &[f64]) -> Histogram {
        rebin(&self.cells[cell].error, edges)
    }

    /// Laws of the error and the studentised error of every cell.
    #[must_use]
    pub fn distributions(&self) -> Vec<CellDistribution> {
        self.cells
            .iter()
            .enumerate()
            .map(|(index, cell)| CellDistribution {
                estimand: index / self.layout.methods,
                method: index % self.layout.methods,
                error: cell.error.clone(),
                studentised: studentised_histogram(&cell.linear_bins),
            })
            .collect()
    }
}
