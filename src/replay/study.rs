//! A plan made ready to be replayed.

use super::{Pilot, projection};
use crate::methods::{Needs, TunedMethod};
use crate::numerics::kernels::Kernels;
use crate::outcome::OutcomeModel;
use crate::plan::{BatchWeights, DebiasingPenalty, Design, MethodKind, Plan, Source};
use crate::population::Sampler;

/// True value of an estimand under one truth.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct TrueValue {
    /// The value.
    pub value: f64,
    /// Its Monte Carlo standard error; zero where the value is exact.
    pub error: f64,
}

/// A plan with samplers prepared, true values computed and tuning constants fixed.
#[derive(Debug, Clone)]
pub struct Study {
    plan: Plan,
    design: Design,
    /// Stored columns that batch sums are kept for, increasing.
    used: Vec<usize>,
    /// Stored columns of the analysis model.
    analysis: Vec<usize>,
    sampler: Sampler,
    outcomes: Vec<OutcomeModel>,
    /// Per truth, per estimand.
    true_values: Vec<Vec<TrueValue>>,
    pilot: Option<Pilot>,
    methods: Vec<TunedMethod>,
    needs: Needs,
    kernels: Kernels,
    /// Whether the extreme candidates of a Gaussian population are drawn without the others.
    draws_extremes: bool,
}

impl Study {
    /// Prepares a plan: samplers, true values, and the pilot replay if a method's tuning constant
    /// comes from one.
    #[must_use]
    pub fn prepare(plan: &Plan) -> Self {
        let mut study = Self::without_methods(plan);
        study.true_values = projection::true_values(&study);
        let wants_pilot = plan.methods.iter().any(|method| {
            matches!(
                method.kind,
                MethodKind::BatchCombined {
                    weights: BatchWeights::Planned
                } | MethodKind::WDecorrelation {
                    penalty: DebiasingPenalty::Replayed,
                    ..
                }
            )
        });
        study.pilot = wants_pilot.then(|| Pilot::run(&study));
        study.methods = plan
            .methods
            .iter()
            .map(|method| study.tune(&method.kind))
            .collect();
        study.needs = study
            .methods
            .iter()
            .map(TunedMethod::needs)
            .fold(Needs::default(), Needs::union);
        study
    }

    /// The study with no method scored and no true value computed: enough to simulate trials.
    #[must_use]
    pub fn without_methods(plan: &Plan) -> Self {
        let design = plan.design();
        let analysis = design.columns_of(&plan.analysis);
        let mut used = analysis.clone();
        for fit in plan
            .batches
            .iter()
            .flat_map(|b| &b.select)
            .filter_map(|part| part.rule.fit())
        {
            used.extend(design.columns_of(&fit.model));
        }
        used.sort_unstable();
        used.dedup();
        let outcomes = plan
            .truths
            .iter()
            .map(|truth| OutcomeModel::new(truth, &design, plan.batches.len()))
            .collect();
        Self {
            sampler: Sampler::new(&plan.population),
            design,
            used,
            analysis,
            outcomes,
            true_values: Vec::new(),
            pilot: None,
            methods: Vec::new(),
            needs: Needs::default(),
            kernels: Kernels::detect(),
            draws_extremes: true,
            plan: plan.clone(),
        }
    }

    /// The same study computed by the kernels for the baseline instruction set.
    #[must_use]
    pub fn with_portable_kernels(mut self) -> Self {
        self.kernels = Kernels::portable();
        self
    }

    /// The same study with every candidate drawn, scored and ranked one by one.
    #[must_use]
    pub fn with_every_candidate_drawn(mut self) -> Self {
        self.draws_extremes = false;
        self
    }

    /// Whether the extreme candidates are drawn without the others.
    #[must_use]
    pub fn draws_extremes(&self) -> bool {
        self.draws_extremes && self.sampler.draws_extremes()
    }

