//! The program as a user runs it: what is printed, what is written, and the exit codes.

use assert_cmd::Command;
use std::fmt::Write as _;
use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Child, Stdio};
use std::time::{Duration, Instant};

fn windage() -> Command {
    Command::new(env!("CARGO_BIN_EXE_windage"))
}

fn shipped(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("scenarios")
        .join(name)
}

const SOUND: &str = r#"format = 1

[study]
title = "Two batches"

[population]
covariates = [{ name = "x", law = "normal", count = 3 }]

[outcome]
family = "normal"
noise = { law = "normal", sd = 1.0 }

[[truth]]
name = "null"
coefficients = { x = 0.0 }

[[batch]]
size = 30

[[batch]]
size = 30
select = { rule = "top-quantile", fraction = 0.2, score = "predicted-outcome" }

[[estimand]]
name = "first slope"
contrast = { x1 = 1.0 }

[[method]]
kind = "least-squares"

[[method]]
kind = "batch-combined"

[precision]
trials = 200
seed = 1
"#;

/// A folder with a scenario file in it.
struct Desk {
    folder: tempfile::TempDir,
}

impl Desk {
    fn with(text: &str) -> Self {
        let folder = tempfile::tempdir().expect("a temporary folder");
        fs::write(folder.path().join("plan.toml"), text).expect("writable");
        Self { folder }
    }

    fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    /// Exit code, standard output and standard error of `windage ARGUMENTS` run in the folder.
    fn run(&self, arguments: &[&str]) -> (i32, String, String) {
        let output = windage()
            .current_dir(self.folder.path())
            .args(arguments)
            .output()
            .expect("it runs");
        let text = |bytes: Vec<u8>| String::from_utf8(bytes).expect("text");
        (
            output.status.code().expect("no signal"),
            text(output.stdout),
            text(output.stderr),
        )
    }

    /// Names of everything in the folder but the scenario.
    fn leftovers(&self) -> Vec<String> {
        let entries = fs::read_dir(self.folder.path()).expect("readable");
        let mut names: Vec<String> = entries
            .map(|entry| {
                entry
                    .expect("readable")
                    .file_name()
                    .to_string_lossy()
                    .into_owned()
            })
            .filter(|name| !matches!(name.as_str(), "plan.toml" | "units.csv"))
            .collect();
        names.sort();
        names
    }

    /// Runs a verb that must fail with code 2, and returns its message.
    fn refused(&self, verb: &str) -> String {
        let (code, stdout, stderr) = self.run(&[verb, "plan.toml"]);
        assert_eq!(code, 2, "{stderr}");
        assert_eq!(stdout, "");
        assert_eq!(
            self.leftovers(),
            Vec::<String>::new(),
            "nothing is left behind"
        );
        stderr
    }
}

/// Asserts that a message is one mistake at a line, and holds the words.
#[track_caller]
fn assert_mistake(message: &str, line: usize, words: &[&str]) {
    assert!(
        message.contains(&format!("plan.toml:{line}:")),
        "line {line} in:\n{message}"
    );
    assert!(message.contains("1 mistake"), "{message}");
    for word in words {
        assert!(message.contains(word), "{word:?} in:\n{message}");
    }
}

#[test]
fn replay_prints_tables_and_writes_a_whole_folder() {
    let desk = Desk::with(SOUND);
    let (code, stdout, stderr) = desk.run(&["replay", "plan.toml", "--output", "result"]);
    assert_eq!((code, stderr.as_str()), (0, ""));
    for words in [
        "least-squares",
        "batch-combined",
        "coverage",
        "type I",
        "Verdicts",
        "planning aid",
    ] {
        assert!(stdout.contains(words), "{words:?} in:\n{stdout}");
    }
    let widest = stdout.lines().map(|line| line.chars().count()).max();
    assert!(
        widest <= Some(100) || stdout.contains("Written to"),
        "{widest:?}"
    );
    for name in [
        "scenario.toml",
        "run.json",
        "measures.csv",
        "operating.csv",
        "verdicts.csv",
        "columns.md",
        "figures/coverage-1-first-slope.svg",
        "figures/errors-1-null-1-first-slope.svg",
    ] {
        assert!(desk.path("result").join(name).is_file(), "{name}");
    }
    assert_eq!(
        fs::read_to_string(desk.path("result/scenario.toml")).unwrap(),
        SOUND
    );
    assert_eq!(desk.leftovers(), ["result"]);
}

