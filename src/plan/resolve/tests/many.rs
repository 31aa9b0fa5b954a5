//! Many mistakes in one file are all reported, each once and on its own line.

use std::fmt::Write as _;

use super::{STUDY, read};

/// A mistake of the large scenario: its line and what is said about it.
struct Planted {
    line: String,
    message: &'static str,
}

/// A scenario of about 100 kB with one mistake on each of forty lines.
#[allow(clippy::too_many_lines)] // a long file is its purpose
fn large_scenario() -> (String, Vec<Planted>) {
    let mut planted = Vec::new();
    let mut text = String::from("format = 1\n[study]\ntitle = \"Large\"\nobjective = \"x\"\n");
    let mut plant = |line: &str, message: &'static str| {
        planted.push(Planted {
            line: line.to_owned(),
            message,
        });
        format!("{line}\n")
    };
    plant("objective = \"x\"", "unknown key `objective`");
    text += "[population]\ncovariates = [\n";
    for index in 0..400 {
        let wrong = match index {
            50 => Some(("lwa = \"normal\"", "unknown key `lwa`")),
            100 => Some(("law = \"normall\"", "unknown law")),
            150 => Some(("law = \"normal\", sd = -1", "`sd` is -1")),
            200 => Some(("law = \"gamma\"", "`shape` is missing")),
            250 => Some(("law = \"normal\", df = 3", "takes no `df`")),
            300 => Some(("law = \"normal\", mean = \"0\"", "`mean` is the text")),
            350 => Some(("law = \"uniform\", low = 2", "range from 2 to 1")),
            399 => Some(("law = \"normal\", mean = nan", "`mean` is NaN")),
            _ => None,
        };
        if let Some((keys, message)) = wrong {
            text += &plant(
                &format!("  {{ name = \"covariate{index}\", {keys} }},"),
                message,
            );
        } else {
            let _ = writeln!(
                text,
                "  {{ name = \"covariate{index}\", law = \"normal\", mean = 0.0, sd = 1.0 }}, # as surveyed"
            );
        }
    }
    text += "]\n[arms]\nnames = [\"control\", \"treated\"]\n[outcome]\n";
    text += &plant("family = \"poisson\"", "\"poisson\"");
    text += &plant("noise = { law = \"student-t\", df = 1 }", "`df` is 1");
    text += &plant("delay = -2", "`delay` is -2");
    for index in 0..120 {
        let _ = writeln!(text, "[[truth]]\nname = \"truth {index}\"");
        let line = match index {
            10 => plant(
                "coefficients = { covariat7 = 0.5 } # a",
                "unknown coefficient",
            ),
            20 => plant("coefficients = { treatd = 0.5 }", "unknown coefficient"),
            30 => plant("coefficients = { control = 0.5 }", "reference arm"),
            40 => plant("drift = { kind = \"sudden\" }", "unknown kind"),
            50 => plant(
                "drift = { kind = \"linear\", total = 1, amount = 3 }",
                "unknown key `amount`",
            ),
            60 => plant("intercept = \"none\"", "`intercept` is the text"),
            70 => plant("noise = { sd = 0 }", "`sd` is 0"),
            80 => plant("seed = -5", "`seed` is -5"),
            90 => plant(
                "coefficients = { covariate7 = { first = 1, ratio = 3 } }",
                "`ratio` is 3",
            ),
            _ => {
                let values: Vec<String> = (0..24)
                    .map(|column| format!("covariate{} = 0.125", (column * 7 + index) % 400))
                    .collect();
                format!("coefficients = {{ {} }}\n", values.join(", "))
            }
        };
        text += &line;
    }
    text += "[[truth]]\n";
    text += &plant("name = \"truth 3\"", "two truths are named");
    text += "[analysis]\n";
    text += &plant(
        "regressors = [\"intercept\", \"treatet\"]",
        "unknown regressor",
    );
    text += &plant("level = 95", "`level` is 95");
    text += "[[batch]]\n";
    text += &plant("size = 0", "`size` is 0");
    text += "[[batch]]\nsize = 50\n";
    text += &plant("select = { rule = \"top-quantil\" }", "unknown rule");
    text += &plant(
        "allocate = { rule = \"fixed\", shares = { control = 0.5, treated = 0.4 } }",
        "sum to 0.9",
    );
    text += "[[batch]]\nsize = 50\n";
    text += &plant(
        "select = { rule = \"top-quantile\", fraction = 0, score = \"covariate\", covariate = \"covariate1\" }",
        "`fraction` is 0",
    );
    text += &plant(
        "allocate = { rule = \"epsilon-greedy\", epsilon = 7 }",
        "`epsilon` is 7",
    );
    text += "[[estimand]]\nname = \"treatment\"\n";
    text += &plant("contrast = { treted = 1.0 }", "unknown coefficient");
    text += "[[estimand]]\n";
    text += &plant("name = \"treatment\"", "two estimands");
    text += "along = \"coefficients\"\n[[method]]\nkind = \"least-squares\"\n[[method]]\n";
    text += &plant("kind = \"ordinary\"", "unknown kind");
    text += "[[method]]\nkind = \"ridge\"\n";
    text += &plant("penalty = -1", "`penalty` is -1");
    text += "[[method]]\n";
    text += &plant("kind = \"least-squares\" # again", "the same label");
    text += "[verdict]\n";
    text += &plant("tolerance = 2", "`tolerance` is 2");
    text += &plant("reference = \"least-square\"", "unknown method");
    text += "[[require]]\n";
    text += &plant("measure = \"covrage\"", "unknown measure");
    text += "at_least = 0.9\n[precision]\n";
    text += &plant("trials = 1e4", "`trials` is 10000");
    text += &plant("seed = 1.5", "`seed` is 1.5");
    text += &plant("pilot_trial = 10", "unknown key `pilot_trial`");
    (text, planted)
}

