//! How far the work has come, shown to a terminal and to nobody else.

use std::time::Duration;

use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};

/// A bar on standard error, hidden where that is no terminal.
pub struct Progress {
    bar: ProgressBar,
}

impl Progress {
    /// A bar over `length` units of work.
    pub fn new(what: &'static str, length: u64) -> Progress {
        let bar = ProgressBar::with_draw_target(Some(length), ProgressDrawTarget::stderr());
        if let Ok(style) = ProgressStyle::with_template("{msg} {wide_bar} {percent:>3} %  {eta} left") {
            bar.set_style(style);
        }
        bar.set_message(what);
        bar.enable_steady_tick(Duration::from_millis(250));
        Progress { bar }
    }

    /// Some more is done.
    pub fn add(&self, units: u64) {
        self.bar.inc(units);
    }

    /// All is done: the bar goes away.
    pub fn done(&self) {
        self.bar.finish_and_clear();
    }
}

impl Drop for Progress {
    fn drop(&mut self) {
        self.bar.finish_and_clear();
    }
}
