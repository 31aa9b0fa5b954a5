//! Names of arms, covariates and blocks, and the regressors that they stand for.

use std::collections::HashMap;
use std::ops::Range;

use crate::plan::Term;
use crate::scenario::{Place, Sink};

/// Most covariate columns: a Gram matrix of that order takes 3.2 GB.
pub(super) const MOST_COLUMNS: usize = 20_000;

/// Words that stand for several regressors.
const GROUP_WORDS: [&str; 3] = ["intercept", "arms", "covariates"];

/// What a name stands for.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) enum Meaning {
    /// The constant one.
    Intercept,
    /// An arm, the reference arm among them.
    Arm(usize),
    /// One covariate column.
    Column(usize),
    /// Several covariate columns: a block, or the levels of a categorical covariate.
    Group(Range<usize>),
}

/// Every name of a scenario that a regressor can be made of.
#[derive(Debug, Default)]
pub(super) struct Names {
    arms: Vec<String>,
    columns: Vec<String>,
    meanings: HashMap<String, Meaning>,
    /// Names of groups in file order, for offers.
    groups: Vec<String>,
    /// Beginnings of names whose number or spelling is unknown after a mistake.
    open: Vec<String>,
}

impl Names {
    pub(super) fn new() -> Self {
        let mut names = Self::default();
        names
            .meanings
            .insert("intercept".to_owned(), Meaning::Intercept);
        names
    }

    pub(super) fn arms(&self) -> &[String] {
        &self.arms
    }

    pub(super) fn columns(&self) -> &[String] {
        &self.columns
    }

    pub(super) fn has_arms(&self) -> bool {
        !self.arms.is_empty()
    }

    /// Whether every column is known.
    pub(super) fn is_complete(&self) -> bool {
        self.open.is_empty()
    }

    /// Notes that columns whose names begin with `beginning` may exist.
    pub(super) fn leave_open(&mut self, beginning: &str) {
        self.open.push(beginning.to_owned());
    }

    pub(super) fn add_arm(&mut self, name: &str, place: &Place, sink: &Sink<'_>) {
        self.claim(name, Meaning::Arm(self.arms.len()), place, sink);
        self.arms.push(name.to_owned());
    }

    pub(super) fn add_column(&mut self, name: &str, place: &Place, sink: &Sink<'_>) {
        self.claim(name, Meaning::Column(self.columns.len()), place, sink);
        self.columns.push(name.to_owned());
    }

    /// Names the columns from `first` to the last one added.
    pub(super) fn add_group(&mut self, name: &str, first: usize, place: &Place, sink: &Sink<'_>) {
        let columns = first..self.columns.len();
        self.claim(name, Meaning::Group(columns), place, sink);
        self.groups.push(name.to_owned());
    }

    /// Claims a name; a name that is taken, reserved or unusable in `arm:column` is reported.
    fn claim(&mut self, name: &str, meaning: Meaning, place: &Place, sink: &Sink<'_>) {
        if GROUP_WORDS.contains(&name) {
            sink.report(
                place,
                format!("\"{name}\" has a meaning of its own among regressors"),
                Some("choose another name".to_owned()),
            );
        } else if name.contains(':') {
            sink.report(
                place,
                format!("the name \"{name}\" holds a colon"),
                Some("colons join an arm and a covariate, as in treated:age".to_owned()),
            );
        } else if let Some(other) = self.meanings.get(name) {
            let what = match other {
                Meaning::Intercept => "the intercept",
                Meaning::Arm(_) => "an arm",
                Meaning::Column(_) => "a covariate",
                Meaning::Group(_) => "a block of covariates",
            };
            sink.report(
                place,
                format!("the name \"{name}\" is already taken by {what}"),
                Some("names of arms and covariates must differ".to_owned()),
            );
        } else {
            self.meanings.insert(name.to_owned(), meaning);
        }
    }

    /// What a plain name stands for.
    pub(super) fn meaning(&self, name: &str) -> Option<&Meaning> {
        self.meanings.get(name)
    }

    /// The covariate columns of a column, block, or the word `covariates`.
    pub(super) fn columns_of(&self, name: &str) -> Option<Range<usize>> {
        if name == "covariates" {
            return Some(0..self.columns.len());
        }
        match self.meanings.get(name)? {
            Meaning::Column(column) => Some(*column..*column + 1),
            Meaning::Group(columns) => Some(columns.clone()),
            Meaning::Intercept | Meaning::Arm(_) => None,
        }
    }

    /// One column by name; reports anything else.
    pub(super) fn column(&self, name: &str, place: &Place, sink: &Sink<'_>) -> Option<usize> {
        match self.meanings.get(name) {
            Some(Meaning::Column(column)) => Some(*column),
            Some(Meaning::Group(columns)) => {
                let member = self.columns.get(columns.start).map_or("", String::as_str);
                sink.report(
                    place,
                    format!("\"{name}\" stands for {} covariates", columns.len()),
                    Some(format!("name one of them, such as \"{member}\"")),
                );
                None
            }
            _ => {
                self.unknown("covariate", name, place, sink);
                None
            }
        }
    }

