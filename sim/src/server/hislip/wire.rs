//! HiSLIP messages as bytes (IVI-6.1, message header and tables of types and codes; from memory).

use std::io;

use tokio::io::{AsyncRead, AsyncReadExt, AsyncWrite, AsyncWriteExt};

/// Types of messages that this server takes or says.
pub(super) mod kind {
    pub(in super::super) const INITIALIZE: u8 = 0;
    pub(in super::super) const INITIALIZE_RESPONSE: u8 = 1;
    pub(in super::super) const FATAL_ERROR: u8 = 2;
    pub(in super::super) const ERROR: u8 = 3;
    pub(in super::super) const ASYNC_LOCK: u8 = 4;
    pub(in super::super) const ASYNC_LOCK_RESPONSE: u8 = 5;
    pub(in super::super) const DATA: u8 = 6;
    pub(in super::super) const DATA_END: u8 = 7;
    pub(in super::super) const DEVICE_CLEAR_COMPLETE: u8 = 8;
    pub(in super::super) const DEVICE_CLEAR_ACKNOWLEDGE: u8 = 9;
    pub(in super::super) const ASYNC_REMOTE_LOCAL_CONTROL: u8 = 10;
    pub(in super::super) const ASYNC_REMOTE_LOCAL_RESPONSE: u8 = 11;
    pub(in super::super) const TRIGGER: u8 = 12;
    pub(in super::super) const INTERRUPTED: u8 = 13;
    pub(in super::super) const ASYNC_INTERRUPTED: u8 = 14;
    pub(in super::super) const ASYNC_MAXIMUM_MESSAGE_SIZE: u8 = 15;
    pub(in super::super) const ASYNC_MAXIMUM_MESSAGE_SIZE_RESPONSE: u8 = 16;
    pub(in super::super) const ASYNC_INITIALIZE: u8 = 17;
    pub(in super::super) const ASYNC_INITIALIZE_RESPONSE: u8 = 18;
    pub(in super::super) const ASYNC_DEVICE_CLEAR: u8 = 19;
    pub(in super::super) const ASYNC_SERVICE_REQUEST: u8 = 20;
    pub(in super::super) const ASYNC_STATUS_QUERY: u8 = 21;
    pub(in super::super) const ASYNC_STATUS_RESPONSE: u8 = 22;
    pub(in super::super) const ASYNC_DEVICE_CLEAR_ACKNOWLEDGE: u8 = 23;
    pub(in super::super) const ASYNC_LOCK_INFO: u8 = 24;
    pub(in super::super) const ASYNC_LOCK_INFO_RESPONSE: u8 = 25;
    /// From here on types belong to the makers.
    pub(in super::super) const FIRST_VENDOR: u8 = 128;
}

/// Why a message was thrown away: control code and words of an `Error`.
pub(super) const UNRECOGNIZED_TYPE: (u8, &str) = (1, "unrecognized message type");
/// See [`UNRECOGNIZED_TYPE`].
pub(super) const UNRECOGNIZED_CONTROL: (u8, &str) = (2, "unrecognized control code");
/// See [`UNRECOGNIZED_TYPE`].
pub(super) const UNRECOGNIZED_VENDOR: (u8, &str) = (3, "unrecognized vendor-defined message");
/// See [`UNRECOGNIZED_TYPE`].
pub(super) const TOO_LARGE: (u8, &str) = (4, "message too large");

/// Why a connection is given up: control code and words of a `FatalError`.
pub(super) const POOR_HEADER: (u8, &str) = (1, "poorly formed message header");
/// See [`POOR_HEADER`].
pub(super) const ONE_CHANNEL: (u8, &str) = (2, "attempt to use the connection without both channels established");
/// See [`POOR_HEADER`].
pub(super) const BAD_START: (u8, &str) = (3, "invalid initialization sequence");
/// See [`POOR_HEADER`].
pub(super) const TOO_MANY: (u8, &str) = (4, "as many clients as the server can take");

/// The largest message that is taken, header included: four times the longest program message, and a bound on what a
/// connection can make us hold.
pub(super) const LARGEST: usize = 256 * 1024;

/// The length of a header.
pub(super) const HEADER: usize = 16;

/// A message.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Frame {
    pub(super) kind: u8,
    pub(super) control: u8,
    pub(super) parameter: u32,
    pub(super) payload: Vec<u8>,
}

impl Frame {
    /// A message without payload.
    pub(super) fn new(kind: u8, control: u8, parameter: u32) -> Self {
        Self { kind, control, parameter, payload: Vec::new() }
    }

    /// With a payload.
    pub(super) fn with(self, payload: impl Into<Vec<u8>>) -> Self {
        Self { payload: payload.into(), ..self }
    }

    /// `Error` or `FatalError`.
    pub(super) fn error(kind: u8, (code, words): (u8, &str)) -> Self {
        Self::new(kind, code, 0).with(words)
    }

    /// What is to be said about a message of a type that has no place.
    pub(super) fn unrecognized(kind: u8) -> Self {
        let why = if kind < kind::FIRST_VENDOR { UNRECOGNIZED_TYPE } else { UNRECOGNIZED_VENDOR };
        Self::error(kind::ERROR, why)
    }

    /// As it goes over the wire.
    pub(super) fn bytes(&self) -> Vec<u8> {
        let mut bytes = b"HS".to_vec();
        bytes.push(self.kind);
        bytes.push(self.control);
        bytes.extend(self.parameter.to_be_bytes());
        bytes.extend((self.payload.len() as u64).to_be_bytes());
        bytes.extend(&self.payload);
        bytes
    }
}

/// What a look at a connection gave.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) enum Got {
    /// The peer closed it.
    End,
    /// A message.
    Frame(Frame),
    /// A message of more than [`LARGEST`] bytes, which was thrown away; its type.
    TooLarge(u8),
    /// Something that does not begin with `HS`.
    Garbage,
}

/// Reads one message. Of a payload that is too large nothing is kept.
///
/// # Errors
/// When reading fails.
pub(super) async fn read(stream: &mut (impl AsyncRead + Unpin)) -> io::Result<Got> {
    // The first two bytes alone: whoever says something else may say less than a header.
    let mut prologue = [0; 2];
    let mut head = [0; HEADER - 2];
    for part in [prologue.as_mut_slice(), head.as_mut_slice()] {
        match stream.read_exact(part).await {
            Err(error) if error.kind() == io::ErrorKind::UnexpectedEof => return Ok(Got::End),
            outcome => outcome?,
        };
        if part.len() == 2 && part != b"HS" {
            return Ok(Got::Garbage);
        }
    }
    let [kind, control, p0, p1, p2, p3, length @ ..] = head;
    let length = u64::from_be_bytes(length);
    if length > (LARGEST - HEADER) as u64 {
        let passed = tokio::io::copy(&mut stream.take(length), &mut tokio::io::sink()).await?;
        return Ok(if passed < length { Got::End } else { Got::TooLarge(kind) });
    }
    let mut payload = Vec::new();
    // Grows with what comes, not with what was said.
    stream.take(length).read_to_end(&mut payload).await?;
    if (payload.len() as u64) < length {
        return Ok(Got::End);
    }
    Ok(Got::Frame(Frame { kind, control, parameter: u32::from_be_bytes([p0, p1, p2, p3]), payload }))
}

/// Writes one message.
///
/// # Errors
/// When writing fails.
pub(super) async fn write(stream: &mut (impl AsyncWrite + Unpin), frame: &Frame) -> io::Result<()> {
    stream.write_all(&frame.bytes()).await
}
