//! A progress bar on a terminal, nothing elsewhere.

use std::time::Duration;

use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};

use crate::batch::Progress;

/// The bar; it draws to stderr, and only when that is a terminal.
pub(super) fn bar(quiet: bool) -> ProgressBar {
    let target = if quiet {
        ProgressDrawTarget::hidden()
    } else {
        ProgressDrawTarget::stderr()
    };
    let bar = ProgressBar::with_draw_target(Some(0), target);
    let style = ProgressStyle::with_template("{msg:<10} {wide_bar} {pos}/{len} {eta}")
        .unwrap_or_else(|_| ProgressStyle::default_bar());
    bar.set_style(style);
    bar.enable_steady_tick(Duration::from_millis(200));
    bar
}

/// Moves the bar.
pub(super) fn show(bar: &ProgressBar, progress: Progress) {
    match progress {
        Progress::SurveyOf(files) => begin(bar, "surveying", files),
        Progress::AuditOf(files) => begin(bar, "auditing", files),
        Progress::Surveyed | Progress::Audited => bar.inc(1),
    }
}

fn begin(bar: &ProgressBar, what: &'static str, files: u64) {
    bar.set_message(what);
    bar.set_length(files);
    bar.set_position(0);
}
