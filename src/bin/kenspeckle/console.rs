//! What the person sees while the program works, on standard error: one line for each thing, and progress.

use std::{
    fmt::Display,
    io::{IsTerminal, Write},
    sync::atomic::{AtomicBool, Ordering},
    time::Duration,
};

use indicatif::{ProgressBar, ProgressStyle};

/// Why a command could not do its job.
pub enum Failure {
    /// The person stopped it.
    Stopped,
    /// Something else, with its remedy, in one line.
    Because(String),
}

impl Failure {
    /// A failure for this reason.
    pub fn because(reason: impl Display) -> Self {
        Self::Because(reason.to_string())
    }
}

static STOP: AtomicBool = AtomicBool::new(false);

/// From now on Ctrl-C (and a request to terminate) asks the work to stop; a second one ends the program at once.
pub fn watch_for_stop() {
    // Without a handler Ctrl-C ends the program, which is what it should do then.
    let _ = ctrlc::set_handler(|| {
        if STOP.swap(true, Ordering::SeqCst) {
            std::process::exit(130);
        }
    });
}

/// Whether the person asked to stop.
pub fn stopped() -> bool {
    STOP.load(Ordering::SeqCst)
}

/// A failure if the person asked to stop.
pub fn go_on() -> Result<(), Failure> {
    if stopped() { Err(Failure::Stopped) } else { Ok(()) }
}

/// Text from outside, made safe for a terminal: control characters are shown, not obeyed.
pub fn plain(text: &str) -> String {
    text.chars().flat_map(|c| if c.is_control() { c.escape_default().collect::<Vec<_>>() } else { vec![c] }).collect()
}

/// Says one thing on a line of its own.
pub fn say(line: &str) {
    // A closed standard error is no reason to fail.
    let _ = writeln!(std::io::stderr(), "kenspeckle: {}", plain(line));
}

/// A bar with the time that is left; nothing where nobody watches.
pub fn progress(items: usize, what: &str) -> ProgressBar {
    if !std::io::stderr().is_terminal() {
        return ProgressBar::hidden();
    }
    let style = ProgressStyle::with_template("{msg} {wide_bar} {pos} of {len}, {eta} left")
        .unwrap_or_else(|_| ProgressStyle::default_bar());
    let bar = ProgressBar::new(items as u64).with_style(style).with_message(what.to_owned());
    bar.enable_steady_tick(Duration::from_millis(200));
    bar
}
