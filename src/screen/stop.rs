//! Owns when to give up, and what a long search says of itself while it runs.

use std::sync::Arc;
use std::sync::atomic::{AtomicBool, AtomicI64, AtomicU64, AtomicUsize, Ordering};
use std::time::Instant;

/// When to give up: a deadline, or a signal from the user.
#[derive(Debug, Clone, Default)]
pub struct Stop {
    /// Wall clock to stop at.
    pub deadline: Option<Instant>,
    /// Set by Ctrl-C.
    pub asked: Arc<AtomicBool>,
    /// Where the search says how far it is; `None`: nobody looks.
    pub progress: Option<Arc<Progress>>,
}

/// How far a search is, for whoever watches it; nothing is decided by it.
#[derive(Debug)]
pub struct Progress {
    /// Objective of the best build so far (millionths of the currency, or microwatts).
    best: AtomicI64,
    /// No build has a lower one.
    bound: AtomicI64,
    nodes: AtomicU64,
    /// Of several searches: how many are done, and how many there are.
    done: AtomicUsize,
    of: AtomicUsize,
}

/// What a watcher reads.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Glance {
    /// Objective of the best build so far.
    pub best: Option<i64>,
    /// No build has a lower one.
    pub bound: Option<i64>,
    /// Nodes of the search.
    pub nodes: u64,
    /// Searches done, and how many there are; (0, 0) for a single one.
    pub steps: (usize, usize),
}

impl Default for Progress {
    fn default() -> Progress {
        Progress {
            best: AtomicI64::new(i64::MAX),
            bound: AtomicI64::new(i64::MIN),
            nodes: AtomicU64::new(0),
            done: AtomicUsize::new(0),
            of: AtomicUsize::new(0),
        }
    }
}

impl Progress {
    /// As it stands now.
    #[must_use]
    pub fn glance(&self) -> Glance {
        let best = self.best.load(Ordering::Relaxed);
        let bound = self.bound.load(Ordering::Relaxed);
        Glance {
            best: (best != i64::MAX).then_some(best),
            bound: (bound != i64::MIN).then_some(bound),
            nodes: self.nodes.load(Ordering::Relaxed),
            steps: (self.done.load(Ordering::Relaxed), self.of.load(Ordering::Relaxed)),
        }
    }
}

impl Stop {
    /// The same with half of the time that is left.
    #[must_use]
    pub fn half(&self) -> Stop {
        let half = |at: Instant| Instant::now() + at.saturating_duration_since(Instant::now()) / 2;
        Stop {
            deadline: self.deadline.map(half),
            ..self.clone()
        }
    }

    /// The same for a search whose figures would mean nothing to who watches: one of another objective, one of many.
    #[must_use]
    pub fn unwatched(&self) -> Stop {
        Stop {
            progress: None,
            ..self.clone()
        }
    }

    /// Whether to give up now.
    #[must_use]
    pub fn now(&self) -> bool {
        self.asked.load(Ordering::Relaxed) || self.deadline.is_some_and(|at| Instant::now() >= at)
    }

    /// Says that a build with this objective was found.
    pub fn found(&self, objective: i64) {
        if let Some(progress) = &self.progress {
            progress.best.fetch_min(objective, Ordering::Relaxed);
        }
    }

    /// Says that no build has a lower objective than this.
    pub fn bounded(&self, objective: i64) {
        if let Some(progress) = &self.progress {
            progress.bound.fetch_max(objective, Ordering::Relaxed);
        }
    }

    /// Says how many nodes were looked at.
    pub fn looked_at(&self, nodes: u64) {
        if let Some(progress) = &self.progress {
            progress.nodes.store(nodes, Ordering::Relaxed);
        }
    }

    /// Says how many of several searches are done.
    pub fn steps(&self, done: usize, of: usize) {
        if let Some(progress) = &self.progress {
            progress.done.store(done, Ordering::Relaxed);
            progress.of.store(of, Ordering::Relaxed);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_glance_shows_what_was_said() {
        let progress = Arc::new(Progress::default());
        let stop = Stop {
            progress: Some(Arc::clone(&progress)),
            ..Stop::default()
        };
        let nothing = Glance {
            best: None,
            bound: None,
            nodes: 0,
            steps: (0, 0),
        };
        assert_eq!(progress.glance(), nothing);
        stop.found(12);
        stop.half().found(15);
        stop.bounded(7);
        stop.bounded(5);
        stop.looked_at(99);
        stop.unwatched().found(1);
        stop.unwatched().steps(1, 2);
        let seen = Glance {
            best: Some(12),
            bound: Some(7),
            nodes: 99,
            steps: (0, 0),
        };
        assert_eq!(progress.glance(), seen);
        stop.steps(3, 60);
        assert_eq!(progress.glance().steps, (3, 60));
        Stop::default().found(1);
    }
}
