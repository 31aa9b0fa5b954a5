//! Critical values of two-sided intervals.

use crate::numerics::distribution::{normal_quantile, student_t_quantile};

/// Critical values at one level, kept once computed for whole degrees of freedom.
#[derive(Debug, Clone)]
pub struct CriticalValues {
    upper: f64,
    normal: f64,
    student: Vec<f64>,
}

impl CriticalValues {
    /// Critical values at `level` for up to `largest` degrees of freedom without allocation.
    #[must_use]
    pub fn new(level: f64, largest: usize) -> Self {
        let upper = 0.5 + level / 2.0;
        Self {
            upper,
            normal: normal_quantile(upper),
            student: vec![f64::NAN; largest + 1],
        }
    }

    /// Chance of missing that the level allows, `1 - level`.
    #[must_use]
    pub fn miss(&self) -> f64 {
        2.0 * (1.0 - self.upper)
    }

    /// Standard normal critical value.
    #[must_use]
    pub fn normal(&self) -> f64 {
        self.normal
    }

    /// Student t critical value; `degrees` must be at least one.
    pub fn student(&mut self, degrees: usize) -> f64 {
        if degrees >= self.student.len() {
            return student_t_quantile(self.upper, degrees as f64);
        }
        let known = self.student[degrees];
        if !known.is_nan() {
            return known;
        }
        let value = student_t_quantile(self.upper, degrees as f64);
        self.student[degrees] = value;
        value
    }

    /// Student t critical value at fractional degrees of freedom.
    #[must_use]
    pub fn student_fractional(&self, degrees: f64) -> f64 {
        student_t_quantile(self.upper, degrees)
    }
}
