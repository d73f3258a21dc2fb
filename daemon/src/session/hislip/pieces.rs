//! Bytes on the wire to pieces of HiSLIP messages: a `tokio_util` codec over the core's scanner.

use std::io;

use bytes::BytesMut;
use evenpair_core::scpi::hislip::{Fault, HEADER_BYTES, Header, Scan, ScanState, scan};
use tokio_util::codec::{Decoder, Encoder};

use super::super::codec::CodecError;
use super::super::error::Trouble;

/// A piece of a message that owns its bytes.
#[derive(Debug)]
pub(super) enum Came {
    /// A message begins.
    Head(Header),
    /// Some of its payload.
    Payload {
        /// The bytes.
        bytes: BytesMut,
        /// Whether the message ends with them.
        last: bool,
    },
}

/// Cuts the stream into pieces.
#[derive(Debug, Default)]
pub(super) struct Pieces {
    progress: ScanState,
}

impl From<io::Error> for Trouble {
    fn from(error: io::Error) -> Self {
        CodecError::from(error).into()
    }
}

impl Decoder for Pieces {
    type Item = Came;
    type Error = Trouble;

    fn decode(&mut self, buffer: &mut BytesMut) -> Result<Option<Came>, Trouble> {
        match scan(buffer, &mut self.progress).map_err(Fault::from)? {
            Scan::NeedMore { at_least } => {
                // The hint is bounded by the scanner: no declared length sets memory aside.
                buffer.reserve(at_least);
                Ok(None)
            }
            Scan::Head(header) => {
                drop(buffer.split_to(HEADER_BYTES));
                Ok(Some(Came::Head(header)))
            }
            Scan::Payload { bytes, last } => Ok(Some(Came::Payload { bytes: buffer.split_to(bytes), last })),
        }
    }

    fn decode_eof(&mut self, buffer: &mut BytesMut) -> Result<Option<Came>, Trouble> {
        match self.decode(buffer)? {
            Some(came) => Ok(Some(came)),
            None if buffer.is_empty() => Ok(None),
            // Half a header is no more than an end.
            None => Err(Trouble::PeerClosed),
        }
    }
}

impl Encoder<Vec<u8>> for Pieces {
    type Error = Trouble;

    fn encode(&mut self, bytes: Vec<u8>, buffer: &mut BytesMut) -> Result<(), Trouble> {
        buffer.extend_from_slice(&bytes);
        Ok(())
    }
}