#[test]
fn forty_mistakes_in_a_hundred_kilobytes_are_all_reported() {
    let (text, planted) = large_scenario();
    assert!(text.len() > 90_000, "{} bytes", text.len());
    assert_eq!(planted.len(), 40);
    let diagnostics = read(&text).unwrap_err();
    for mistake in &planted {
        let lines: Vec<usize> = (1..)
            .zip(text.lines())
            .filter(|(_, line)| *line == mistake.line)
            .map(|(number, _)| number)
            .collect();
        let found = diagnostics.iter().any(|diagnostic| {
            lines.contains(&diagnostic.line) && diagnostic.message.contains(mistake.message)
        });
        assert!(found, "{}: {}", mistake.line, mistake.message);
    }
    assert_eq!(diagnostics.len(), 40, "{diagnostics}");
    let shown = diagnostics.to_string();
    assert!(shown.ends_with("\n40 mistakes in study.toml"));
}

#[test]
fn mistakes_of_syntax_and_of_meaning_are_reported_together() {
    let text = STUDY
        .replace("title = \"A study\"", "title = \"A study")
        .replace("level = 0.9", "level = 9")
        .replace("size = 60", "size = ")
        .replace("kind = \"batch-combined\"", "kind = \"batch-combine\"")
        .replace(
            "coefficients = { soil = 0.5, soil2 = 0.25 }",
            "coefficients = { soil = 0.5, soil2 = 0.25",
        )
        .replace("trials = 100", "trials = 100\ntrials = 200");
    let diagnostics = read(&text).unwrap_err();
    let shown = diagnostics.to_string();
    let lines: Vec<&str> = diagnostics
        .iter()
        .map(|diagnostic| diagnostic.source_line.as_str())
        .collect();
    assert_eq!(
        lines,
        [
            "title = \"A study",
            "coefficients = { soil = 0.5, soil2 = 0.25",
            "level = 9",
            "size = ",
            "kind = \"batch-combine\"",
            "trials = 200",
        ],
        "{shown}"
    );
}

#[test]
fn an_unclosed_bracket_is_one_mistake() {
    let text = STUDY.replace("] }\n]\n", "] }\n").replace(
        "probabilities = [0.5, 0.5] },\n]",
        "probabilities = [0.5, 0.5] },",
    );
    assert_ne!(text, STUDY);
    let diagnostics = read(&text).unwrap_err();
    let shown = diagnostics.to_string();
    assert_eq!(diagnostics.iter().next().unwrap().line, 5, "{shown}");
    assert!(shown.contains("never closed"), "{shown}");
}

#[test]
fn a_broken_header_is_one_mistake() {
    let text = STUDY
        .replace("[arms]", "[arms")
        .replace("level = 0.9", "level = 9");
    let diagnostics = read(&text).unwrap_err();
    let lines: Vec<&str> = diagnostics
        .iter()
        .map(|diagnostic| diagnostic.source_line.as_str())
        .collect();
    // What names an arm is not wrong: the arms could not be read.
    assert!(
        lines.contains(&"[arms") && lines.contains(&"level = 9"),
        "{diagnostics}"
    );
    assert!(diagnostics.len() <= 3, "{diagnostics}");
}

#[test]
fn forty_mistakes_of_syntax_are_all_reported() {
    let mut text = STUDY.to_owned();
    let mut lines = Vec::new();
    for index in 0..1000 {
        let _ = writeln!(
            text,
            "[[truth]]\nname = \"truth {index}\" # as in the survey of the year"
        );
        if index % 25 == 0 {
            let wrong = [
                "coefficients = { treated = 0.1",
                "coefficients = { treated 0.1 }",
                "coefficients",
                "coefficients = { treated = \"0.1 }",
            ][index / 25 % 4];
            text += wrong;
            text.push('\n');
            lines.push(text.lines().count());
        }
    }
    let diagnostics = read(&text).unwrap_err();
    let found: Vec<usize> = diagnostics.iter().map(|found| found.line).collect();
    assert_eq!(found, lines, "{diagnostics}");
}

#[test]
fn a_mistake_in_a_member_leaves_the_other_members_readable() {
    let text = STUDY
        .replace(
            "{ name = \"age\", law = \"normal\" }",
            "{ name = \"age\", law = }",
        )
        .replace("count = 3 }", "count = -3 }");
    let diagnostics = read(&text).unwrap_err();
    let lines: Vec<usize> = diagnostics.iter().map(|found| found.line).collect();
    assert_eq!(lines, [6, 7], "{diagnostics}");
}
