//! Checks of the rules, and of what they may see.

use super::{edited, one_mistake, read};

#[test]
fn selection_rules() {
    let right = "select = { rule = \"top-quantile\", fraction = 0.2, score = \"predicted-outcome\", arm = \"treated\" }";
    let predicted = "score = \"predicted-outcome\"";
    let rule = |keys: &str| format!("select = {{ {keys} }}");
    let cases = [
        ("rule = \"best\", fraction = 0.2".to_owned(), "unknown rule \"best\"", "top-quantile"),
        (format!("rule = \"top-quantile\", fraction = 0, {predicted}"), "`fraction` is 0", "above 0 and at most 1"),
        (format!("rule = \"top-quantile\", fraction = 1.5, {predicted}"), "`fraction` is 1.5", "above 0"),
        (format!("rule = \"top-quantile\", fraction = 1e-9, {predicted}"), "need 40000000000 candidates", "fraction larger"),
        (format!("rule = \"top-quantile\", fraction = 0.5, candidates = 80, {predicted}"), "both", "one of them"),
        (format!("rule = \"top-quantile\", candidates = 39, {predicted}"), "39 candidates for 40 units", "at least as many"),
        (format!("rule = \"top-quantile\", {predicted}"), "says nothing about its candidates", "fraction = 0.15"),
        ("rule = \"top-quantile\", fraction = 0.5".to_owned(), "`score` is missing", "predicted-outcome"),
        ("rule = \"random\", fraction = 0.5".to_owned(), "\"random\" takes no `fraction`", "rule"),
        ("rule = \"above-threshold\", fraction = 0.5, score = \"covariate\", covariate = \"age\"".to_owned(), "`threshold` is missing", "score above"),
        ("rule = \"tilted\", fraction = 0.5, score = \"covariate\", covariate = \"age\"".to_owned(), "`strength` is missing", "weight"),
        ("rule = \"tilted\", fraction = 0.5, strength = 1, score = \"covariate\"".to_owned(), "`covariate` is missing", "ranked"),
        ("rule = \"top-quantile\", fraction = 0.5, score = \"covariate\", covariate = \"agee\"".to_owned(), "unknown covariate \"agee\"", "\"age\""),
        (format!("rule = \"top-quantile\", fraction = 0.5, {predicted}, arm = \"treat\""), "unknown arm \"treat\"", "\"treated\""),
        (format!("rule = \"top-quantile\", fraction = 0.5, {predicted}, covariate = \"age\""), "takes no `covariate`", "arm"),
        (format!("rule = \"top-quantile\", fraction = 0.5, {predicted}, penalty = 1"), "penalty without ridge", "fit = \"ridge\""),
        (format!("rule = \"top-quantile\", fraction = 0.5, {predicted}, fit = \"lasso\""), "unknown fit \"lasso\"", "ridge"),
        (format!("rule = \"top-quantile\", fraction = 0.5, {predicted}, fit = \"ridge\", penalty = 0"), "`penalty` is 0", "above 0"),
        (format!("rule = \"top-quantile\", fraction = 0.5, {predicted}, regressors = [\"arms\"]"), "same for every unit", "add regressors"),
        ("rule = \"top-quantile\", fraction = 0.5, score = \"predicted-contrast\"".to_owned(), "`arm` is missing", "compared"),
        ("rule = \"top-quantile\", fraction = 0.5, score = \"predicted-contrast\", arm = \"control\"".to_owned(), "compared with itself", "another arm"),
        ("rule = \"top-quantile\", fraction = 0.5, score = \"predicted-contrast\", arm = \"treated\"".to_owned(), "same for every unit", "treated:age"),
        ("share = 0.5, rule = \"random\"".to_owned(), "a share where there is only one rule", "list several"),
    ];
    for (keys, message, help) in cases {
        one_mistake(right, &rule(&keys), message, help, &keys);
    }
    let mixtures = [
        ("[]", "the list has 0 rules", "1 to 64"),
        (
            "[{ share = 0.5, rule = \"random\" }]",
            "the shares sum to 0.5",
            "sum to 1",
        ),
        (
            "[{ rule = \"random\" }]",
            "`share` is missing",
            "which share",
        ),
        (
            "[{ share = 1.5, rule = \"random\" }]",
            "`share` is 1.5",
            "at most 1",
        ),
        (
            "[{ share = 0.999, rule = \"random\" }, { share = 0.001, rule = \"random\" }]",
            "too small to enrol",
            "larger",
        ),
    ];
    for (to, message, help) in mixtures {
        one_mistake(right, &format!("select = {to}"), message, help, to);
    }
}

