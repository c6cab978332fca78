//! Limits: when a search must stop, whether by time or because somebody asked. Being stopped is a normal
//! outcome, with true bounds; nothing here is an error.

use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};
use std::time::{Duration, Instant};

/// The limits of a run.
#[derive(Clone, Debug, Default)]
pub struct Limits {
    /// When the whole run must end.
    pub deadline: Option<Instant>,
    /// How long one piece may take.
    pub piece_limit: Option<Duration>,
    /// Set from outside to stop everything.
    pub cancel: Arc<AtomicBool>,
}

impl Limits {
    /// The stop sign for the whole run.
    pub fn for_run(&self) -> Stop {
        Stop {
            deadline: self.deadline,
            cancel: Arc::clone(&self.cancel),
        }
    }

    /// The stop sign for one piece whose search begins now.
    pub fn for_piece(&self) -> Stop {
        let own = self
            .piece_limit
            .and_then(|limit| Instant::now().checked_add(limit));
        Stop {
            deadline: match (self.deadline, own) {
                (Some(a), Some(b)) => Some(a.min(b)),
                (a, b) => a.or(b),
            },
            cancel: Arc::clone(&self.cancel),
        }
    }
}

/// The stop sign that a search looks at.
#[derive(Clone, Debug, Default)]
pub struct Stop {
    deadline: Option<Instant>,
    cancel: Arc<AtomicBool>,
}

impl Stop {
    /// Whether to stop now.
    pub fn now(&self) -> bool {
        self.cancel.load(Ordering::Relaxed)
            || self
                .deadline
                .is_some_and(|deadline| Instant::now() >= deadline)
    }
}
