//! Methods: one estimator a file. They read a finished [`crate::trial::Trial`] and answer, or say
//! why they cannot.

mod answer;

pub use answer::{Answer, Estimate, NoAnswer};
