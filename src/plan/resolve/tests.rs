//! Every check of meaning, with its message and the line it points to; defaults; roster files.

mod batch_checks;
mod defaults;
mod judgement_checks;
mod many;
mod population_checks;
mod robustness;
mod rosters;
mod truth_checks;

use std::path::Path;

use crate::plan::{Plan, parse};
use crate::scenario::{Diagnostics, Scenario};

/// A study with two arms, a block, a categorical covariate and an adaptive second batch.
const STUDY: &str = r#"format = 1
[study]
title = "A study"
[population]
covariates = [
  { name = "age", law = "normal" },
  { name = "soil", law = "normal", count = 3 },
  { name = "site", law = "categorical", levels = ["north", "south"], probabilities = [0.5, 0.5] },
]
correlation = { kind = "exchangeable", rho = 0.2 }
[arms]
names = ["control", "treated", "doubled"]
[outcome]
family = "normal"
intercept = 1.0
noise = { law = "normal", sd = 1.0 }
coefficients = { soil = 0.5, soil2 = 0.25 }
[[truth]]
name = "null"
[[truth]]
name = "effect"
coefficients = { treated = 0.3, "treated:age" = 0.1 }
[analysis]
regressors = ["intercept", "arms", "covariates"]
level = 0.9
[[batch]]
size = 60
[[batch]]
size = 40
repeat = 2
select = { rule = "top-quantile", fraction = 0.2, score = "predicted-outcome", arm = "treated" }
allocate = { rule = "epsilon-greedy", epsilon = 0.2, floor = 0.1 }
[[estimand]]
name = "treatment"
contrast = { treated = 1.0 }
[[method]]
kind = "least-squares"
[[method]]
kind = "batch-combined"
[verdict]
reference = "least-squares"
[[require]]
measure = "honest"
[precision]
trials = 100
seed = 7
"#;

fn read(text: &str) -> Result<Plan, Diagnostics> {
    parse(text, "study.toml", Path::new("")).map(|(_, plan)| plan)
}

fn plan(text: &str) -> Plan {
    match read(text) {
        Ok(plan) => plan,
        Err(diagnostics) => panic!("{diagnostics}"),
    }
}

fn scenario(text: &str) -> Scenario {
    match Scenario::parse(text, "study.toml", Path::new("")) {
        Ok(scenario) => scenario,
        Err(diagnostics) => panic!("{diagnostics}"),
    }
}

/// The study with one piece of text replaced, which must occur.
fn edited(from: &str, to: &str) -> String {
    assert!(STUDY.contains(from), "no {from}");
    STUDY.replacen(from, to, 1)
}

/// Replaces `from` by `to`, and expects exactly one mistake: its message holds `message`, its help
/// holds `help`, and its line holds `line`.
fn one_mistake(from: &str, to: &str, message: &str, help: &str, line: &str) {
    let text = edited(from, to);
    let diagnostics = read(&text).expect_err(to);
    let shown = diagnostics.to_string();
    assert_eq!(diagnostics.len(), 1, "{to}\n{shown}");
    let found = diagnostics.iter().next().unwrap();
    assert!(found.message.contains(message), "{to}\n{shown}");
    let found_help = found.help.clone().unwrap_or_default();
    assert!(found_help.contains(help), "{to}\n{shown}");
    assert!(found.source_line.contains(line), "{to}\n{shown}");
}
