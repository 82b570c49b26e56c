//! A bar on standard error for long work.

use indicatif::{ProgressBar, ProgressStyle};

/// A bar over so many points; nothing where standard error is no terminal.
pub(super) fn bar(points: usize) -> ProgressBar {
    let bar = ProgressBar::new(points as u64);
    if let Ok(style) = ProgressStyle::with_template("{bar:40} {pos} of {len} points, {eta} left") {
        bar.set_style(style);
    }
    bar
}
