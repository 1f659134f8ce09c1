//! Shows a run on standard error: messages always, a progress bar where a person watches.

use crate::diag::Diagnostic;
use crate::diag::{Ink, render};
use crate::run::Watch;
use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};
use std::io::Write as _;

/// Tells a person what a run does.
pub struct Progress {
    bar: ProgressBar,
    ink: Ink,
}

impl Progress {
    /// A display that shows a bar only on a terminal.
    pub fn new(terminal: bool, ink: Ink) -> Self {
        let target = if terminal { ProgressDrawTarget::stderr() } else { ProgressDrawTarget::hidden() };
        let bar = ProgressBar::with_draw_target(None, target);
        let layout = ProgressStyle::with_template("{bar:30} {pos} of {len} maps, {msg}");
        bar.set_style(layout.unwrap_or_else(|_| ProgressStyle::default_bar()));
        Self { bar, ink }
    }

    /// Takes the bar away.
    pub fn finish(&self) {
        self.bar.finish_and_clear();
    }
}

impl Watch for Progress {
    fn message(&self, message: &Diagnostic, source: Option<&str>) {
        let text = render(message, source, self.ink);
        // Nobody can be told that standard error is gone.
        self.bar.suspend(|| drop(std::io::stderr().write_all(text.as_bytes())));
    }

    fn planned(&self, maps: usize) {
        self.bar.set_length(maps as u64);
        self.bar.set_message("solving");
        self.bar.tick();
    }

    fn mapped(&self, net: &str, band: &str) {
        self.bar.set_message(format!("{net} {band} solved"));
        self.bar.inc(1);
    }
}
