//! What a scenario means where it says nothing, and how its values reach the plan.

use super::{STUDY, edited, plan, scenario};
use crate::plan::{
    AllocationRule, BatchWeights, Bound, CorrelationFactor, Drift, Marginal, MethodKind, NoiseLaw,
    OutcomeVariance, Score, SelectRule, Source, Term, count_for_share, resolve,
};

const SMALLEST: &str = r#"format = 1
[study]
title = "Smallest"
[population]
covariates = [{ name = "x", law = "normal" }]
[[truth]]
name = "t"
[[batch]]
size = 10
[[estimand]]
name = "e"
contrast = { x = 1 }
[[method]]
kind = "first-batch"
[precision]
trials = 10
seed = 0
"#;

#[test]
#[allow(clippy::float_cmp)] // the values are given or copied, not computed
fn the_smallest_scenario_takes_every_default() {
    let plan = plan(SMALLEST);
    assert_eq!(plan.aim, "");
    assert!(plan.arms.is_empty());
    assert_eq!(plan.level, 0.95);
    assert_eq!(plan.analysis.names, ["intercept", "x"]);
    assert_eq!(plan.precision.pilot_trials, 1000);
    assert_eq!(plan.verdicts.tolerance, 0.01);
    assert_eq!(plan.verdicts.confidence, 0.95);
    assert_eq!(plan.verdicts.reference, 0);
    assert!(plan.requirements.is_empty());
    let truth = &plan.truths[0];
    assert_eq!((truth.intercept, truth.delay), (0.0, 0));
    assert_eq!(truth.slopes, [0.0]);
    assert!(truth.arm_effects.is_empty() && truth.interactions.is_empty());
    assert_eq!(truth.noise.law, NoiseLaw::Normal);
    assert_eq!(truth.noise.sd, 1.0);
    assert_eq!(truth.drift, Drift::None);
    let batch = &plan.batches[0];
    assert!(batch.allocate.is_none());
    assert!(matches!(batch.select[0].rule, SelectRule::Random));
    assert_eq!(batch.select[0].candidates, 10);
    assert_eq!(plan.estimands[0].contrasts, [[0.0, 1.0]]);
    assert_eq!(plan.estimands[0].null, 0.0);
    let Source::Law(law) = &plan.population.source else {
        panic!("a law")
    };
    assert_eq!(law.marginals, [Marginal::Normal { mean: 0.0, sd: 1.0 }]);
    assert!(matches!(law.correlation, CorrelationFactor::Identity));
}

#[test]
fn blocks_levels_arms_and_repeats_unfold() {
    let plan = plan(STUDY);
    let columns = ["age", "soil1", "soil2", "soil3", "site=south"];
    assert_eq!(plan.population.columns, columns);
    assert_eq!(
        plan.analysis.names[..4],
        ["intercept", "treated", "doubled", "age"]
    );
    assert_eq!(plan.batches.len(), 3);
    assert_eq!(plan.units(), 140);
    assert_eq!(plan.batches[2].select[0].candidates, 200);
    let SelectRule::Quantile { score, .. } = &plan.batches[1].select[0].rule else {
        panic!("a quantile rule")
    };
    let Score::PredictedOutcome { arm, fit } = score else {
        panic!("a predicted outcome")
    };
    assert_eq!((*arm, &fit.model), (1, &plan.analysis));
    let first = plan.batches[0].allocate.as_ref().unwrap();
    assert!(matches!(first.rule, AllocationRule::Equal));
    // A member's own value overrides that of its block; a truth adds to the shared values.
    assert_eq!(plan.truths[0].slopes, [0.0, 0.5, 0.25, 0.5, 0.0]);
    assert_eq!(plan.truths[1].slopes, [0.0, 0.5, 0.25, 0.5, 0.0]);
    assert_eq!(plan.truths[1].arm_effects, [0.0, 0.3, 0.0]);
    assert!((plan.truths[1].interactions[1][0] - 0.1).abs() < 1e-15);
    assert!(plan.truths[0].interactions.is_empty());
    assert!((plan.truths[1].intercept - 1.0).abs() < 1e-15);
    assert_eq!(plan.requirements[0].bound, Bound::Honest);
    let labels: Vec<&str> = plan.methods.iter().map(|m| m.label.as_str()).collect();
    assert_eq!(labels, ["least-squares", "batch-combined"]);
}

