//! Progress on standard error when that is a terminal; silence otherwise.

use indicatif::{ProgressBar, ProgressStyle};
use std::io::IsTerminal as _;
use std::time::Duration;

use crate::extract::Progress;

/// A line that says what is going on.
#[derive(Debug)]
pub(crate) struct ProgressLine {
    bar: ProgressBar,
}

impl ProgressLine {
    /// A line that shows something only when `wanted` and standard error is a terminal.
    pub(crate) fn new(wanted: bool) -> Self {
        if !(wanted && std::io::stderr().is_terminal()) {
            return ProgressLine { bar: ProgressBar::hidden() };
        }
        let bar = ProgressBar::new_spinner();
        if let Ok(style) = ProgressStyle::with_template("{spinner} {elapsed} {msg}") {
            bar.set_style(style);
        }
        bar.enable_steady_tick(Duration::from_millis(120));
        ProgressLine { bar }
    }

    /// Shows a step of the extraction.
    pub(crate) fn tell(&self, progress: Progress) {
        let Progress { level, stage, panels } = progress;
        self.bar.set_message(format!("level {level}: {stage} {panels} panels"));
    }

    /// Takes the line away.
    pub(crate) fn finish(&self) {
        self.bar.finish_and_clear();
    }
}
