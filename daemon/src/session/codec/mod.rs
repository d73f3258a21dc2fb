//! Bytes on the wire to messages: a `tokio_util` codec over the SCPI frame scanner.
//!
//! Replies carry no mark of the query that they belong to, so the codec must be told what is awaited before it reads.
//! While nothing is awaited, any byte is an error: a reply that nobody asked for would be taken for the next query's.

use std::io;

use bytes::{Buf, BytesMut};
use evenpair_core::dialect::Message;
use evenpair_core::scpi::frame::{Limits, Malformed, Scan, ScanState, Want, scan};
use tokio_util::codec::{Decoder, Encoder};

use super::error::shown;

/// Why the bytes of a connection make no sense.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub(crate) enum CodecError {
    /// The connection ended within a reply.
    #[error("the connection ended within a reply, after {bytes} bytes of it")]
    Cut {
        /// How many bytes of it had come.
        bytes: usize,
    },
    /// The system says that the connection failed.
    #[error("the connection failed: {reason}")]
    Io {
        /// The system's words.
        reason: String,
    },
    /// The bytes are no reply of the kind that was asked for.
    #[error("the reply is malformed: {0}")]
    Malformed(#[from] Malformed),
    /// Something came that nobody had asked for.
    #[error("the instrument sent `{shown}`, which was not asked for")]
    Unsolicited {
        /// Its beginning.
        shown: String,
    },
}

impl From<io::Error> for CodecError {
    fn from(error: io::Error) -> Self {
        Self::Io { reason: error.to_string() }
    }
}

/// Cuts the stream into the one message that is awaited.
#[derive(Debug)]
pub(crate) struct Codec {
    want: Option<(Want, Limits)>,
    progress: ScanState,
}

impl Codec {
    /// Awaits nothing yet.
    #[must_use]
    pub(crate) fn new() -> Self {
        Self { want: None, progress: ScanState::new() }
    }

    /// Says what the next message must be, and how long it may be.
    pub(crate) fn await_one(&mut self, want: Want, limits: Limits) {
        self.want = Some((want, limits));
        self.progress = ScanState::new();
    }
}

impl Decoder for Codec {
    type Item = Message;
    type Error = CodecError;

    fn decode(&mut self, buffer: &mut BytesMut) -> Result<Option<Message>, CodecError> {
        let Some((want, limits)) = self.want else {
            return match buffer.is_empty() {
                true => Ok(None),
                false => Err(CodecError::Unsolicited { shown: shown(buffer) }),
            };
        };
        match scan(buffer, &mut self.progress, want, &limits)? {
            Scan::NeedMore { at_least } => {
                // The hint is bounded by the scanner (`MOST_HINT`): no declared length sets memory aside.
                buffer.reserve(at_least);
                Ok(None)
            }
            Scan::Frame { body, consumed } => {
                self.want = None;
                let mut frame = buffer.split_to(consumed.min(buffer.len()));
                frame.truncate(body.end);
                frame.advance(body.start.min(frame.len()));
                Ok(Some(match want {
                    Want::Line => Message::line(&frame),
                    Want::Block { .. } => Message::Block(frame.to_vec()),
                }))
            }
        }
    }

    fn decode_eof(&mut self, buffer: &mut BytesMut) -> Result<Option<Message>, CodecError> {
        match self.decode(buffer)? {
            Some(message) => Ok(Some(message)),
            None if buffer.is_empty() => Ok(None),
            None => Err(CodecError::Cut { bytes: buffer.len() }),
        }
    }
}

impl Encoder<&[u8]> for Codec {
    type Error = CodecError;

    fn encode(&mut self, bytes: &[u8], buffer: &mut BytesMut) -> Result<(), CodecError> {
        buffer.extend_from_slice(bytes);
        Ok(())
    }
}

#[cfg(test)]
mod tests;
