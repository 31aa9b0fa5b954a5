//! Tables, result folder, figures: everything that shows what was scored.
//!
//! This module reads measures and verdicts, never trials; the one exception is [`TrialsFile`],
//! which is handed the rows it stores. Apart from `run.json`, which holds the clock and the
//! machine, every byte written depends on the results alone.

mod assemble;
mod csv_files;
pub mod figures;
#[cfg(test)]
mod fixtures;
mod folder;
mod folder_error;
mod narrative;
mod number;
mod operating_table;
mod result_files;
mod run_record;
mod scored;
mod summary;
mod sweep_text;
mod table;
mod text;
mod text_table;
mod trial_listing;
mod trials_file;
mod verdict_table;

pub use assemble::replay_figures;
pub use csv_files::{CsvError, measures_csv, operating_csv, sweep_csv, verdicts_csv};
pub use folder::ResultFolder;
pub use folder_error::FolderError;
pub use narrative::{CAUTIONS, narrative};
pub use operating_table::operating_tables;
pub use result_files::write_result;
pub use run_record::{Clock, FailureTotal, Machine, RunRecord, Shard, sha256_hex, utc_text};
pub use scored::{AxisValue, Scored, SweepPoint, VerdictLine};
pub use summary::{Summary, summary_json};
pub use sweep_text::{break_points_csv, break_sentences, sweep_tables};
pub use table::{Look, measure_tables, replay_tables};
pub use text_table::{Align, Cell, Column, TextTable};
pub use trial_listing::trial_listing;
pub use trials_file::{TrialsFile, TrialsFileError};
pub use verdict_table::verdict_tables;

/// Data dictionary of a result folder: every file, column and measure. Written as `columns.md`.
pub const DATA_DICTIONARY: &str = include_str!("columns.md");
