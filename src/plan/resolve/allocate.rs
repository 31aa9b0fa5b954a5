//! Allocation rules.

use super::marginals::{normalise, positive};
use super::names::{Meaning, Names};
use crate::plan::{Allocation, AllocationRule, Draw, OutcomeVariance};
use crate::scenario::{Fields, number};

/// Share allocated at random by epsilon-greedy where the scenario gives none.
const DEFAULT_EPSILON: f64 = 0.1;
/// Prior sd of every coefficient of contextual Thompson allocation where none is given.
const DEFAULT_COEFFICIENT_SD: f64 = 10.0;

#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Rule {
    Equal,
    Fixed,
    EpsilonGreedy,
    Thompson,
    ThompsonLinear,
}

/// Reads an allocation rule of a study with arms. `None` after a mistake.
pub(super) fn read(fields: &Fields<'_>, names: &Names) -> Option<Allocation> {
    let rules = [
        ("equal", Rule::Equal),
        ("fixed", Rule::Fixed),
        ("epsilon-greedy", Rule::EpsilonGreedy),
        ("thompson", Rule::Thompson),
        ("thompson-linear", Rule::ThompsonLinear),
    ];
    fields.required("rule", "say rule = \"equal\", \"fixed\", \"thompson\", ...");
    let rule = fields.choice("rule", &rules)?;
    let keys: &[&str] = match rule {
        Rule::Equal => &["rule"],
        Rule::Fixed => &["rule", "shares", "draw"],
        Rule::EpsilonGreedy => &["rule", "epsilon", "floor", "draw"],
        Rule::Thompson => &[
            "rule",
            "variance",
            "known_sd",
            "prior_mean",
            "prior_sd",
            "floor",
            "draw",
        ],
        Rule::ThompsonLinear => &[
            "rule",
            "variance",
            "known_sd",
            "prior_sd",
            "covariates",
            "floor",
            "draw",
        ],
    };
    let word = fields.text("rule").unwrap_or_default();
    fields.only(keys, &format!("the rule \"{word}\""));
    let arms = names.arms().len();
    let largest = 1.0 / arms as f64;
    let inside = |floor: f64| (0.0..=largest).contains(&floor);
    let condition = format!(
        "from 0 to {}, since there are {arms} arms",
        super::marginals::rounded(largest)
    );
    let floor = fields.number_where("floor", inside, &condition);
    let draws = [("quota", Draw::Quota), ("independent", Draw::Independent)];
    let draw = fields.choice("draw", &draws).unwrap_or(Draw::Quota);
    let rule = match rule {
        Rule::Equal => AllocationRule::Equal,
        Rule::Fixed => AllocationRule::Fixed {
            shares: shares(fields, names)?,
        },
        Rule::EpsilonGreedy => {
            let inside = |epsilon: f64| (0.0..=1.0).contains(&epsilon);
            AllocationRule::EpsilonGreedy {
                epsilon: fields
                    .number_where("epsilon", inside, "from 0 to 1")
                    .unwrap_or(DEFAULT_EPSILON),
            }
        }
        Rule::Thompson => AllocationRule::Thompson {
            variance: variance(fields)?,
            prior_mean: fields.number("prior_mean").unwrap_or(0.0),
            prior_sd: positive(fields, "prior_sd").unwrap_or(f64::INFINITY),
        },
        Rule::ThompsonLinear => {
            let variance = variance(fields);
            let finite = |sd: f64| sd > 0.0 && sd.is_finite();
            let columns = columns(fields, names);
            AllocationRule::ThompsonLinear {
                variance: variance?,
                prior_sd: fields
                    .number_where("prior_sd", finite, "above 0 and finite")
                    .unwrap_or(DEFAULT_COEFFICIENT_SD),
                columns: columns?,
            }
        }
    };
    Some(Allocation {
        rule,
        floor: floor.unwrap_or(0.0),
        draw,
    })
}

fn shares(fields: &Fields<'_>, names: &Names) -> Option<Vec<f64>> {
    let sink = fields.sink();
    fields.required(
        "shares",
        "give the share of every arm, as shares = { control = 0.5, ... }",
    );
    let table = fields.table("shares")?;
    let before = sink.trouble();
    let mut shares = vec![None; names.arms().len()];
    for entry in table.entries() {
        let arm = names.arm(&entry.key, &entry.key_place, sink);
        let Some(share) = number(&entry.node) else {
            sink.taint();
            continue;
        };
        if !(0.0..=1.0).contains(&share) {
            sink.report(
                &entry.node.place,
                format!("the share of \"{}\" is {share}", entry.key),
                Some("it must be from 0 to 1".to_owned()),
            );
        }
        if let Some(arm) = arm {
            shares[arm] = Some(share);
        }
    }
    for (arm, share) in names.arms().iter().zip(&shares) {
        if share.is_none() && sink.trouble() == before {
            sink.report(
                table.own_place(),
                format!("the arm \"{arm}\" has no share"),
                Some("give the share of every arm".to_owned()),
            );
        }
    }
    let mut shares: Vec<f64> = shares.into_iter().collect::<Option<_>>()?;
    if sink.trouble() != before {
        return None;
    }
    normalise(&mut shares, "the shares", "shares", fields)?;
    Some(shares)
}

fn variance(fields: &Fields<'_>) -> Option<OutcomeVariance> {
    let known = fields.has("known_sd");
    if fields.has("variance") {
        let chosen = fields.choice("variance", &[("estimated", false), ("known", true)])?;
        if chosen && !known {
            fields.required("known_sd", "give the standard deviation that is known");
            return None;
        }
        if !chosen && known {
            fields.report(
                "known_sd",
                "a known standard deviation beside variance = \"estimated\"",
                "use variance = \"known\", or take `known_sd` out",
            );
            return None;
        }
    }
    if !known {
        return Some(OutcomeVariance::Estimated);
    }
    let finite = |sd: f64| sd > 0.0 && sd.is_finite();
    Some(OutcomeVariance::Known {
        sd: fields.number_where("known_sd", finite, "above 0")?,
    })
}

/// Columns of the arm regressions: all, unless listed; a block stands for its members.
fn columns(fields: &Fields<'_>, names: &Names) -> Option<Vec<usize>> {
    if !fields.has("covariates") {
        return Some((0..names.columns().len()).collect());
    }
    let sink = fields.sink();
    let before = sink.trouble();
    let mut columns = Vec::new();
    for node in fields.list("covariates")? {
        let Some(name) = node.as_text() else {
            sink.taint();
            continue;
        };
        match names.meaning(name) {
            Some(Meaning::Column(_) | Meaning::Group(_)) => {
                for column in names.columns_of(name).unwrap_or(0..0) {
                    if columns.contains(&column) {
                        sink.report(
                            &node.place,
                            format!("\"{}\" is listed twice", names.columns()[column]),
                            Some("every covariate may be listed once".to_owned()),
                        );
                        break;
                    }
                    columns.push(column);
                }
            }
            _ => names.unknown("covariate", name, &node.place, sink),
        }
    }
    (sink.trouble() == before).then_some(columns)
}
