//! Progress on standard error for work of over half a second; silent when nobody looks at a terminal.

use std::io::{IsTerminal, Write, stderr};
use std::time::{Duration, Instant};

/// How far a piece of work has come.
pub struct Progress {
    what: &'static str,
    started: Instant,
    shown: Option<Instant>,
    enabled: bool,
}

impl Progress {
    #[must_use]
    pub fn new(what: &'static str) -> Self {
        Progress {
            what,
            started: Instant::now(),
            shown: None,
            enabled: stderr().is_terminal(),
        }
    }

    /// Says that this share of the work, 0 to 1, is done.
    pub fn at(&mut self, share: f64) {
        let due = match self.shown {
            None => self.started.elapsed() > Duration::from_millis(500),
            Some(shown) => shown.elapsed() > Duration::from_millis(200),
        };
        if self.enabled && due {
            // A terminal that cannot be written to loses the progress, nothing else.
            let _ = write!(
                stderr(),
                "\r{} {:.0} %",
                self.what,
                100.0 * share.clamp(0.0, 1.0)
            );
            self.shown = Some(Instant::now());
        }
    }
}

impl Drop for Progress {
    fn drop(&mut self) {
        if self.shown.is_some() {
            let _ = write!(stderr(), "\r{:width$}\r", "", width = self.what.len() + 8);
        }
    }
}
