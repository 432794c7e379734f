//! How far a search has come, shown on a terminal only.

use crate::tune::Stage;
use indicatif::{ProgressBar, ProgressStyle};
use std::time::Duration;

/// A line on the terminal; it appears only for work that takes longer than a moment.
pub struct SearchProgress {
    line: ProgressBar,
}

impl SearchProgress {
    /// Hidden unless stderr is a terminal.
    pub fn new() -> Self {
        let line = ProgressBar::new_spinner();
        if let Ok(style) = ProgressStyle::with_template("{elapsed} {msg}") {
            line.set_style(style);
        }
        line.enable_steady_tick(Duration::from_millis(200));
        Self { line }
    }

    pub fn show(&self, stage: Stage) {
        let message = match stage {
            Stage::Descent { designs } => format!("descending: {designs} designs"),
            Stage::Starts { done, planned } => format!("looking for a start: {done} of {planned}"),
            Stage::Monolayers { designs } => format!("whole monolayers: {designs} designs"),
        };
        self.say(message);
    }

    pub fn say(&self, message: String) {
        self.line.set_message(message);
    }
}

impl Drop for SearchProgress {
    fn drop(&mut self) {
        self.line.finish_and_clear();
    }
}
