//! Paths, values, hashes and files.

use std::path::Path;

use toml::Value;

use super::{AxisValues, Scenario};

const TEXT: &str = r#"format = 1
[population]
covariates = [{ name = "soil", law = "normal", count = 3 }]
[[truth]]
name = "worthwhile effect"
coefficients = { soil = { value = 0.2, nonzero = 5 }, "treated:soil1" = 0.1 }
[[truth]]
name = "v1.2"
[[batch]]
size = 10
[[batch]]
size = 20
select = { rule = "top-quantile", fraction = 0.15 }
[sweep]
axes = [
  { path = "batch.2.size", from = 10, to = 1000, points = 3, spacing = "geometric" },
  { path = "truth.worthwhile effect.coefficients.elevation", from = 0.0, to = 0.3, step = 0.1 },
]
break_point = { method = "least-squares" }
"#;

fn parse(text: &str) -> Scenario {
    match Scenario::parse(text, "s.toml", Path::new("")) {
        Ok(scenario) => scenario,
        Err(diagnostics) => panic!("{diagnostics}"),
    }
}

#[test]
fn values_are_set_and_read_back_by_their_path() {
    let scenario = parse(TEXT);
    for (path, value) in [
        ("population.covariates.soil.count", Value::Integer(7)),
        ("population.covariates.1.count", Value::Integer(7)),
        ("batch.2.size", Value::Integer(90)),
        ("batch.2.select.fraction", Value::Float(0.4)),
        ("batch.1.select.fraction", Value::Float(0.4)),
        (
            "truth.worthwhile effect.coefficients.elevation",
            Value::Float(0.3),
        ),
        (
            "truth.worthwhile effect.coefficients.soil.value",
            Value::Float(0.3),
        ),
        (
            "truth.worthwhile effect.coefficients.treated:soil1",
            Value::Float(0.3),
        ),
        ("truth.\"v1.2\".delay", Value::Integer(2)),
        ("outcome.noise.sd", Value::Float(2.0)),
        ("analysis.level", Value::Float(0.9)),
    ] {
        let changed = scenario.with_value(path, value.clone());
        let changed = changed.unwrap_or_else(|diagnostics| panic!("{diagnostics}"));
        assert_eq!(changed.value(path), Some(value.clone()), "{path}");
        assert_eq!(changed.replaced(), [(path.to_owned(), value)]);
        assert_eq!(changed.hash(), scenario.hash());
        assert_eq!(changed.text(), TEXT);
    }
    assert_eq!(scenario.value("batch.2.size"), Some(Value::Integer(20)));
    assert_eq!(scenario.value("outcome.noise.sd"), None);
}

#[test]
fn whole_numbers_may_come_as_floats() {
    let scenario = parse(TEXT);
    let changed = scenario
        .with_value("batch.2.size", Value::Float(60.0))
        .unwrap();
    assert_eq!(changed.value("batch.2.size"), Some(Value::Integer(60)));
    let wrong = scenario.with_value("batch.2.size", Value::Float(60.5));
    let shown = wrong.unwrap_err().to_string();
    assert!(
        shown.contains("s.toml:12:8: the value is 60.5 (set through `batch.2.size`)"),
        "{shown}"
    );
    assert!(
        scenario
            .with_value("batch.2.size", Value::Float(1e300))
            .is_err()
    );
}

#[test]
fn paths_that_lead_nowhere_offer_the_nearest_name() {
    let scenario = parse(TEXT);
    for (path, message, help) in [
        ("bach.2.size", "the scenario has no `bach`", "`batch`"),
        ("batch.2.seize", "no `seize`", "`size`"),
        ("batch.3.size", "no member `3`", "from 1 to 2"),
        ("batch.0.size", "no member `0`", "from 1 to 2"),
        (
            "truth.worthwile effect.delay",
            "no member `worthwile effect`",
            "`worthwhile effect`",
        ),
        ("batch.2.size.more", "holds no names", "end the path"),
        ("method.1.kind", "has no `method`", "in the file first"),
        ("batch..size", "empty name", "dots"),
    ] {
        let shown = scenario
            .with_value(path, Value::Integer(1))
            .unwrap_err()
            .to_string();
        assert!(
            shown.contains(message) && shown.contains(help),
            "{path}\n{shown}"
        );
    }
}

#[test]
fn sweeps_expand_their_axes() {
    let sweep = parse(TEXT).sweep().cloned().unwrap();
    let AxisValues::Values(sizes) = &sweep.axes[0].values else {
        panic!("values")
    };
    assert_eq!(*sizes, [10, 100, 1000].map(Value::Integer));
    let AxisValues::Values(effects) = &sweep.axes[1].values else {
        panic!("values")
    };
    let effects: Vec<f64> = effects.iter().filter_map(Value::as_float).collect();
    assert_eq!(effects.len(), 4);
    assert!((effects[3] - 0.3).abs() < 1e-12);
    assert_eq!(sweep.break_point.unwrap().method, "least-squares");
    assert!(parse("format = 1").sweep().is_none());
}

#[test]
fn the_hash_is_the_sha_256_of_the_text() {
    // FIPS 180-4 test vector of the empty message.
    let empty = "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855";
    assert_eq!(parse("").hash(), empty);
    assert_ne!(parse("format = 1").hash(), parse("format = 1 ").hash());
}

#[test]
fn files_are_read_or_refused_with_a_reason() {
    let folder = tempfile::TempDir::new().unwrap();
    let path = folder.path().join("s.toml");
    assert!(
        Scenario::read(&path)
            .unwrap_err()
            .to_string()
            .contains("cannot be read")
    );
    assert!(
        Scenario::read(folder.path())
            .unwrap_err()
            .to_string()
            .contains("is no file")
    );
    std::fs::write(&path, b"format = 1\n\xff").unwrap();
    assert!(
        Scenario::read(&path)
            .unwrap_err()
            .to_string()
            .contains("byte 12 is not part")
    );
    std::fs::write(&path, vec![b' '; 5 << 20]).unwrap();
    assert!(
        Scenario::read(&path)
            .unwrap_err()
            .to_string()
            .contains("at most 4 MiB")
    );
    std::fs::write(&path, "format = 1\n").unwrap();
    let scenario = Scenario::read(&path).unwrap();
    assert_eq!(scenario.base_folder(), folder.path());
    assert_eq!(scenario.text(), "format = 1\n");
}
