//! Linear algebra kernels and distributions.

pub mod distribution;
