//! Roster files, right and wrong.

use std::fmt::Write as _;
use std::path::Path;

use tempfile::TempDir;

use crate::plan::{Plan, SelectRule, Source, parse};
use crate::scenario::Diagnostics;

const STUDY: &str = r#"format = 1
[study]
title = "Roster"
[population]
roster = { file = "plots.csv", id = "plot", covariates = ["elevation", "soil"], outcome = "yield" }
[[batch]]
size = 6
[[batch]]
size = 5
select = { rule = "top-quantile", score = "predicted-outcome" }
[[estimand]]
name = "elevation"
contrast = { elevation = 1 }
[[method]]
kind = "least-squares"
[precision]
trials = 10
seed = 1
"#;

fn rows(count: usize) -> String {
    let mut csv = String::from("plot,elevation,soil,yield\n");
    for row in 0..count {
        let _ = writeln!(csv, "p{row},{row}.5,{},1e1", row * row);
    }
    csv
}

fn read_bytes(study: &str, csv: &[u8]) -> Result<Plan, Diagnostics> {
    let folder = TempDir::new().unwrap();
    std::fs::write(folder.path().join("plots.csv"), csv).unwrap();
    parse(study, "roster.toml", folder.path()).map(|(_, plan)| plan)
}

fn read(study: &str, csv: &str) -> Result<Plan, Diagnostics> {
    read_bytes(study, csv.as_bytes())
}

fn mistakes(study: &str, csv: &str) -> String {
    read(study, csv).unwrap_err().to_string()
}

#[test]
fn a_roster_with_outcomes_is_its_own_truth() {
    let plan = read(STUDY, &format!("\u{feff}{}", rows(20))).unwrap();
    let Source::Roster(roster) = &plan.population.source else {
        panic!("a roster")
    };
    assert_eq!(roster.len(), 20);
    assert_eq!(roster.ids[19], "p19");
    // Column-major: the elevations, then the soils.
    assert_eq!(roster.values.len(), 40);
    assert!((roster.values[1] - 1.5).abs() < 1e-15);
    assert!((roster.values[23] - 9.0).abs() < 1e-15);
    assert_eq!(roster.outcomes.as_ref().unwrap().len(), 20);
    assert_eq!(plan.truths.len(), 1);
    assert_eq!(plan.truths[0].name, "recorded outcomes");
    assert_eq!(plan.truths[0].slopes, [0.0, 0.0]);
    // All remaining units are screened.
    assert_eq!(plan.batches[1].select[0].candidates, 14);
    assert!(matches!(
        plan.batches[1].select[0].rule,
        SelectRule::Quantile { .. }
    ));
}

#[test]
fn a_roster_without_outcomes_needs_truths() {
    let study = STUDY.replace(", outcome = \"yield\"", "");
    assert!(mistakes(&study, &rows(20)).contains("no truth"));
    let with_truth = format!("{study}[[truth]]\nname = \"t\"\ncoefficients = {{ soil = 1 }}\n");
    let plan = read(&with_truth, &rows(20)).unwrap();
    assert_eq!(plan.truths[0].slopes, [0.0, 1.0]);
}

#[test]
fn every_wrong_value_is_named_by_row_and_column() {
    let csv = "plot,elevation,soil,yield\na,1,2,3\nb,,2,3\nc,1,x y,3\nd,inf,2,3\na,1,2,3\ne,1,2\n\nf,1,NaN,3\n,1,2,3\n";
    let shown = mistakes(STUDY, csv);
    for message in [
        "plots.csv: row 3, column \"elevation\" is empty",
        "plots.csv: row 4, column \"soil\" is \"x y\"",
        "plots.csv: row 5, column \"elevation\" is inf",
        "plots.csv: row 6, column \"plot\" repeats \"a\" of row 2",
        "plots.csv: row 7 has 3 values",
        "plots.csv: row 9, column \"soil\" is NaN",
        "plots.csv: row 10, column \"plot\" is empty",
    ] {
        assert!(shown.contains(message), "{message}\n{shown}");
    }
    assert!(shown.contains("7 mistakes in roster.toml"), "{shown}");
    assert!(shown.contains("roster.toml:5:"), "{shown}");
}

