//! A clock for tests, moved by hand.

use std::sync::{Arc, Mutex, PoisonError};
use std::time::Duration;

use jiff::{SignedDuration, Timestamp};

use super::Clock;

/// A clock that stands still until it is moved by hand. Clones are the same clock.
#[derive(Debug, Clone)]
pub(crate) struct HandClock {
    hands: Arc<Mutex<Hands>>,
}

#[derive(Debug)]
struct Hands {
    now: Timestamp,
    elapsed: Duration,
}

impl HandClock {
    /// Shows `now`; nothing has elapsed.
    #[must_use]
    pub(crate) fn new(now: Timestamp) -> Self {
        Self { hands: Arc::new(Mutex::new(Hands { now, elapsed: Duration::ZERO })) }
    }

    /// Lets `by` pass, on both clocks. The wall clock stops at the end of the calendar (year 9999).
    pub(crate) fn advance(&self, by: Duration) {
        self.with(|hands| {
            hands.elapsed = hands.elapsed.saturating_add(by);
            hands.now = hands.now.saturating_add(by).unwrap_or(Timestamp::MAX);
        });
    }

    /// Sets the wall clock, as a person or a time server does; no time passes.
    pub(crate) fn set_wall(&self, now: Timestamp) {
        self.with(|hands| hands.now = now);
    }

    /// Makes the wall clock jump by `by`, of either sign; no time passes.
    pub(crate) fn jump(&self, by: SignedDuration) {
        let end = if by.is_negative() { Timestamp::MIN } else { Timestamp::MAX };
        self.with(|hands| hands.now = hands.now.saturating_add(by).unwrap_or(end));
    }

    /// No code can panic while it holds the lock, so a poisoned one still holds whole hands.
    fn with<T>(&self, act: impl FnOnce(&mut Hands) -> T) -> T {
        act(&mut self.hands.lock().unwrap_or_else(PoisonError::into_inner))
    }
}

impl Clock for HandClock {
    fn now(&self) -> Timestamp {
        self.with(|hands| hands.now)
    }

    fn elapsed(&self) -> Duration {
        self.with(|hands| hands.elapsed)
    }
}
