//! What a session needs to know: whom it talks to, in which dialect, and how patient it is.

use std::sync::Arc;
use std::time::Duration;

use evenpair_core::dialect::Dialect;
use evenpair_core::scpi::address::Resource;
use evenpair_core::scpi::frame::MOST_LINE_BYTES;

/// Everything that a session is made from.
#[derive(Debug, Clone)]
pub(crate) struct SessionSpec {
    /// The instrument's name in the bench file; it stands in every error and log line.
    pub(crate) instrument: String,
    /// Host name or address.
    pub(crate) host: String,
    /// TCP port.
    pub(crate) port: u16,
    /// What is spoken below the dialect.
    pub(crate) protocol: Protocol,
    /// How the instrument is spoken to.
    pub(crate) dialect: Arc<Dialect>,
    /// How long is waited for what.
    pub(crate) timing: Timing,
    /// How much is read.
    pub(crate) caps: Caps,
}

/// Where an instrument is, and by what its messages are carried there: host, port, protocol. `None` for what this daemon
/// does not speak.
pub(crate) fn place_of(resource: &Resource) -> Option<(String, u16, Protocol)> {
    match resource {
        Resource::Hislip { host, port, device, .. } => {
            Some((host.clone(), *port, Protocol::Hislip { device: device.clone() }))
        }
        Resource::Socket { host, port, .. } => Some((host.clone(), *port, Protocol::Socket)),
        Resource::Instr { .. } => None,
    }
}

/// What carries the instrument's messages.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) enum Protocol {
    /// HiSLIP: messages with an end and a number, on two connections.
    Hislip {
        /// The sub-address, such as `hislip0`.
        device: String,
    },
    /// Text on one connection.
    Socket,
}

/// How long a session waits for what.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) struct Timing {
    /// For a connection to be made: on a bench's network it takes milliseconds, or does not happen.
    pub(crate) connect: Duration,
    /// For a device clear, where the protocol has one, before the connection is made anew instead: an instrument that
    /// still answers does so at once, whatever it was busy with.
    pub(crate) clear: Duration,
    /// For one reply, unless a call says otherwise.
    pub(crate) reply: Duration,
    /// Before the second attempt to connect in a row; the first is made at once, and each further one waits twice as
    /// long as the one before.
    pub(crate) backoff_first: Duration,
    /// The longest wait between two attempts.
    pub(crate) backoff_most: Duration,
    /// How long a call waits for a lost connection to come back before it fails.
    pub(crate) patience: Duration,
}

impl Default for Timing {
    fn default() -> Self {
        Self {
            connect: Duration::from_secs(2),
            clear: Duration::from_secs(2),
            reply: Duration::from_secs(3),
            backoff_first: Duration::from_millis(100),
            backoff_most: Duration::from_secs(5),
            patience: Duration::from_secs(6),
        }
    }
}

impl Timing {
    /// How long to wait before the attempt that follows `attempts` in a row: none, then doubling up to the longest.
    #[must_use]
    pub(crate) fn pause(&self, attempts: u32) -> Duration {
        match attempts {
            0 => Duration::ZERO,
            // 2^16 times any first wait is beyond the longest, and the product cannot overflow.
            _ => self.backoff_first.saturating_mul(1 << (attempts - 1).min(16)).min(self.backoff_most),
        }
    }
}

/// The most that is read of a reply: an instrument is not trusted with the daemon's memory.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) struct Caps {
    /// Bytes of a line.
    pub(crate) line_bytes: usize,
    /// Bytes of a block, unless a call says less: ten million samples of four bytes, in round numbers.
    pub(crate) block_bytes: usize,
}

impl Default for Caps {
    fn default() -> Self {
        Self { line_bytes: MOST_LINE_BYTES, block_bytes: 40_000_000 }
    }
}
