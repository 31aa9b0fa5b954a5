//! Outside checks: published tables, certified values, general-purpose reference libraries.

mod common;

use serde_json::Value;
use std::fmt::Write as _;
use std::path::Path;
use windage::numerics::distribution::{
    clopper_pearson, f_quantile, normal_cdf, normal_quantile, student_t_quantile,
};
use windage::numerics::least_squares::LeastSquares;
use windage::plan;
use windage::replay::{Study, Worker};
use windage::scenario::Scenario;
use windage::score::BlockRecord;
use windage::streams::Phase;

fn reference(name: &str) -> Value {
    let path = Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("tests/reference")
        .join(name);
    let text = std::fs::read_to_string(&path).expect("the file is in the repository");
    serde_json::from_str(&text).expect("valid JSON")
}

fn numbers(value: &Value) -> Vec<f64> {
    let list = value.as_array().expect("a list");
    list.iter()
        .map(|entry| match entry {
            Value::String(digits) => digits.parse().expect("a number"),
            other => other.as_f64().expect("a number"),
        })
        .collect()
}

/// Digits in common: `-log10` of the relative error (of the absolute error for a certified zero).
fn digits(found: f64, certified: f64) -> f64 {
    let error = (found - certified).abs();
    let error = if certified == 0.0 {
        error
    } else {
        error / certified.abs()
    };
    if error == 0.0 { 16.0 } else { -error.log10() }
}

/// NIST Statistical Reference Datasets, linear regression (public domain): certified coefficients,
/// standard errors and residual standard deviations. The digits asked for are what a Householder
/// QR in double precision reaches on each set, less one.
#[test]
fn least_squares_reaches_the_certified_values() {
    let sets = reference("nist_strd.json");
    for (name, wanted) in [
        ("Norris", 11.0),
        ("Pontius", 11.0),
        ("NoInt1", 13.0),
        ("NoInt2", 14.0),
        ("Filip", 6.3),
        ("Longley", 9.9),
        ("Wampler1", 8.0),
        ("Wampler2", 11.0),
        ("Wampler3", 8.0),
        ("Wampler4", 7.0),
        ("Wampler5", 5.0),
    ] {
        let set = &sets[name];
        let rows: Vec<Vec<f64>> = set["X"]
            .as_array()
            .expect("rows")
            .iter()
            .map(numbers)
            .collect();
        let outcomes = numbers(&set["y"]);
        let (n, p) = (rows.len(), rows[0].len());
        let design: Vec<f64> = (0..p)
            .flat_map(|column| rows.iter().map(move |row| row[column]))
            .collect();
        let columns: Vec<usize> = (0..p).collect();
        let mut fit = LeastSquares::new();
        fit.fit(&design, n, n, &columns, &outcomes)
            .expect("full rank");
        let certified = numbers(&set["coef"]);
        for (found, certified) in fit.coefficients().iter().zip(&certified) {
            let reached = digits(*found, *certified);
            assert!(
                reached >= wanted,
                "{name}: {reached:.1} digits of {certified}"
            );
        }
        let certified_sd: f64 = set["rsd"]
            .as_str()
            .expect("digits")
            .parse()
            .expect("a number");
        if certified_sd == 0.0 {
            // An exact polynomial: what is left is rounding of outcomes up to 3 million.
            assert!(fit.residual_sum_of_squares().sqrt() < 1e-6, "{name}");
            continue;
        }
        let sd = (fit.residual_sum_of_squares() / (n - p) as f64).sqrt();
        assert!(
            digits(sd, certified_sd) >= wanted.min(10.0),
            "{name}: residual sd {sd}"
        );
        for (index, certified) in numbers(&set["se"]).iter().enumerate() {
            let mut contrast = vec![0.0; p];
            contrast[index] = 1.0;
            let error = sd * fit.contrast_variance(&contrast).sqrt();
            let reached = digits(error, *certified);
            assert!(
                reached >= wanted.min(9.0),
                "{name}: {reached:.1} digits of {certified}"
            );
        }
    }
}