#[test]
fn two_runs_write_the_same_bytes_whatever_the_threads() {
    let desk = Desk::with(SOUND);
    for (folder, threads) in [("one", "1"), ("two", "3")] {
        let (code, ..) = desk.run(&[
            "replay",
            "plan.toml",
            "-o",
            folder,
            "--threads",
            threads,
            "--keep-trials",
        ]);
        assert_eq!(code, 0);
    }
    for name in [
        "measures.csv",
        "operating.csv",
        "verdicts.csv",
        "trials.parquet",
    ] {
        let read = |folder: &str| fs::read(desk.path(folder).join(name)).expect("written");
        assert!(read("one") == read("two"), "{name}");
        assert!(!read("one").is_empty());
    }
}

#[test]
fn json_holds_what_the_tables_hold() {
    let desk = Desk::with(SOUND);
    let (code, stdout, _) = desk.run(&["replay", "plan.toml", "-o", "result", "--json"]);
    assert_eq!(code, 0);
    let value: serde_json::Value = serde_json::from_str(&stdout).expect("valid JSON");
    assert!(stdout.contains("\"coverage\"") && value.is_object());
}

#[test]
fn an_unmet_requirement_is_exit_code_three() {
    let text = format!("{SOUND}\n[[require]]\nmeasure = \"coverage\"\nat_least = 0.999\n");
    let desk = Desk::with(&text);
    let (code, stdout, _) = desk.run(&["replay", "plan.toml", "-o", "result"]);
    assert_eq!(code, 3);
    assert!(
        stdout.contains("NOT MET") && stdout.contains("worst:"),
        "{stdout}"
    );
    assert!(
        desk.path("result/run.json").is_file(),
        "the result is written all the same"
    );
    let met = Desk::with(&text.replace("0.999", "0.5"));
    assert_eq!(met.run(&["replay", "plan.toml", "-o", "result"]).0, 0);
}

#[test]
fn check_explains_the_study_and_lists_a_trial() {
    let desk = Desk::with(SOUND);
    let (code, stdout, stderr) = desk.run(&["check", "plan.toml"]);
    assert_eq!((code, stderr.as_str()), (0, ""));
    for words in [
        "150 candidates are screened",
        "batch 1",
        "planning aid",
        "p/n = 0.067",
    ] {
        assert!(stdout.contains(words), "{words:?} in:\n{stdout}");
    }
    let (code, stdout, _) = desk.run(&["check", "plan.toml", "--trial", "7"]);
    assert_eq!(code, 0);
    assert_eq!(stdout.lines().count(), 61);
    assert!(
        stdout.starts_with("batch,unit,source,x1,x2,x3,outcome,"),
        "{stdout}"
    );
    let (code, _, stderr) = desk.run(&["check", "plan.toml", "--trial", "7", "--truth", "nil"]);
    assert_eq!(code, 2);
    assert!(stderr.contains("null"), "{stderr}");
    assert_eq!(desk.leftovers(), Vec::<String>::new());
}

