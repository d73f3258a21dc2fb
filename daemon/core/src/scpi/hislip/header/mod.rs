//! The sixteen bytes that begin every message: `HS`, type, control code, parameter (32 bits), payload length (64 bits),
//! all of them with the high byte first.

/// How long a header is.
pub const HEADER_BYTES: usize = 16;

/// How a header begins.
pub(super) const PROLOGUE: [u8; 2] = *b"HS";

/// Which of the two connections.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Channel {
    /// The one that carries what is said to the instrument and what it answers.
    Sync,
    /// The one for clearing, status, service requests and locks.
    Async,
}

/// The type of a message. Those of version 1.0 have names; others keep their number.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
#[allow(missing_docs)] // The names are the standard's, in its order.
pub enum Kind {
    Initialize,
    InitializeResponse,
    FatalError,
    Error,
    AsyncLock,
    AsyncLockResponse,
    Data,
    DataEnd,
    DeviceClearComplete,
    DeviceClearAcknowledge,
    AsyncRemoteLocalControl,
    AsyncRemoteLocalResponse,
    Trigger,
    Interrupted,
    AsyncInterrupted,
    AsyncMaximumMessageSize,
    AsyncMaximumMessageSizeResponse,
    AsyncInitialize,
    AsyncInitializeResponse,
    AsyncDeviceClear,
    AsyncServiceRequest,
    AsyncStatusQuery,
    AsyncStatusResponse,
    AsyncDeviceClearAcknowledge,
    AsyncLockInfo,
    AsyncLockInfoResponse,
    /// Later versions of the standard (up to 127) or a maker's own (from 128).
    Unknown(u8),
}

/// The types in the order of their numbers, from 0.
const KINDS: [Kind; 26] = [
    Kind::Initialize,
    Kind::InitializeResponse,
    Kind::FatalError,
    Kind::Error,
    Kind::AsyncLock,
    Kind::AsyncLockResponse,
    Kind::Data,
    Kind::DataEnd,
    Kind::DeviceClearComplete,
    Kind::DeviceClearAcknowledge,
    Kind::AsyncRemoteLocalControl,
    Kind::AsyncRemoteLocalResponse,
    Kind::Trigger,
    Kind::Interrupted,
    Kind::AsyncInterrupted,
    Kind::AsyncMaximumMessageSize,
    Kind::AsyncMaximumMessageSizeResponse,
    Kind::AsyncInitialize,
    Kind::AsyncInitializeResponse,
    Kind::AsyncDeviceClear,
    Kind::AsyncServiceRequest,
    Kind::AsyncStatusQuery,
    Kind::AsyncStatusResponse,
    Kind::AsyncDeviceClearAcknowledge,
    Kind::AsyncLockInfo,
    Kind::AsyncLockInfoResponse,
];

impl From<u8> for Kind {
    fn from(number: u8) -> Self {
        KINDS.get(usize::from(number)).copied().unwrap_or(Self::Unknown(number))
    }
}

impl From<Kind> for u8 {
    fn from(kind: Kind) -> Self {
        match kind {
            Kind::Unknown(number) => number,
            // The table holds every other kind and has 26 rows.
            kind => KINDS.iter().zip(0..).find_map(|(known, number)| (*known == kind).then_some(number)).unwrap_or(0),
        }
    }
}

/// A message without its payload.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Header {
    /// The type.
    pub kind: Kind,
    /// What it means depends on the type.
    pub control: u8,
    /// What it means depends on the type; for data it is the message's number.
    pub parameter: u32,
    /// How many bytes of payload follow.
    pub length: u64,
}

impl Header {
    /// A header for a message of that type with neither control code, parameter nor payload.
    #[must_use]
    pub fn new(kind: Kind) -> Self {
        Self { kind, control: 0, parameter: 0, length: 0 }
    }

    /// With this control code.
    #[must_use]
    pub fn control(self, control: u8) -> Self {
        Self { control, ..self }
    }

