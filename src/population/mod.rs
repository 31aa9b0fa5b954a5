//! Covariates of candidates: drawn from a law, or units of a roster.

mod extreme;
mod law;
mod marginal;
mod pool;
mod roster;

pub use extreme::Extreme;
pub use law::LawSampler;
pub(crate) use marginal::student_t_table;
pub use pool::Pool;
pub use roster::RosterSampler;

use crate::plan::{Population, Source};
use crate::streams::Streams;

/// Where candidates come from, ready to be drawn.
#[derive(Debug, Clone)]
pub enum Sampler {
    /// A law.
    Law(LawSampler),
    /// A roster.
    Roster(RosterSampler),
}

impl Sampler {
    /// Prepares a population for drawing.
    #[must_use]
    pub fn new(population: &Population) -> Self {
        match &population.source {
            Source::Law(law) => Self::Law(LawSampler::new(law)),
            Source::Roster(roster) => Self::Roster(RosterSampler::new(roster)),
        }
    }

    /// Whether the extreme candidates can be drawn without the others.
    #[must_use]
    pub fn draws_extremes(&self) -> bool {
        match self {
            Self::Law(law) => law.is_gaussian(),
            Self::Roster(_) => false,
        }
    }

    /// Draws the extreme candidates alone into the pool, if [`Self::draws_extremes`].
    pub fn draw_extreme(
        &self,
        streams: &Streams,
        batch: usize,
        part: usize,
        extreme: &Extreme<'_>,
        pool: &mut Pool,
    ) {
        if let Self::Law(law) = self {
            law.draw_extreme(streams, batch, part, extreme, pool);
        }
    }

    /// Draws `count` candidates for one part of a batch into the pool.
    ///
    /// Candidates from a roster are drawn without replacement from the units that are not yet
    /// enrolled; `pool` keeps track of them.
    pub fn draw(
        &self,
        streams: &Streams,
        batch: usize,
        part: usize,
        count: usize,
        pool: &mut Pool,
    ) {
        match self {
            Self::Law(law) => law.draw(streams, batch, part, count, pool),
            Self::Roster(roster) => roster.draw(streams, batch, part, count, pool),
        }
    }
}
