//! Where a connection is, and what can go wrong with it.

use super::super::frame::Malformed;
use super::super::header::{Channel, ErrorCode, FatalCode, Kind};

/// How far the connection is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Phase {
    /// `Initialize` was sent.
    Initializing,
    /// `AsyncInitialize` was sent; whether the server wants overlap mode.
    AsyncInitializing { overlap: bool },
    /// The maximum size of messages was sent; whether the server wants overlap mode.
    Sizing { overlap: bool },
    /// Requests can be made.
    Ready,
    /// A device clear is under way: whether the asynchronous half is done, and whether the connection was never ready.
    Clearing { acknowledged: bool, opening: bool },
}

/// What went wrong.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum Fault {
    /// The server threw a message away.
    #[error("the instrument answered with a HiSLIP error: {code}{}", said(.text))]
    Answered {
        /// Which.
        code: ErrorCode,
        /// Its words.
        text: String,
    },
    /// The server gives the connection up.
    #[error("the instrument gave the HiSLIP connection up: {code}{}", said(.text))]
    Fatal {
        /// Why.
        code: FatalCode,
        /// Its words.
        text: String,
    },
    /// The server threw a reply away because it was asked something else before the reply was taken.
    #[error("the instrument says that a query was interrupted by the next")]
    Interrupted,
    /// The bytes are no messages.
    #[error(transparent)]
    Malformed(#[from] Malformed),
    /// Asked for at a moment when it is not possible: a mistake of the caller.
    #[error("{doing} is not possible now: the HiSLIP connection is busy or not ready")]
    NotReady {
        /// What was asked for.
        doing: &'static str,
    },
    /// The server insists on overlap mode.
    #[error("the instrument insists on HiSLIP's overlap mode; choose its synchronised mode, or use a SOCKET resource")]
    OverlapOnly,
    /// The reply is longer than what was asked for.
    #[error("the reply has at least {declared} bytes, but at most {most} were asked for")]
    ReplyTooLong {
        /// What came or was announced.
        declared: u64,
        /// What was asked for.
        most: usize,
    },
    /// A size without room for any payload, or of another length than eight bytes.
    #[error("the instrument takes HiSLIP messages of at most {size} bytes, in which nothing can be said")]
    Size {
        /// What it says; 0 if it cannot be read.
        size: u64,
    },
    /// A message that has no place here.
    #[error("the instrument sent {kind:?} on the {channel:?} connection, where it has no place at this moment")]
    Unexpected {
        /// Its type.
        kind: Kind,
        /// The connection.
        channel: Channel,
    },
    /// Data with the number of a request that expects none, or that has its reply already.
    #[error("the instrument sent {bytes} bytes that were not asked for")]
    Unsolicited {
        /// How many the message has.
        bytes: u64,
    },
}

impl Fault {
    /// Whether messages can still be told from each other, so that a device clear may help.
    #[must_use]
    pub fn curable(&self) -> bool {
        match self {
            Self::Answered { .. } | Self::Interrupted | Self::ReplyTooLong { .. } | Self::Unsolicited { .. } => true,
            Self::Fatal { .. }
            | Self::Malformed(_)
            | Self::NotReady { .. }
            | Self::OverlapOnly
            | Self::Size { .. }
            | Self::Unexpected { .. } => false,
        }
    }
}

fn said(text: &str) -> String {
    if text.is_empty() { String::new() } else { format!(", \"{}\"", crate::scpi::value::shorten(text)) }
}
