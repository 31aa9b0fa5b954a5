//! Checks of the head of the file, the population and its names.

use super::{STUDY, one_mistake, read};

#[test]
fn head_of_the_file() {
    one_mistake(
        "format = 1",
        "format = 2",
        "the format is 2",
        "format = 1",
        "format = 2",
    );
    one_mistake(
        "format = 1\n",
        "\n",
        "`format` is missing",
        "format = 1",
        "",
    );
    one_mistake(
        "title = \"A study\"",
        "",
        "`title` is missing in [study]",
        "one line",
        "[study]",
    );
    one_mistake(
        "title = \"A study\"",
        "titel = \"A study\"",
        "unknown key `titel`",
        "`title`",
        "titel",
    );
    one_mistake(
        "title = \"A study\"",
        "title = \" \"",
        "is empty",
        "1 to 200",
        "title",
    );
    one_mistake(
        "title = \"A study\"",
        "title = 5",
        "`title` is 5",
        "text in quotes",
        "title",
    );
    one_mistake(
        "[study]",
        "[stduy]",
        "unknown key `stduy`",
        "`study`",
        "[stduy]",
    );
    one_mistake(
        "[verdict]",
        "[extra]\nx = 1\n[verdict]",
        "unknown key `extra`",
        "known here",
        "[extra]",
    );
}

#[test]
#[allow(clippy::too_many_lines)] // one table of cases
fn laws_and_their_parameters() {
    let normal = "law = \"normal\" }";
    let cases = [
        ("law = \"nromal\" }", "unknown law \"nromal\"", "\"normal\""),
        ("law = \"cauchy\" }", "unknown law \"cauchy\"", "student-t"),
        ("law = \"normal\", sd = 0 }", "`sd` is 0", "above 0"),
        ("law = \"normal\", sd = nan }", "`sd` is NaN", "finite"),
        ("law = \"normal\", mean = inf }", "`mean` is inf", "finite"),
        (
            "law = \"normal\", scale = 1 }",
            "takes no `scale`",
            "mean, sd",
        ),
        (
            "law = \"normal\", mean = 9007199254740993 }",
            "`mean` is 9007199254740993",
            "9007199254740993.0",
        ),
        ("law = \"normal\", mean = 1e999 }", "too large", "1.8e308"),
        (
            "law = \"normal\", mean = 99999999999999999999 }",
            "does not fit",
            "smaller",
        ),
        ("law = \"uniform\", low = 2 }", "from 2 to 1", "below"),
        (
            "law = \"log-normal\", log_sd = -1 }",
            "`log_sd` is -1",
            "above 0",
        ),
        (
            "law = \"gamma\" }",
            "`shape` is missing in covariate \"age\"",
            "above 0",
        ),
        (
            "law = \"gamma\", shape = 1, scale = 0 }",
            "`scale` is 0",
            "above 0",
        ),
        (
            "law = \"student-t\" }",
            "`df` is missing",
            "degrees of freedom",
        ),
        (
            "law = \"bernoulli\", probability = 1.5 }",
            "`probability` is 1.5",
            "below 1",
        ),
        ("law = \"poisson\", mean = 0 }", "`mean` is 0", "above 0"),
        ("sd = 1.0 }", "`law` is missing", "normal, uniform"),
    ];
    for (to, message, help) in cases {
        one_mistake(normal, to, message, help, "\"age\"");
    }
    let site = "levels = [\"north\", \"south\"], probabilities = [0.5, 0.5]";
    let cases = [
        (
            "levels = [\"north\", \"south\"]",
            "`probabilities` is missing",
            "one probability per level",
        ),
        (
            "levels = [\"north\", \"south\"], probabilities = [1.0]",
            "1 probabilities for 2 levels",
            "one per level",
        ),
        (
            "levels = [\"north\", \"south\"], probabilities = [0.5, 0.6]",
            "sum to 1.1",
            "sum to 1",
        ),
        (
            "levels = [\"south\", \"south\"], probabilities = [0.5, 0.5]",
            "listed twice",
            "differ",
        ),
        (
            "levels = [\"south\"], probabilities = [0.5]",
            "there are 1 levels",
            "at least two",
        ),
    ];
    for (to, message, help) in cases {
        one_mistake(site, to, message, help, "\"site\"");
    }
    one_mistake(
        "count = 3",
        "count = 0",
        "`count` is 0",
        "at least 1",
        "soil",
    );
    one_mistake(
        "count = 3",
        "count = -3",
        "`count` is -3",
        "from 0 to",
        "soil",
    );
    one_mistake(
        "count = 3",
        "count = 2000000000",
        "2000000000",
        "from 0 to 1000000000",
        "soil",
    );
    one_mistake(
        "count = 3",
        "count = 30000",
        "`count` is 30000",
        "at most 20000",
        "soil",
    );
    one_mistake(
        "count = 3",
        "count = 3.5",
        "`count` is 3.5",
        "whole number",
        "soil",
    );
}

