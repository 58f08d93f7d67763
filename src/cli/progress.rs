//! Owns the line on a terminal that shows how far a search is: on standard error, and only there.

use std::io::{IsTerminal, Write};
use std::sync::Arc;
use std::sync::mpsc::{RecvTimeoutError, Sender, channel};
use std::thread::JoinHandle;
use std::time::{Duration, Instant};

use super::Common;
use crate::report::printable;
use crate::screen::{Glance, Objective, Progress};

/// Searches that are over sooner show nothing.
const FIRST: Duration = Duration::from_secs(1);
const EVERY: Duration = Duration::from_millis(500);
/// Width of a terminal that does not say it.
const USUAL_WIDTH: usize = 80;

/// Rewrites the line until it is dropped, which clears it.
pub(super) struct Ticker {
    running: Option<(Sender<()>, JoinHandle<()>)>,
}

impl Ticker {
    /// Starts when standard error is a terminal and nobody asked for quiet.
    pub(super) fn start(
        progress: Arc<Progress>,
        objective: Objective,
        currency: Option<&str>,
        common: &Common,
    ) -> Ticker {
        let dumb = std::env::var_os("TERM").is_some_and(|term| term == "dumb");
        if common.quiet || dumb || !std::io::stderr().is_terminal() {
            return Ticker { running: None };
        }
        let unit = match objective {
            Objective::Cost => printable(currency.unwrap_or("")),
            Objective::Heat => "W".to_owned(),
        };
        let begun = Instant::now();
        let (end, ended) = channel();
        let thread = std::thread::spawn(move || {
            let mut wait = FIRST;
            let mut shown = false;
            while ended.recv_timeout(wait) == Err(RecvTimeoutError::Timeout) {
                wait = EVERY;
                let text = line(begun.elapsed(), progress.glance(), &unit, width());
                // Whoever closed the terminal does not look.
                let _ = write!(std::io::stderr(), "\r{text}\u{1b}[K").and_then(|()| std::io::stderr().flush());
                shown = true;
            }
            if shown {
                let _ = write!(std::io::stderr(), "\r\u{1b}[K").and_then(|()| std::io::stderr().flush());
            }
        });
        Ticker {
            running: Some((end, thread)),
        }
    }

    /// Whether anybody looks.
    pub(super) fn watches(&self) -> bool {
        self.running.is_some()
    }
}

impl Drop for Ticker {
    fn drop(&mut self) {
        if let Some((end, thread)) = self.running.take() {
            drop(end);
            let _ = thread.join();
        }
    }
}

fn width() -> usize {
    let said = std::env::var("COLUMNS")
        .ok()
        .and_then(|c| c.parse().ok())
        .filter(|&c| c > 0);
    let asked = || terminal_size::terminal_size_of(std::io::stderr()).map(|(width, _)| usize::from(width.0));
    said.or_else(asked).unwrap_or(USUAL_WIDTH)
}

/// Seconds, the best so far, the bound: cut so that the line does not wrap.
fn line(elapsed: Duration, glance: Glance, unit: &str, width: usize) -> String {
    #[allow(clippy::cast_precision_loss)]
    let amount = |millionths: i64| format!("{:.4} {unit}", millionths as f64 / 1e6).trim_end().to_owned();
    let mut parts = vec![format!("{} s", elapsed.as_secs())];
    if glance.steps.1 > 0 {
        parts.push(format!("{} of {}", glance.steps.0, glance.steps.1));
    }
    parts.extend(glance.best.map(|best| format!("best {}", amount(best))));
    parts.extend(glance.bound.map(|bound| format!("none below {}", amount(bound))));
    if glance.nodes > 0 {
        parts.push(format!("{} nodes", glance.nodes));
    }
    let text = parts.join(", ");
    // The last column stays free: some terminals wrap when it is written.
    text.chars().take(width.saturating_sub(1)).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_line_says_what_is_known_and_fits() {
        let mut glance = Glance {
            best: None,
            bound: None,
            nodes: 0,
            steps: (0, 0),
        };
        let at = Duration::from_millis(2700);
        assert_eq!(line(at, glance, "EUR", 80), "2 s");
        glance.best = Some(36_319_600);
        glance.bound = Some(35_000_000);
        assert_eq!(
            line(at, glance, "EUR", 80),
            "2 s, best 36.3196 EUR, none below 35.0000 EUR"
        );
        assert_eq!(line(at, glance, "", 80), "2 s, best 36.3196, none below 35.0000");
        assert_eq!(line(at, glance, "EUR", 20), "2 s, best 36.3196 E");
        glance.steps = (12, 60);
        glance.nodes = 4096;
        assert_eq!(
            line(at, glance, "W", 100),
            "2 s, 12 of 60, best 36.3196 W, none below 35.0000 W, 4096 nodes"
        );
        assert_eq!(line(at, glance, "W", 1), "");
    }
}
