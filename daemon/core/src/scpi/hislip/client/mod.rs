//! The client's side of a HiSLIP connection as a state machine: it says what to send, is told what came, and touches no
//! socket.
//!
//! ```text
//!  new: Initialize ─► InitializeResponse ─► OpenAsync: AsyncInitialize ─► response ─► sizes ─► Ready
//!                                                                                     │        │ ▲
//!                                               the server prefers overlap mode: clear ┘ clear │ │ Cleared
//!   ready ──► AsyncDeviceClear ─► acknowledged ─► DeviceClearComplete ─► acknowledged ─────────┴─┘
//! ```
//!
//! The methods in their families: `request`, `clear`, `ask_status`, `lock` and `unlock` are what a caller wants;
//! [`Client::next_output`] is what must be sent because of it, to be asked after each of them and after each `take`;
//! [`Client::take`] is told every [`Piece`] that came and gives the [`Event`]s.

mod fault;
mod receive;

use std::collections::VecDeque;

pub use fault::Fault;
use fault::Phase;
use receive::Incoming;

use super::header::{Channel, HEADER_BYTES, Header, Kind};

/// The longest message that the server is told to send at once: its data are kept as they come, so that this sets no
/// memory aside; longer replies come in several messages, between which a device clear finds its place.
pub const MAXIMUM_MESSAGE_BYTES: u64 = 1 << 20;

/// The version that is spoken: 1.0, the major number in the high byte.
const VERSION: u16 = 0x0100;

/// The two letters of a client's maker. The IVI Foundation gives them out; these are none of its.
const VENDOR: u16 = u16::from_be_bytes(*b"XX");

/// The number of the first message after the connection was made or cleared.
const FIRST_ID: u32 = 0xFFFF_FF00;

/// The number that a server gives to data while it cannot know the number of their request yet.
const NO_ID: u32 = 0xFFFF_FFFF;

/// The longest sub-address.
const MOST_DEVICE_BYTES: usize = 256;

/// Something that came, as [`super::scan`] gives it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Piece<'b> {
    /// A message begins.
    Head(Header),
    /// Some of its payload.
    Payload {
        /// The bytes.
        bytes: &'b [u8],
        /// Whether the message ends with them.
        last: bool,
    },
}

/// What came of it.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Event {
    /// The device clear is done: nothing of what was said before is under way any more.
    Cleared,
    /// The answer to [`Client::lock`] or [`Client::unlock`].
    Lock(LockAnswer),
    /// The second connection must be made now; what is then to be sent over it waits already.
    OpenAsync,
    /// The connection is ready for requests.
    Ready,
    /// The whole reply to the request under way.
    Reply(Vec<u8>),
    /// The instrument wants service; its status byte.
    ServiceRequest(u8),
    /// A reply to an earlier request was thrown away.
    Stale {
        /// The number of that request.
        id: u32,
    },
    /// The status byte that was asked for.
    Status(u8),
}

/// What a server says to a request for a lock, or to its release.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum LockAnswer {
    /// 0: somebody else holds it and did not let go in time.
    Refused,
    /// 1: the lock is granted, or the exclusive lock is released.
    Done,
    /// 2: the shared lock is released.
    SharedReleased,
    /// 3: that lock is held already, or there is none to release.
    Invalid,
    /// A number that version 1.0 does not have.
    Unknown(u8),
}

impl From<u8> for LockAnswer {
    fn from(code: u8) -> Self {
        match code {
            0 => Self::Refused,
            1 => Self::Done,
            2 => Self::SharedReleased,
            3 => Self::Invalid,
            other => Self::Unknown(other),
        }
    }
}

/// The client's side of one connection.
#[derive(Debug, Clone)]
pub struct Client {
    phase: Phase,
    session: u16,
    output: VecDeque<(Channel, Vec<u8>)>,
    /// The most payload that the server takes in one message.
    most_payload: usize,
    next_id: u32,
    /// The number of the last message sent, which a reply must carry.
    last_id: u32,
    /// The end of a reply was taken since the last message was sent (the standard's RMT-delivered).
    delivered: bool,
    /// How long the reply under way may be; `None` while none is awaited.
    awaited: Option<usize>,
    reply: Vec<u8>,
    sync: Incoming,
    r#async: Incoming,
}

impl Client {
    /// A connection to be made to this sub-address, such as `hislip0`. The first thing to send waits already.
    #[must_use]
    pub fn new(device: &str) -> Self {
        let mut client = Self {
            phase: Phase::Initializing,
            session: 0,
            output: VecDeque::new(),
            most_payload: 0,
            next_id: FIRST_ID,
            last_id: NO_ID,
            delivered: false,
            awaited: None,
            reply: Vec::new(),
            sync: Incoming::default(),
            r#async: Incoming::default(),
        };
        // A sub-address is cut rather than refused: a longer one names no device that there is.
        let device = device.as_bytes();
        let parameter = (u32::from(VERSION) << 16) | u32::from(VENDOR);
        let initialize = Header::new(Kind::Initialize).parameter(parameter);
        client.say(Channel::Sync, initialize, device.get(..MOST_DEVICE_BYTES).unwrap_or(device));
        client
    }

