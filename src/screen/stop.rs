//! Owns when to give up.

use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};
use std::time::Instant;

/// When to give up: a deadline, or a signal from the user.
#[derive(Debug, Clone, Default)]
pub struct Stop {
    /// Wall clock to stop at.
    pub deadline: Option<Instant>,
    /// Set by Ctrl-C.
    pub asked: Arc<AtomicBool>,
}

impl Stop {
    /// The same with half of the time that is left.
    #[must_use]
    pub fn half(&self) -> Stop {
        let half = |at: Instant| Instant::now() + at.saturating_duration_since(Instant::now()) / 2;
        Stop {
            deadline: self.deadline.map(half),
            asked: Arc::clone(&self.asked),
        }
    }

    /// Whether to give up now.
    #[must_use]
    pub fn now(&self) -> bool {
        self.asked.load(Ordering::Relaxed) || self.deadline.is_some_and(|at| Instant::now() >= at)
    }
}