    fn tune(&self, kind: &MethodKind) -> TunedMethod {
        let estimands = self.plan.estimands.len();
        match kind {
            MethodKind::LeastSquares { variance } => TunedMethod::LeastSquares {
                variance: *variance,
            },
            MethodKind::Ridge { penalty } => TunedMethod::Ridge { penalty: *penalty },
            MethodKind::FirstBatch => TunedMethod::FirstBatch,
            MethodKind::LastBatch => TunedMethod::LastBatch,
            MethodKind::InverseVariance => TunedMethod::InverseVariance,
            MethodKind::BatchCombined { weights } => {
                let fixed = |row: Vec<f64>| vec![row; estimands];
                let weights = match weights {
                    BatchWeights::Size => fixed(self.size_weights()),
                    BatchWeights::Equal => fixed(vec![1.0 / self.batches() as f64; self.batches()]),
                    BatchWeights::Given(row) => fixed(row.clone()),
                    BatchWeights::Planned => match &self.pilot {
                        Some(pilot) => pilot.planned_weights.clone(),
                        None => fixed(self.size_weights()),
                    },
                };
                TunedMethod::BatchCombined { weights }
            }
            MethodKind::WDecorrelation {
                penalty,
                steps,
                error,
            } => TunedMethod::WDecorrelation {
                penalty: match (penalty, &self.pilot) {
                    (DebiasingPenalty::Fixed(value), _) => *value,
                    (DebiasingPenalty::Replayed, Some(pilot)) => pilot.decorrelation_penalty,
                    (DebiasingPenalty::Replayed, None) => 1.0,
                },
                steps: *steps,
                error: *error,
            },
            MethodKind::AnticipatedDecorrelation => TunedMethod::AnticipatedDecorrelation,
            MethodKind::PredictablePivot => TunedMethod::PredictablePivot,
            MethodKind::SelfNormalised { penalty, bound } => TunedMethod::SelfNormalised {
                penalty: *penalty,
                bound: *bound,
            },
        }
    }
    fn size_weights(&self) -> Vec<f64> {
        let units = self.plan.units() as f64;
        self.plan
            .batches
            .iter()
            .map(|batch| batch.size as f64 / units)
            .collect()
    }

    /// The plan.
    #[must_use]
    pub fn plan(&self) -> &Plan {
        &self.plan
    }

    /// Stored columns.
    #[must_use]
    pub fn design(&self) -> &Design {
        &self.design
    }

    /// Stored columns that batch sums are kept for.
    #[must_use]
    pub fn used(&self) -> &[usize] {
        &self.used
    }

    /// Stored columns of the analysis model.
    #[must_use]
    pub fn analysis(&self) -> &[usize] {
        &self.analysis
    }

    /// Where candidates come from.
    #[must_use]
    pub fn sampler(&self) -> &Sampler {
        &self.sampler
    }

    /// Outcome model of a truth.
    #[must_use]
    pub fn outcome(&self, truth: usize) -> &OutcomeModel {
        &self.outcomes[truth]
    }

    /// Recorded outcomes of the roster, if the scenario uses them.
    #[must_use]
    pub fn recorded_outcomes(&self) -> Option<&[f64]> {
        match &self.plan.population.source {
            Source::Roster(roster) => roster.outcomes.as_deref(),
            Source::Law(_) => None,
        }
    }

    /// True values of the estimands under a truth.
    #[must_use]
    pub fn true_values(&self, truth: usize) -> &[TrueValue] {
        &self.true_values[truth]
    }

    /// True values of all truths, one row per truth, one entry per estimand.
    #[must_use]
    pub fn true_value_table(&self) -> Vec<Vec<f64>> {
        let rows = self.true_values.iter();
        rows.map(|row| row.iter().map(|value| value.value).collect())
            .collect()
    }

    /// The pilot replay, if one was needed.
    #[must_use]
    pub fn pilot(&self) -> Option<&Pilot> {
        self.pilot.as_ref()
    }

    /// Methods with their tuning constants fixed.
    #[must_use]
    pub fn methods(&self) -> &[TunedMethod] {
        &self.methods
    }

    /// What the methods read.
    #[must_use]
    pub fn needs(&self) -> Needs {
        self.needs
    }

    /// Number of batches.
    #[must_use]
    pub fn batches(&self) -> usize {
        self.plan.batches.len()
    }

    /// Kernels that the study computes with.
    #[must_use]
    pub fn kernels(&self) -> Kernels {
        self.kernels
    }
}
