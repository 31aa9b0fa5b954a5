//! One trial at a time, in buffers that are reused.

use super::Study;
use crate::methods::{Needs, Workbench, estimate};
use crate::numerics::kernels::Kernels;
use crate::population::{Pool, Sampler};
use crate::rules::Past;
use crate::rules::allocate::Allocator;
use crate::rules::select::{Choice, Selector};
use crate::score::BlockRecord;
use crate::streams::{Phase, Purpose, Streams};
use crate::trial::{BatchSums, Trial};

/// Buffers of one thread. After the first trial, a trial allocates nothing.
#[derive(Debug, Clone)]
pub struct Worker<'a> {
    study: &'a Study,
    trial: Trial,
    sums: BatchSums,
    pool: Pool,
    /// Per batch, per part.
    selectors: Vec<Vec<Selector>>,
    allocators: Vec<Option<Allocator>>,
    bench: Workbench,
    chosen: Vec<Choice>,
    scratch: Vec<f64>,
    kernels: Kernels,
}

impl<'a> Worker<'a> {
    /// Buffers for a study, with a workbench for what its methods need.
    #[must_use]
    pub fn new(study: &'a Study) -> Self {
        Self::with_needs(study, study.needs())
    }

    /// Buffers for a study, with a workbench for `needs`.
    #[must_use]
    pub fn with_needs(study: &'a Study, needs: Needs) -> Self {
        let plan = study.plan();
        let design = study.design();
        let used = study.used();
        let units = plan.units();
        let selectors = plan
            .batches
            .iter()
            .map(|batch| {
                batch
                    .select
                    .iter()
                    .map(|p| Selector::new(p, design, used))
                    .collect()
            })
            .collect();
        let allocators = plan
            .batches
            .iter()
            .map(|batch| {
                let allocation = batch.allocate.as_ref()?;
                Some(Allocator::new(allocation, plan.arm_count(), design))
            })
            .collect();
        Self {
            study,
            trial: Trial::new(units, design.width(), plan.arm_count(), plan.batches.len()),
            sums: BatchSums::new(used.to_vec(), plan.batches.len()),
            pool: Pool::new(design.covariates),
            selectors,
            allocators,
            bench: Workbench::new(plan, study.analysis(), used, needs, study.kernels()),
            chosen: Vec::new(),
            scratch: Vec::new(),
            kernels: study.kernels(),
        }
    }

    /// Simulates trial `index` under truth `truth`.
    pub fn simulate(&mut self, truth: usize, phase: Phase, index: u64) {
        let plan = self.study.plan();
        let streams = Streams::new(plan.precision.seed, phase, index);
        self.trial.clear();
        self.sums.clear();
        let roster_rows = match self.study.sampler() {
            Sampler::Law(_) => 0,
            Sampler::Roster(roster) => roster.rows(),
        };
        self.pool.reset(roster_rows);
        for batch in 0..plan.batches.len() {
            let due = batch.saturating_sub(plan.truths[truth].delay);
            let first = self.trial.rows();
            for part in 0..self.selectors[batch].len() {
                self.enrol(&streams, batch, part, due);
            }
            let rows = first..self.trial.rows();
            self.trial.column_mut(0, rows.clone()).fill(1.0);
            if self.allocators[batch].is_some() {
                self.allocate(&streams, batch, due, rows.clone());
            }
            self.fill_interactions(rows.clone());
            self.observe(&streams, truth, batch, rows);
            self.trial.finish_batch();
            self.sums.push(&self.trial, self.kernels);
        }
    }

    fn enrol(&mut self, streams: &Streams, batch: usize, part: usize, due: usize) {
        let selector = &mut self.selectors[batch][part];
        let sampler = self.study.sampler();
        let past = Past::new(&self.trial, &self.sums, due);
        let extreme = if self.study.draws_extremes() {
            selector.extreme(&past, self.kernels)
        } else {
            None
        };
        if let Some(extreme) = extreme {
            sampler.draw_extreme(streams, batch, part, &extreme, &mut self.pool);
            let everyone = 0..self.pool.count();
            self.chosen.clear();
            self.chosen.extend(everyone.map(|candidate| Choice {
                candidate,
                probability: f64::NAN,
            }));
        } else {
            sampler.draw(streams, batch, part, selector.candidates(), &mut self.pool);
            let mut stream = streams.open(Purpose::Selection, batch, part, 0);
            selector.choose(
                &past,
                &self.pool,
                &mut stream,
                self.kernels,
                &mut self.chosen,
            );
        }
        let first = self.trial.rows();
        for choice in &self.chosen {
            self.trial
                .push_unit(self.pool.source(choice.candidate), choice.probability);
            self.pool.enrol(choice.candidate);
        }
        let rows = first..self.trial.rows();
        let design = self.study.design();
        for column in 0..design.covariates {
            let source = self.pool.covariates().column(column);
            let target = self
                .trial
                .column_mut(design.first_covariate() + column, rows.clone());
            // Whoever enrols every candidate enrols them in order.
            if self.chosen.len() == source.len() {
                target.copy_from_slice(source);
                continue;
            }
            for (value, choice) in target.iter_mut().zip(&self.chosen) {
                *value = source[choice.candidate];
            }
        }
        self.pool.finish();
    }