#[test]
fn names() {
    one_mistake(
        "name = \"site\", law",
        "name = \"treated\", law",
        "already taken by an arm",
        "differ",
        "treated",
    );
    one_mistake(
        "name = \"site\"",
        "name = \"soil\"",
        "already taken by a block",
        "differ",
        "categorical",
    );
    one_mistake(
        "\"doubled\"",
        "\"intercept\"",
        "meaning of its own",
        "another name",
        "names",
    );
    one_mistake("\"doubled\"", "\"a:b\"", "holds a colon", "join", "names");
    one_mistake(
        "\"doubled\"",
        "\"treated\"",
        "already taken by an arm",
        "differ",
        "names",
    );
    one_mistake(
        "name = \"effect\"",
        "name = \"null\"",
        "two truths are named \"null\"",
        "differ",
        "null",
    );
    one_mistake(
        "name = \"null\"\n",
        "\n",
        "`name` is missing",
        "name",
        "[[truth]]",
    );
    let twice = "[[estimand]]\nname = \"treatment\"\ncontrast = { age = 1 }\n[[method]]";
    one_mistake(
        "[[method]]",
        twice,
        "two estimands are named",
        "differ",
        "treatment",
    );
    one_mistake(
        "kind = \"batch-combined\"",
        "kind = \"least-squares\"",
        "the same label \"least-squares\"",
        "`label`",
        "kind",
    );
}

#[test]
fn correlations() {
    let right = "kind = \"exchangeable\", rho = 0.2";
    let matrix = |values: &str| format!("kind = \"matrix\", values = {values}");
    let full = "[[1,0,0,0,0],[0,1,0,0,0],[0,0,1,0,0],[0,0,0,1,0],[0,0,0,0,1]]";
    let cases = [
        (
            "kind = \"exchangeable\", rho = 1.0".to_owned(),
            "`rho` is 1",
            "above -0.25",
        ),
        (
            "kind = \"exchangeable\", rho = -0.25".to_owned(),
            "`rho` is -0.25",
            "above -0.25",
        ),
        (
            "kind = \"autoregressive\", rho = -1".to_owned(),
            "`rho` is -1",
            "above -1",
        ),
        (
            "kind = \"autoregressive\"".to_owned(),
            "`rho` is missing",
            "neighbours",
        ),
        (
            "kind = \"banded\"".to_owned(),
            "unknown kind \"banded\"",
            "autoregressive",
        ),
        (
            matrix("[[1]]"),
            "1 rows for 5 covariates",
            "every covariate",
        ),
        (
            matrix(&full.replacen("[1,0,", "[1,0.5,", 1)),
            "not symmetric: row 2, column 1",
            "both sides",
        ),
        (
            matrix(&full.replacen("[1,0,", "[2,0,", 1)),
            "row 1, column 1 of the correlation matrix is 2",
            "diagonal",
        ),
        (
            matrix(&full.replacen("[1,0,", "[1,1.5,", 1)),
            "row 1, column 2",
            "above -1",
        ),
        (
            matrix(&full.replacen("[1,0,", "[1,", 1)),
            "row 1 has 4 values",
            "must have 5",
        ),
        (
            matrix("[[1,0.9,-0.9,0,0],[0.9,1,0.9,0,0],[-0.9,0.9,1,0,0],[0,0,0,1,0],[0,0,0,0,1]]"),
            "not positive definite",
            "closer to 0",
        ),
    ];
    for (to, message, help) in cases {
        one_mistake(right, &to, message, help, "correlation");
    }
}

#[test]
fn missing_sections() {
    let text = "format = 1\n";
    let diagnostics = read(text).unwrap_err();
    let shown = diagnostics.to_string();
    for part in [
        "`study` is missing",
        "`population` is missing",
        "no truth",
        "no batch",
        "no estimand",
        "no method",
        "`precision` is missing",
    ] {
        assert!(shown.contains(part), "{part}\n{shown}");
    }
    assert_eq!(diagnostics.len(), 7, "{shown}");
    assert!(read(STUDY).is_ok());
}
