//! A bar on stderr for work that takes a while; nothing where stderr is no terminal.

use indicatif::{ProgressBar, ProgressStyle};

/// A bar of `length` steps with rate and time left; hidden when `quiet`, or without anything to do.
pub(super) fn bar(length: usize, quiet: bool) -> ProgressBar {
    if quiet || length == 0 {
        return ProgressBar::hidden();
    }
    let bar = ProgressBar::new(length as u64);
    let style = ProgressStyle::with_template("{bar:40} {pos} of {len}, {per_sec}, {eta} left");
    bar.set_style(style.unwrap_or_else(|_| ProgressStyle::default_bar()));
    bar
}