    fn allocate(
        &mut self,
        streams: &Streams,
        batch: usize,
        due: usize,
        rows: std::ops::Range<usize>,
    ) {
        let Some(allocator) = &mut self.allocators[batch] else {
            return;
        };
        let mut stream = streams.open(Purpose::Allocation, batch, 0, 0);
        let past = Past::new(&self.trial, &self.sums, due);
        allocator.allocate(
            &past,
            self.trial.design(rows.clone()),
            &mut stream,
            self.kernels,
        );
        self.trial
            .arms_mut(rows.clone())
            .copy_from_slice(allocator.arms());
        self.trial
            .allocation_probabilities_mut(rows.clone())
            .copy_from_slice(allocator.probabilities());
        let first = self.study.design().first_arm_indicator();
        for indicator in 0..self.study.design().arm_indicators {
            let target = self.trial.column_mut(first + indicator, rows.clone());
            for (value, &arm) in target.iter_mut().zip(allocator.arms()) {
                *value = f64::from(u8::from(arm == indicator + 1));
            }
        }
    }

    fn fill_interactions(&mut self, rows: std::ops::Range<usize>) {
        let first_covariate = self.study.design().first_covariate();
        for (stored, arm, column) in self.study.design().interactions() {
            for row in rows.clone() {
                let inside = self.trial.arms()[row] == arm;
                let value = self.trial.value(row, first_covariate + column);
                self.trial.column_mut(stored, row..row + 1)[0] = if inside { value } else { 0.0 };
            }
        }
    }

    fn observe(
        &mut self,
        streams: &Streams,
        truth: usize,
        batch: usize,
        rows: std::ops::Range<usize>,
    ) {
        if let Some(recorded) = self.study.recorded_outcomes() {
            for row in rows {
                let outcome = recorded[self.trial.sources()[row]];
                self.trial.outcomes_mut(row..row + 1)[0] = outcome;
                self.trial.expected_mut(row..row + 1)[0] = outcome;
            }
            return;
        }
        let model = self.study.outcome(truth);
        model.fill(
            streams,
            batch,
            rows,
            &mut self.trial,
            &mut self.scratch,
            self.kernels,
        );
    }

    /// The trial simulated last.
    #[must_use]
    pub fn trial(&self) -> &Trial {
        &self.trial
    }

    /// Points the workbench at the contrasts of a truth.
    pub fn set_truth(&mut self, truth: usize) {
        for (target, estimand) in self
            .bench
            .contrasts_mut()
            .iter_mut()
            .zip(&self.study.plan().estimands)
        {
            target.copy_from_slice(&estimand.contrasts[truth]);
        }
    }

    /// Prepares the workbench for the trial simulated last.
    pub fn prepare(&mut self) -> &mut Workbench {
        self.bench.prepare(&self.trial, &self.sums);
        &mut self.bench
    }

    /// The workbench as prepared last, with the trial simulated last.
    pub fn workbench(&mut self) -> (&mut Workbench, &Trial) {
        (&mut self.bench, &self.trial)
    }

    /// Applies every method to the trial simulated last and appends the results to `record`.
    pub fn score_into(&mut self, record: &mut BlockRecord) {
        self.bench.prepare(&self.trial, &self.sums);
        for estimand in 0..self.study.plan().estimands.len() {
            for method in self.study.methods() {
                record
                    .estimates
                    .push(estimate(method, &mut self.bench, &self.trial, estimand));
            }
        }
        let units = self.trial.rows();
        record.trials += 1;
        record.units.push(units as f64);
        for arm in 0..self.trial.arm_count() {
            let count = self.trial.arms().iter().filter(|&&own| own == arm).count();
            record.arm_units.push(count as f64);
        }
        let total: f64 = self.trial.expected().iter().sum();
        record.mean_outcomes.push(total / units.max(1) as f64);
    }
}
