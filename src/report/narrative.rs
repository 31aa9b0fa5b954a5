//! A plan in plain words, batch by batch.

use super::number::short;
use crate::plan::{
    Allocation, AllocationRule, Batch, BatchWeights, CorrelationFactor, DebiasingError,
    DebiasingPenalty, DebiasingSteps, Draw, Drift, Estimand, Marginal, Method, MethodKind, Noise,
    NoiseLaw, OutcomeVariance, Plan, Score, ScoreFit, SelectPart, SelectRule, Source, Tail, Truth,
    VarianceForm,
};
use std::fmt::Write as _;

/// Cautions that stand under every description and result.
pub const CAUTIONS: &[&str] = &[
    "windage is a planning aid. It shows how methods behave in the truths that were put in; it \
     cannot show that those truths hold.",
    "A verdict is a statement about simulated trials at a stated Monte Carlo error, not approval \
     of a design.",
    "Decisions about people (enrolment, dose, stopping) are for the responsible investigators, \
     the trial statistician, the independent monitoring committee, the ethics committee and the \
     regulator, under local law and licensed practice.",
];

/// Describes a plan: population, batches, truths, estimands, methods, cautions.
#[must_use]
pub fn narrative(plan: &Plan, width: usize) -> String {
    let mut text = Text {
        out: String::new(),
        width,
    };
    text.heading(&plan.title);
    if !plan.aim.is_empty() {
        text.paragraph("", &plan.aim);
    }
    text.heading("Population");
    text.paragraph("", &population(plan));
    text.heading("Batches");
    for (index, batch) in plan.batches.iter().enumerate() {
        text.paragraph(
            &format!("{}. ", index + 1),
            &describe_batch(plan, index, batch),
        );
    }
    let total = plan.units();
    text.paragraph(
        "",
        &format!(
            "In all {} units in {}.",
            total,
            count(plan.batches.len(), "batch")
        ),
    );
    text.heading("Truths");
    for truth in &plan.truths {
        text.paragraph("- ", &describe_truth(plan, truth));
    }
    text.heading("Analysis");
    text.paragraph("", &analysis(plan));
    for estimand in &plan.estimands {
        text.paragraph("- ", &describe_estimand(plan, estimand));
    }
    text.heading("Methods");
    for method in &plan.methods {
        text.paragraph(
            "- ",
            &format!("{}: {}", method.label, describe_method(method)),
        );
    }
    text.heading("Simulation");
    text.paragraph("", &simulation(plan));
    text.heading("Cautions");
    for caution in CAUTIONS {
        text.paragraph("- ", caution);
    }
    text.out
}

/// Text with wrapped paragraphs.
struct Text {
    out: String,
    width: usize,
}

impl Text {
    fn heading(&mut self, words: &str) {
        if !self.out.is_empty() {
            self.out.push('\n');
        }
        self.out.push_str(words);
        self.out.push('\n');
    }

    /// A paragraph whose later lines are indented to where the first line's text begins.
    fn paragraph(&mut self, bullet: &str, words: &str) {
        let indent = 2 + bullet.chars().count();
        let _ = write!(self.out, "  {bullet}");
        let mut column = indent;
        for (index, word) in words.split_whitespace().enumerate() {
            let length = word.chars().count();
            if index > 0 && column + 1 + length > self.width {
                let _ = write!(self.out, "\n{:indent$}", "");
                column = indent;
            } else if index > 0 {
                self.out.push(' ');
                column += 1;
            }
            self.out.push_str(word);
            column += length;
        }
        self.out.push('\n');
    }
}

fn count(number: usize, noun: &str) -> String {
    let plural = if number == 1 {
        ""
    } else if noun.ends_with("ch") {
        "es"
    } else {
        "s"
    };
    format!("{number} {noun}{plural}")
}

fn list(items: &[String]) -> String {
    /// More than this many names are cut short.
    const SHOWN: usize = 8;
    if items.len() > SHOWN {
        let head = items[..SHOWN - 2].join(", ");
        return format!(
            "{head}, ... {} ({} in all)",
            items[items.len() - 1],
            items.len()
        );
    }
    items.join(", ")
}

