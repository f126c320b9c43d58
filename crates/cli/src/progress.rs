//! The one place that makes progress bars.

use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};
use std::io::IsTerminal;
use std::time::Duration;

/// Makes the bars of a run: all hidden when the run is quiet or stderr is no terminal.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Progress {
    shown: bool,
}

impl Progress {
    pub(crate) fn new(quiet: bool) -> Self {
        Self {
            shown: !quiet && std::io::stderr().is_terminal(),
        }
    }

    /// A bar for one DEM being read; `total` is in thousandths.
    pub(crate) fn reading(self, label: &str) -> ProgressBar {
        self.bar(
            1000,
            "{msg} [{bar:30}] {percent:>3} %",
            format!("reading {label}"),
        )
    }

    /// A spinner for work whose length is not known.
    pub(crate) fn working(self, what: &str) -> ProgressBar {
        let bar = self.bar(0, "{msg} {elapsed}", what.to_owned());
        if self.shown {
            bar.enable_steady_tick(Duration::from_millis(200));
        }
        bar
    }

    /// The bar of the main work: stations done and time left.
    pub(crate) fn stations(self, count: usize) -> ProgressBar {
        self.bar(
            count as u64,
            "{msg} [{bar:30}] {pos}/{len}, {eta} left",
            "stations".to_owned(),
        )
    }

    fn bar(self, length: u64, template: &str, message: String) -> ProgressBar {
        let target = if self.shown {
            ProgressDrawTarget::stderr_with_hz(5)
        } else {
            ProgressDrawTarget::hidden()
        };
        let style =
            ProgressStyle::with_template(template).unwrap_or_else(|_| ProgressStyle::default_bar());
        ProgressBar::with_draw_target(Some(length), target)
            .with_style(style.progress_chars("=> "))
            .with_message(message)
    }
}
