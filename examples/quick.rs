use std::sync::atomic::AtomicBool;
use windage::plan::*;
use windage::replay::*;
fn main() {
    let a: Vec<String> = std::env::args().collect();
    let n: usize = a[1].parse().unwrap();
    let p: usize = a[2].parse().unwrap();
    let trials: u64 = a[3].parse().unwrap();
    let frac: f64 = a[4].parse().unwrap();
    let columns: Vec<String> = (0..p).map(|i| format!("x{i}")).collect();
    let model = Model {
        terms: (0..p).map(Term::Covariate).collect(),
        names: columns.clone(),
    };
    let b = (1.0 / (p as f64)).sqrt();
    let truth = Truth {
        name: "t".into(),
        reason: None,
        intercept: 0.0,
        arm_effects: vec![],
        slopes: vec![b; p],
        interactions: vec![],
        noise: Noise {
            law: NoiseLaw::Normal,
            sd: 1.0,
            log_sd_slope: None,
        },
        drift: Drift::None,
        delay: 0,
    };
    let half = n / 2;
    let cands = (half as f64 / frac).round() as usize;
    let fit = ScoreFit {
        model: model.clone(),
        penalty: 0.0,
    };
    let batches = vec![
        Batch {
            size: half,
            select: vec![SelectPart {
                size: half,
                candidates: half,
                rule: SelectRule::Random,
            }],
            allocate: None,
        },
        Batch {
            size: half,
            select: vec![SelectPart {
                size: half,
                candidates: cands,
                rule: SelectRule::Quantile {
                    tail: Tail::Top,
                    score: Score::PredictedOutcome { arm: 0, fit },
                },
            }],
            allocate: None,
        },
    ];
    let m = |label: &str, kind| Method {
        label: label.into(),
        kind,
    };
    let plan = Plan {
        title: "".into(),
        aim: "".into(),
        population: Population {
            columns,
            source: Source::Law(LawPopulation {
                marginals: vec![Marginal::Normal { mean: 0.0, sd: 1.0 }; p],
                correlation: CorrelationFactor::Identity,
            }),
        },
        arms: vec![],
        truths: vec![truth],
        batches,
        analysis: model,
        level: 0.95,
        estimands: vec![Estimand {
            name: "aligned".into(),
            contrasts: vec![vec![b; p]],
            null: 0.0,
        }],
        methods: vec![
            m(
                "ls",
                MethodKind::LeastSquares {
                    variance: VarianceForm::Model,
                },
            ),
            m("first", MethodKind::FirstBatch),
            m(
                "bc",
                MethodKind::BatchCombined {
                    weights: BatchWeights::Size,
                },
            ),
            m(
                "w",
                MethodKind::WDecorrelation {
                    penalty: DebiasingPenalty::Fixed(half as f64 / 2.0 / (n as f64).ln()),
                },
            ),
        ],
        precision: Precision {
            trials,
            seed: 7,
            pilot_trials: 100,
        },
        verdicts: Verdicts {
            tolerance: 0.01,
            confidence: 0.95,
            reference: 0,
        },
        requirements: vec![],
    };
    let study = Study::prepare(&plan);
    let flag = AtomicBool::new(false);
    let threads = a.get(5).map_or(1, |t| t.parse().unwrap());
    let t = std::time::Instant::now();
    replay(
        &study,
        &mut ReplayOptions {
            threads,
            interrupt: &flag,
            progress: &mut |_| {},
            sink: None,
            diagnostics: false,
        },
    )
    .unwrap();
    println!(
        "n={n} p={p}: {:.1} us/trial",
        t.elapsed().as_secs_f64() * 1e6 / trials as f64
    );
}
