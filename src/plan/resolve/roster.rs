//! A file of real units.

use std::collections::HashMap;
use std::path::Path;

use csv::StringRecord;

use super::names::Names;
use crate::plan::{Population, Roster, Source};
use crate::scenario::{Fields, Place, Sink};

/// Mistakes of one file that are shown.
const SHOWN_MISTAKES: usize = 50;
/// Most values of a roster: 1.6 GB.
const MOST_VALUES: usize = 200_000_000;
/// Largest roster file, in bytes.
const LARGEST_FILE: u64 = 2 << 30;

/// Mistakes of a roster file: shown one by one at first, then counted.
struct Mistakes<'s> {
    file: &'s str,
    place: &'s Place,
    sink: &'s Sink<'s>,
    count: usize,
}

impl Mistakes<'_> {
    fn note(&mut self, message: &str, help: &str) {
        self.count += 1;
        if self.count <= SHOWN_MISTAKES {
            self.sink.report(
                self.place,
                format!("{}: {message}", self.file),
                Some(help.to_owned()),
            );
        }
    }

    fn close(&self) {
        if self.count > SHOWN_MISTAKES {
            self.sink.report(
                self.place,
                format!(
                    "{}: {} more mistakes are not shown",
                    self.file,
                    self.count - SHOWN_MISTAKES
                ),
                None,
            );
        }
    }
}

/// Positions of the wanted columns in the file.
struct Wanted<'s> {
    id: (usize, &'s str),
    covariates: Vec<(usize, &'s str)>,
    outcome: Option<(usize, &'s str)>,
}

/// Reads the roster and adds its covariates to the names. `None` after a mistake.
pub(super) fn read(
    fields: &Fields<'_>,
    base_folder: &Path,
    names: &mut Names,
) -> Option<Population> {
    let sink = fields.sink();
    let before = sink.trouble();
    fields.required("file", "name the CSV file, relative to the scenario");
    fields.required("id", "name the column that identifies the units");
    fields.required("covariates", "list the columns to use as covariates");
    if let Some(nodes) = fields.list("covariates") {
        for node in nodes {
            match node.as_text() {
                Some(name) => names.add_column(name, &node.place, sink),
                None => names.leave_open(""),
            }
        }
        if nodes.is_empty() {
            fields.report("covariates", "no covariate is listed", "list at least one");
        }
    } else {
        names.leave_open("");
    }
    let file = fields.text("file")?;
    let id = fields.text("id")?;
    if sink.trouble() != before {
        return None;
    }
    let path = base_folder.join(file);
    let unreadable = |problem: String| {
        fields.report(
            "file",
            format!("{file} cannot be read: {problem}"),
            format!("it is looked for at {}", path.display()),
        );
    };
    let bytes = match std::fs::metadata(&path) {
        Err(error) => Err(error.to_string()),
        Ok(found) if !found.is_file() => Err("it is no file".to_owned()),
        Ok(found) if found.len() > LARGEST_FILE => Err(format!("it has {} bytes", found.len())),
        Ok(_) => std::fs::read(&path).map_err(|error| error.to_string()),
    };
    let bytes = match bytes {
        Ok(bytes) => bytes,
        Err(problem) => {
            unreadable(problem);
            return None;
        }
    };
    let mut reader = csv::ReaderBuilder::new()
        .flexible(true)
        .trim(csv::Trim::All)
        .from_reader(bytes.as_slice());
    let header = match reader.headers() {
        Ok(header) => header.clone(),
        Err(error) => {
            unreadable(error.to_string());
            return None;
        }
    };
    let wanted = find_columns(fields, file, id, &header)?;
    let mut mistakes = Mistakes {
        file,
        place: fields.place("file"),
        sink,
        count: 0,
    };
    let roster = rows(&mut reader, &bytes, &header, &wanted, &mut mistakes);
    mistakes.close();
    (sink.trouble() == before).then(|| Population {
        columns: names.columns().to_vec(),
        source: Source::Roster(roster),
    })
}

fn find_columns<'s>(
    fields: &Fields<'s>,
    file: &str,
    id_name: &'s str,
    header: &StringRecord,
) -> Option<Wanted<'s>> {
    let sink = fields.sink();
    let before = sink.trouble();
    let titles: Vec<&str> = header
        .iter()
        .map(|title| title.trim_start_matches('\u{feff}'))
        .collect();
    let find = |name: &str, place: &Place| {
        let found: Vec<usize> = (0..titles.len())
            .filter(|&column| titles[column] == name)
            .collect();
        match found.as_slice() {
            [column] => return Some(*column),
            [] => {
                let help = match sink.nearest(name, titles.iter().copied()) {
                    Some(near) => format!("did you mean \"{near}\"?"),
                    None => format!("its columns are {}", titles.join(", ")),
                };
                sink.report(
                    place,
                    format!("{file} has no column \"{name}\""),
                    Some(help),
                );
            }
            _ => sink.report(
                place,
                format!("{file} has {} columns named \"{name}\"", found.len()),
                Some("column names must differ".to_owned()),
            ),
        }
        None
    };
    let id = find(id_name, fields.place("id"));
    let mut covariates = Vec::new();
    for node in fields.list("covariates").unwrap_or_default() {
        let name = node.as_text().unwrap_or_default();
        covariates.extend(find(name, &node.place).map(|column| (column, name)));
    }
    let outcome = fields.text("outcome").and_then(|name| {
        if covariates.iter().any(|&(_, covariate)| covariate == name) {
            fields.report(
                "outcome",
                format!("\"{name}\" is both covariate and outcome"),
                "take it out of the covariates",
            );
        }
        Some((find(name, fields.place("outcome"))?, name))
    });
    (sink.trouble() == before).then_some(())?;
    Some(Wanted {
        id: (id?, id_name),
        covariates,
        outcome,
    })
}

