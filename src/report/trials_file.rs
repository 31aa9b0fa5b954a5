//! `trials.parquet`: every estimate of every trial, streamed in row groups of bounded size.

use std::io::Write;
use std::sync::Arc;

use parquet::basic::{LogicalType, Repetition, Type as Physical};
use parquet::data_type::{ByteArray, ByteArrayType, DataType, DoubleType, Int32Type, Int64Type};
use parquet::errors::ParquetError;
use parquet::file::metadata::KeyValue;
use parquet::file::properties::WriterProperties;
use parquet::file::writer::{SerializedFileWriter, SerializedRowGroupWriter};
use parquet::schema::types::{Type, TypePtr};

use super::Scored;
use crate::methods::Estimate;
use crate::score::BlockRecord;

/// Rows of a row group: with nine columns of at most eight bytes, a few megabytes of memory.
const ROW_GROUP: usize = 1 << 16;

/// Definition levels of an optional column outside any group.
const PRESENT: i16 = 1;
const ABSENT: i16 = 0;

/// Why the trials could not be written.
#[derive(Debug, thiserror::Error)]
pub enum TrialsFileError {
    /// The Parquet writer failed, as when the disk is full.
    #[error("trials.parquet cannot be written: {0}")]
    Parquet(#[from] ParquetError),
    /// A name could not be written as JSON.
    #[error("the names in trials.parquet cannot be written: {0}")]
    Names(#[from] serde_json::Error),
    /// An index is too large for its column.
    #[error("trials.parquet: index {index} of the {column} column is too large for its type")]
    TooLarge {
        /// The column.
        column: &'static str,
        /// The index.
        index: u64,
    },
}

/// Writer of `trials.parquet`.
///
/// Rows are pushed in the order in which they are to stand; the bytes depend on them alone.
pub struct TrialsFile<W: Write + Send> {
    writer: SerializedFileWriter<W>,
    rows: Rows,
}

/// Rows of the row group that is being filled.
#[derive(Default)]
struct Rows {
    truth: Vec<i32>,
    trial: Vec<i64>,
    estimand: Vec<i32>,
    method: Vec<i32>,
    answered: Vec<i16>,
    unanswered: Vec<i16>,
    point: Vec<f64>,
    standard_error: Vec<f64>,
    lower: Vec<f64>,
    upper: Vec<f64>,
    no_answer: Vec<ByteArray>,
}

impl<W: Write + Send> TrialsFile<W> {
    /// Begins a file on `sink`. The names of `scored` go into the key-value metadata; its
    /// measures are not looked at and may be empty.
    ///
    /// # Errors
    /// If the sink cannot be written to.
    pub fn begin(sink: W, scored: &Scored) -> Result<Self, TrialsFileError> {
        let names = |key: &str, names: &[String]| -> Result<KeyValue, TrialsFileError> {
            Ok(KeyValue::new(key.to_owned(), serde_json::to_string(names)?))
        };
        let metadata = vec![
            names("truths", &scored.truths)?,
            names("estimands", &scored.estimands)?,
            names("methods", &scored.methods)?,
        ];
        let program = concat!(env!("CARGO_PKG_NAME"), " ", env!("CARGO_PKG_VERSION"));
        let properties = WriterProperties::builder()
            .set_created_by(program.to_owned())
            .set_key_value_metadata(Some(metadata))
            .build();
        let writer = SerializedFileWriter::new(sink, schema()?, Arc::new(properties))?;
        Ok(Self {
            writer,
            rows: Rows::default(),
        })
    }

    /// Adds one row.
    ///
    /// # Errors
    /// If an index is too large, or the sink cannot be written to.
    pub fn push(
        &mut self,
        truth: usize,
        trial: u64,
        estimand: usize,
        method: usize,
        estimate: &Estimate,
    ) -> Result<(), TrialsFileError> {
        let rows = &mut self.rows;
        let narrow = |column, index: usize| {
            let too_large = |_| TrialsFileError::TooLarge {
                column,
                index: index as u64,
            };
            i32::try_from(index).map_err(too_large)
        };
        let indices = (
            narrow("truth", truth)?,
            narrow("estimand", estimand)?,
            narrow("method", method)?,
        );
        let trial = i64::try_from(trial).map_err(|_| TrialsFileError::TooLarge {
            column: "trial",
            index: trial,
        })?;
        rows.truth.push(indices.0);
        rows.trial.push(trial);
        rows.estimand.push(indices.1);
        rows.method.push(indices.2);
        match estimate {
            Ok(answer) => {
                rows.answered.push(PRESENT);
                rows.unanswered.push(ABSENT);
                rows.point.push(answer.point);
                rows.standard_error.push(answer.standard_error);
                rows.lower.push(answer.lower);
                rows.upper.push(answer.upper);
            }
            Err(reason) => {
                rows.answered.push(ABSENT);
                rows.unanswered.push(PRESENT);
                rows.no_answer.push(ByteArray::from(reason.key()));
            }
        }
        if rows.truth.len() >= ROW_GROUP {
            self.flush()?;
        }
        Ok(())
    }

    /// Adds the rows of a block of trials, of which `first_trial` is the first, with `methods`
    /// methods per estimand.
    ///
    /// # Errors
    /// As for [`Self::push`].
    pub fn push_block(
        &mut self,
        truth: usize,
        first_trial: u64,
        methods: usize,
        block: &BlockRecord,
    ) -> Result<(), TrialsFileError> {
        if block.trials == 0 {
            return Ok(());
        }
        let cells = (block.estimates.len() / block.trials).max(1);
        for (trial, estimates) in (first_trial..).zip(block.estimates.chunks(cells)) {
            for (cell, estimate) in estimates.iter().enumerate() {
                self.push(truth, trial, cell / methods, cell % methods, estimate)?;
            }
        }
        Ok(())
    }

    /// Writes what is left and the footer, and gives the sink back.
    ///
    /// # Errors
    /// If the sink cannot be written to.
    pub fn finish(mut self) -> Result<W, TrialsFileError> {
        self.flush()?;
        Ok(self.writer.into_inner()?)
    }

    fn flush(&mut self) -> Result<(), TrialsFileError> {
        if self.rows.truth.is_empty() {
            return Ok(());
        }
        let rows = &self.rows;
        let mut group = self.writer.next_row_group()?;
        column::<Int32Type, _>(&mut group, &rows.truth, None)?;
        column::<Int64Type, _>(&mut group, &rows.trial, None)?;
        column::<Int32Type, _>(&mut group, &rows.estimand, None)?;
        column::<Int32Type, _>(&mut group, &rows.method, None)?;
        for values in [&rows.point, &rows.standard_error, &rows.lower, &rows.upper] {
            column::<DoubleType, _>(&mut group, values, Some(&rows.answered))?;
        }
        column::<ByteArrayType, _>(&mut group, &rows.no_answer, Some(&rows.unanswered))?;
        group.close()?;
        self.rows = Rows::default();
        Ok(())
    }
}

fn column<T: DataType, W: Write + Send>(
    group: &mut SerializedRowGroupWriter<'_, W>,
    values: &[T::T],
    levels: Option<&[i16]>,
) -> Result<(), ParquetError> {
    let missing = || ParquetError::General("the schema has too few columns".to_owned());
    let mut column = group.next_column()?.ok_or_else(missing)?;
    column.typed::<T>().write_batch(values, levels, None)?;
    column.close()
}

fn schema() -> Result<TypePtr, ParquetError> {
    let field = |name: &str, physical, repetition, logical| {
        Type::primitive_type_builder(name, physical)
            .with_repetition(repetition)
            .with_logical_type(logical)
            .build()
            .map(Arc::new)
    };
    let required = |name, physical| field(name, physical, Repetition::REQUIRED, None);
    let optional = |name, physical, logical| field(name, physical, Repetition::OPTIONAL, logical);
    let fields = vec![
        required("truth", Physical::INT32)?,
        required("trial", Physical::INT64)?,
        required("estimand", Physical::INT32)?,
        required("method", Physical::INT32)?,
        optional("point", Physical::DOUBLE, None)?,
        optional("standard_error", Physical::DOUBLE, None)?,
        optional("lower", Physical::DOUBLE, None)?,
        optional("upper", Physical::DOUBLE, None)?,
        optional("no_answer", Physical::BYTE_ARRAY, Some(LogicalType::String))?,
    ];
    Ok(Arc::new(
        Type::group_type_builder("trials")
            .with_fields(fields)
            .build()?,
    ))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::methods::{Answer, NoAnswer};
    use crate::report::fixtures;
    use parquet::file::reader::{FileReader as _, SerializedFileReader};
    use parquet::record::Field;

    /// Every third estimate is missing; the others are functions of their place.
    fn estimate(place: u32) -> Estimate {
        if place % 3 == 2 {
            Err(NoAnswer::EmptyBatch)
        } else {
            Ok(Answer::symmetric(f64::from(place) / 7.0, 0.5, 1.96))
        }
    }

    fn written(trials: u32) -> Vec<u8> {
        let mut file = TrialsFile::begin(Vec::new(), &fixtures::scored(2)).unwrap();
        let block = BlockRecord {
            trials: trials as usize,
            estimates: (0..4 * trials).map(estimate).collect(),
            ..BlockRecord::default()
        };
        file.push_block(1, 100, 2, &block).unwrap();
        file.finish().unwrap()
    }

    fn open(bytes: &[u8]) -> SerializedFileReader<std::fs::File> {
        let mut file = tempfile::tempfile().unwrap();
        file.write_all(bytes).unwrap();
        SerializedFileReader::new(file).unwrap()
    }

    #[test]
    fn rows_read_back() {
        let bytes = written(3);
        let reader = open(&bytes);
        let rows: Vec<_> = reader
            .get_row_iter(None)
            .unwrap()
            .map(Result::unwrap)
            .collect();
        assert_eq!(rows.len(), 12);
        for (place, row) in (0_u32..).zip(rows) {
            let columns = row.into_columns();
            let names: Vec<&str> = columns.iter().map(|(name, _)| name.as_str()).collect();
            assert_eq!(
                names,
                [
                    "truth",
                    "trial",
                    "estimand",
                    "method",
                    "point",
                    "standard_error",
                    "lower",
                    "upper",
                    "no_answer"
                ]
            );
            let at = |column: usize| columns[column].1.clone();
            let signed = |value: u32| i32::try_from(value).unwrap();
            assert_eq!(at(0), Field::Int(1));
            assert_eq!(at(1), Field::Long(100 + i64::from(place / 4)));
            assert_eq!(at(2), Field::Int(signed(place % 4 / 2)));
            assert_eq!(at(3), Field::Int(signed(place % 2)));
            if let Ok(answer) = estimate(place) {
                assert_eq!(at(4), Field::Double(answer.point));
                assert_eq!(at(5), Field::Double(answer.standard_error));
                assert_eq!(at(6), Field::Double(answer.lower));
                assert_eq!(at(7), Field::Double(answer.upper));
                assert_eq!(at(8), Field::Null);
            } else {
                assert_eq!(at(4), Field::Null);
                assert_eq!(at(7), Field::Null);
                assert_eq!(at(8), Field::Str("empty-batch".to_owned()));
            }
        }
    }

    #[test]
    fn names_are_in_the_metadata() {
        let reader = open(&written(1));
        let metadata = reader.metadata().file_metadata();
        let names = metadata.key_value_metadata().unwrap();
        let methods = names.iter().find(|entry| entry.key == "methods").unwrap();
        assert_eq!(
            methods.value.as_deref(),
            Some("[\"least-squares\",\"batch-combined\"]")
        );
        assert!(metadata.created_by().unwrap().starts_with("windage"));
    }

    #[test]
    fn row_groups_are_bounded_and_bytes_repeat() {
        let trials = 20_000; // 80 000 rows: one full group and a rest
        let bytes = written(trials);
        assert_eq!(bytes, written(trials));
        let reader = open(&bytes);
        let sizes: Vec<i64> = reader
            .metadata()
            .row_groups()
            .iter()
            .map(parquet::file::metadata::RowGroupMetaData::num_rows)
            .collect();
        assert_eq!(sizes, [65_536, 80_000 - 65_536]);
    }

    #[test]
    fn no_trial_leaves_a_file_without_rows() {
        let file = TrialsFile::begin(Vec::new(), &fixtures::scored(2)).unwrap();
        let bytes = file.finish().unwrap();
        let reader = open(&bytes);
        assert_eq!(reader.metadata().file_metadata().num_rows(), 0);
    }
}
