//! The two clocks: the wall clock that people read, and the time since the start that never jumps.
//!
//! A night's log needs both: captures are stamped with the wall clock, but how long something took and when it is due
//! must not follow a clock that is set in the middle of the night. [`RealClock`] asks the machine, [`HandClock`] goes
//! only where a test takes it.

use std::fmt::Debug;
use std::sync::{Arc, Mutex, PoisonError};
use std::time::{Duration, Instant};

use jiff::{SignedDuration, Timestamp};

/// Tells the time. The only door to it for everything above this floor.
pub(crate) trait Clock: Debug + Send + Sync {
    /// The wall clock. It may jump, forwards and backwards: only for stamps.
    fn now(&self) -> Timestamp;

    /// The time since this clock was made. It never goes backwards: for intervals and deadlines.
    fn elapsed(&self) -> Duration;
}

/// The machine's clocks.
#[derive(Debug, Clone)]
pub(crate) struct RealClock {
    started: Instant,
}

impl RealClock {
    /// Begins to count now.
    #[must_use]
    pub(crate) fn new() -> Self {
        Self { started: Instant::now() }
    }
}

impl Clock for RealClock {
    fn now(&self) -> Timestamp {
        Timestamp::now()
    }

    fn elapsed(&self) -> Duration {
        self.started.elapsed()
    }
}

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

#[cfg(test)]
mod tests;