fn population(plan: &Plan) -> String {
    let columns = list(&plan.population.columns);
    match &plan.population.source {
        Source::Roster(roster) => {
            let outcome = if roster.outcomes.is_some() {
                " Their recorded outcomes are what the trial sees; the truth is the least-squares \
                 fit on the whole roster."
            } else {
                ""
            };
            format!(
                "{} from a roster, drawn without replacement; covariates {columns}.{outcome}",
                count(roster.len(), "unit")
            )
        }
        Source::Law(law) => {
            let mut laws: Vec<String> = Vec::new();
            for marginal in &law.marginals {
                let words = describe_marginal(marginal);
                if !laws.contains(&words) {
                    laws.push(words);
                }
            }
            let correlation = match &law.correlation {
                CorrelationFactor::Identity => "independent of each other".to_owned(),
                CorrelationFactor::Autoregressive(rho) => {
                    format!(
                        "with latent correlation {rho} between neighbours, falling as its powers"
                    )
                }
                CorrelationFactor::Lower(_) => "with the latent correlation given".to_owned(),
            };
            format!(
                "{} ({columns}), {correlation}. Laws: {}.",
                count(plan.population.columns.len(), "covariate column"),
                laws.join("; ")
            )
        }
    }
}

fn describe_marginal(marginal: &Marginal) -> String {
    match marginal {
        Marginal::Normal { mean, sd } => format!("normal (mean {mean}, sd {sd})"),
        Marginal::Uniform { low, high } => format!("uniform on {low} to {high}"),
        Marginal::LogNormal { log_mean, log_sd } => {
            format!("log-normal (mean {log_mean} and sd {log_sd} of the logarithm)")
        }
        Marginal::Gamma { shape, scale } => format!("gamma (shape {shape}, scale {scale})"),
        Marginal::StudentT {
            df,
            location,
            scale,
        } => {
            format!("Student t ({df} degrees of freedom, location {location}, scale {scale})")
        }
        Marginal::Bernoulli { probability } => format!("Bernoulli ({probability})"),
        Marginal::Categorical { probabilities } => {
            format!("categorical with {}", count(probabilities.len(), "level"))
        }
        Marginal::Poisson { mean } => format!("Poisson (mean {mean})"),
    }
}

fn describe_batch(plan: &Plan, index: usize, batch: &Batch) -> String {
    let looks_back = batch.select.iter().any(|part| part.rule.fit().is_some())
        || batch
            .allocate
            .as_ref()
            .is_some_and(|allocation| allocation.rule.looks_back());
    let mut words = if looks_back {
        describe_look(plan, index)
    } else {
        "No outcome is looked at.".to_owned()
    };
    for part in &batch.select {
        words.push(' ');
        words.push_str(&describe_part(plan, part));
    }
    if let Some(allocation) = &batch.allocate {
        words.push(' ');
        words.push_str(&describe_allocation(plan, allocation));
    }
    words
}

/// Which outcomes a rule for the batch sees, and under which truths it sees fewer.
fn describe_look(plan: &Plan, index: usize) -> String {
    let seen = |delay: usize| match index.saturating_sub(delay) {
        0 => "no batch".to_owned(),
        1 => "batch 1".to_owned(),
        last => format!("batches 1 to {last}"),
    };
    let delay = plan
        .truths
        .iter()
        .map(|truth| truth.delay)
        .min()
        .unwrap_or(0);
    let late: Vec<String> = plan
        .truths
        .iter()
        .filter(|truth| truth.delay > delay)
        .map(|truth| format!("of {} under {}", seen(truth.delay), truth.name))
        .collect();
    let exceptions = if late.is_empty() {
        String::new()
    } else {
        format!(" ({})", late.join(", "))
    };
    format!("The outcomes of {} are looked at{exceptions}.", seen(delay))
}

fn describe_part(plan: &Plan, part: &SelectPart) -> String {
    let enrolled = count(part.size, "unit");
    let candidates = count(part.candidates, "candidate");
    match &part.rule {
        SelectRule::Random => format!("{enrolled} are enrolled as they come."),
        SelectRule::Quantile { tail, score } => {
            let end = if *tail == Tail::Top {
                "highest"
            } else {
                "lowest"
            };
            format!(
                "{candidates} are screened and the {} with the {end} {} are enrolled.",
                part.size,
                describe_score(plan, score)
            )
        }
        SelectRule::AboveThreshold { threshold, score } => format!(
            "Up to {candidates} are screened, and the first {} whose {} exceeds {threshold} are \
             enrolled; fewer if too few pass.",
            part.size,
            describe_score(plan, score)
        ),
        SelectRule::Tilted { strength, score } => format!(
            "{candidates} are screened and {enrolled} drawn with probability proportional to \
             exp({strength} × {}); the probabilities are logged.",
            describe_score(plan, score)
        ),
        SelectRule::Uncertain { fit } => format!(
            "{candidates} are screened and the {} whose prediction is least certain ({}) are \
             enrolled.",
            part.size,
            describe_fit(fit)
        ),
    }
}

fn describe_fit(fit: &ScoreFit) -> String {
    let how = if fit.penalty > 0.0 {
        format!("ridge regression with penalty {}", fit.penalty)
    } else {
        "least squares".to_owned()
    };
    format!("{how} with {}", count(fit.model.len(), "coefficient"))
}

