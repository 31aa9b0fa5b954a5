//! The columnar record of one trial and its batch sums. Nothing here knows how a trial came about.

mod record;
mod sums;

pub use record::Trial;
pub use sums::{BatchSums, SumsPrefix, SumsView};