#[test]
fn truths_override_the_shared_outcome() {
    let effect = "name = \"effect\"\nintercept = -1\nnoise = { law = \"student-t\", df = 5, sd = 2 }\ndrift = { kind = \"step\", from = 2, size = 0.5 }";
    let plan = plan(&edited("name = \"effect\"", effect));
    let truth = &plan.truths[1];
    assert!((truth.intercept + 1.0).abs() < 1e-15);
    assert_eq!(truth.noise.law, NoiseLaw::StudentT { df: 5.0 });
    assert_eq!(truth.drift, Drift::Step { from: 1, size: 0.5 });
    assert_eq!(plan.truths[0].noise.law, NoiseLaw::Normal);
}

#[test]
fn patterns_fill_a_block() {
    let truth = |pattern: &str| {
        let to = format!("coefficients = {{ soil = {pattern} }}");
        let text = edited("coefficients = { soil = 0.5, soil2 = 0.25 }", &to);
        plan(&text).truths[0].slopes[1..4].to_vec()
    };
    assert_eq!(truth("{ value = 0.2, nonzero = 2 }"), [0.2, 0.2, 0.0]);
    assert_eq!(truth("{ value = 0.2 }"), [0.2, 0.2, 0.2]);
    assert_eq!(truth("{ first = 1.0, ratio = 0.5 }"), [1.0, 0.5, 0.25]);
    let direction = truth("{ norm = 2.0 }");
    let norm: f64 = direction.iter().map(|value| value * value).sum();
    assert!((norm.sqrt() - 2.0).abs() < 1e-12);
    assert_eq!(direction, truth("{ norm = 2.0 }"));
    assert_ne!(direction, truth("{ norm = 2.0, seed = 1 }"));
    assert_eq!(direction, truth("{ norm = 2.0, seed = 0 }"));
}

#[test]
fn the_direction_of_a_truth_follows_its_seed() {
    let text = STUDY.replace("soil = 0.5, soil2 = 0.25", "soil = { norm = 1 }");
    let shared = plan(&text);
    assert_eq!(shared.truths[0].slopes, shared.truths[1].slopes);
    let own = plan(&text.replace("name = \"effect\"", "name = \"effect\"\nseed = 4"));
    assert_eq!(own.truths[0].slopes, shared.truths[0].slopes);
    assert_ne!(own.truths[1].slopes, shared.truths[1].slopes);
    let other = plan(&text.replace("seed = 7", "seed = 8"));
    assert_ne!(other.truths[0].slopes, shared.truths[0].slopes);
}

#[test]
fn an_aligned_estimand_is_the_unit_vector_of_the_slopes() {
    let text = edited("contrast = { treated = 1.0 }", "along = \"coefficients\"")
        .replace("name = \"effect\"", "name = \"effect\"\nintercept = 0")
        .replace("soil = 0.5, soil2 = 0.25", "age = 3.0, soil1 = 4.0");
    let text = text.replace(
        "[[truth]]\nname = \"null\"",
        "[[truth]]\nname = \"null\"\ncoefficients = { age = 0, soil1 = 0 }",
    );
    let plan = plan(&text);
    let contrasts = &plan.estimands[0].contrasts;
    // Without any slope, the first covariate of the analysis model.
    assert_eq!(contrasts[0], [0.0, 0.0, 0.0, 1.0, 0.0, 0.0, 0.0, 0.0]);
    assert!((contrasts[1][3] - 0.6).abs() < 1e-15);
    assert!((contrasts[1][4] - 0.8).abs() < 1e-15);
}

