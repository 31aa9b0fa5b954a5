//! Selection rules.

use super::marginals::positive;
use super::names::Names;
use super::regressors;
use crate::plan::{Model, Score, ScoreFit, SelectPart, SelectRule, Tail, Term};
use crate::scenario::{Fields, Place};

/// Most candidates of one part of a batch.
const MOST_CANDIDATES: usize = 100_000_000;
/// Ridge penalty where a rule gives none.
const DEFAULT_PENALTY: f64 = 1.0;

/// A part of a selection whose candidates may still depend on what a roster has left.
#[derive(Debug, Clone)]
pub(super) struct Draft {
    size: usize,
    candidates: Candidates,
    rule: SelectRule,
    /// Place of the rule.
    pub(super) place: Place,
    /// Whether the working model is the analysis model.
    pub(super) default_regressors: bool,
}

impl Draft {
    /// Random enrolment of `size` units.
    pub(super) fn random(size: usize, place: &Place) -> Self {
        Self {
            size,
            candidates: Candidates::Stated(size),
            rule: SelectRule::Random,
            place: place.clone(),
            default_regressors: false,
        }
    }

    /// Whether the rule screens all remaining units of a roster.
    pub(super) fn screens_all(&self) -> bool {
        self.candidates == Candidates::Remaining
    }
}

