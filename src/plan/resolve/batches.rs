//! `[[batch]]`: sizes, repeats, and the parts of a mixture.

use super::marginals::{SUM_TOLERANCE, rounded};
use super::names::Names;
use super::population::Supply;
use super::{allocate, select};
use crate::plan::{
    Allocation, AllocationRule, Batch, Draw, Model, Score, ScoreFit, SelectPart, SelectRule,
};
use crate::scenario::{Content, Fields, Place};

/// Most batches after unrolling `repeat`.
const MOST_BATCHES: usize = 10_000;
/// Most parts of a mixture.
const MOST_PARTS: usize = 64;

/// A batch with the places that its mistakes are shown at.
#[derive(Debug, Clone)]
pub(super) struct PlacedBatch {
    pub(super) batch: Batch,
    /// Which `[[batch]]` it is unrolled from.
    pub(super) entry: usize,
    pub(super) place: Place,
    pub(super) size_place: Place,
    pub(super) part_places: Vec<Place>,
    pub(super) allocate_place: Place,
    /// Whether the working model of a part is the analysis model.
    default_regressors: Vec<bool>,
}

/// Reads every batch; with a roster, rules without a stated number of candidates screen all
/// remaining units.
pub(super) fn read(root: &Fields<'_>, names: &Names, supply: Supply) -> Vec<PlacedBatch> {
    let sink = root.sink();
    let nodes = root.list("batch").unwrap_or_default();
    if nodes.is_empty() && (!root.has("batch") || root.list("batch").is_some()) {
        sink.report_missing(
            root.place("batch"),
            "batch",
            "the scenario has no batch",
            Some("add [[batch]] with a size".to_owned()),
        );
    }
    let mut batches: Vec<PlacedBatch> = Vec::new();
    let mut enrolled = 0;
    for (entry, node) in nodes.iter().enumerate() {
        let Some(fields) = Fields::of(node, format!("batch entry {}", entry + 1), sink) else {
            continue;
        };
        fields.required("size", "say how many units the batch enrols");
        let size = fields.count("size", 1, usize::MAX);
        let repeat = if fields.has("repeat") {
            fields.count("repeat", 1, MOST_BATCHES)
        } else {
            Some(1)
        };
        let drafts = parts(&fields, names, size);
        if supply == Supply::Law {
            for draft in drafts.iter().flatten().filter(|draft| draft.screens_all()) {
                sink.report(
                    &draft.place,
                    "the rule says nothing about its candidates",
                    Some("give fraction = 0.15, say, or candidates = 800".to_owned()),
                );
            }
        }
        let allocate = allocation(&fields, names);
        let (Some(size), Some(repeat), Some(drafts)) = (size, repeat, drafts) else {
            continue;
        };
        if batches.len() + repeat > MOST_BATCHES {
            fields.report(
                "repeat",
                format!("there are more than {MOST_BATCHES} batches"),
                format!("a study can have {MOST_BATCHES}"),
            );
            continue;
        }
        for _ in 0..repeat {
            let remaining = match supply {
                Supply::Roster(Some(units)) => units.saturating_sub(enrolled),
                Supply::Roster(None) | Supply::Law => 0,
            };
            batches.push(PlacedBatch {
                batch: Batch {
                    size,
                    select: select::fill_candidates(&drafts, remaining),
                    allocate: allocate.clone(),
                },
                entry,
                place: node.place.clone(),
                size_place: fields.place("size").clone(),
                part_places: drafts.iter().map(|draft| draft.place.clone()).collect(),
                allocate_place: fields.place("allocate").clone(),
                default_regressors: drafts
                    .iter()
                    .map(|draft| draft.default_regressors)
                    .collect(),
            });
            enrolled += size;
        }
    }
    batches
}

