//! Where results and progress go.

use crate::replay::Progress;
use std::io::{IsTerminal, Write, stderr, stdout};
use std::time::{Duration, Instant};

/// What the terminal can show.
#[derive(Debug, Clone, Copy)]
pub(super) struct Output {
    /// Width of tables in columns.
    pub(super) width: usize,
    /// Whether bold and dim text may be used.
    pub(super) styled: bool,
    progress: bool,
}

impl Output {
    /// Looks at the terminal and the environment (`NO_COLOR`).
    pub(super) fn detect() -> Self {
        /// Width of tables that do not go to a terminal, and the widest on one.
        const WIDTH: usize = 100;
        let terminal = stdout().is_terminal();
        let width = terminal_size::terminal_size()
            .filter(|_| terminal)
            .map_or(WIDTH, |(width, _)| usize::from(width.0).clamp(60, WIDTH));
        let colourless = std::env::var_os("NO_COLOR").is_some_and(|value| !value.is_empty());
        Self {
            width,
            styled: terminal && !colourless,
            progress: stderr().is_terminal(),
        }
    }

    /// Writes a result to standard output.
    pub(super) fn print(text: &str) -> std::io::Result<()> {
        let mut out = stdout().lock();
        out.write_all(text.as_bytes())?;
        out.flush()
    }

    /// A progress line for `total` trials, silent when standard error is no terminal.
    pub(super) fn progress(self, quiet: bool) -> ProgressLine {
        ProgressLine {
            shown: self.progress && !quiet,
            started: Instant::now(),
            last: None,
            drawn: false,
        }
    }
}

/// One line on standard error that is redrawn.
pub(super) struct ProgressLine {
    shown: bool,
    started: Instant,
    last: Option<Instant>,
    drawn: bool,
}

impl ProgressLine {
    /// Shows a word while there are no trials to count yet.
    pub(super) fn note(&mut self, words: &str) {
        if self.shown {
            self.drawn = true;
            eprint!("\r\x1b[K{words} ...");
        }
    }

    /// Redraws the line, a few times a second at most.
    pub(super) fn show(&mut self, label: &str, progress: Progress) {
        const INTERVAL: Duration = Duration::from_millis(200);
        if !self.shown || self.last.is_some_and(|last| last.elapsed() < INTERVAL) {
            return;
        }
        self.last = Some(Instant::now());
        self.drawn = true;
        let seconds = self.started.elapsed().as_secs_f64();
        let rate = progress.done as f64 / seconds.max(1e-9);
        let left = (progress.total - progress.done) as f64 / rate.max(1e-9);
        eprint!(
            "\r\x1b[K{label}{} of {} trials, {rate:.0} a second, {left:.0} s left",
            progress.done, progress.total
        );
    }

    /// Clears the line.
    pub(super) fn finish(&mut self) {
        if self.drawn {
            eprint!("\r\x1b[K");
            self.drawn = false;
        }
    }
}