/// Number of candidates that a part screens.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Candidates {
    /// As many as stated.
    Stated(usize),
    /// All that remain in the roster.
    Remaining,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Rule {
    Random,
    Quantile(Tail),
    AboveThreshold,
    Tilted,
    Uncertain,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum ScoreKind {
    Outcome,
    Contrast,
    Covariate,
}

/// Reads one rule for a part of `size` units, if that is known. `None` after a mistake.
pub(super) fn read(fields: &Fields<'_>, names: &Names, size: Option<usize>) -> Option<Draft> {
    let rules = [
        ("random", Rule::Random),
        ("top-quantile", Rule::Quantile(Tail::Top)),
        ("bottom-quantile", Rule::Quantile(Tail::Bottom)),
        ("above-threshold", Rule::AboveThreshold),
        ("tilted", Rule::Tilted),
        ("uncertain", Rule::Uncertain),
    ];
    let before = fields.sink().trouble();
    fields.required("rule", "say rule = \"random\", \"top-quantile\", ...");
    let rule = fields.choice("rule", &rules)?;
    let word = fields.text("rule").unwrap_or_default();
    let score_kind = score_kind(fields, rule, word);
    check_keys(fields, rule, score_kind, word);
    let candidates = candidates(fields, rule, size);
    let mut default_regressors = false;
    let rule = match rule {
        Rule::Random => SelectRule::Random,
        Rule::Uncertain => {
            let fit = fit(fields, names, &mut default_regressors);
            SelectRule::Uncertain { fit: fit? }
        }
        Rule::Quantile(tail) => SelectRule::Quantile {
            tail,
            score: score(fields, names, score_kind, &mut default_regressors)?,
        },
        Rule::AboveThreshold => {
            fields.required("threshold", "give the score above which units are enrolled");
            let score = score(fields, names, score_kind, &mut default_regressors);
            SelectRule::AboveThreshold {
                threshold: fields.number("threshold")?,
                score: score?,
            }
        }
        Rule::Tilted => {
            fields.required(
                "strength",
                "give the weight of the score in the logarithm of the inclusion probability",
            );
            let score = score(fields, names, score_kind, &mut default_regressors);
            SelectRule::Tilted {
                strength: fields.number("strength")?,
                score: score?,
            }
        }
    };
    if fields.sink().trouble() != before {
        return None;
    }
    Some(Draft {
        size: size?,
        candidates: candidates?,
        rule,
        place: fields.place("rule").clone(),
        default_regressors,
    })
}

fn score_kind(fields: &Fields<'_>, rule: Rule, word: &str) -> Option<ScoreKind> {
    if matches!(rule, Rule::Random | Rule::Uncertain) {
        return None;
    }
    let help = format!(
        "say what {word} looks at: score = \"predicted-outcome\", \"predicted-contrast\" or \"covariate\""
    );
    fields.required("score", &help);
    fields.choice(
        "score",
        &[
            ("predicted-outcome", ScoreKind::Outcome),
            ("predicted-contrast", ScoreKind::Contrast),
            ("covariate", ScoreKind::Covariate),
        ],
    )
}

fn check_keys(fields: &Fields<'_>, rule: Rule, score: Option<ScoreKind>, word: &str) {
    let mut keys = vec!["rule", "share"];
    if rule == Rule::Random {
        fields.only(&keys, "the rule \"random\"");
        return;
    }
    keys.extend(["fraction", "candidates"]);
    let mut owner = format!("the rule \"{word}\"");
    match rule {
        Rule::AboveThreshold => keys.push("threshold"),
        Rule::Tilted => keys.push("strength"),
        _ => {}
    }
    let fit = ["fit", "penalty", "regressors"];
    if rule == Rule::Uncertain {
        keys.extend(fit);
    } else {
        keys.push("score");
        match score {
            Some(ScoreKind::Covariate) => keys.push("covariate"),
            Some(ScoreKind::Outcome | ScoreKind::Contrast) => {
                keys.push("arm");
                keys.extend(fit);
            }
            // An unreadable score is no ground to refuse keys that one of them takes.
            None => keys.extend(["covariate", "arm", "fit", "penalty", "regressors"]),
        }
        if score.is_some() {
            let kind = fields.text("score").unwrap_or_default();
            owner = format!("{owner} with the score \"{kind}\"");
        }
    }
    fields.only(&keys, &owner);
}

/// Number of candidates; `None` after a mistake.
#[allow(clippy::cast_possible_truncation, clippy::cast_sign_loss)] // bounded before the cast
fn candidates(fields: &Fields<'_>, rule: Rule, size: Option<usize>) -> Option<Candidates> {
    if rule == Rule::Random {
        return Some(Candidates::Stated(size?));
    }
    if fields.has("fraction") && fields.has("candidates") {
        fields.report(
            "candidates",
            "both `fraction` and `candidates` are given",
            "give one of them: candidates = size / fraction",
        );
        return None;
    }
    if fields.has("fraction") {
        let inside = |fraction: f64| fraction > 0.0 && fraction <= 1.0;
        let condition = "above 0 and at most 1; to enrol at random use rule = \"random\"";
        let fraction = fields.number_where("fraction", inside, condition)?;
        let size = size?;
        let candidates = (size as f64 / fraction).round();
        if candidates > MOST_CANDIDATES as f64 {
            fields.report(
                "fraction",
                format!("{size} units at the fraction {fraction} need {candidates} candidates"),
                format!("at most {MOST_CANDIDATES} can be screened; make the fraction larger"),
            );
            return None;
        }
        return Some(Candidates::Stated((candidates as usize).max(size)));
    }
    if fields.has("candidates") {
        let count = fields.count("candidates", 1, MOST_CANDIDATES)?;
        if let Some(size) = size
            && count < size
        {
            fields.report(
                "candidates",
                format!("{count} candidates for {size} units"),
                "there must be at least as many candidates as units to enrol",
            );
            return None;
        }
        return Some(Candidates::Stated(count));
    }
    Some(Candidates::Remaining)
}

fn fit(fields: &Fields<'_>, names: &Names, default_regressors: &mut bool) -> Option<ScoreFit> {
    let ridge = if fields.has("fit") {
        fields.choice("fit", &[("least-squares", false), ("ridge", true)])?
    } else {
        false
    };
    let penalty = if ridge {
        if fields.has("penalty") {
            positive(fields, "penalty")?
        } else {
            DEFAULT_PENALTY
        }
    } else {
        if fields.has("penalty") {
            fields.report(
                "penalty",
                "a penalty without ridge regression",
                "add fit = \"ridge\", or take the penalty out",
            );
        }
        0.0
    };
    let model = if fields.has("regressors") {
        regressors::read(fields, names)
    } else {
        *default_regressors = true;
        Model {
            terms: Vec::new(),
            names: Vec::new(),
        }
    };
    Some(ScoreFit { model, penalty })
}

fn score(
    fields: &Fields<'_>,
    names: &Names,
    kind: Option<ScoreKind>,
    default_regressors: &mut bool,
) -> Option<Score> {
    let sink = fields.sink();
    let kind = kind?;
    if kind == ScoreKind::Covariate {
        fields.required("covariate", "name the covariate that units are ranked by");
        let name = fields.text("covariate")?;
        let column = names.column(name, fields.place("covariate"), sink)?;
        return Some(Score::Covariate { column });
    }
    let fit = fit(fields, names, default_regressors);
    let arm = fields
        .text("arm")
        .map(|name| names.arm(name, fields.place("arm"), sink));
    if kind == ScoreKind::Outcome {
        // Without an arm named, units are ranked as if all were in the reference arm.
        let arm = arm.unwrap_or(Some(0))?;
        return Some(Score::PredictedOutcome { arm, fit: fit? });
    }
    if !names.has_arms() {
        fields.report(
            "score",
            "a predicted contrast in a study without arms",
            "use score = \"predicted-outcome\", or add [arms]",
        );
        return None;
    }
    let arm = match arm {
        Some(arm) => arm?,
        None if names.arms().len() == 2 => 1,
        None => {
            fields.required(
                "arm",
                "name the arm that is compared with the reference arm",
            );
            return None;
        }
    };
    if arm == 0 {
        fields.report(
            "arm",
            "the reference arm is compared with itself",
            "name another arm",
        );
        return None;
    }
    Some(Score::PredictedContrast { arm, fit: fit? })
}

/// Whether a model lets the score differ between units.
pub(super) fn ranks_units(score: &Score) -> bool {
    let varies = |model: &Model, wanted: usize, own: bool| {
        model.terms.iter().any(|term| match term {
            Term::Covariate(_) => own,
            Term::ArmCovariate { arm, .. } => *arm == wanted,
            Term::Intercept | Term::Arm(_) => false,
        })
    };
    match score {
        Score::PredictedOutcome { arm, fit } => varies(&fit.model, *arm, true),
        Score::PredictedContrast { arm, fit } => varies(&fit.model, *arm, false),
        Score::Covariate { .. } => true,
    }
}

/// The parts with their candidates; a part without a stated number takes what a roster has left
/// after the others, in equal shares.
pub(super) fn fill_candidates(drafts: &[Draft], remaining: usize) -> Vec<SelectPart> {
    let stated: usize = drafts
        .iter()
        .map(|draft| match draft.candidates {
            Candidates::Stated(count) => count,
            Candidates::Remaining => 0,
        })
        .sum();
    let open = drafts.iter().filter(|draft| draft.screens_all()).count();
    let left = remaining.saturating_sub(stated);
    let share = left.checked_div(open).unwrap_or(0);
    drafts
        .iter()
        .map(|draft| SelectPart {
            size: draft.size,
            // A roster that is too small for the batch is reported with its sizes.
            candidates: match draft.candidates {
                Candidates::Stated(count) => count,
                Candidates::Remaining => share.max(draft.size),
            },
            rule: draft.rule.clone(),
        })
        .collect()
}