    /// With this parameter.
    #[must_use]
    pub fn parameter(self, parameter: u32) -> Self {
        Self { parameter, ..self }
    }

    /// The bytes of the whole message; the length is the payload's, whatever the header said.
    #[must_use]
    pub fn message(self, payload: &[u8]) -> Vec<u8> {
        let mut bytes = Vec::with_capacity(HEADER_BYTES + payload.len());
        bytes.extend_from_slice(&PROLOGUE);
        bytes.extend_from_slice(&[u8::from(self.kind), self.control]);
        bytes.extend_from_slice(&self.parameter.to_be_bytes());
        bytes.extend_from_slice(&(payload.len() as u64).to_be_bytes());
        bytes.extend_from_slice(payload);
        bytes
    }

    /// Reads a header; `None` when the bytes do not begin one.
    #[must_use]
    pub fn read(bytes: &[u8; HEADER_BYTES]) -> Option<Self> {
        let [h, s, kind, control, p0, p1, p2, p3, l0, l1, l2, l3, l4, l5, l6, l7] = *bytes;
        ([h, s] == PROLOGUE).then(|| Self {
            kind: kind.into(),
            control,
            parameter: u32::from_be_bytes([p0, p1, p2, p3]),
            length: u64::from_be_bytes([l0, l1, l2, l3, l4, l5, l6, l7]),
        })
    }
}

/// The control code of an `Error` message: the message that it is about was thrown away, and nothing else happened.
#[derive(Debug, Clone, Copy, PartialEq, Eq, thiserror::Error)]
pub enum ErrorCode {
    /// 0.
    #[error("unidentified error")]
    Unidentified,
    /// 1.
    #[error("unrecognized message type")]
    UnrecognizedType,
    /// 2.
    #[error("unrecognized control code")]
    UnrecognizedControl,
    /// 3.
    #[error("unrecognized vendor-defined message")]
    UnrecognizedVendor,
    /// 4.
    #[error("message too large")]
    TooLarge,
    /// A code that version 1.0 does not have.
    #[error("error {0}")]
    Unknown(u8),
}

impl From<u8> for ErrorCode {
    fn from(code: u8) -> Self {
        match code {
            0 => Self::Unidentified,
            1 => Self::UnrecognizedType,
            2 => Self::UnrecognizedControl,
            3 => Self::UnrecognizedVendor,
            4 => Self::TooLarge,
            other => Self::Unknown(other),
        }
    }
}

impl From<ErrorCode> for u8 {
    fn from(code: ErrorCode) -> Self {
        match code {
            ErrorCode::Unidentified => 0,
            ErrorCode::UnrecognizedType => 1,
            ErrorCode::UnrecognizedControl => 2,
            ErrorCode::UnrecognizedVendor => 3,
            ErrorCode::TooLarge => 4,
            ErrorCode::Unknown(other) => other,
        }
    }
}

/// The control code of a `FatalError` message: whoever sent it closes both connections.
#[derive(Debug, Clone, Copy, PartialEq, Eq, thiserror::Error)]
pub enum FatalCode {
    /// 0.
    #[error("unidentified error")]
    Unidentified,
    /// 1.
    #[error("poorly formed message header")]
    PoorHeader,
    /// 2.
    #[error("attempt to use the connection without both channels established")]
    OneChannel,
    /// 3.
    #[error("invalid initialization sequence")]
    Initialization,
    /// 4.
    #[error("the server has as many clients as it can take")]
    TooManyClients,
    /// A code that version 1.0 does not have.
    #[error("error {0}")]
    Unknown(u8),
}

impl From<u8> for FatalCode {
    fn from(code: u8) -> Self {
        match code {
            0 => Self::Unidentified,
            1 => Self::PoorHeader,
            2 => Self::OneChannel,
            3 => Self::Initialization,
            4 => Self::TooManyClients,
            other => Self::Unknown(other),
        }
    }
}

#[cfg(test)]
mod tests;
