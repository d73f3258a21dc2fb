//! The two clocks: the wall clock that people read, and the time since the start that never jumps.
//!
//! A night's log needs both: captures are stamped with the wall clock, but how long something took and when it is due
//! must not follow a clock that is set in the middle of the night. [`RealClock`] asks the machine; the tests'
//! `HandClock` goes only where a test takes it.

use std::fmt::Debug;
use std::time::{Duration, Instant};

use jiff::Timestamp;

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

#[cfg(test)]
mod hand;
#[cfg(test)]
mod tests;
