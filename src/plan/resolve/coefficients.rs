//! Coefficients of a truth: single values and patterns over blocks.

use std::ops::Range;

use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use sha2::{Digest, Sha256};

use super::names::{Meaning, Names};
use crate::plan::Truth;
use crate::scenario::{Fields, Node, number};
use crate::streams::fill_standard_normal;

/// One entry of `coefficients`.
#[derive(Debug, Clone)]
pub(super) struct Coefficient<'s> {
    /// Name as written.
    pub(super) name: &'s str,
    target: Target,
    amount: Amount,
}

/// What a coefficient belongs to.
#[derive(Debug, Clone)]
enum Target {
    Intercept,
    Arm(usize),
    /// Slopes, or interactions with an arm.
    Columns {
        arm: Option<usize>,
        columns: Range<usize>,
    },
}

/// Values over the columns of a target.
#[derive(Debug, Clone, Copy)]
enum Amount {
    /// The same for all.
    Constant(f64),
    /// `value` for the first `nonzero`, then zero.
    Leading { value: f64, nonzero: usize },
    /// `first × ratio^j`.
    Geometric { first: f64, ratio: f64 },
    /// A random direction of the given Euclidean norm.
    Direction { norm: f64, seed: Option<u64> },
}

impl Coefficient<'_> {
    /// The value of the intercept, if this is it.
    pub(super) fn intercept(&self) -> Option<f64> {
        match (&self.target, self.amount) {
            (Target::Intercept, Amount::Constant(value)) => Some(value),
            _ => None,
        }
    }
}

/// Reads a table of coefficients; what cannot be read is reported and left out.
pub(super) fn read<'s>(fields: &Fields<'s>, names: &Names) -> Vec<Coefficient<'s>> {
    let mut list = Vec::new();
    for entry in fields.entries() {
        let target = target(&entry.key, names, fields, &entry.key_place);
        let width = match &target {
            Some(Target::Columns { columns, .. }) => Some(columns.len()),
            Some(_) => Some(1),
            None => None,
        };
        let amount = amount(&entry.node, &entry.key, width, fields);
        if let (Some(target), Some(amount)) = (target, amount) {
            list.push(Coefficient {
                name: &entry.key,
                target,
                amount,
            });
        }
    }
    list
}

fn target(
    name: &str,
    names: &Names,
    fields: &Fields<'_>,
    place: &crate::scenario::Place,
) -> Option<Target> {
    let sink = fields.sink();
    let found = if let Some((arm, columns)) = name.split_once(':') {
        match (names.meaning(arm), names.columns_of(columns)) {
            (Some(Meaning::Arm(arm)), Some(columns)) => {
                names.not_reference(*arm, name, place, sink)?;
                Some(Target::Columns {
                    arm: Some(*arm),
                    columns,
                })
            }
            _ => None,
        }
    } else {
        match names.meaning(name) {
            Some(Meaning::Intercept) => Some(Target::Intercept),
            Some(Meaning::Arm(arm)) => {
                names.not_reference(*arm, name, place, sink)?;
                Some(Target::Arm(*arm))
            }
            _ => names
                .columns_of(name)
                .map(|columns| Target::Columns { arm: None, columns }),
        }
    };
    if found.is_none() {
        names.unknown("coefficient", name, place, sink);
    }
    found
}

