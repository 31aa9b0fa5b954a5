//! `[population]` and `[arms]`: where the units come from, and what they can be given.

use std::path::Path;

use super::names::{MOST_COLUMNS, Names};
use super::{correlation, marginals, roster};
use crate::plan::{LawPopulation, Population, Source};
use crate::scenario::{Fields, Node};

/// What is known of the population.
pub(super) struct Units {
    /// `None` after a mistake.
    pub(super) resolved: Option<Population>,
    /// Whether a roster is to supply the outcomes.
    pub(super) recorded: bool,
    from_roster: bool,
}

/// Where candidates come from, as far as their number is concerned.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Supply {
    /// As many as are wanted.
    Law,
    /// The units of a file; `None` if it could not be read.
    Roster(Option<usize>),
}

impl Units {
    /// Where candidates come from.
    pub(super) fn supply(&self) -> Supply {
        if !self.from_roster {
            return Supply::Law;
        }
        Supply::Roster(
            self.resolved
                .as_ref()
                .and_then(|population| match &population.source {
                    Source::Roster(roster) => Some(roster.len()),
                    Source::Law(_) => None,
                }),
        )
    }
}

/// Reads `[arms]`.
pub(super) fn arms(root: &Fields<'_>, names: &mut Names) -> Vec<String> {
    let Some(fields) = root.section("arms") else {
        return Vec::new();
    };
    fields.required("names", "list the arms, the reference arm first");
    let Some(nodes) = fields.list("names") else {
        return Vec::new();
    };
    if nodes.len() < 2 {
        let found = match nodes.len() {
            0 => "no arm is",
            _ => "only one arm is",
        };
        fields.report(
            "names",
            format!("{found} named"),
            "name at least two, the reference arm first; leave [arms] out in a study without arms",
        );
    }
    for node in nodes {
        if let Some(name) = node.as_text() {
            names.add_arm(name, &node.place, fields.sink());
        }
    }
    names.arms().to_vec()
}

/// Reads `[population]`, and adds its columns to the names.
pub(super) fn read(root: &Fields<'_>, base_folder: &Path, names: &mut Names) -> Units {
    let mut units = Units {
        resolved: None,
        recorded: false,
        from_roster: false,
    };
    root.required(
        "population",
        "add [population] with covariates = [...] or roster = {...}",
    );
    let Some(fields) = root.section("population") else {
        names.leave_open("");
        return units;
    };
    if fields.has("roster") {
        units.from_roster = true;
        for key in ["covariates", "correlation"] {
            if fields.has(key) {
                fields.report(
                    key,
                    format!("a roster is given, so `{key}` has no meaning"),
                    "draw covariates from laws, or take them from a file, not both",
                );
            }
        }
        if let Some(roster_fields) = fields.table("roster") {
            units.recorded = roster_fields.has("outcome");
            units.resolved = roster::read(&roster_fields, base_folder, names);
        } else {
            names.leave_open("");
        }
        return units;
    }
    let before = fields.sink().trouble();
    fields.required("covariates", "list the covariates, or name a roster");
    let marginals = if let Some(nodes) = fields.list("covariates") {
        covariates(nodes, &fields, names)
    } else {
        names.leave_open("");
        Vec::new()
    };
    let sound = fields.sink().trouble() == before;
    let correlation = correlation::read(&fields, sound.then_some(marginals.len()));
    if sound && let Some(correlation) = correlation {
        units.resolved = Some(Population {
            columns: names.columns().to_vec(),
            source: Source::Law(LawPopulation {
                marginals,
                correlation,
            }),
        });
    }
    units
}

fn covariates(
    nodes: &[Node],
    population: &Fields<'_>,
    names: &mut Names,
) -> Vec<crate::plan::Marginal> {
    if nodes.is_empty() && !names.has_arms() {
        population.report(
            "covariates",
            "the study has neither covariates nor arms",
            "list at least one covariate, or add [arms]",
        );
    }
    let mut marginals = Vec::new();
    for (index, node) in nodes.iter().enumerate() {
        let title = match node.entry("name").and_then(|entry| entry.node.as_text()) {
            Some(name) => format!("covariate \"{name}\""),
            None => format!("covariate {}", index + 1),
        };
        let Some(fields) = Fields::of(node, title, population.sink()) else {
            names.leave_open("");
            continue;
        };
        let covariate = marginals::read(&fields);
        fields.required("name", "give the covariate a name");
        let Some(name) = fields.text("name") else {
            names.leave_open("");
            continue;
        };
        let counted = fields.has("count");
        let count = if counted {
            fields.count("count", 1, MOST_COLUMNS)
        } else {
            Some(1)
        };
        let Some(count) = count else {
            names.leave_open(name);
            continue;
        };
        let columns = covariate.levels.len().max(1);
        if names.columns().len() + count * columns > MOST_COLUMNS {
            fields.report(
                "count",
                format!("the covariates have more than {MOST_COLUMNS} columns"),
                format!("a study can have {MOST_COLUMNS}"),
            );
            names.leave_open(name);
            continue;
        }
        let first = names.columns().len();
        for member in 1..=count {
            let member_name = if counted {
                format!("{name}{member}")
            } else {
                name.to_owned()
            };
            add_member(&member_name, &covariate.levels, &fields, names);
            marginals.extend(covariate.marginal.clone());
        }
        if counted {
            names.add_group(name, first, fields.place("name"), fields.sink());
        }
    }
    marginals
}

/// Adds one covariate: a column, or a column for each level of a categorical one but the first.
fn add_member(name: &str, levels: &[String], fields: &Fields<'_>, names: &mut Names) {
    let place = fields.place("name");
    if levels.is_empty() {
        names.add_column(name, place, fields.sink());
        return;
    }
    let first = names.columns().len();
    for level in levels {
        names.add_column(&format!("{name}={level}"), place, fields.sink());
    }
    names.add_group(name, first, place, fields.sink());
}
