//! The scenario *as written*: a TOML file, read with the place of every value, so that whatever is
//! wrong with it can be shown on its own line.
//!
//! Reading has three steps: TOML syntax, the comparison with the known keys and kinds of value,
//! and the meaning, which is [`plan`](crate::plan)'s. Each collects all mistakes it finds.

mod diagnostic;
mod fields;
mod path;
mod schema;
mod sink;
mod source;
mod statements;
mod structure;
mod sweep;
mod syntax;
mod tree;

#[cfg(test)]
mod tests;

use std::fmt::Write as _;
use std::path::{Path, PathBuf};
use std::sync::Arc;

use sha2::{Digest, Sha256};

pub use diagnostic::{Diagnostic, Diagnostics};
pub(crate) use fields::{Fields, number};
pub(crate) use sink::Sink;
pub(crate) use source::Place;
use source::SourceText;
pub use sweep::{Axis, AxisValues, BreakPoint, Sweep};
pub(crate) use tree::{Content, Node};

/// Largest file that is read as a scenario, in bytes.
const LARGEST_FILE: u64 = 4 << 20;

/// A scenario file: its text, and its values with their places.
#[derive(Debug, Clone)]
pub struct Scenario {
    source: Arc<SourceText>,
    base_folder: PathBuf,
    root: Node,
    sweep: Option<Sweep>,
    replaced: Vec<(String, toml::Value)>,
}

/// A scenario with the mistakes found so far.
#[derive(Debug)]
pub(crate) struct Draft {
    pub(crate) scenario: Scenario,
    pub(crate) mistakes: Vec<Diagnostic>,
    /// Lines that could not be read; what depends on them is unknown, not wrong.
    pub(crate) unreadable: Vec<String>,
    /// Whether the rest of the file could be read.
    pub(crate) complete: bool,
}

impl Scenario {
    /// Reads a file; paths in it are relative to its folder.
    ///
    /// # Errors
    ///
    /// If the file cannot be read, and every mistake in TOML syntax, key names and kinds of value.
    /// [`plan::read`](crate::plan::read) reports mistakes of meaning along with them.
    pub fn read(path: &Path) -> Result<Self, Diagnostics> {
        Self::read_draft(path)?.finish()
    }

    /// Reads a text; `origin` is the file name used in messages.
    ///
    /// # Errors
    ///
    /// Every mistake in TOML syntax, key names and kinds of value.
    pub fn parse(text: &str, origin: &str, base_folder: &Path) -> Result<Self, Diagnostics> {
        Self::parse_draft(text, origin, base_folder).finish()
    }

    /// Reads a file and keeps what could be read of it.
    pub(crate) fn read_draft(path: &Path) -> Result<Draft, Diagnostics> {
        let origin = path.display().to_string();
        let unreadable = |message: String, help: &str| {
            Diagnostics::one(Diagnostic::of_file(&origin, message, Some(help.to_owned())))
        };
        let place = "name a scenario file that exists and may be read";
        let found = std::fs::metadata(path)
            .map_err(|error| unreadable(format!("cannot be read: {error}"), place))?;
        if !found.is_file() {
            return Err(unreadable("is no file".to_owned(), place));
        }
        if found.len() > LARGEST_FILE {
            return Err(unreadable(
                format!("has {} bytes", found.len()),
                "a scenario is a TOML text of at most 4 MiB",
            ));
        }
        let bytes = std::fs::read(path)
            .map_err(|error| unreadable(format!("cannot be read: {error}"), place))?;
        let text = String::from_utf8(bytes).map_err(|error| {
            unreadable(
                format!(
                    "byte {} is not part of a UTF-8 text",
                    error.utf8_error().valid_up_to() + 1
                ),
                "a scenario is a TOML text in UTF-8",
            )
        })?;
        let folder = path.parent().unwrap_or(Path::new(""));
        Ok(Self::parse_draft(&text, &origin, folder))
    }

