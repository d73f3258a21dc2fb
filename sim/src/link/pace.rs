//! Deafness: an instrument that hears nothing for a while after each message.
//!
//! A message is lost only if it provably came too soon, however slow this process was to look: counted is the time from
//! the last moment at which nothing had yet come of the message before, to the moment at which this one was found. A
//! sender that pauses for as long as the deafness therefore never loses anything, and one that does not pause loses what
//! it sends too soon wherever the simulator gets its turn in time.

use std::io;
use std::time::Duration;

use tokio::io::{AsyncRead, AsyncReadExt};
use tokio::time::{Instant, timeout};

/// How often it is looked whether something has come: the uncertainty of when it came.
const LOOK: Duration = Duration::from_millis(1);

/// The pace of one connection.
#[derive(Debug)]
pub(super) struct Pace {
    deafness: Option<Duration>,
    /// A moment at which nothing had come of what was read last.
    empty: Instant,
    /// When what was read last was there.
    found: Instant,
    /// The earliest moment at which the message heard last may have come.
    heard: Option<Instant>,
}

impl Pace {
    /// Nothing was heard yet.
    pub(super) fn new(deafness: Option<Duration>) -> Self {
        let now = Instant::now();
        Self { deafness, empty: now, found: now, heard: None }
    }

    /// Reads what has come, and remembers when it can have come.
    ///
    /// # Errors
    /// When reading fails.
    pub(super) async fn read(&mut self, stream: &mut (impl AsyncRead + Unpin), buffer: &mut [u8]) -> io::Result<usize> {
        if self.deafness.is_none() {
            return stream.read(buffer).await;
        }
        // The first look takes no time: what is found by it came since the look before.
        let mut look = Duration::ZERO;
        loop {
            let asked = Instant::now();
            if let Ok(read) = timeout(look, stream.read(buffer)).await {
                self.found = Instant::now();
                return read;
            }
            self.empty = asked;
            look = LOOK;
        }
    }

    /// Whether the next message of what was read last is heard.
    pub(super) fn hears(&mut self) -> bool {
        let Some(deafness) = self.deafness else { return true };
        if self.heard.is_some_and(|heard| self.found.duration_since(heard) < deafness) {
            return false;
        }
        self.heard = Some(self.empty);
        true
    }
}
