//! Selection rules: which candidates are enrolled.

mod quantile;
mod score;
mod threshold;
mod tilted;
mod uncertain;

use super::{Past, WorkingFit};
use crate::numerics::kernels::Kernels;
use crate::plan::{Design, SelectPart, SelectRule};
use crate::population::{Extreme, Pool};
use crate::streams::Stream;
use score::Scorer;

/// One part of a batch's selection, ready to choose.
#[derive(Debug, Clone)]
pub struct Selector {
    part: SelectPart,
    scorer: Option<Scorer>,
    /// Working model of the `uncertain` rule; scores keep their own.
    information: Option<WorkingFit>,
    scores: Vec<f64>,
    order: Vec<usize>,
    scratch: Vec<f64>,
    tile: Vec<f64>,
}

/// A candidate that is enrolled, with the probability of that.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Choice {
    /// Position in the pool.
    pub candidate: usize,
    /// Inclusion probability; NaN where the rule is deterministic in the score.
    pub probability: f64,
}

impl Selector {
    /// Prepares a part over the summed columns `used` of `design`.
    #[must_use]
    pub fn new(part: &SelectPart, design: &Design, used: &[usize]) -> Self {
        let information = match &part.rule {
            SelectRule::Uncertain { fit } => Some(WorkingFit::new(fit, design, used)),
            _ => None,
        };
        Self {
            scorer: part
                .rule
                .score()
                .map(|score| Scorer::new(score, design, used)),
            information,
            scores: Vec::new(),
            order: Vec::new(),
            scratch: Vec::new(),
            tile: Vec::new(),
            part: part.clone(),
        }
    }

    /// Candidates to screen.
    #[must_use]
    pub fn candidates(&self) -> usize {
        self.part.candidates
    }

    /// For a rule that takes the extreme candidates of a linear score: which end, and the slopes
    /// of the score on the covariate columns. `past` holds the batches that are due.
    pub fn extreme(&mut self, past: &Past<'_>, kernels: Kernels) -> Option<Extreme<'_>> {
        let SelectRule::Quantile { tail, .. } = self.part.rule else {
            return None;
        };
        let (size, candidates) = (self.part.size, self.part.candidates);
        if size >= candidates {
            return None;
        }
        let scorer = self.scorer.as_mut()?;
        scorer.update(past, kernels);
        Some(Extreme {
            slopes: scorer.slopes(),
            tail,
            candidates,
            size,
        })
    }

    /// Chooses among the pool, in order of arrival. `past` holds the batches that are due.
    pub fn choose(
        &mut self,
        past: &Past<'_>,
        pool: &Pool,
        stream: &mut Stream,
        kernels: Kernels,
        chosen: &mut Vec<Choice>,
    ) {
        chosen.clear();
        let size = self.part.size.min(pool.count());
        if let Some(scorer) = &mut self.scorer {
            scorer.score(past, pool, kernels, &mut self.scores);
        }
        match &self.part.rule {
            SelectRule::Random => {
                chosen.extend((0..size).map(|candidate| Choice {
                    candidate,
                    probability: 1.0,
                }));
            }
            SelectRule::Quantile { tail, .. } => {
                quantile::choose(&self.scores, *tail, size, &mut self.order, chosen);
            }
            SelectRule::AboveThreshold { threshold, .. } => {
                threshold::choose(&self.scores, *threshold, size, chosen);
            }
            SelectRule::Tilted { strength, .. } => {
                tilted::choose(
                    &self.scores,
                    *strength,
                    size,
                    stream,
                    &mut self.scratch,
                    chosen,
                );
            }
            SelectRule::Uncertain { .. } => {
                if let Some(fit) = &mut self.information {
                    fit.update(past, kernels);
                    let (scratch, tile) = (&mut self.scratch, &mut self.tile);
                    uncertain::score(fit, pool, kernels, scratch, tile, &mut self.scores);
                }
                let tail = crate::plan::Tail::Top;
                quantile::choose(&self.scores, tail, size, &mut self.order, chosen);
            }
        }
    }
}