#[test]
fn allocation_rules() {
    let right = "allocate = { rule = \"epsilon-greedy\", epsilon = 0.2, floor = 0.1 }";
    let cases = [
        (
            "rule = \"greedy\"",
            "unknown rule \"greedy\"",
            "epsilon-greedy",
        ),
        (
            "rule = \"epsilon-greedy\", epsilon = 1.2",
            "`epsilon` is 1.2",
            "from 0 to 1",
        ),
        (
            "rule = \"epsilon-greedy\", floor = 0.4",
            "`floor` is 0.4",
            "from 0 to 0.333333333",
        ),
        (
            "rule = \"epsilon-greedy\", draw = \"urn\"",
            "unknown draw \"urn\"",
            "quota",
        ),
        (
            "rule = \"equal\", floor = 0.1",
            "\"equal\" takes no `floor`",
            "rule",
        ),
        ("rule = \"fixed\"", "`shares` is missing", "control = 0.5"),
        (
            "rule = \"fixed\", shares = { control = 0.5, treated = 0.5 }",
            "the arm \"doubled\" has no share",
            "every arm",
        ),
        (
            "rule = \"fixed\", shares = { control = 0.5, treated = 0.5, doubled = 0.5 }",
            "the shares sum to 1.5",
            "sum to 1",
        ),
        (
            "rule = \"fixed\", shares = { control = 0.5, treated = 0.5, double = 0.0 }",
            "unknown arm \"double\"",
            "\"doubled\"",
        ),
        (
            "rule = \"fixed\", shares = { control = -0.5, treated = 0.5, doubled = 1.0 }",
            "share of \"control\" is -0.5",
            "from 0 to 1",
        ),
        (
            "rule = \"thompson\", prior_sd = 0",
            "`prior_sd` is 0",
            "above 0",
        ),
        (
            "rule = \"thompson\", variance = \"known\"",
            "`known_sd` is missing",
            "standard deviation",
        ),
        (
            "rule = \"thompson\", variance = \"estimated\", known_sd = 1",
            "beside variance = \"estimated\"",
            "variance = \"known\"",
        ),
        (
            "rule = \"thompson\", known_sd = 0",
            "`known_sd` is 0",
            "above 0",
        ),
        (
            "rule = \"thompson-linear\", prior_sd = inf",
            "`prior_sd` is inf",
            "finite",
        ),
        (
            "rule = \"thompson-linear\", covariates = [\"treated\"]",
            "unknown covariate \"treated\"",
            "",
        ),
        (
            "rule = \"thompson-linear\", covariates = [\"soil\", \"soil1\"]",
            "\"soil1\" is listed twice",
            "once",
        ),
    ];
    for (keys, message, help) in cases {
        one_mistake(
            right,
            &format!("allocate = {{ {keys} }}"),
            message,
            help,
            keys,
        );
    }
    let text = "format = 1\n[study]\ntitle = \"t\"\n[population]\ncovariates = [{ name = \"x\", law = \"normal\" }]\n[[truth]]\nname = \"t\"\n[[batch]]\nsize = 9\nallocate = { rule = \"equal\" }\n[[estimand]]\nname = \"e\"\ncontrast = { x = 1 }\n[[method]]\nkind = \"least-squares\"\n[precision]\ntrials = 1\nseed = 1\n";
    let shown = read(text).unwrap_err().to_string();
    assert!(
        shown.contains("an allocation rule in a study without arms"),
        "{shown}"
    );
    assert!(shown.ends_with("\n1 mistake in study.toml"), "{shown}");
}

#[test]
fn rules_see_only_outcomes_that_are_due() {
    let first = "[[batch]]\nsize = 60\n";
    let predicted = "select = { rule = \"tilted\", strength = 1, fraction = 0.5, score = \"predicted-outcome\" }";
    let uncertain = "select = { rule = \"uncertain\", fraction = 0.5 }";
    for select in [predicted, uncertain] {
        let to = format!("{first}{select}\n");
        one_mistake(
            first,
            &to,
            "batch 1 comes before any outcome",
            "from batch 2 on",
            select,
        );
    }
    for rule in ["epsilon-greedy", "thompson", "thompson-linear"] {
        let allocate = format!("allocate = {{ rule = \"{rule}\" }}");
        let to = format!("{first}{allocate}\n");
        one_mistake(
            first,
            &to,
            "batch 1 comes before any outcome",
            "rule = \"equal\"",
            &allocate,
        );
    }
    let text = edited("name = \"effect\"", "name = \"effect\"\ndelay = 1");
    let diagnostics = read(&text).unwrap_err();
    let shown = diagnostics.to_string();
    assert_eq!(diagnostics.len(), 2, "{shown}");
    assert!(
        shown.contains("no outcome is due before batch 2: under the truth \"effect\""),
        "{shown}"
    );
    assert!(shown.contains("from batch 3 on"), "{shown}");
}

#[test]
fn units_must_suffice() {
    // Eight coefficients: intercept, two arms, age, three soils, one site.
    let diagnostics = read(&edited("size = 60", "size = 7")).unwrap_err();
    let shown = diagnostics.to_string();
    assert_eq!(diagnostics.len(), 2, "{shown}");
    assert!(
        shown.contains(
            "the rule's model has 8 coefficients, but only 7 outcomes are due before batch 2"
        ),
        "{shown}"
    );
    assert!(
        shown.contains("\"batch-combined\" estimates 8 coefficients, but batch 1 has 7 units"),
        "{shown}"
    );
    one_mistake(
        "size = 40\n",
        "size = 8\n",
        "batch 2 has 8 units",
        "larger batches",
        "batch-combined",
    );
    one_mistake(
        "kind = \"batch-combined\"",
        "kind = \"first-batch\"\n[[batch]]\nsize = 8\n[[method]]\nkind = \"last-batch\"",
        "batch 4 has 8 units",
        "larger batches",
        "last-batch",
    );
    one_mistake(
        "size = 40\n",
        "size = 9000000\n",
        "batch 2 screens 45000000 candidates",
        "fewer candidates",
        "[[batch]]",
    );
}