    /// Reads a text and keeps what could be read of it.
    pub(crate) fn parse_draft(text: &str, origin: &str, base_folder: &Path) -> Draft {
        let source = Arc::new(SourceText::new(text, origin));
        let sink = Sink::new(&source);
        let mut document = syntax::parse(&source, &sink);
        let mut sweep = None;
        if document.complete {
            structure::check(
                &mut document.root,
                &schema::SCENARIO,
                structure::ROOT,
                &sink,
            );
            sweep = document
                .root
                .entry("sweep")
                .and_then(|entry| Fields::of(&entry.node, "[sweep]", &sink))
                .and_then(|fields| sweep::read(&document.root, &fields));
        }
        let mut mistakes = sink.into_list();
        if !document.complete {
            let message = "the rest of the file could not be read and was not checked".to_owned();
            let help = "correct what is shown below, then read the file again".to_owned();
            mistakes.push(Diagnostic::of_file(origin, message, Some(help)));
        }
        Draft {
            scenario: Self {
                source,
                base_folder: base_folder.to_owned(),
                root: document.root,
                sweep,
                replaced: Vec::new(),
            },
            mistakes,
            unreadable: document.unreadable,
            complete: document.complete,
        }
    }

    /// The text as read.
    #[must_use]
    pub fn text(&self) -> &str {
        self.source.text()
    }

    /// File name used in messages.
    #[must_use]
    pub fn origin(&self) -> &str {
        self.source.origin()
    }

    /// Folder that paths in the scenario are relative to.
    #[must_use]
    pub fn base_folder(&self) -> &Path {
        &self.base_folder
    }

    /// SHA-256 of the text as read, in lower-case hexadecimal.
    #[must_use]
    pub fn hash(&self) -> String {
        let digest = Sha256::digest(self.text().as_bytes());
        digest.iter().fold(String::new(), |mut out, byte| {
            // Writing to a string cannot fail.
            let _ = write!(out, "{byte:02x}");
            out
        })
    }

    /// The `[sweep]` section, if there is one.
    #[must_use]
    pub fn sweep(&self) -> Option<&Sweep> {
        self.sweep.as_ref()
    }

    /// Values replaced since reading, with their paths, in order.
    #[must_use]
    pub fn replaced(&self) -> &[(String, toml::Value)] {
        &self.replaced
    }

    /// The value at a path as the file has it; `None` where it is left at its default or the path
    /// leads nowhere. See [`with_value`](Self::with_value) for paths.
    #[must_use]
    pub fn value(&self, path: &str) -> Option<toml::Value> {
        path::get(&self.root, path)?.to_value()
    }

    /// A copy with one value replaced.
    ///
    /// A path is a list of names separated by dots. A member of a list is addressed by its name or
    /// label, or by its number from 1: `batch.2.size`, `truth.no effect.coefficients.elevation`,
    /// `population.covariates.soil.count`. A name that holds a dot stands in double quotes. A key
    /// that the file leaves at its default may be set too. A number without fraction may take the
    /// place of a whole number. Mistakes found later point to the line of the value as read and
    /// name the path.
    ///
    /// # Errors
    ///
    /// If the path leads nowhere (the nearest known name is offered), or the value is of the wrong
    /// kind.
    pub fn with_value(&self, path: &str, value: toml::Value) -> Result<Self, Diagnostics> {
        let mut copy = self.clone();
        let sink = Sink::new(&self.source);
        match path::reach(&mut copy.root, path) {
            Ok((node, shape)) => {
                let mut place = node.place.clone();
                place.set_by = Some(path.into());
                *node = Node::from_value(&value, &place);
                if let (Content::Float(number), schema::Shape::Count | schema::Shape::Seed) =
                    (&node.content, shape)
                    && number.fract() == 0.0
                {
                    #[allow(clippy::cast_possible_truncation)] // saturates, and is then too large
                    let whole = *number as i64;
                    node.content = Content::Integer(whole);
                }
                structure::check(node, shape, "the value", &sink);
            }
            Err(mistake) => {
                return Err(Diagnostics::one(Diagnostic::of_file(
                    self.origin(),
                    mistake.message,
                    Some(mistake.help),
                )));
            }
        }
        copy.replaced.push((path.to_owned(), value));
        match Diagnostics::from_list(sink.into_list()) {
            Some(diagnostics) => Err(diagnostics),
            None => Ok(copy),
        }
    }

    /// The whole tree.
    pub(crate) fn root(&self) -> &Node {
        &self.root
    }

    /// An empty sink for mistakes in this scenario.
    pub(crate) fn sink(&self) -> Sink<'_> {
        Sink::new(&self.source)
    }
}

impl Draft {
    fn finish(self) -> Result<Scenario, Diagnostics> {
        match Diagnostics::from_list(self.mistakes) {
            Some(diagnostics) => Err(diagnostics),
            None => Ok(self.scenario),
        }
    }
}
