//! Tidy CSV files: one row per value, names spelled out, numbers at full precision.

use super::number::{exact, real};
use super::{AxisValue, Scored, SweepPoint};
use crate::score::{CellMeasures, TruthMeasures};

/// Why a CSV file could not be written.
#[derive(Debug, thiserror::Error)]
pub enum CsvError {
    /// The CSV writer refused a record.
    #[error("a row of {file} cannot be written: {source}")]
    Record {
        /// File that was being written.
        file: &'static str,
        /// What the writer says.
        source: csv::Error,
    },
}

const MEASURE_COLUMNS: [&str; 9] = [
    "truth",
    "estimand",
    "method",
    "measure",
    "value",
    "mcse",
    "lower",
    "upper",
    "trials_used",
];
const OPERATING_COLUMNS: [&str; 6] = [
    "truth",
    "characteristic",
    "subject",
    "value",
    "mcse",
    "trials_used",
];
const VERDICT_COLUMNS: [&str; 6] = [
    "estimand", "method", "truth", "verdict", "price", "cheapest",
];

type Row = Vec<String>;

/// `measures.csv`: one row per truth × estimand × method × measure. Reasons of missing answers
/// are rows too, with measure `no-answer:REASON` and the share of trials as value.
///
/// # Errors
/// If the CSV writer refuses a record.
pub fn measures_csv(scored: &Scored) -> Result<String, CsvError> {
    write("measures.csv", &MEASURE_COLUMNS, measure_rows(scored))
}

/// `operating.csv`: one row per truth × operating characteristic × subject.
///
/// # Errors
/// If the CSV writer refuses a record.
pub fn operating_csv(scored: &Scored) -> Result<String, CsvError> {
    let rows = scored.measures.iter().flat_map(|measures| {
        measures.operating.iter().map(|value| {
            vec![
                scored.truths[measures.truth].clone(),
                value.characteristic.clone(),
                value.subject.clone(),
                exact(value.value),
                exact(value.mcse),
                value.trials_used.to_string(),
            ]
        })
    });
    write("operating.csv", &OPERATING_COLUMNS, rows.collect())
}

/// `verdicts.csv`: one row per estimand × method × truth, and one with an empty truth for the
/// verdict over all truths, which also carries the price.
///
/// # Errors
/// If the CSV writer refuses a record.
pub fn verdicts_csv(scored: &Scored) -> Result<String, CsvError> {
    let mut rows = Vec::new();
    for line in &scored.verdicts {
        let names = [
            &scored.estimands[line.estimand],
            &scored.methods[line.method],
        ];
        let row = |truth: &str, word: &str, price: String, cheapest: &str| -> Row {
            let ends = [
                truth.to_owned(),
                word.to_owned(),
                price,
                cheapest.to_owned(),
            ];
            names.into_iter().cloned().chain(ends).collect()
        };
        for (truth, word) in scored.truths.iter().zip(&line.per_truth) {
            rows.push(row(truth, word, String::new(), ""));
        }
        let price = line.price.map_or_else(String::new, exact);
        let cheapest = if line.cheapest { "yes" } else { "no" };
        rows.push(row("", line.overall, price, cheapest));
    }
    write("verdicts.csv", &VERDICT_COLUMNS, rows)
}

/// `sweep.csv`: the columns of `measures.csv` after one column per axis, named as the axis.
///
/// # Errors
/// If the CSV writer refuses a record, as when a point has not one value per axis.
pub fn sweep_csv(axes: &[String], points: &[SweepPoint]) -> Result<String, CsvError> {
    let columns: Vec<&str> = axes
        .iter()
        .map(String::as_str)
        .chain(MEASURE_COLUMNS)
        .collect();
    let rows = points.iter().flat_map(|point| {
        let places: Row = point
            .axes
            .iter()
            .map(|value| match value {
                AxisValue::Number(number) => exact(*number),
                AxisValue::Word(word) => word.clone(),
            })
            .collect();
        measure_rows(&point.scored)
            .into_iter()
            .map(move |row| places.iter().cloned().chain(row).collect::<Row>())
    });
    write("sweep.csv", &columns, rows.collect())
}

fn measure_rows(scored: &Scored) -> Vec<Row> {
    scored
        .measures
        .iter()
        .flat_map(|measures| {
            measures
                .cells
                .iter()
                .flat_map(|cell| cell_rows(scored, measures, cell))
        })
        .collect()
}

fn cell_rows(scored: &Scored, measures: &TruthMeasures, cell: &CellMeasures) -> Vec<Row> {
    let names = [
        &scored.truths[measures.truth],
        &scored.estimands[cell.estimand],
        &scored.methods[cell.method],
    ];
    let row = |measure: String, numbers: [String; 5]| -> Row {
        names
            .into_iter()
            .cloned()
            .chain([measure])
            .chain(numbers)
            .collect()
    };
    let mut rows: Vec<Row> = cell
        .values
        .iter()
        .map(|value| {
            let (lower, upper) = value.limits.unwrap_or((f64::NAN, f64::NAN));
            row(
                value.measure.key().to_owned(),
                [
                    exact(value.value),
                    exact(value.mcse),
                    exact(lower),
                    exact(upper),
                    value.trials_used.to_string(),
                ],
            )
        })
        .collect();
    rows.extend(cell.failures.iter().map(|(reason, count)| {
        let share = real(*count) / real(measures.trials);
        let mcse = (share * (1.0 - share) / real(measures.trials)).sqrt();
        row(
            format!("no-answer:{}", reason.key()),
            [
                exact(share),
                exact(mcse),
                String::new(),
                String::new(),
                measures.trials.to_string(),
            ],
        )
    }));
    rows
}

