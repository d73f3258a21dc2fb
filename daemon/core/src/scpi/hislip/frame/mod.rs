//! Messages in a stream of bytes: headers, and payloads in the pieces in which they come.
//!
//! Three outcomes are kept apart, as in [`crate::scpi::frame`]: more must come ([`Scan::NeedMore`]), there is something
//! ([`Scan::Head`], [`Scan::Payload`]), or this can never become a message ([`Malformed`]). A payload is handed on as it
//! comes and never gathered here, so a declared length sets no memory aside, and what nobody wants is passed over.

use super::header::{HEADER_BYTES, Header, Kind};
use crate::scpi::frame::MOST_HINT;

/// Payloads of everything but data: a sub-address, the name of a lock (256 characters at most), eight bytes of a size,
/// or the text of an error, which is a line or two.
pub const MOST_CONTROL_BYTES: u64 = 4096;

/// Payloads of types that are not known, which are passed over. What a later version might say in passing is short; one
/// that claims more would only keep the connection from anything else.
pub const MOST_UNKNOWN_BYTES: u64 = 1 << 16;

/// What a look at the buffer gave.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Scan {
    /// Nothing can be said yet.
    NeedMore {
        /// At least so many more bytes are to come, from 1 to [`MOST_HINT`].
        at_least: usize,
    },
    /// A message begins; its header takes the first [`HEADER_BYTES`] of the buffer.
    Head(Header),
    /// The first bytes of the buffer are payload of the message that has begun.
    Payload {
        /// How many, at least 1.
        bytes: usize,
        /// Whether the message ends with them.
        last: bool,
    },
}

/// This can never become a message. Close both connections: where the next one begins cannot be told.
#[derive(Debug, Clone, Copy, PartialEq, Eq, thiserror::Error)]
#[error("a HiSLIP message is malformed: {reason}")]
pub struct Malformed {
    /// What is wrong.
    pub reason: Reason,
}

/// What makes a message malformed.
#[derive(Debug, Clone, Copy, PartialEq, Eq, thiserror::Error)]
pub enum Reason {
    /// A header begins with something else.
    #[error("0x{:02X} 0x{:02X} stands where a header begins with `HS`", .found[0], .found[1])]
    NoPrologue {
        /// The first two bytes.
        found: [u8; 2],
    },
    /// The payload is longer than such a message can have use for.
    #[error("{kind:?} says that it has {declared} bytes, but {most} are the most that it can need")]
    TooLong {
        /// The type.
        kind: Kind,
        /// What the header says.
        declared: u64,
        /// The limit.
        most: u64,
    },
}

/// Where in a message the next byte of a stream stands. Keep one per connection.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub struct ScanState {
    left: u64,
}

impl ScanState {
    /// At the start of a message.
    #[must_use]
    pub fn new() -> Self {
        Self::default()
    }
}

/// Looks at the start of `buffer`. After [`Scan::Head`] and [`Scan::Payload`] take those bytes off the buffer before the
/// next call.
///
/// # Errors
/// When no more bytes can make a message of it, as soon as that shows: the first two bytes or the header.
pub fn scan(buffer: &[u8], progress: &mut ScanState) -> Result<Scan, Malformed> {
    if progress.left > 0 {
        // A length beyond what usize can hold is beyond what the buffer can hold.
        let bytes = usize::try_from(progress.left).unwrap_or(usize::MAX).min(buffer.len());
        progress.left -= bytes as u64;
        return Ok(match bytes {
            0 => Scan::NeedMore { at_least: usize::try_from(progress.left).unwrap_or(MOST_HINT).min(MOST_HINT) },
            _ => Scan::Payload { bytes, last: progress.left == 0 },
        });
    }
    if let Some(&found) = buffer.first_chunk::<2>()
        && found != super::header::PROLOGUE
    {
        return Err(Malformed { reason: Reason::NoPrologue { found } });
    }
    let Some(head) = buffer.first_chunk::<HEADER_BYTES>() else {
        return Ok(Scan::NeedMore { at_least: HEADER_BYTES - buffer.len() });
    };
    // The prologue was checked above.
    let Some(header) = Header::read(head) else {
        return Err(Malformed { reason: Reason::NoPrologue { found: [head[0], head[1]] } });
    };
    let most = match header.kind {
        // Whoever awaits data knows how long they may be; data that nobody awaits are not kept.
        Kind::Data | Kind::DataEnd => u64::MAX,
        Kind::Unknown(_) => MOST_UNKNOWN_BYTES,
        _ => MOST_CONTROL_BYTES,
    };
    if header.length > most {
        return Err(Malformed { reason: Reason::TooLong { kind: header.kind, declared: header.length, most } });
    }
    progress.left = header.length;
    Ok(Scan::Head(header))
}

#[cfg(test)]
mod tests;
