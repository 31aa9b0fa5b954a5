//! Checks of arms, outcomes, coefficients and the analysis model.

use super::{edited, one_mistake, read};

#[test]
fn arms_and_outcome() {
    one_mistake(
        "family = \"normal\"",
        "family = \"binary\"",
        "\"binary\"",
        "only family = \"normal\"",
        "family",
    );
    let noise = "noise = { law = \"normal\", sd = 1.0 }";
    let cases = [
        (
            "noise = { law = \"student-t\", df = 2 }",
            "`df` is 2",
            "above 2",
        ),
        (
            "noise = { law = \"student-t\" }",
            "`df` is missing",
            "above 2",
        ),
        (
            "noise = { law = \"log-normal\" }",
            "`log_sd` is missing",
            "above 0",
        ),
        (
            "noise = { law = \"laplace\", df = 3 }",
            "takes no `df`",
            "sd",
        ),
        ("noise = { sd = -1 }", "`sd` is -1", "above 0"),
        (
            "noise = { log_sd_slope = { covariate = \"agge\", slope = 1 } }",
            "unknown covariate \"agge\"",
            "\"age\"",
        ),
        (
            "noise = { log_sd_slope = { covariate = \"soil\", slope = 1 } }",
            "stands for 3",
            "\"soil1\"",
        ),
        (
            "drift = { kind = \"step\", from = 1, size = 1 }",
            "`from` is 1",
            "at least 2",
        ),
        (
            "drift = { kind = \"step\", from = 4, size = 1 }",
            "batch 4, but there are 3",
            "one of the batches",
        ),
        (
            "drift = { kind = \"linear\" }",
            "`total` is missing",
            "change",
        ),
        (
            "drift = { kind = \"sudden\" }",
            "unknown kind \"sudden\"",
            "linear",
        ),
    ];
    for (to, message, help) in cases {
        one_mistake(noise, to, message, help, to);
    }
    let text = edited(
        "names = [\"control\", \"treated\", \"doubled\"]",
        "names = [\"control\"]",
    );
    assert!(
        read(&text)
            .unwrap_err()
            .to_string()
            .contains("only one arm is named")
    );
}

#[test]
fn coefficients() {
    let right = "coefficients = { treated = 0.3, \"treated:age\" = 0.1 }";
    let cases = [
        (
            "{ tretaed = 0.3 }",
            "unknown coefficient \"tretaed\"",
            "\"treated\"",
        ),
        ("{ soil9 = 0.3 }", "unknown coefficient \"soil9\"", "\"soil"),
        (
            "{ control = 0.3 }",
            "names the reference arm",
            "treated, doubled",
        ),
        (
            "{ \"control:age\" = 0.3 }",
            "names the reference arm",
            "treated, doubled",
        ),
        (
            "{ \"treated:agee\" = 0.3 }",
            "unknown coefficient \"treated:agee\"",
            "\"treated:age\"",
        ),
        (
            "{ soil = { value = 1, nonzero = 4 } }",
            "`nonzero` is 4, but `soil` has 3",
            "at most",
        ),
        (
            "{ soil = { value = 1, ratio = 4 } }",
            "takes no `ratio`",
            "nonzero",
        ),
        ("{ soil = { first = 1 } }", "`ratio` is missing", "ratio"),
        (
            "{ soil = { first = 1, ratio = 2 } }",
            "`ratio` is 2",
            "from -1 to 1",
        ),
        ("{ soil = { norm = -1 } }", "`norm` is -1", "at least 0"),
        (
            "{ soil = { norm = 1, value = 1 } }",
            "gives 2 patterns",
            "one of",
        ),
        (
            "{ soil = \"x\" }",
            "`soil` is the text \"x\"",
            "a number, or a table",
        ),
        (
            "{ intercept = 1 }\nintercept = 2",
            "given twice",
            "not both",
        ),
    ];
    for (to, message, help) in cases {
        let to = format!("coefficients = {to}");
        let diagnostics = read(&edited(right, &to)).expect_err(&to);
        let shown = diagnostics.to_string();
        assert_eq!(diagnostics.len(), 1, "{to}\n{shown}");
        assert!(
            shown.contains(message) && shown.contains(help),
            "{to}\n{shown}"
        );
    }
}

#[test]
fn analysis() {
    let right = "[\"intercept\", \"arms\", \"covariates\"]";
    let cases = [
        ("[]", "no regressor", "at least one"),
        (
            "[\"intercept\", \"arms\", \"soil\", \"soil2\"]",
            "\"soil2\" is listed",
            "",
        ),
        (
            "[\"intercept\", \"arms\", \"arms\"]",
            "\"arms\" is listed twice",
            "once",
        ),
        (
            "[\"intercept\", \"arms\", \"covariates\", \"age\"]",
            "through \"covariates\"",
            "once",
        ),
        (
            "[\"intercept\", \"arms\", \"covariates\", \"ages\"]",
            "unknown regressor \"ages\"",
            "\"age\"",
        ),
        (
            "[\"intercept\", \"arms\", \"covariates\", \"control\"]",
            "reference arm",
            "against it",
        ),
        (
            "[\"intercept\", \"arms\", \"covariates\", \"arms:sol\"]",
            "unknown regressor \"arms:sol\"",
            "",
        ),
        (
            "[\"intercept\", \"arms\", \"covariates\", 3]",
            "member 4 of `regressors` is 3",
            "text",
        ),
    ];
    for (to, message, help) in cases {
        if to.contains("soil2") {
            let shown = read(&edited(right, to)).unwrap_err().to_string();
            assert!(
                shown.contains("in the model already, through \"soil\""),
                "{shown}"
            );
            continue;
        }
        let diagnostics = read(&edited(right, to)).expect_err(to);
        let shown = diagnostics.to_string();
        assert!(
            shown.contains(message) && shown.contains(help),
            "{to}\n{shown}"
        );
        assert!(shown.contains("regressors = ["), "{shown}");
    }
    one_mistake(
        "level = 0.9",
        "level = 1",
        "`level` is 1",
        "below 1",
        "level",
    );
}