#[test]
fn sweep_draws_curves_and_brackets_the_break_point() {
    let text = format!(
        "{SOUND}\n[sweep]\naxes = [{{ path = \"population.covariates.x.count\", values = [2, 12] \
         }}]\nbreak_point = {{ method = \"least-squares\" }}\n"
    );
    let text = text
        .replace(
            "coefficients = { x = 0.0 }",
            "coefficients = { x = { norm = 1.0, seed = 1 } }",
        )
        .replace("contrast = { x1 = 1.0 }", "along = \"coefficients\"")
        .replace("[[batch]]\nsize = 30\n\n", "[[batch]]\nsize = 40\n\n")
        .replace("fraction = 0.2", "fraction = 0.05")
        .replace("trials = 200", "trials = 3000")
        .replace(
            "[[truth]]",
            "[analysis]\nregressors = [\"covariates\"]\n\n[[truth]]",
        );
    let desk = Desk::with(&text);
    let (code, stdout, stderr) = desk.run(&["sweep", "plan.toml", "-o", "swept"]);
    assert_eq!((code, stderr.as_str()), (0, ""));
    assert!(
        stdout.contains("Break point") && stdout.contains("p/n = "),
        "{stdout}"
    );
    let table = fs::read_to_string(desk.path("swept/break-points.csv")).unwrap();
    let row: Vec<&str> = table
        .lines()
        .nth(1)
        .expect("one bracket")
        .split(',')
        .collect();
    let (from, to): (f64, f64) = (row[2].parse().unwrap(), row[3].parse().unwrap());
    assert!(
        (to - from - 1.0).abs() < 1e-9,
        "the bracket is closed on a whole axis: {table}"
    );
    let swept = fs::read_to_string(desk.path("swept/sweep.csv")).unwrap();
    assert!(
        swept.starts_with("population.covariates.x.count,truth,"),
        "{swept}"
    );
    assert!(desk.path("swept/figures").read_dir().unwrap().count() >= 3);
}

#[test]
fn every_shipped_scenario_is_sound_and_replays() {
    let folder = tempfile::tempdir().unwrap();
    let mut count = 0;
    for entry in shipped("").read_dir().expect("scenarios") {
        let path = entry.expect("readable").path();
        if path.extension().is_none_or(|extension| extension != "toml") {
            continue;
        }
        count += 1;
        let check = windage().arg("check").arg(&path).output().unwrap();
        assert!(
            check.status.success(),
            "{}",
            String::from_utf8_lossy(&check.stderr)
        );
        let target = folder.path().join(path.file_stem().unwrap());
        let replay = windage()
            .args(["replay", "--trials", "64", "-o"])
            .arg(&target)
            .arg(&path)
            .output()
            .unwrap();
        assert!(
            replay.status.success(),
            "{}",
            String::from_utf8_lossy(&replay.stderr)
        );
    }
    assert!(count >= 5, "{count} scenarios");
}

#[test]
fn an_unknown_key_names_the_nearest_known_one() {
    let text = SOUND.replace("fraction = 0.2", "fractoin = 0.2");
    let message = Desk::with(&text).refused("check");
    assert!(
        message.contains("plan.toml:22:") && message.contains("fraction"),
        "{message}"
    );
}

#[test]
fn a_missing_file_is_named() {
    let desk = Desk::with(SOUND);
    let (code, _, stderr) = desk.run(&["replay", "plam.toml"]);
    assert_eq!(code, 2);
    assert!(stderr.contains("plam.toml"), "{stderr}");
}

#[test]
fn a_fraction_of_zero_is_refused() {
    let message = Desk::with(&SOUND.replace("fraction = 0.2", "fraction = 0")).refused("replay");
    assert_mistake(&message, 22, &["fraction", "above 0"]);
}

#[test]
fn an_empty_batch_is_refused() {
    let text = SOUND.replacen("size = 30", "size = 0", 1);
    let message = Desk::with(&text).refused("replay");
    assert_mistake(&message, 18, &["size", "at least 1"]);
}

#[test]
fn more_coefficients_than_units_in_the_first_batch_are_refused() {
    let message = Desk::with(&SOUND.replace("count = 3", "count = 40")).refused("replay");
    assert!(
        message.contains("41") && message.contains("30"),
        "{message}"
    );
}

