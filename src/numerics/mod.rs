//! Linear algebra kernels, distributions, quadrature: nothing here knows of trials.

pub mod distribution;
pub mod eigen;
pub mod kernels;
pub mod least_squares;
pub mod quadrature;
pub mod quantile_table;
