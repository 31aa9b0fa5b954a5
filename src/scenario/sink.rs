//! Where mistakes are collected.

use std::cell::{Cell, RefCell};
use std::collections::HashSet;

use super::diagnostic::Diagnostic;
use super::source::{Place, SourceText};

/// Mistakes after which no nearest name is looked for: with long lists of names that search is
/// the slowest part of reading a file that is wrong throughout.
const SUGGESTIONS: usize = 500;

/// Collects the mistakes of one reading; a mistake that is met twice is kept once.
#[derive(Debug)]
pub(crate) struct Sink<'s> {
    source: &'s SourceText,
    list: RefCell<Vec<Diagnostic>>,
    seen: RefCell<HashSet<(usize, usize, String)>>,
    trouble: Cell<usize>,
}

impl<'s> Sink<'s> {
    /// An empty sink for a text.
    pub(crate) fn new(source: &'s SourceText) -> Self {
        Self {
            source,
            list: RefCell::default(),
            seen: RefCell::default(),
            trouble: Cell::new(0),
        }
    }

    /// Notes a mistake.
    pub(crate) fn report(&self, place: &Place, message: impl Into<String>, help: Option<String>) {
        self.add(place, message.into(), help, None);
    }

    /// Notes a mistake that comes of the absence of `missing`, and vanishes with it if a line that
    /// could not be read mentions that name.
    pub(crate) fn report_missing(
        &self,
        place: &Place,
        missing: &str,
        message: impl Into<String>,
        help: Option<String>,
    ) {
        self.add(place, message.into(), help, Some(missing.to_owned()));
    }

    fn add(&self, place: &Place, message: String, help: Option<String>, missing: Option<String>) {
        self.taint();
        let key = (place.start, place.end, message.clone());
        if !self.seen.borrow_mut().insert(key) {
            return;
        }
        let mut diagnostic = Diagnostic::new(self.source, place, message, help);
        diagnostic.missing = missing;
        self.list.borrow_mut().push(diagnostic);
    }

    /// Notes that a value already reported was asked for.
    pub(crate) fn taint(&self) {
        self.trouble.set(self.trouble.get() + 1);
    }

    /// A count that grows with every mistake reported or met again: a part read without change of
    /// the count is sound.
    pub(crate) fn trouble(&self) -> usize {
        self.trouble.get()
    }

    /// The known name nearest to a word, if one is near.
    pub(crate) fn nearest<'n>(
        &self,
        word: &str,
        known: impl IntoIterator<Item = &'n str>,
    ) -> Option<&'n str> {
        if self.list.borrow().len() > SUGGESTIONS {
            return None;
        }
        nearest(word, known)
    }

    /// The mistakes found.
    pub(crate) fn into_list(self) -> Vec<Diagnostic> {
        self.list.into_inner()
    }
}

/// The name with the smallest edit distance, case and `_`/`-`/blank aside, if a third of the
/// longer word or less (at least one letter, at most half the word) need change.
pub(super) fn nearest<'n>(word: &str, known: impl IntoIterator<Item = &'n str>) -> Option<&'n str> {
    let word = folded(word);
    let length = word.chars().count();
    known
        .into_iter()
        .filter_map(|name| {
            let candidate = folded(name);
            let longer = candidate.chars().count().max(length);
            let allowed = (longer / 3).max(1);
            // A distance is at least the difference in length: most names need no computation.
            if candidate.chars().count().abs_diff(length) > allowed {
                return None;
            }
            let distance = strsim::osa_distance(&word, &candidate);
            (distance <= allowed && 2 * distance <= longer).then_some((distance, name))
        })
        .min_by_key(|&(distance, _)| distance)
        .map(|(_, name)| name)
}

fn folded(word: &str) -> String {
    word.chars()
        .flat_map(char::to_lowercase)
        .map(|letter| match letter {
            '_' | ' ' => '-',
            letter => letter,
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_nearest_name_forgives_a_slip_but_not_another_word() {
        let known = ["elevation", "soil", "treated"];
        assert_eq!(nearest("elevatoin", known), Some("elevation"));
        assert_eq!(nearest("Soil", known), Some("soil"));
        assert_eq!(nearest("rainfall", known), None);
        assert_eq!(nearest("at least", ["at_least"]), Some("at_least"));
        assert_eq!(nearest("x", ["y"]), None);
    }

    #[test]
    fn a_mistake_met_twice_is_kept_once() {
        let source = SourceText::new("a = 1", "f");
        let sink = Sink::new(&source);
        let place = Place::new(0, 1);
        sink.report(&place, "m", None);
        sink.report(&place, "m", None);
        sink.report(&place, "n", None);
        assert_eq!(sink.trouble(), 3);
        assert_eq!(sink.into_list().len(), 2);
    }
}