pub(super) fn write(
    file: &'static str,
    columns: &[&str],
    rows: Vec<Row>,
) -> Result<String, CsvError> {
    let failed = |source| CsvError::Record { file, source };
    let mut writer = csv::Writer::from_writer(Vec::new());
    writer.write_record(columns).map_err(failed)?;
    for row in rows {
        writer.write_record(row).map_err(failed)?;
    }
    let bytes = writer
        .into_inner()
        .map_err(|error| failed(error.into_error().into()))?;
    // Every record was built from strings, so nothing is lost here.
    Ok(String::from_utf8_lossy(&bytes).into_owned())
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::report::fixtures;
    use crate::score::Measure;

    fn read(text: &str) -> (Vec<String>, Vec<csv::StringRecord>) {
        let mut reader = csv::Reader::from_reader(text.as_bytes());
        let header = reader
            .headers()
            .unwrap()
            .iter()
            .map(ToOwned::to_owned)
            .collect();
        (header, reader.records().map(Result::unwrap).collect())
    }

    #[test]
    fn measures_read_back_bit_for_bit() {
        let scored = fixtures::scored(9);
        let text = measures_csv(&scored).unwrap();
        let (header, rows) = read(&text);
        assert_eq!(header, MEASURE_COLUMNS);
        let cells: usize = scored
            .measures
            .iter()
            .map(|measures| measures.cells.len())
            .sum();
        // Nine measures in every cell, and two reasons in each of method 1's four cells.
        assert_eq!(rows.len(), 9 * cells + 2 * 4);
        let wanted = scored.measures[1].cells[5].get(Measure::MeanWidth).unwrap();
        let row = rows
            .iter()
            .find(|row| {
                row[0] == *scored.truths[1]
                    && row[1] == *scored.estimands[0]
                    && row[2] == *scored.methods[5]
                    && &row[3] == "mean-width"
            })
            .unwrap();
        assert_eq!(
            row[4].parse::<f64>().unwrap().to_bits(),
            wanted.value.to_bits()
        );
        assert_eq!(
            row[5].parse::<f64>().unwrap().to_bits(),
            wanted.mcse.to_bits()
        );
        assert_eq!((&row[6], &row[7], &row[8]), ("", "", "10000"));
    }

    #[test]
    fn reasons_are_shares_of_all_trials() {
        let (_, rows) = read(&measures_csv(&fixtures::scored(2)).unwrap());
        let reasons: Vec<_> = rows
            .iter()
            .filter(|row| row[3].starts_with("no-answer:"))
            .collect();
        assert_eq!(&reasons[0][3], "no-answer:rank-deficient");
        assert_eq!(&reasons[0][4], "0.0007");
        assert_eq!(&reasons[1][3], "no-answer:empty-batch");
    }

    #[test]
    fn verdicts_and_operating_characteristics_have_a_row_each() {
        let scored = fixtures::scored(2);
        let (header, rows) = read(&verdicts_csv(&scored).unwrap());
        assert_eq!(header, VERDICT_COLUMNS);
        assert_eq!(rows.len(), 4 * 3);
        let best: Vec<_> = rows.iter().filter(|row| &row[5] == "yes").collect();
        assert_eq!(
            (best.len(), &best[0][3], &best[0][4]),
            (2, "honest", "1.21")
        );
        let (header, rows) = read(&operating_csv(&scored).unwrap());
        assert_eq!(header, OPERATING_COLUMNS);
        assert_eq!(rows.len(), 6);
        assert_eq!(&rows[1][2], "early");
    }

    #[test]
    fn sweeps_put_the_axes_first() {
        let points: Vec<SweepPoint> = [0.1, 0.25]
            .into_iter()
            .map(|x| SweepPoint {
                axes: vec![
                    AxisValue::Number(x),
                    AxisValue::Word("top-quantile".to_owned()),
                ],
                scored: fixtures::scored(2),
            })
            .collect();
        let axes = ["batch.2.fraction".to_owned(), "batch.2.rule".to_owned()];
        let (header, rows) = read(&sweep_csv(&axes, &points).unwrap());
        assert_eq!(header[..3], ["batch.2.fraction", "batch.2.rule", "truth"]);
        assert_eq!(
            (&rows[0][0], &rows[0][1], &rows[0][2]),
            ("0.1", "top-quantile", "no effect")
        );
        assert_eq!(&rows.last().unwrap()[0], "0.25");
        let short = sweep_csv(&axes[..1], &points);
        assert!(matches!(
            short,
            Err(CsvError::Record {
                file: "sweep.csv",
                ..
            })
        ));
    }
}
