//! Linear algebra kernels, distributions, quadrature: nothing here knows of trials.

pub mod kernels;
pub mod quantile_table;