fn describe_score(plan: &Plan, score: &Score) -> String {
    match score {
        Score::PredictedOutcome { arm, fit } if plan.arms.is_empty() || *arm == 0 => {
            format!("predicted outcome ({})", describe_fit(fit))
        }
        Score::PredictedOutcome { arm, fit } => {
            format!(
                "predicted outcome in arm {} ({})",
                plan.arms[*arm],
                describe_fit(fit)
            )
        }
        Score::PredictedContrast { arm, fit } => format!(
            "predicted difference between {} and {} ({})",
            plan.arms[*arm],
            plan.arms[0],
            describe_fit(fit)
        ),
        Score::Covariate { column } => format!("value of {}", plan.population.columns[*column]),
    }
}

fn describe_variance(variance: OutcomeVariance) -> String {
    match variance {
        OutcomeVariance::Known { sd } => format!("outcome sd taken as {sd}"),
        OutcomeVariance::Estimated => "outcome variance estimated".to_owned(),
    }
}

fn describe_allocation(plan: &Plan, allocation: &Allocation) -> String {
    let rule = match &allocation.rule {
        AllocationRule::Equal => {
            return format!(
                "Arms ({}) are allocated equally, in permuted blocks.",
                plan.arms.join(", ")
            );
        }
        AllocationRule::Fixed { shares } => {
            let shares: Vec<String> = plan
                .arms
                .iter()
                .zip(shares)
                .map(|(arm, share)| format!("{arm} {share}"))
                .collect();
            format!("in fixed shares ({})", shares.join(", "))
        }
        AllocationRule::EpsilonGreedy { epsilon } => format!(
            "epsilon-greedily: a share of {epsilon} at random, the rest to the arm with the \
             highest mean so far"
        ),
        AllocationRule::Thompson { variance, .. } => format!(
            "with the posterior probability that the arm is best ({})",
            describe_variance(*variance)
        ),
        AllocationRule::ThompsonLinear {
            variance, columns, ..
        } => format!(
            "with the posterior probability that the arm is best for the unit's own covariates \
             (regression on {}, {})",
            count(columns.len(), "covariate column"),
            describe_variance(*variance)
        ),
    };
    let floor = if allocation.floor > 0.0 {
        format!(", no arm below {}", allocation.floor)
    } else {
        String::new()
    };
    let draw = match allocation.draw {
        Draw::Quota => "drawn as randomised quotas",
        Draw::Independent => "drawn independently",
    };
    format!("Arms are allocated {rule}{floor}, {draw}; the probabilities are logged.")
}

fn describe_truth(plan: &Plan, truth: &Truth) -> String {
    let mut words = format!("{}:", truth.name);
    if let Source::Roster(roster) = &plan.population.source
        && roster.outcomes.is_some()
    {
        words.push_str(" what the roster records.");
        return words;
    }
    if let Some(reason) = &truth.reason {
        let _ = write!(words, " ({reason})");
    }
    let mut named: Vec<String> = Vec::new();
    if truth.intercept != 0.0 {
        named.push(format!("intercept {}", truth.intercept));
    }
    for (arm, effect) in plan.arms.iter().zip(&truth.arm_effects).skip(1) {
        named.push(format!("{arm} {effect}"));
    }
    let nonzero = truth.slopes.iter().filter(|slope| **slope != 0.0).count();
    for (column, slope) in plan.population.columns.iter().zip(&truth.slopes) {
        // A long list of slopes says less than their number and size.
        if nonzero <= 6 && *slope != 0.0 {
            named.push(format!("{column} {}", short(*slope)));
        }
    }
    if nonzero > 6 {
        let norm = truth
            .slopes
            .iter()
            .map(|slope| slope * slope)
            .sum::<f64>()
            .sqrt();
        named.push(format!("{nonzero} non-zero slopes of norm {}", short(norm)));
    }
    let interactions = truth
        .interactions
        .iter()
        .flatten()
        .filter(|slope| **slope != 0.0)
        .count();
    if interactions > 0 {
        named.push(count(interactions, "non-zero interaction"));
    }
    if named.is_empty() {
        words.push_str(" all coefficients zero");
    } else {
        let _ = write!(words, " {}", named.join(", "));
    }
    let _ = write!(words, "; noise {}", describe_noise(plan, &truth.noise));
    match truth.drift {
        Drift::None => {}
        Drift::Linear { total } => {
            let _ = write!(words, "; drift of {total} from the first batch to the last");
        }
        Drift::Step { from, size } => {
            let _ = write!(words, "; step of {size} from batch {}", from + 1);
        }
    }
    if truth.delay > 0 {
        let _ = write!(words, "; outcomes late by {}", count(truth.delay, "batch"));
    }
    words.push('.');
    words
}

