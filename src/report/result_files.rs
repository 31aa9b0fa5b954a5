//! The files that every replay leaves in its result folder.

use super::figures::Figure;
use super::folder::{MARK, ResultFolder};
use super::folder_error::FolderError;
use super::{DATA_DICTIONARY, RunRecord, Scored, measures_csv, operating_csv, verdicts_csv};

/// Writes the files that every replay leaves: scenario, run record, tables, data dictionary and
/// figures.
///
/// # Errors
/// If a file cannot be written.
pub fn write_result(
    folder: &ResultFolder,
    scenario_text: &str,
    run: &RunRecord,
    scored: &Scored,
    figures: &[Figure],
) -> Result<(), FolderError> {
    folder.write("scenario.toml", scenario_text.as_bytes())?;
    folder.write(MARK, run.to_json()?.as_bytes())?;
    folder.write("measures.csv", measures_csv(scored)?.as_bytes())?;
    folder.write("operating.csv", operating_csv(scored)?.as_bytes())?;
    folder.write("verdicts.csv", verdicts_csv(scored)?.as_bytes())?;
    folder.write("columns.md", DATA_DICTIONARY.as_bytes())?;
    for figure in figures {
        folder.write(
            &format!("figures/{}.svg", figure.name),
            figure.svg.as_bytes(),
        )?;
    }
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::report::{Clock, Machine, fixtures, utc_text};
    use std::collections::BTreeMap;
    use std::fs;
    use std::path::Path;

    fn written(target: &Path, started: u64) -> BTreeMap<String, Vec<u8>> {
        let scored = fixtures::scored(2);
        let clock = Clock {
            started: utc_text(started),
            seconds: 1.0,
        };
        let text = "format = 1\n";
        let run = RunRecord::new(&scored, text, 1, 10_000, None, clock, Machine::current(1));
        let figures = [crate::report::figures::coverage_figure(&scored, 0)];
        let folder = ResultFolder::begin(target, false).unwrap();
        write_result(&folder, text, &run, &scored, &figures).unwrap();
        folder.commit().unwrap();
        let mut files = BTreeMap::new();
        for folder in [target.to_owned(), target.join("figures")] {
            for entry in fs::read_dir(folder).unwrap().map(Result::unwrap) {
                if entry.path().is_file() {
                    let name = entry.file_name().to_string_lossy().into_owned();
                    files.insert(name, fs::read(entry.path()).unwrap());
                }
            }
        }
        files
    }

    #[test]
    fn every_file_is_there_and_described() {
        let home = tempfile::tempdir().unwrap();
        let files = written(&home.path().join("result"), 0);
        let names: Vec<&str> = files.keys().map(String::as_str).collect();
        let wanted = [
            "columns.md",
            "coverage-1-elevation-effect.svg",
            "measures.csv",
            "operating.csv",
            "run.json",
            "scenario.toml",
            "verdicts.csv",
        ];
        assert_eq!(names, wanted);
        for name in wanted.iter().filter(|name| !name.ends_with("svg")) {
            assert!(DATA_DICTIONARY.contains(&format!("| `{name}` |")), "{name}");
        }
    }

    #[test]
    fn only_the_run_record_knows_the_clock() {
        let home = tempfile::tempdir().unwrap();
        let mut first = written(&home.path().join("first"), 0);
        let mut second = written(&home.path().join("second"), 86_400);
        assert_ne!(first.remove("run.json"), second.remove("run.json"));
        assert_eq!(first, second);
    }

    #[test]
    fn every_measure_reason_and_column_is_in_the_dictionary() {
        use crate::methods::NoAnswer;
        use crate::score::Measure;
        let keys = Measure::ALL.map(Measure::key).into_iter();
        for key in keys.chain(NoAnswer::ALL.map(NoAnswer::key)) {
            assert!(DATA_DICTIONARY.contains(&format!("| `{key}` |")), "{key}");
        }
        let scored = fixtures::scored(2);
        let tables = [
            measures_csv(&scored),
            operating_csv(&scored),
            verdicts_csv(&scored),
        ];
        for table in tables.map(Result::unwrap) {
            for column in table.lines().next().unwrap().split(',') {
                assert!(DATA_DICTIONARY.contains(&format!("`{column}`")), "{column}");
            }
        }
    }
}