fn rows(
    reader: &mut csv::Reader<&[u8]>,
    bytes: &[u8],
    header: &StringRecord,
    wanted: &Wanted<'_>,
    mistakes: &mut Mistakes<'_>,
) -> Roster {
    let id_name = wanted.id.1;
    let mut ids = Vec::new();
    let mut columns: Vec<Vec<f64>> = vec![Vec::new(); wanted.covariates.len()];
    let mut outcomes = Vec::new();
    let mut seen: HashMap<String, u64> = HashMap::new();
    let mut record = StringRecord::new();
    loop {
        let row = row_at(reader.position(), bytes);
        match reader.read_record(&mut record) {
            Ok(true) => {}
            Ok(false) => break,
            Err(error) => {
                let problem = match error.kind() {
                    csv::ErrorKind::Utf8 { .. } => "is not UTF-8 text".to_owned(),
                    _ => format!("cannot be read: {error}"),
                };
                mistakes.note(
                    &format!("row {row} {problem}"),
                    "save the file as UTF-8 CSV",
                );
                if matches!(error.kind(), csv::ErrorKind::Io(_)) {
                    break;
                }
                continue;
            }
        }
        if record.len() != header.len() {
            mistakes.note(
                &format!("row {row} has {} values", record.len()),
                &format!("the header has {} columns", header.len()),
            );
            continue;
        }
        let id = record.get(wanted.id.0).unwrap_or_default().to_owned();
        if id.is_empty() {
            mistakes.note(
                &format!("row {row}, column \"{id_name}\" is empty"),
                "every unit needs an identifier",
            );
        } else if let Some(earlier) = seen.insert(id.clone(), row) {
            mistakes.note(
                &format!("row {row}, column \"{id_name}\" repeats \"{id}\" of row {earlier}"),
                "identifiers must differ",
            );
        }
        ids.push(id);
        for ((position, name), column) in wanted.covariates.iter().zip(&mut columns) {
            column.push(value(&record, row, *position, name, mistakes));
        }
        if let Some((position, name)) = wanted.outcome {
            outcomes.push(value(&record, row, position, name, mistakes));
        }
        if ids.len() * (columns.len() + 1) > MOST_VALUES {
            mistakes.note(
                &format!("more than {MOST_VALUES} values"),
                "use fewer covariates or rows",
            );
            break;
        }
    }
    if ids.is_empty() && mistakes.count == 0 {
        mistakes.note("there is no row below the header", "list at least one unit");
    }
    Roster {
        ids,
        values: columns.concat(),
        outcomes: wanted.outcome.map(|_| outcomes),
    }
}

/// Line of the file on which the next record begins; the header is row 1, as a spreadsheet counts.
/// The reader passes over blank lines only when it reads on.
fn row_at(position: &csv::Position, bytes: &[u8]) -> u64 {
    let start = usize::try_from(position.byte()).unwrap_or(usize::MAX);
    let blank = bytes
        .get(start..)
        .unwrap_or_default()
        .iter()
        .take_while(|byte| matches!(byte, b'\r' | b'\n'))
        .filter(|&&byte| byte == b'\n')
        .count();
    position.line() + blank as u64
}

/// A number of a row; anything else is noted.
fn value(
    record: &StringRecord,
    row: u64,
    position: usize,
    name: &str,
    mistakes: &mut Mistakes<'_>,
) -> f64 {
    let text = record.get(position).unwrap_or_default();
    match text.parse::<f64>() {
        Ok(value) if value.is_finite() => return value,
        Ok(_) => mistakes.note(
            &format!("row {row}, column \"{name}\" is {text}"),
            "values must be finite numbers",
        ),
        Err(_) if text.is_empty() => mistakes.note(
            &format!("row {row}, column \"{name}\" is empty"),
            "fill in the value, or leave the row out",
        ),
        Err(_) => mistakes.note(
            &format!("row {row}, column \"{name}\" is \"{text}\""),
            "values must be numbers, with a point as decimal mark",
        ),
    }
    f64::NAN
}
