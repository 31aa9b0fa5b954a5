//! Rules: who is enrolled, and in which arm.
//!
//! A rule sees [`Past`] and the candidates at hand. `Past` is cut at the last batch whose
//! outcomes are due, so that no rule can look ahead.

pub mod allocate;
mod past;
pub mod select;
mod working_fit;

pub use past::Past;
pub use working_fit::WorkingFit;
