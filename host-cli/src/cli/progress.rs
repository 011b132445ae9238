//! A progress bar for people who wait.

use std::io::{IsTerminal, stderr};
use std::time::{Duration, Instant};

use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};

/// How long a run may take before a bar appears.
const PATIENCE: Duration = Duration::from_secs(1);

/// Shows on standard error how far a run has come, if that is a terminal and the run is long.
pub(super) struct Progress {
    bar: Option<ProgressBar>,
    start: Instant,
    /// What is being counted.
    noun: &'static str,
}

impl Progress {
    /// Progress through `size` bytes, if that is known, and through things called `noun`; `silent`:
    /// never show any.
    pub fn new(size: Option<u64>, noun: &'static str, silent: bool) -> Self {
        let bar = (!silent && stderr().is_terminal()).then(|| {
            let (length, template) = match size {
                Some(_) => (size, "{bar:40} {percent} %  {msg}, {eta} left"),
                None => (None, "{spinner} {msg}"),
            };
            let style = ProgressStyle::with_template(template).expect("the template is a constant");
            ProgressBar::with_draw_target(length, ProgressDrawTarget::hidden()).with_style(style)
        });
        Progress {
            bar,
            start: Instant::now(),
            noun,
        }
    }

    /// Shows that `bytes` of the input and `count` of what is counted are done.
    pub fn advance(&mut self, bytes: u64, count: u64) {
        let Some(bar) = &self.bar else { return };
        if bar.is_hidden() && self.start.elapsed() > PATIENCE {
            bar.set_draw_target(ProgressDrawTarget::stderr());
        }
        bar.set_position(bytes);
        bar.set_message(format!("{count} {}", self.noun));
    }

    /// Runs `speak`, which may write to standard error, with the bar out of the way.
    pub fn pause(&self, speak: impl FnOnce()) {
        match &self.bar {
            Some(bar) => bar.suspend(speak),
            None => speak(),
        }
    }

    /// Takes the bar away.
    pub fn finish(&self) {
        if let Some(bar) = &self.bar {
            bar.finish_and_clear();
        }
    }
}
