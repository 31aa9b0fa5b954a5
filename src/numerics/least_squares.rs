//! Temporary.
/// LS
#[derive(Debug, Clone, Default)]
pub struct LeastSquares {
    coefficients: Vec<f64>,
    rss: f64,
}
/// rank
#[derive(Debug, Clone, Copy)]
pub struct RankDeficient;
impl LeastSquares {
    /// new
    #[must_use]
    pub fn new() -> Self {
        Self::default()
    }
    /// fit
    pub fn fit(
        &mut self,
        _x: &[f64],
        _leading: usize,
        _rows: usize,
        _columns: &[usize],
        _y: &[f64],
    ) -> Result<(), RankDeficient> {
        Err(RankDeficient)
    }
    /// b
    #[must_use]
    pub fn coefficients(&self) -> &[f64] {
        &self.coefficients
    }
    /// rss
    #[must_use]
    pub fn residual_sum_of_squares(&self) -> f64 {
        self.rss
    }
    /// v
    #[must_use]
    pub fn contrast_variance(&self, _c: &[f64]) -> f64 {
        0.0
    }
    /// a
    pub fn contrast_weights(&self, _c: &[f64], _out: &mut [f64]) {}
    /// h
    pub fn leverages(&self, _out: &mut [f64]) {}
}