#[test]
fn long_lists_of_mistakes_are_cut() {
    let csv = rows(200).replace(".5", ".5x");
    let shown = mistakes(STUDY, &csv);
    assert!(shown.contains("150 more mistakes are not shown"), "{shown}");
}

#[test]
fn columns_must_exist_once() {
    let study = STUDY.replace("\"soil\"]", "\"soils\"]");
    let shown = mistakes(&study, &rows(20));
    assert!(
        shown.contains("has no column \"soils\"") && shown.contains("\"soil\"?"),
        "{shown}"
    );
    let shown = mistakes(&STUDY.replace("id = \"plot\"", "id = \"unit\""), &rows(20));
    assert!(shown.contains("its columns are plot, elevation"), "{shown}");
    let shown = mistakes(STUDY, &rows(20).replace("soil,yield", "soil,soil"));
    assert!(shown.contains("2 columns named \"soil\""), "{shown}");
    let shown = mistakes(&STUDY.replace("\"yield\"", "\"soil\""), &rows(20));
    assert!(shown.contains("both covariate and outcome"), "{shown}");
}

#[test]
fn files_that_are_no_roster() {
    assert!(mistakes(STUDY, "").contains("has no column \"plot\""));
    assert!(mistakes(STUDY, "plot,elevation,soil,yield\n").contains("no row below the header"));
    let study = STUDY.replace("plots.csv", "missing.csv");
    assert!(mistakes(&study, "").contains("missing.csv cannot be read"));
    assert!(mistakes(&STUDY.replace("plots.csv", "."), "").contains("it is no file"));
    let latin = read_bytes(STUDY, b"plot,elevation,soil,yield\na,1,2,\xe9\n").unwrap_err();
    assert!(latin.to_string().contains("row 2 is not UTF-8"), "{latin}");
}

#[test]
fn what_a_recorded_outcome_rules_out() {
    for (addition, message) in [
        (
            "[arms]\nnames = [\"a\", \"b\"]\n",
            "arms cannot be allocated",
        ),
        ("[outcome]\nintercept = 1\n", "takes no `intercept`"),
        (
            "[[truth]]\nname = \"a\"\n[[truth]]\nname = \"b\"\n",
            "a second truth",
        ),
        (
            "[[truth]]\nname = \"a\"\ncoefficients = {}\n",
            "takes no `coefficients`",
        ),
    ] {
        let shown = mistakes(&format!("{STUDY}{addition}"), &rows(20));
        assert!(shown.contains(message), "{addition}\n{shown}");
    }
    let named = format!("{STUDY}[[truth]]\nname = \"as measured\"\n[outcome]\ndelay = 0\n");
    assert_eq!(
        read(&named, &rows(20)).unwrap().truths[0].name,
        "as measured"
    );
    let both = STUDY.replace("roster =", "covariates = []\nroster =");
    assert!(mistakes(&both, &rows(20)).contains("`covariates` has no meaning"));
}

#[test]
fn a_roster_must_be_large_enough() {
    let shown = mistakes(STUDY, &rows(10));
    assert!(
        shown.contains("batch 2 needs 5 candidates, but 4 of the 10 units"),
        "{shown}"
    );
    let study = STUDY.replace("score =", "candidates = 15, score =");
    let shown = mistakes(&study, &rows(20));
    assert!(
        shown.contains("batch 2 needs 15 candidates, but 14 of the 20"),
        "{shown}"
    );
}

#[test]
fn a_missing_folder_is_no_panic() {
    assert!(parse(STUDY, "roster.toml", Path::new("/nowhere/at/all")).is_err());
}