/// Reads the value or pattern of a coefficient over `width` columns, if their number is known.
fn amount(node: &Node, name: &str, width: Option<usize>, fields: &Fields<'_>) -> Option<Amount> {
    if let Some(value) = number(node) {
        return Some(Amount::Constant(value));
    }
    let table = Fields::of(node, format!("`{name}`"), fields.sink())?;
    let forms = ["value", "first", "norm"];
    let given: Vec<&str> = forms.into_iter().filter(|form| table.has(form)).collect();
    let [form] = given.as_slice() else {
        fields.sink().report_missing(
            &node.place,
            "value",
            format!("`{name}` gives {} patterns", given.len()),
            Some("give one of: value and nonzero, first and ratio, norm and seed".to_owned()),
        );
        return None;
    };
    match *form {
        "value" => {
            table.only(&["value", "nonzero"], "a constant pattern");
            let nonzero = table.count("nonzero", 0, usize::MAX);
            if let (Some(nonzero), Some(width)) = (nonzero, width)
                && nonzero > width
            {
                table.report(
                    "nonzero",
                    format!("`nonzero` is {nonzero}, but `{name}` has {width} members"),
                    "it must be at most the number of members",
                );
            }
            Some(Amount::Leading {
                value: table.number("value")?,
                nonzero: nonzero.or(width)?,
            })
        }
        "first" => {
            table.only(&["first", "ratio"], "a geometric pattern");
            table.required(
                "ratio",
                "give the ratio of one coefficient to the one before",
            );
            let inside = |ratio: f64| ratio.abs() <= 1.0;
            Some(Amount::Geometric {
                first: table.number("first")?,
                ratio: table.number_where("ratio", inside, "from -1 to 1")?,
            })
        }
        _ => {
            table.only(&["norm", "seed"], "a random direction");
            Some(Amount::Direction {
                norm: table.number_where("norm", |norm| norm >= 0.0, "at least 0")?,
                seed: table.whole("seed"),
            })
        }
    }
}

/// Seeds of the random directions of one truth.
#[derive(Debug, Clone, Copy)]
pub(super) struct DirectionSeeds {
    /// Seed of the scenario.
    pub(super) scenario: u64,
    /// Seed of the truth; 0 unless given, so that truths share their directions.
    pub(super) truth: u64,
}

/// Writes coefficients into a truth; a block comes before its members, whatever the order.
pub(super) fn apply(list: &[Coefficient<'_>], seeds: DirectionSeeds, truth: &mut Truth) {
    let mut ordered: Vec<&Coefficient<'_>> = list.iter().collect();
    ordered.sort_by_key(|coefficient| match &coefficient.target {
        Target::Columns { columns, .. } => std::cmp::Reverse(columns.len()),
        Target::Intercept | Target::Arm(_) => std::cmp::Reverse(0),
    });
    for coefficient in ordered {
        let values = |count| coefficient.amount.values(count, coefficient.name, seeds);
        match &coefficient.target {
            // The intercept is taken from the section that gives it last.
            Target::Intercept => {}
            Target::Arm(arm) => truth.arm_effects[*arm] = values(1)[0],
            Target::Columns { arm: None, columns } => {
                truth.slopes[columns.clone()].copy_from_slice(&values(columns.len()));
            }
            Target::Columns {
                arm: Some(arm),
                columns,
            } => {
                if truth.interactions.is_empty() {
                    truth.interactions =
                        vec![vec![0.0; truth.slopes.len()]; truth.arm_effects.len()];
                }
                truth.interactions[*arm][columns.clone()].copy_from_slice(&values(columns.len()));
            }
        }
    }
}

impl Amount {
    fn values(self, count: usize, name: &str, seeds: DirectionSeeds) -> Vec<f64> {
        match self {
            Self::Constant(value) => vec![value; count],
            Self::Leading { value, nonzero } => (0..count)
                .map(|index| if index < nonzero { value } else { 0.0 })
                .collect(),
            Self::Geometric { first, ratio } => {
                std::iter::successors(Some(first), |value| Some(value * ratio))
                    .take(count)
                    .collect()
            }
            Self::Direction { norm, seed } => direction(
                count,
                norm,
                name,
                seed.unwrap_or(seeds.truth),
                seeds.scenario,
            ),
        }
    }
}

/// Independent standard normals scaled to a Euclidean norm: a uniformly distributed direction.
fn direction(count: usize, norm: f64, name: &str, seed: u64, scenario_seed: u64) -> Vec<f64> {
    let mut digest = Sha256::new();
    digest.update(b"coefficients");
    digest.update(scenario_seed.to_le_bytes());
    digest.update(seed.to_le_bytes());
    digest.update(name.as_bytes());
    let mut stream = ChaCha8Rng::from_seed(digest.finalize().into());
    let mut values = vec![0.0; count];
    fill_standard_normal(&mut stream, &mut values);
    let length = values.iter().map(|value| value * value).sum::<f64>().sqrt();
    if length > 0.0 {
        for value in &mut values {
            *value *= norm / length;
        }
    }
    values
}