#[test]
fn regressors_expand_in_their_order() {
    let text = edited(
        "[\"intercept\", \"arms\", \"covariates\"]",
        "[\"soil\", \"treated\", \"treated:soil\", \"arms:age\"]",
    );
    let plan = plan(&text.replace("size = 60", "size = 80"));
    assert_eq!(
        plan.analysis.names,
        [
            "soil1",
            "soil2",
            "soil3",
            "treated",
            "treated:soil1",
            "treated:soil2",
            "treated:soil3",
            "treated:age",
            "doubled:age"
        ]
    );
    let last = Term::ArmCovariate { arm: 2, column: 0 };
    assert_eq!(plan.analysis.terms[8], last);
}

#[test]
fn options_of_rules_and_methods_reach_the_plan() {
    let text = edited(
        "rule = \"epsilon-greedy\", epsilon = 0.2, floor = 0.1",
        "rule = \"thompson\", known_sd = 2, prior_sd = inf, draw = \"independent\"",
    );
    let plan = plan(&text.replace(
        "kind = \"batch-combined\"",
        "kind = \"batch-combined\"\nweights = [1, 1, 2]",
    ));
    let allocation = plan.batches[1].allocate.as_ref().unwrap();
    let AllocationRule::Thompson {
        variance, prior_sd, ..
    } = &allocation.rule
    else {
        panic!("a Thompson rule")
    };
    assert_eq!(*variance, OutcomeVariance::Known { sd: 2.0 });
    assert!(prior_sd.is_infinite());
    let MethodKind::BatchCombined { weights } = &plan.methods[1].kind else {
        panic!("batch-combined")
    };
    assert_eq!(*weights, BatchWeights::Given(vec![0.25, 0.25, 0.5]));
    assert_eq!(plan.methods[1].label, "batch-combined (given weights)");
}

#[test]
fn a_mixture_fills_the_batch() {
    let right = "select = { rule = \"top-quantile\", fraction = 0.2, score = \"predicted-outcome\", arm = \"treated\" }";
    let mixture = "select = [{ share = 0.26, rule = \"random\" }, { share = 0.74, rule = \"bottom-quantile\", candidates = 100, score = \"covariate\", covariate = \"age\" }]";
    let plan = plan(&edited(right, mixture));
    let parts = &plan.batches[1].select;
    assert_eq!((parts[0].size, parts[0].candidates), (10, 10));
    assert_eq!((parts[1].size, parts[1].candidates), (30, 100));
}

#[test]
fn the_exchangeable_factor_reproduces_its_matrix() {
    let plan = plan(STUDY);
    let Source::Law(law) = &plan.population.source else {
        panic!("a law")
    };
    let CorrelationFactor::Lower(factor) = &law.correlation else {
        panic!("a factor")
    };
    let product = factor * factor.transpose();
    for row in 0..5 {
        for column in 0..5 {
            let expected = if row == column { 1.0 } else { 0.2 };
            assert!((product[(row, column)] - expected).abs() < 1e-14);
        }
    }
}

#[test]
fn a_share_of_units_gives_a_number_of_covariates() {
    let scenario = scenario(STUDY);
    let plan = resolve(&scenario).unwrap();
    let path = "population.covariates.soil.count";
    // 140 units, 8 coefficients of which 3 are soils: 0.2 × 140 = 28, less 5 others.
    assert_eq!(count_for_share(&scenario, &plan, path, 0.2), Some(23));
    assert_eq!(count_for_share(&scenario, &plan, path, 0.001), Some(1));
    assert_eq!(count_for_share(&scenario, &plan, "batch.9.size", 0.2), None);
    let wider = scenario
        .with_value(path, toml::Value::Integer(23))
        .and_then(|scenario| resolve(&scenario))
        .unwrap();
    assert_eq!(wider.analysis.len(), 28);
}