    /// One arm by name; reports anything else.
    pub(super) fn arm(&self, name: &str, place: &Place, sink: &Sink<'_>) -> Option<usize> {
        if let Some(Meaning::Arm(arm)) = self.meanings.get(name) {
            return Some(*arm);
        }
        let help = if self.has_arms() {
            match sink.nearest(name, self.arms.iter().map(String::as_str)) {
                Some(near) => format!("did you mean \"{near}\"?"),
                None => format!("the arms are {}", self.arms.join(", ")),
            }
        } else {
            "this study has no [arms]".to_owned()
        };
        sink.report_missing(place, name, format!("unknown arm \"{name}\""), Some(help));
        None
    }

    /// Reports a name that stands for nothing, with the nearest one that does.
    pub(super) fn unknown(&self, what: &str, name: &str, place: &Place, sink: &Sink<'_>) {
        // The name may belong to covariates that a mistake keeps from being known.
        let column = name.rsplit(':').next().unwrap_or(name);
        if self
            .open
            .iter()
            .any(|beginning| column.starts_with(beginning))
        {
            sink.taint();
            return;
        }
        let missing = match name.split_once(':') {
            Some((arm, _)) if !self.meanings.contains_key(arm) => arm,
            _ => column,
        };
        let help = self.offer(name, sink);
        sink.report_missing(
            place,
            missing,
            format!("unknown {what} \"{name}\""),
            Some(help),
        );
    }

    fn offer(&self, name: &str, sink: &Sink<'_>) -> String {
        let plain = || {
            let words = self.arms.iter().chain(&self.groups).chain(&self.columns);
            words.map(String::as_str)
        };
        if let Some((arm, column)) = name.split_once(':') {
            let arm = self.nearest_or(arm, self.arms.iter().map(String::as_str), sink);
            let column = self.nearest_or(column, plain(), sink);
            if let (Some(arm), Some(column)) = (arm, column) {
                return format!("did you mean \"{arm}:{column}\"?");
            }
        } else if let Some(near) = sink.nearest(name, plain().chain(GROUP_WORDS)) {
            return format!("did you mean \"{near}\"?");
        }
        let known: Vec<&str> = plain().take(OFFERED + 1).collect();
        match known.len() {
            0 => "this study has no covariates or arms of known name".to_owned(),
            count if count > OFFERED => {
                format!("known names are {}, and more", known[..OFFERED].join(", "))
            }
            _ => format!("known names are {}", known.join(", ")),
        }
    }

    fn nearest_or<'n>(
        &'n self,
        name: &'n str,
        known: impl Iterator<Item = &'n str>,
        sink: &Sink<'_>,
    ) -> Option<&'n str> {
        if self.meanings.contains_key(name) {
            return Some(name);
        }
        sink.nearest(name, known)
    }

    /// The regressors that a word stands for; an unknown word or the reference arm is reported.
    pub(super) fn terms(&self, word: &str, place: &Place, sink: &Sink<'_>) -> Option<Vec<Term>> {
        let terms = if let Some((arm, columns)) = word.split_once(':') {
            let arms = if arm == "arms" {
                Some((1..self.arms.len()).collect())
            } else if let Some(Meaning::Arm(arm)) = self.meaning(arm) {
                self.not_reference(*arm, word, place, sink)?;
                Some(vec![*arm])
            } else {
                None
            };
            arms.zip(self.columns_of(columns)).map(|(arms, columns)| {
                arms.into_iter()
                    .flat_map(|arm| {
                        columns
                            .clone()
                            .map(move |column| Term::ArmCovariate { arm, column })
                    })
                    .collect()
            })
        } else if word == "arms" {
            Some((1..self.arms.len()).map(Term::Arm).collect())
        } else {
            match self.meaning(word) {
                Some(Meaning::Intercept) => Some(vec![Term::Intercept]),
                Some(Meaning::Arm(arm)) => {
                    self.not_reference(*arm, word, place, sink)?;
                    Some(vec![Term::Arm(*arm)])
                }
                _ => self
                    .columns_of(word)
                    .map(|columns| columns.map(Term::Covariate).collect()),
            }
        };
        if terms.is_none() {
            self.unknown("regressor", word, place, sink);
        }
        terms
    }

    /// Whether a word stands for regressors, in the analysis model or not.
    pub(super) fn terms_exist(&self, word: &str) -> bool {
        match word.split_once(':') {
            Some((arm, columns)) => {
                matches!(self.meaning(arm), Some(Meaning::Arm(arm)) if *arm > 0)
                    && self.columns_of(columns).is_some()
            }
            None => match self.meaning(word) {
                Some(Meaning::Arm(arm)) => *arm > 0,
                Some(_) => true,
                None => false,
            },
        }
    }

    /// The reference arm has no coefficient of its own.
    pub(super) fn not_reference(
        &self,
        arm: usize,
        word: &str,
        place: &Place,
        sink: &Sink<'_>,
    ) -> Option<()> {
        if arm > 0 {
            return Some(());
        }
        let others = self.arms.get(1..).unwrap_or_default().join(", ");
        sink.report(
            place,
            format!("\"{word}\" names the reference arm"),
            Some(format!(
                "effects are those of the other arms ({others}) against it"
            )),
        );
        None
    }

    /// The name of a regressor.
    pub(super) fn name_of(&self, term: Term) -> String {
        match term {
            Term::Intercept => "intercept".to_owned(),
            Term::Arm(arm) => self.arms[arm].clone(),
            Term::Covariate(column) => self.columns[column].clone(),
            Term::ArmCovariate { arm, column } => {
                format!("{}:{}", self.arms[arm], self.columns[column])
            }
        }
    }
}

/// Names listed when none is near.
const OFFERED: usize = 12;
