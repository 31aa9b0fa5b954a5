//! Checks of estimands, methods, verdicts, requirements, precision and sweeps.

use super::{edited, one_mistake, read};

#[test]
fn estimands() {
    let right = "contrast = { treated = 1.0 }";
    let cases = [
        (
            "contrast = { traeted = 1.0 }",
            "unknown coefficient \"traeted\"",
            "\"treated\"",
        ),
        (
            "contrast = { rainfall = 1.0 }",
            "unknown coefficient \"rainfall\"",
            "intercept, treated",
        ),
        ("contrast = { soil = 1.0 }", "stands for 3", "\"soil1\""),
        (
            "contrast = { \"treated:age\" = 1.0 }",
            "not in the analysis model",
            "regressors",
        ),
        (
            "contrast = { treated = 0.0 }",
            "no coefficient any weight",
            "other than 0",
        ),
        ("contrast = {}", "no coefficient any weight", "other than 0"),
        (
            "contrast = { treated = \"one\" }",
            "the text \"one\"",
            "a number",
        ),
        (
            "along = \"truth\"",
            "unknown along \"truth\"",
            "coefficients",
        ),
        (
            "along = \"coefficients\"\ncontrast = { age = 1 }",
            "both a contrast and `along`",
            "contrast",
        ),
        ("null = 1", "neither a contrast nor `along`", "contrast"),
    ];
    for (to, message, help) in cases {
        let diagnostics = read(&edited(right, to)).expect_err(to);
        let shown = diagnostics.to_string();
        assert_eq!(diagnostics.len(), 1, "{to}\n{shown}");
        assert!(
            shown.contains(message) && shown.contains(help),
            "{to}\n{shown}"
        );
    }
    let text = edited(right, "along = \"coefficients\"")
        .replace("[\"intercept\", \"arms\", \"covariates\"]", "[\"intercept\", \"arms\"]")
        .replace("rule = \"top-quantile\", fraction = 0.2, score = \"predicted-outcome\", arm = \"treated\"", "rule = \"random\"");
    let shown = read(&text).unwrap_err().to_string();
    assert!(
        shown.contains("no covariate to define a direction"),
        "{shown}"
    );
}

#[test]
#[allow(clippy::too_many_lines)] // one table of cases
fn methods_verdicts_and_requirements() {
    let kind = "kind = \"batch-combined\"";
    let cases = [
        (
            "kind = \"bayes\"",
            "unknown kind \"bayes\"",
            "least-squares",
            "bayes",
        ),
        (
            "label = \"x\"",
            "`kind` is missing in method 2",
            "known kinds",
            "[[method]]",
        ),
        (
            "kind = \"first-batch\"\npenalty = 1",
            "takes no `penalty`",
            "kind",
            "penalty",
        ),
        (
            "kind = \"least-squares\"\nvariance = \"HC4\"\nlabel = \"x\"",
            "unknown variance \"HC4\"",
            "HC3",
            "HC4",
        ),
        (
            "kind = \"ridge\"\npenalty = 0",
            "`penalty` is 0",
            "above 0",
            "penalty",
        ),
        (
            "kind = \"ridge\"\npenalty = \"replayed\"",
            "the penalty is a word",
            "above 0",
            "penalty",
        ),
        (
            "kind = \"w-decorrelation\"\npenalty = \"tuned\"",
            "unknown penalty \"tuned\"",
            "replayed",
            "penalty",
        ),
        (
            "kind = \"batch-combined\"\nweights = [1, 2]",
            "2 weights for 3 batches",
            "per batch",
            "weights",
        ),
        (
            "kind = \"batch-combined\"\nweights = [1, 2, 0]",
            "weight of a batch is 0",
            "above 0",
            "weights",
        ),
        (
            "kind = \"batch-combined\"\nweights = \"optimal\"",
            "unknown weights \"optimal\"",
            "planned",
            "weights",
        ),
    ];
    for (to, message, help, line) in cases {
        one_mistake(kind, to, message, help, line);
    }
    one_mistake(
        "reference = \"least-squares\"",
        "reference = \"least-squared\"",
        "unknown method",
        "\"least-squares\"",
        "reference",
    );
    one_mistake(
        "reference = \"least-squares\"",
        "tolerance = -0.1",
        "`tolerance` is -0.1",
        "at least 0",
        "tolerance",
    );
    one_mistake(
        "reference = \"least-squares\"",
        "confidence = 1",
        "`confidence` is 1",
        "below 1",
        "confidence",
    );
    let honest = "measure = \"honest\"";
    let cases = [
        (
            "measure = \"coverege\"\nat_least = 0.9",
            "unknown measure \"coverege\"",
            "\"coverage\"",
            "coverege",
        ),
        (
            "measure = \"coverage\"",
            "has 0 bounds",
            "at_least, at_most",
            "[[require]]",
        ),
        (
            "measure = \"coverage\"\nat_least = 0.9\nat_most = 1",
            "has 2 bounds",
            "at_least, at_most",
            "[[require]]",
        ),
        (
            "measure = \"honest\"\nat_least = 0.9",
            "a bound on a requirement to be honest",
            "tolerance",
            "at_least",
        ),
        (
            "measure = \"honest\"\ntruth = \"nul\"",
            "unknown truth \"nul\"",
            "\"null\"",
            "truth",
        ),
        (
            "measure = \"honest\"\nestimand = \"treatmnet\"",
            "unknown estimand",
            "\"treatment\"",
            "estimand",
        ),
        (
            "measure = \"honest\"\nmethod = \"first\"",
            "unknown method \"first\"",
            "known",
            "method",
        ),
        (
            "truth = \"null\"",
            "`measure` is missing",
            "coverage",
            "[[require]]",
        ),
    ];
    for (to, message, help, line) in cases {
        one_mistake(honest, to, message, help, line);
    }
    one_mistake(
        "trials = 100\n",
        "",
        "`trials` is missing",
        "per truth",
        "[precision]",
    );
    one_mistake(
        "trials = 100",
        "trials = 0",
        "`trials` is 0",
        "at least 1",
        "trials",
    );
    one_mistake(
        "trials = 100",
        "trials = 1000000001",
        "`trials` is 1000000001",
        "to 1000000000",
        "trials",
    );
    one_mistake(
        "seed = 7",
        "seed = -1",
        "`seed` is -1",
        "from 0 to 9223372036854775807",
        "seed",
    );
    one_mistake(
        "seed = 7",
        "seed = 7\npilot_trials = 0",
        "`pilot_trials` is 0",
        "at least 1",
        "pilot",
    );
}

