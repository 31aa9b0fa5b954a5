//! From what was scored to what the report reads.

use super::figures::{ErrorHistogram, ErrorRow, Figure, coverage_figure, error_figure};
use super::{Scored, VerdictLine};
use crate::plan::Plan;
use crate::score::{
    CellDistribution, EstimandVerdict, Histogram, TruthMeasures, Verdict, verdicts,
};

/// Bins of the raw error between the most extreme errors shown.
const RAW_BINS: usize = 160;

impl Scored {
    /// Reaches the verdicts on the measures of a plan and joins them to its names.
    #[must_use]
    pub fn judge(
        plan: &Plan,
        true_values: Vec<Vec<f64>>,
        measures: Vec<TruthMeasures>,
    ) -> (Self, Vec<EstimandVerdict>) {
        let judged = verdicts(&measures, plan.level, &plan.verdicts);
        let lines = judged.iter().flat_map(verdict_lines).collect();
        (Self::new(plan, true_values, measures, lines), judged)
    }
}

fn word(verdict: Verdict) -> &'static str {
    match verdict {
        Verdict::Honest => "honest",
        Verdict::Undecided => "undecided",
        Verdict::NotHonest => "not honest",
    }
}

fn verdict_lines(judged: &EstimandVerdict) -> impl Iterator<Item = VerdictLine> + '_ {
    judged.methods.iter().map(|method| VerdictLine {
        estimand: judged.estimand,
        method: method.method,
        per_truth: method
            .truths
            .iter()
            .map(|truth| word(truth.verdict))
            .collect(),
        overall: word(method.verdict),
        price: method.price.map(|(price, _)| price),
        cheapest: judged
            .cheapest_honest
            .is_some_and(|best| best.method == method.method),
    })
}

/// The figures of a replay: coverage of every estimand, and the error histograms of every truth
/// and estimand. `distributions` has one entry per truth.
#[must_use]
pub fn replay_figures(scored: &Scored, distributions: &[Vec<CellDistribution>]) -> Vec<Figure> {
    let mut figures: Vec<Figure> = (0..scored.estimands.len())
        .map(|estimand| coverage_figure(scored, estimand))
        .collect();
    for (truth, cells) in distributions.iter().enumerate() {
        for estimand in 0..scored.estimands.len() {
            let own: Vec<&CellDistribution> = cells
                .iter()
                .filter(|cell| cell.estimand == estimand)
                .collect();
            let edges = common_edges(&own);
            let rows: Vec<ErrorRow> = own
                .iter()
                .map(|cell| ErrorRow {
                    method: cell.method,
                    raw: whole(cell.error_histogram(&edges)),
                    studentised: whole(cell.studentised.clone()),
                })
                .collect();
            figures.push(error_figure(scored, truth, estimand, &rows));
        }
    }
    figures
}

/// Equally spaced edges over the range of all methods but for the extreme half per cent of each.
fn common_edges(cells: &[&CellDistribution]) -> Vec<f64> {
    const TAIL: f64 = 0.0025;
    let mut low = f64::INFINITY;
    let mut high = f64::NEG_INFINITY;
    for cell in cells {
        if let (Some(left), Some(right)) =
            (cell.error.quantile(TAIL), cell.error.quantile(1.0 - TAIL))
        {
            low = low.min(left);
            high = high.max(right);
        }
    }
    if !(low.is_finite() && high.is_finite()) || low >= high {
        let centre = if low.is_finite() { low } else { 0.0 };
        return vec![centre - 1.0, centre, centre + 1.0];
    }
    let step = (high - low) / RAW_BINS as f64;
    (0..=RAW_BINS)
        .map(|edge| low + step * edge as f64)
        .collect()
}

/// A histogram with its open ends as bins of their own.
fn whole(histogram: Histogram) -> ErrorHistogram {
    let mut edges = vec![f64::NEG_INFINITY];
    edges.extend(histogram.edges);
    edges.push(f64::INFINITY);
    let mut counts = vec![histogram.below];
    counts.extend(histogram.counts);
    counts.push(histogram.above);
    ErrorHistogram { edges, counts }
}
