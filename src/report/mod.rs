//! Tables, result folder, figures: they read measures, never trials.

pub mod narrative;
pub mod trial_listing;
