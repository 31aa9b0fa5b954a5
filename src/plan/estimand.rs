//! What the study is to estimate.

/// A contrast `θ = c'β` of the analysis coefficients, fixed before the data.
#[derive(Debug, Clone)]
pub struct Estimand {
    /// Name, unique in the scenario.
    pub name: String,
    /// Contrast vector per truth, each of the analysis model's length. The same in every truth
    /// unless the estimand is defined along the truth's own coefficients.
    pub contrasts: Vec<Vec<f64>>,
    /// Value under the null hypothesis.
    pub null: f64,
}
