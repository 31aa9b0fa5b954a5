//! Nothing that is given as a scenario makes the reader panic.

use proptest::prelude::*;

use super::{STUDY, read, scenario};
use crate::plan::{parse, resolve};
use std::path::Path;

proptest! {
    #![proptest_config(ProptestConfig { cases: 400, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn arbitrary_text(text in "\\PC{0,200}") {
        let _ = read(&text);
    }

    #[test]
    fn text_of_the_marks_of_toml(text in "[\\[\\]{}=\",.#'\\\\\n a-c0-9_-]{0,120}") {
        let _ = read(&text);
    }

    #[test]
    fn the_study_with_a_piece_cut_out(start in 0..STUDY.len(), length in 0usize..60) {
        let end = (start + length).min(STUDY.len());
        let text = format!("{}{}", &STUDY[..start], &STUDY[end..]);
        if let Err(diagnostics) = read(&text) {
            prop_assert!(!diagnostics.to_string().is_empty());
            prop_assert!(diagnostics.len() < 60);
        }
    }

    #[test]
    fn the_study_with_a_piece_put_in(start in 0..STUDY.len(), piece in "[\\[\\]{}=\",.#'\\\\\n a-z0-9é_-]{1,6}") {
        let _ = read(&format!("{}{piece}{}", &STUDY[..start], &STUDY[start..]));
    }

    #[test]
    fn any_number_in_place_of_any_number(
        which in 0usize..40,
        value in prop_oneof![
            any::<f64>().prop_map(|value| format!("{value:?}")),
            any::<i64>().prop_map(|value| value.to_string()),
            (0i64..1000).prop_map(|value| value.to_string()),
            Just("1e308".to_owned()),
            Just("9223372036854775808".to_owned()),
        ],
    ) {
        let numbers = number_places();
        let (start, end) = numbers[which % numbers.len()];
        let value = value.replace("NaN", "nan");
        let text = format!("{}{value}{}", &STUDY[..start], &STUDY[end..]);
        let _ = read(&text);
    }

    #[test]
    fn any_path_and_value(path in "([a-z]{1,8}|[0-9]{1,2}|batch|truth|size|select|\"|effect)(\\.([a-z]{1,8}|[0-9]{1,2}|size|select|name|coefficients)){0,4}", value in any::<f64>()) {
        let scenario = scenario(STUDY);
        if let Ok(changed) = scenario.with_value(&path, toml::Value::Float(value)) {
            let _ = resolve(&changed);
        }
    }
}

/// Stretches of the study that are numbers.
fn number_places() -> Vec<(usize, usize)> {
    let bytes = STUDY.as_bytes();
    let mut places = Vec::new();
    let mut start = 0;
    while start < bytes.len() {
        let after_blank = start > 0 && matches!(bytes[start - 1], b' ' | b'[');
        if after_blank && bytes[start].is_ascii_digit() {
            let mut end = start;
            while bytes[end].is_ascii_digit() || bytes[end] == b'.' {
                end += 1;
            }
            places.push((start, end));
            start = end;
        }
        start += 1;
    }
    places
}

#[test]
fn deep_nesting_and_long_keys_are_refused() {
    for text in [
        "a = ".to_owned() + &"[".repeat(100_000),
        "a = ".to_owned() + &"{a=".repeat(100_000),
        "a.".repeat(100_000) + "a = 1",
        "[".to_owned() + &"a.".repeat(100_000) + "a]",
        "x".repeat(1_000_000),
        "=\n".repeat(3_000),
        "\u{0}\u{1}\u{7f}".repeat(100),
    ] {
        assert!(read(&text).is_err());
    }
}

#[test]
fn every_scenario_of_the_repository_resolves() {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("scenarios");
    let mut count = 0;
    for entry in std::fs::read_dir(&folder).unwrap() {
        let path = entry.unwrap().path();
        if path
            .extension()
            .is_some_and(|extension| extension == "toml")
        {
            let text = std::fs::read_to_string(&path).unwrap();
            let origin = path.display().to_string();
            if let Err(diagnostics) = parse(&text, &origin, &folder) {
                // A roster file may be left out of a copy of the repository; nothing else may.
                let only_roster = diagnostics.iter().all(|diagnostic| {
                    diagnostic
                        .message
                        .contains(".csv cannot be read: No such file")
                });
                assert!(only_roster, "{diagnostics}");
            }
            count += 1;
        }
    }
    assert!(count >= 5, "{count} scenarios");
}