    /// The next thing to send, and over which connection; `None` when there is nothing.
    pub fn next_output(&mut self) -> Option<(Channel, Vec<u8>)> {
        self.output.pop_front()
    }

    /// Whether requests can be made.
    #[must_use]
    pub fn ready(&self) -> bool {
        self.phase == Phase::Ready
    }

    /// Says something to the instrument. `most_reply_bytes` is the longest reply that is taken, or `None` if none is
    /// expected: then whatever comes with this request's number is [`Fault::Unsolicited`].
    ///
    /// # Errors
    /// [`Fault::NotReady`] while the connection is not ready, or another reply is awaited: one request at a time.
    pub fn request(&mut self, message: &[u8], most_reply_bytes: Option<usize>) -> Result<(), Fault> {
        if !self.ready() || self.awaited.is_some() {
            return Err(Fault::NotReady { doing: "a request" });
        }
        self.awaited = most_reply_bytes;
        self.reply.clear();
        let mut rest = message;
        while rest.len() > self.most_payload {
            let (piece, after) = rest.split_at(self.most_payload);
            self.say_numbered(Kind::Data, piece);
            rest = after;
        }
        self.say_numbered(Kind::DataEnd, rest);
        Ok(())
    }

    /// Begins a device clear, which ends with [`Event::Cleared`]. What was under way is given up.
    ///
    /// # Errors
    /// [`Fault::NotReady`] before the connection is ready or while it is being cleared.
    pub fn clear(&mut self) -> Result<(), Fault> {
        if !self.ready() {
            return Err(Fault::NotReady { doing: "a device clear" });
        }
        self.begin_clear(false);
        Ok(())
    }

    /// Asks for the status byte past everything that is under way; the answer is [`Event::Status`].
    ///
    /// # Errors
    /// [`Fault::NotReady`] before the connection is ready or while it is being cleared.
    pub fn ask_status(&mut self) -> Result<(), Fault> {
        if !self.ready() {
            return Err(Fault::NotReady { doing: "a question for the status" });
        }
        let query = Header::new(Kind::AsyncStatusQuery).control(u8::from(self.delivered)).parameter(self.last_id);
        self.say(Channel::Async, query, &[]);
        Ok(())
    }

    /// Asks for the lock that keeps every other client out, for at most `within_ms` milliseconds; the answer is
    /// [`Event::Lock`].
    ///
    /// # Errors
    /// [`Fault::NotReady`] before the connection is ready or while it is being cleared.
    pub fn lock(&mut self, within_ms: u32) -> Result<(), Fault> {
        self.say_lock(1, within_ms)
    }

    /// Gives the lock back; the answer is [`Event::Lock`].
    ///
    /// # Errors
    /// [`Fault::NotReady`] before the connection is ready or while it is being cleared.
    pub fn unlock(&mut self) -> Result<(), Fault> {
        self.say_lock(0, self.last_id)
    }

    fn say_lock(&mut self, control: u8, parameter: u32) -> Result<(), Fault> {
        if !self.ready() {
            return Err(Fault::NotReady { doing: "a lock" });
        }
        self.say(Channel::Async, Header::new(Kind::AsyncLock).control(control).parameter(parameter), &[]);
        Ok(())
    }

    fn begin_clear(&mut self, opening: bool) {
        self.awaited = None;
        self.reply = Vec::new();
        self.phase = Phase::Clearing { acknowledged: false, opening };
        // What is under way on the synchronous connection is given up from here on.
        self.sync.skip();
        self.say(Channel::Async, Header::new(Kind::AsyncDeviceClear), &[]);
    }

    fn say(&mut self, channel: Channel, header: Header, payload: &[u8]) {
        self.output.push_back((channel, header.message(payload)));
    }

    fn say_numbered(&mut self, kind: Kind, payload: &[u8]) {
        self.last_id = self.next_id;
        // The server tells requests by their numbers only; that they begin anew after 2^31 of them does no harm.
        self.next_id = self.next_id.wrapping_add(2);
        let delivered = u8::from(std::mem::take(&mut self.delivered));
        self.say(Channel::Sync, Header::new(kind).control(delivered).parameter(self.last_id), payload);
    }
}

/// The payload that fits into a message of so many bytes. Whether a maximum message size counts the header is read both
/// ways; counting it is right in either.
fn payload_of(size: u64) -> Option<usize> {
    // A server that takes more than can be addressed takes everything.
    let size = usize::try_from(size).unwrap_or(usize::MAX);
    size.checked_sub(HEADER_BYTES).filter(|payload| *payload > 0)
}

#[cfg(test)]
mod tests;