#[test]
fn a_roster_with_text_in_a_number_column_names_the_row() {
    let text = SOUND
        .replace(
            "covariates = [{ name = \"x\", law = \"normal\", count = 3 }]",
            "roster = { file = \"units.csv\", id = \"plot\", covariates = [\"x1\"] }",
        )
        .replace("coefficients = { x = 0.0 }", "coefficients = { x1 = 0.0 }");
    let desk = Desk::with(&text);
    let mut rows = String::from("plot,x1\n");
    for row in 1..=200 {
        let value = if row == 17 {
            "wet".to_owned()
        } else {
            (row % 7).to_string()
        };
        let _ = writeln!(rows, "{row},{value}");
    }
    fs::write(desk.path("units.csv"), rows).unwrap();
    let message = desk.refused("check");
    for words in ["units.csv", "x1", "wet", "18"] {
        assert!(message.contains(words), "{words:?} in:\n{message}");
    }
}

#[test]
fn a_folder_that_cannot_be_written_is_refused_before_the_run() {
    let desk = Desk::with(&SOUND.replace("trials = 200", "trials = 100000000"));
    let begun = Instant::now();
    // A file where a parent folder should be; permissions would not stop a superuser.
    let (code, _, stderr) = desk.run(&["replay", "plan.toml", "-o", "plan.toml/result"]);
    assert_eq!(code, 1);
    assert!(
        stderr.contains("plan.toml") && stderr.lines().count() <= 3,
        "{stderr}"
    );
    assert!(
        begun.elapsed() < Duration::from_secs(20),
        "it did not replay first"
    );
    fs::create_dir(desk.path("full")).unwrap();
    fs::write(desk.path("full/letter.txt"), "keep me").unwrap();
    let (code, _, stderr) = desk.run(&["replay", "plan.toml", "-o", "full", "--force"]);
    assert_eq!(code, 1, "{stderr}");
    assert_eq!(
        fs::read_to_string(desk.path("full/letter.txt")).unwrap(),
        "keep me"
    );
}

fn wait(mut child: Child) -> Option<i32> {
    let begun = Instant::now();
    loop {
        if let Some(status) = child.try_wait().expect("a child") {
            return status.code();
        }
        if begun.elapsed() > Duration::from_mins(1) {
            child.kill().expect("killed");
            panic!("the program did not stop");
        }
        std::thread::sleep(Duration::from_millis(20));
    }
}

#[cfg(unix)]
#[test]
fn an_interrupt_stops_with_one_message_and_leaves_nothing() {
    let desk = Desk::with(&SOUND.replace("trials = 200", "trials = 100000000"));
    let mut child = std::process::Command::new(env!("CARGO_BIN_EXE_windage"))
        .current_dir(desk.folder.path())
        .args(["replay", "plan.toml", "-o", "result"])
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .expect("it starts");
    std::thread::sleep(Duration::from_millis(800));
    let signal = std::process::Command::new("kill")
        .args(["-INT", &child.id().to_string()])
        .status()
        .expect("kill");
    assert!(signal.success());
    let mut stderr = child.stderr.take().expect("piped");
    let code = wait(child);
    let mut message = String::new();
    std::io::Read::read_to_string(&mut stderr, &mut message).unwrap();
    assert_eq!(code, Some(1), "{message}");
    assert!(
        message.contains("interrupted after") && message.lines().count() == 1,
        "{message}"
    );
    assert_eq!(desk.leftovers(), Vec::<String>::new());
}

#[test]
fn a_reader_that_leaves_is_no_error() {
    let desk = Desk::with(SOUND);
    let mut child = std::process::Command::new(env!("CARGO_BIN_EXE_windage"))
        .current_dir(desk.folder.path())
        .args(["check", "plan.toml", "--trial", "1"])
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .expect("it starts");
    drop(child.stdout.take());
    let mut stderr = child.stderr.take().expect("piped");
    let code = wait(child);
    let mut message = String::new();
    std::io::Read::read_to_string(&mut stderr, &mut message).unwrap();
    assert_eq!((code, message.as_str()), (Some(0), ""));
}