/// Parts of the selection with their sizes. `None` after a mistake that leaves them unknown.
fn parts(fields: &Fields<'_>, names: &Names, size: Option<usize>) -> Option<Vec<select::Draft>> {
    if !fields.has("select") {
        return Some(vec![select::Draft::random(size?, fields.own_place())]);
    }
    let node = fields.node("select")?;
    let Content::List(nodes) = &node.content else {
        let table = fields.table("select")?;
        if table.has("share") {
            table.report(
                "share",
                "a share where there is only one rule",
                "take it out, or list several rules: select = [ {...}, {...} ]",
            );
        }
        return Some(vec![select::read(&table, names, size)?]);
    };
    if nodes.is_empty() || nodes.len() > MOST_PARTS {
        fields.report(
            "select",
            format!("the list has {} rules", nodes.len()),
            format!("list 1 to {MOST_PARTS}"),
        );
        return None;
    }
    let tables: Vec<Fields<'_>> = nodes
        .iter()
        .enumerate()
        .filter_map(|(index, node)| Fields::of(node, format!("rule {}", index + 1), fields.sink()))
        .collect();
    let mut shares = Vec::new();
    for table in &tables {
        table.required("share", "say which share of the batch the rule enrols");
        let inside = |share: f64| share > 0.0 && share <= 1.0;
        shares.extend(table.number_where("share", inside, "above 0 and at most 1"));
    }
    let complete = tables.len() == nodes.len() && shares.len() == nodes.len();
    let sum: f64 = shares.iter().sum();
    if complete && (sum - 1.0).abs() > SUM_TOLERANCE {
        fields.report(
            "select",
            format!("the shares sum to {}", rounded(sum)),
            "they must sum to 1",
        );
    }
    let sizes: Vec<Option<usize>> = match size {
        Some(size) if complete => largest_remainder(size, &shares)
            .into_iter()
            .map(Some)
            .collect(),
        _ => vec![None; tables.len()],
    };
    let mut drafts = Vec::new();
    for (table, size) in tables.iter().zip(&sizes) {
        if *size == Some(0) {
            table.report(
                "share",
                "the share is too small to enrol one unit",
                "make the share or the batch larger",
            );
        }
        drafts.extend(select::read(table, names, *size));
    }
    (complete && drafts.len() == nodes.len()).then_some(drafts)
}

/// Sizes with a given sum, in proportion to shares (Hamilton's method; ties to the earlier part).
#[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)] // shares lie in [0, 1]
fn largest_remainder(size: usize, shares: &[f64]) -> Vec<usize> {
    let total: f64 = shares.iter().sum();
    let quotas: Vec<f64> = shares
        .iter()
        .map(|share| size as f64 * share / total)
        .collect();
    let mut sizes: Vec<usize> = quotas.iter().map(|quota| quota.floor() as usize).collect();
    let mut order: Vec<usize> = (0..shares.len()).collect();
    order.sort_by(|&one, &two| {
        let remainder = |index: usize| quotas[index] - quotas[index].floor();
        remainder(two).total_cmp(&remainder(one))
    });
    let left = size.saturating_sub(sizes.iter().sum());
    for &index in order.iter().cycle().take(left) {
        sizes[index] += 1;
    }
    sizes
}

fn allocation(fields: &Fields<'_>, names: &Names) -> Option<Allocation> {
    if !fields.has("allocate") {
        return names.has_arms().then_some(Allocation {
            rule: AllocationRule::Equal,
            floor: 0.0,
            draw: Draw::Quota,
        });
    }
    if !names.has_arms() {
        fields.sink().report_missing(
            fields.place("allocate"),
            "arms",
            "an allocation rule in a study without arms",
            Some("add [arms] with names = [...], or take the rule out".to_owned()),
        );
        return None;
    }
    allocate::read(&fields.table("allocate")?, names)
}

/// Gives the analysis model to working models without regressors of their own.
pub(super) fn with_default_regressors(
    mut batches: Vec<PlacedBatch>,
    analysis: &Model,
) -> Vec<PlacedBatch> {
    for placed in &mut batches {
        for (part, default) in placed
            .batch
            .select
            .iter_mut()
            .zip(&placed.default_regressors)
        {
            if *default && let Some(fit) = fit_mut(part) {
                fit.model = analysis.clone();
            }
        }
    }
    batches
}

fn fit_mut(part: &mut SelectPart) -> Option<&mut ScoreFit> {
    match &mut part.rule {
        SelectRule::Uncertain { fit } => Some(fit),
        SelectRule::Quantile { score, .. }
        | SelectRule::AboveThreshold { score, .. }
        | SelectRule::Tilted { score, .. } => match score {
            Score::PredictedOutcome { fit, .. } | Score::PredictedContrast { fit, .. } => Some(fit),
            Score::Covariate { .. } => None,
        },
        SelectRule::Random => None,
    }
}

/// The batches without their places.
pub(super) fn plain(batches: Vec<PlacedBatch>) -> Vec<Batch> {
    batches.into_iter().map(|placed| placed.batch).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn parts_share_a_batch_to_the_last_unit() {
        assert_eq!(largest_remainder(10, &[0.5, 0.5]), [5, 5]);
        assert_eq!(largest_remainder(11, &[0.5, 0.5]), [6, 5]);
        assert_eq!(largest_remainder(10, &[0.25, 0.25, 0.5]), [3, 2, 5]);
        for size in 1..50 {
            let sizes = largest_remainder(size, &[0.1, 0.2, 0.3, 0.4]);
            assert_eq!(sizes.iter().sum::<usize>(), size);
        }
    }
}
