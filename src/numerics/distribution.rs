//! Temporary.
use statrs::distribution::{ContinuousCDF, Normal, StudentsT};
/// cdf
#[must_use]
pub fn normal_cdf(z: f64) -> f64 {
    Normal::standard().cdf(z)
}
/// quantile
#[must_use]
pub fn normal_quantile(p: f64) -> f64 {
    Normal::standard().inverse_cdf(p)
}
/// quantile
#[must_use]
pub fn student_t_quantile(p: f64, df: f64) -> f64 {
    if df.is_infinite() {
        normal_quantile(p)
    } else {
        StudentsT::new(0.0, 1.0, df).unwrap().inverse_cdf(p)
    }
}