fn describe_noise(plan: &Plan, noise: &Noise) -> String {
    let law = match noise.law {
        NoiseLaw::Normal => "normal".to_owned(),
        NoiseLaw::StudentT { df } => format!("Student t ({df} degrees of freedom)"),
        NoiseLaw::Laplace => "Laplace".to_owned(),
        NoiseLaw::CentredLogNormal { log_sd } => format!("centred log-normal (log sd {log_sd})"),
    };
    let varying = match noise.log_sd_slope {
        None => String::new(),
        Some((column, slope)) => {
            format!(" × exp({slope} × {})", plan.population.columns[column])
        }
    };
    format!("{law} with sd {}{varying}", noise.sd)
}

fn analysis(plan: &Plan) -> String {
    let units = plan.units();
    format!(
        "{} ({}) for {}: p/n = {:.3}. Intervals at level {}.",
        count(plan.analysis.len(), "coefficient"),
        list(&plan.analysis.names),
        count(units, "unit"),
        share(plan.analysis.len(), units),
        plan.level
    )
}
fn share(part: usize, whole: usize) -> f64 {
    part as f64 / whole as f64
}

fn describe_estimand(plan: &Plan, estimand: &Estimand) -> String {
    let first = &estimand.contrasts[0];
    let fixed = estimand.contrasts.iter().all(|contrast| contrast == first);
    let contrast = if fixed {
        let terms: Vec<String> = first
            .iter()
            .zip(&plan.analysis.names)
            .filter(|(weight, _)| **weight != 0.0)
            .map(|(weight, name)| format!("{} × {name}", short(*weight)))
            .collect();
        list(&terms)
    } else {
        "the coefficients along their own direction in each truth".to_owned()
    };
    format!(
        "{}: {contrast}; null value {}.",
        estimand.name, estimand.null
    )
}

fn describe_method(method: &Method) -> String {
    match &method.kind {
        MethodKind::LeastSquares { variance } => {
            let form = match variance {
                VarianceForm::Model => "model variance",
                VarianceForm::Hc0 => "HC0 variance",
                VarianceForm::Hc1 => "HC1 variance",
                VarianceForm::Hc2 => "HC2 variance",
                VarianceForm::Hc3 => "HC3 variance",
            };
            format!("least squares on all units, {form}, t interval")
        }
        MethodKind::Ridge { penalty } => {
            format!("ridge regression with penalty {penalty} and the usual interval (biased)")
        }
        MethodKind::FirstBatch => "least squares on the first batch alone".to_owned(),
        MethodKind::LastBatch => "least squares on the last batch alone".to_owned(),
        MethodKind::BatchCombined { weights } => {
            let weights = match weights {
                BatchWeights::Size => "by planned size".to_owned(),
                BatchWeights::Equal => "equal".to_owned(),
                BatchWeights::Given(values) => format!("{values:?}"),
                BatchWeights::Planned => "from a pilot replay".to_owned(),
            };
            format!("batchwise-studentised least squares, weights {weights}, exact t interval")
        }
        MethodKind::InverseVariance => {
            "batch estimates weighted by their inverse variances".to_owned()
        }
        MethodKind::WDecorrelation {
            penalty,
            steps,
            error,
        } => {
            let tuning = match penalty {
                DebiasingPenalty::Replayed => "from a pilot replay".to_owned(),
                DebiasingPenalty::Fixed(value) => value.to_string(),
            };
            let steps = match steps {
                DebiasingSteps::Units => "unit by unit",
                DebiasingSteps::Batches => "batch by batch",
            };
            let error = match error {
                DebiasingError::Weights => "",
                DebiasingError::RemainderAware => ", remainder-aware standard error",
            };
            format!("online debiasing {steps}, tuning constant {tuning}{error}")
        }
        MethodKind::AnticipatedDecorrelation => {
            "online debiasing that anticipates the information of later batches".to_owned()
        }
        MethodKind::PredictablePivot => {
            "predictable weights closed on the contrast, exact t interval".to_owned()
        }
        MethodKind::SelfNormalised { penalty, bound } => format!(
            "any-time valid ellipsoid, regularisation {penalty}, coefficients of norm at most \
             {bound}"
        ),
    }
}

fn simulation(plan: &Plan) -> String {
    let trials = plan.precision.trials;
    let error = 100.0 * (plan.level * (1.0 - plan.level) / trials as f64).sqrt();
    format!(
        "{trials} trials for each of {}, seed {}. The Monte Carlo standard error of a coverage \
         near {:.0} % is then {error:.2} points. A method is honest if its coverage is shown to \
         be at least {:.1} % in every truth.",
        count(plan.truths.len(), "truth"),
        plan.precision.seed,
        100.0 * plan.level,
        100.0 * (plan.level - plan.verdicts.tolerance)
    )
}
