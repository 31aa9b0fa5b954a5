//! Questions that take more than one replay. They call [`crate::replay`], never the other way.

mod break_point;
mod grid;

pub use break_point::{BreakBracket, Search, find_breaks};
pub use grid::{GridPoint, grid, point};
