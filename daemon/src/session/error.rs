//! What can go wrong between the daemon and an instrument: [`Trouble`] with a connection, [`SessionError`] of a call.
//!
//! Each error says what was being done, to which instrument, with which command, and what to try.

use std::time::Duration;

use evenpair_core::dialect::DialectError;
use evenpair_core::scpi::hislip::Fault;

use super::codec::CodecError;

/// Why a connection is no longer trusted, or could not be had.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub(crate) enum Trouble {
    /// Whoever waited for the reply went away; the reply may still come and must not meet the next query.
    #[error("the request was given up before its reply was there")]
    Abandoned,
    /// The connection could not be made.
    #[error("no connection to {place}: {reason}")]
    Connect {
        /// Host and port.
        place: String,
        /// The system's words.
        reason: String,
    },
    /// The bytes are not what was asked for.
    #[error(transparent)]
    Codec(#[from] CodecError),
    /// The reply cannot be read.
    #[error("{0}")]
    Garbled(DialectError),
    /// The dialect cannot say what reconnecting needs.
    #[error("the dialect cannot greet the instrument: {0}")]
    Greeting(DialectError),
    /// What a HiSLIP connection cannot go on with.
    #[error(transparent)]
    Hislip(#[from] Fault),
    /// The settings that had been made could not be made again.
    #[error("the instrument refuses the setting that it had before, `{command}`: error {number}, \"{text}\"")]
    NotRestored {
        /// The command.
        command: String,
        /// The number in the error queue.
        number: i64,
        /// The text in the error queue.
        text: String,
    },
    /// The other end closed the connection.
    #[error("the instrument closed the connection")]
    PeerClosed,
    /// Nothing came in time.
    #[error("no answer to `{command}` within {after:?}")]
    Silent {
        /// What was sent.
        command: String,
        /// For how long was waited.
        after: Duration,
    },
    /// Another instrument answers at this address.
    #[error("it says that it is `{found}`, but before it was `{expected}`")]
    Stranger {
        /// Who answered first.
        expected: String,
        /// Who answers now.
        found: String,
    },
}

/// Why a call was not carried out, or not known to be.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub(crate) enum SessionError {
    /// Too many requests wait already.
    #[error("{instrument}: {what} was not sent: {waiting} requests wait already; let them end, or end what floods it")]
    Busy {
        /// The instrument.
        instrument: String,
        /// What was to be done.
        what: String,
        /// How many may wait.
        waiting: usize,
    },
    /// The session has ended.
    #[error("{instrument}: {what} was not carried out: the daemon is closing the connection")]
    Closed {
        /// The instrument.
        instrument: String,
        /// What was to be done.
        what: String,
    },
    /// The call could not be put into the instrument's words.
    #[error("{instrument}: {what} cannot be said: {source}")]
    Dialect {
        /// The instrument.
        instrument: String,
        /// What was to be done.
        what: String,
        /// Why.
        source: Box<DialectError>,
    },
    /// The connection broke while the request was under way; it is not known whether it took effect.
    #[error(
        "{instrument}: {what}: the connection was lost after `{command}`: {reason}; it is not known whether the \
         command took effect; check cable, power and whether somebody else uses the instrument"
    )]
    Lost {
        /// The instrument.
        instrument: String,
        /// What was being done.
        what: String,
        /// The command.
        command: String,
        /// What broke it.
        reason: Box<Trouble>,
    },
    /// What was started did not come to its end.
    #[error(
        "{instrument}: not complete within {after:?}; when an acquisition was started, check that the trigger \
         source moves and that the trigger level lies within it"
    )]
    NotComplete {
        /// The instrument.
        instrument: String,
        /// For how long was waited.
        after: Duration,
    },
    /// The instrument put an entry into its error queue.
    #[error(
        "{instrument}: {what}: the instrument refused `{command}`: error {number}, \"{text}\"{}; check the value \
         against its manual, and the dialect's words for it", also(.more)
    )]
    Refused {
        /// The instrument.
        instrument: String,
        /// What was being done.
        what: String,
        /// The command, or the group of commands after which the queue was read.
        command: String,
        /// The number of the first entry.
        number: i64,
        /// Its text.
        text: String,
        /// How many entries came after it.
        more: usize,
    },
    /// Another instrument answers at this address.
    #[error(
        "{instrument}: {what} was not sent: {place} is now `{found}`, but it was `{expected}`; restart the daemon if \
         it was replaced on purpose"
    )]
    Stranger {
        /// The instrument.
        instrument: String,
        /// What was to be done.
        what: String,
        /// Host and port.
        place: String,
        /// Who answered first.
        expected: String,
        /// Who answers now.
        found: String,
    },
    /// The reply did not come in time.
    #[error(
        "{instrument}: {what}: no answer to `{command}` within {after:?}; the connection was cleared or closed so \
         that a late reply does no harm; check that the command is one of the instrument's, or allow more time"
    )]
    TimedOut {
        /// The instrument.
        instrument: String,
        /// What was being done.
        what: String,
        /// The command.
        command: String,
        /// For how long was waited.
        after: Duration,
    },
    /// The reply came, but cannot be read.
    #[error("{instrument}: {what}: {source}; check the dialect against the instrument's manual")]
    Unreadable {
        /// The instrument.
        instrument: String,
        /// What was being done.
        what: String,
        /// Why.
        source: Box<DialectError>,
    },
    /// There is no connection.
    #[error(
        "{instrument}: {what} was not sent: {reason} (waited {waited:?}); check that it is on, its address in the \
         bench file, and that its port is open"
    )]
    Unreachable {
        /// The instrument.
        instrument: String,
        /// What was to be done.
        what: String,
        /// For how long was waited.
        waited: Duration,
        /// What stood in the way at the last attempt.
        reason: String,
    },
}

/// `, and 3 more` after the first entry of an error queue.
fn also(more: &usize) -> String {
    if *more == 0 { String::new() } else { format!(", and {more} more") }
}

/// How much of a command is shown: enough for any command that is not a mistake, and a log line stays a line.
const SHOWN: usize = 80;

/// Bytes for people: one line, control characters escaped, at most [`SHOWN`] characters.
pub(super) fn shown(bytes: &[u8]) -> String {
    // A character takes at most four bytes, so nothing of what is shown is cut off here; a megabyte is not converted.
    let head = &bytes[..bytes.len().min(4 * SHOWN + 4)];
    let text = String::from_utf8_lossy(head);
    let mut line: String = text.trim_end().chars().flat_map(char::escape_debug).collect();
    // Quotes stand in nearly every command and need no escape on one line.
    line = line.replace("\\\"", "\"").replace("\\'", "'");
    match line.char_indices().nth(SHOWN) {
        Some((cut, _)) => format!("{}…", &line[..cut]),
        None => line,
    }
}