#[test]
fn sweeps() {
    let sweep = |keys: &str| format!("seed = 7\n[sweep]\n{keys}\n");
    let axis = |keys: &str| sweep(&format!("axes = [{{ {keys} }}]"));
    let cases = [
        (sweep(""), "`axes` is missing", "axes ="),
        (sweep("axes = []"), "0 axes", "one or two"),
        (
            axis("path = \"batch.2.sise\", values = [1]"),
            "has no `sise`",
            "`size`",
        ),
        (
            axis("path = \"batch.9.size\", values = [1]"),
            "no member `9`",
            "from 1 to 2",
        ),
        (
            axis("path = \"truth.efect.delay\", values = [1]"),
            "no member `efect`",
            "`effect`",
        ),
        (
            axis("path = \"batch.2.size.x\", values = [1]"),
            "leads nowhere",
            "end the path",
        ),
        (
            axis("path = \"batch.2.size\", values = [1.5]"),
            "the value is 1.5",
            "whole number",
        ),
        (
            axis("path = \"batch.2.size\", values = []"),
            "no value",
            "at least one",
        ),
        (
            axis("path = \"batch.2.size\""),
            "says its values 0 times",
            "give one of",
        ),
        (
            axis("path = \"batch.2.size\", from = 1, to = 5, step = -1"),
            "leads away",
            "sign",
        ),
        (
            axis("path = \"batch.2.size\", from = 1, to = 5, step = 0"),
            "`step` is 0",
            "other than 0",
        ),
        (
            axis("path = \"batch.2.size\", from = 1, to = 1e9, step = 1"),
            "more than 10000",
            "larger",
        ),
        (
            axis("path = \"batch.2.size\", from = 0, to = 5, points = 3, spacing = \"geometric\""),
            "geometric axis cannot",
            "above 0",
        ),
        (
            axis("path = \"batch.2.size\", to = 5, points = 3"),
            "`from` is missing",
            "begins",
        ),
        (
            axis("path = \"population.covariates.soil.count\", share_of_units = [1.5]"),
            "share 1.5",
            "below 1",
        ),
        (
            axis("path = \"analysis.level\", share_of_units = [0.5]"),
            "is no count",
            "count",
        ),
        (
            sweep(
                "axes = [{ path = \"batch.2.size\", values = [9] }]\nbreak_point = { method = \"lest-squares\" }",
            ),
            "unknown method",
            "\"least-squares\"",
        ),
        (
            sweep(
                "axes = [{ path = \"batch.2.size\", values = [90] }, { path = \"batch.2.size\", values = [91] }]",
            ),
            "both axes vary",
            "different",
        ),
    ];
    for (to, message, help) in cases {
        one_mistake("seed = 7\n", &to, message, help, "");
    }
}