/// statsmodels 0.15.0 on the diabetes data (see `tests/reference/make_diabetes_sandwich.py`): the
/// whole program, from a roster scenario whose one batch enrols all 442 patients.
#[test]
fn sandwich_variances_agree_with_a_reference_library() {
    let expected = reference("diabetes_sandwich.json");
    let names: Vec<String> = expected["names"]
        .as_array()
        .expect("names")
        .iter()
        .map(|name| name.as_str().expect("text").to_owned())
        .collect();
    let mut estimands = String::new();
    for name in &names {
        let _ = writeln!(
            estimands,
            "[[estimand]]\nname = \"of {name}\"\ncontrast = {{ \"{name}\" = 1.0 }}"
        );
    }
    let forms = ["model", "HC0", "HC1", "HC2", "HC3"];
    let mut methods = String::new();
    for form in forms {
        let _ = writeln!(
            methods,
            "[[method]]\nkind = \"least-squares\"\nvariance = \"{form}\""
        );
    }
    let covariates: Vec<String> = names[1..]
        .iter()
        .map(|name| format!("\"{name}\""))
        .collect();
    let text = format!(
        "format = 1\n[study]\ntitle = \"all\"\n[population]\nroster = {{ file = \"diabetes.csv\", \
         id = \"id\", covariates = [{}], outcome = \"progression\" }}\n[[batch]]\nsize = 442\n\
         {estimands}{methods}[precision]\ntrials = 1\nseed = 1\n",
        covariates.join(", ")
    );
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("scenarios");
    let scenario = Scenario::parse(&text, "all.toml", &folder).expect("a sound scenario");
    let study = Study::prepare(&plan::resolve(&scenario).expect("a sound plan"));
    let mut worker = Worker::new(&study);
    let mut record = BlockRecord::default();
    worker.set_truth(0);
    worker.simulate(0, Phase::Replay, 0);
    worker.score_into(&mut record);
    for (estimand, name) in names.iter().enumerate() {
        let coefficient = numbers(&expected["coefficients"])[estimand];
        let true_value = study.true_values(0)[estimand].value;
        assert!(
            digits(true_value, coefficient) > 9.0,
            "{name}: roster fit {true_value}"
        );
        for (method, form) in forms.iter().enumerate() {
            let answer = record.estimates[estimand * forms.len() + method].expect("an answer");
            let error = numbers(&expected[*form])[estimand];
            assert!(
                digits(answer.point, coefficient) > 8.0,
                "{name}: {}",
                answer.point
            );
            let reached = digits(answer.standard_error, error);
            assert!(
                reached > 8.0,
                "{name}, {form}: {reached:.1} digits of {error}"
            );
        }
    }
}

/// Student t and F tables as in any textbook (for instance NIST/SEMATECH e-Handbook of Statistical
/// Methods, 1.3.6.7), recalled, to the digits printed; normal quantiles likewise.
#[test]
fn quantiles_agree_with_printed_tables() {
    for (probability, expected) in [(0.975, 1.960), (0.995, 2.576), (0.95, 1.645), (0.9, 1.282)] {
        assert!(
            (normal_quantile(probability) - expected).abs() < 6e-4,
            "normal {probability}"
        );
    }
    for (probability, df, expected) in [
        (0.975, 1.0, 12.706),
        (0.975, 5.0, 2.571),
        (0.975, 10.0, 2.228),
        (0.975, 30.0, 2.042),
        (0.995, 20.0, 2.845),
        (0.95, 100.0, 1.660),
    ] {
        let found = student_t_quantile(probability, df);
        assert!(
            (found - expected).abs() < 6e-4,
            "t({df}) at {probability}: {found}"
        );
    }
    for (numerator, denominator, expected) in [
        (1.0, 10.0, 4.965),
        (3.0, 20.0, 3.098),
        (5.0, 30.0, 2.534),
        (10.0, 10.0, 2.978),
    ] {
        let found = f_quantile(0.95, numerator, denominator);
        assert!(
            (found - expected).abs() < 6e-4,
            "F({numerator}, {denominator}): {found}"
        );
    }
}

/// Newcombe (1998), Statistics in Medicine 17:857-872, Table I, recalled: exact limits.
#[test]
fn exact_limits_agree_with_a_printed_table() {
    for (successes, trials, lower, upper) in [
        (81, 263, 0.2527, 0.3676),
        (15, 148, 0.0578, 0.1617),
        (0, 20, 0.0, 0.1684),
        (1, 29, 0.0009, 0.1776),
    ] {
        let (low, high) = clopper_pearson(successes, trials, 0.95);
        assert!((low - lower).abs() < 6e-5, "{successes}/{trials}: {low}");
        assert!((high - upper).abs() < 6e-5, "{successes}/{trials}: {high}");
    }
}

/// `SciPy` 1.17.1 (see `tests/reference/make_distribution_values.py`).
#[test]
fn distributions_agree_with_a_reference_library() {
    let expected = reference("distributions.json");
    let rows = |name: &str| -> Vec<Vec<f64>> {
        expected[name]
            .as_array()
            .expect("rows")
            .iter()
            .map(numbers)
            .collect()
    };
    let close = |found: f64, expected: f64, label: &str| {
        let tolerance = 1e-10 * expected.abs().max(1e-3);
        assert!(
            (found - expected).abs() <= tolerance,
            "{label}: {found} for {expected}"
        );
    };
    for row in rows("normal") {
        close(
            normal_quantile(row[0]),
            row[1],
            &format!("normal {}", row[0]),
        );
    }
    for row in rows("normal_cdf") {
        assert!(
            digits(normal_cdf(row[0]), row[1]) > 12.0,
            "normal cdf {}",
            row[0]
        );
    }
    for row in rows("student") {
        let label = format!("t({}) at {}", row[1], row[0]);
        close(student_t_quantile(row[0], row[1]), row[2], &label);
    }
    for row in rows("f") {
        let label = format!("F({}, {}) at {}", row[1], row[2], row[0]);
        close(f_quantile(row[0], row[1], row[2]), row[3], &label);
    }
    for row in rows("clopper_pearson") {
        #[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)] // counts in the table
        let (low, high) = clopper_pearson(row[0] as u64, row[1] as u64, 0.95);
        close(
            low,
            row[2],
            &format!("lower limit of {}/{}", row[0], row[1]),
        );
        close(
            high,
            row[3],
            &format!("upper limit of {}/{}", row[0], row[1]),
        );
    }
}
