//! HiSLIP (IVI-6.1, version 1.0; everything from memory of the standard): a server of the one sub-address `hislip0`, in
//! synchronised mode only. It shares no code with the client that it serves to test.
//!
//! A client has two connections. The first thing on the first is `Initialize`, whose answer carries a number; the first
//! thing on the second is `AsyncInitialize` with that number. Either one's end is the end of both.

mod channels;
mod locks;
mod session;
mod wire;

use std::collections::BTreeMap;
use std::io;
use std::sync::{Arc, Mutex};

use tokio::io::{AsyncRead, AsyncWrite, split};

use self::channels::{deliver, serve_async, serve_sync, watch_status};
use self::locks::Locks;
use self::session::Session;
use self::wire::{Frame, Got, kind};
use crate::instrument::{Device, lock};

/// The one sub-address.
pub(crate) const SUB_ADDRESS: &str = "hislip0";

/// Version 1.0.
const VERSION: u16 = 0x0100;

/// The two letters of a server's maker; these are nobody's.
const VENDOR: u32 = u16::from_be_bytes(*b"ZZ") as u32;

/// Clients at once.
const MOST_CLIENTS: usize = 16;

/// One instrument's server.
pub(crate) struct Server {
    device: Arc<Device>,
    clients: Mutex<Clients>,
    locks: Locks,
}

#[derive(Default)]
struct Clients {
    last: u16,
    sessions: BTreeMap<u16, Arc<Session>>,
}

impl Server {
    /// Nobody is there yet.
    pub(crate) fn new(device: Arc<Device>) -> Self {
        Self { device, clients: Mutex::default(), locks: Locks::default() }
    }

    /// Serves one connection, whichever of the two it is, until it ends.
    ///
    /// # Errors
    /// When reading or writing fails.
    pub(crate) async fn converse(self: &Arc<Self>, stream: impl AsyncRead + AsyncWrite + Unpin) -> io::Result<()> {
        let (mut from, mut to) = split(stream);
        let frame = match wire::read(&mut from).await? {
            Got::End => return Ok(()),
            Got::Frame(frame) => frame,
            Got::Garbage => return wire::write(&mut to, &Frame::error(kind::FATAL_ERROR, wire::POOR_HEADER)).await,
            Got::TooLarge(_) => return wire::write(&mut to, &Frame::error(kind::FATAL_ERROR, wire::BAD_START)).await,
        };
        let served = match frame.kind {
            kind::INITIALIZE => self.open(&frame),
            kind::ASYNC_INITIALIZE => self.join(&frame),
            kind::DATA | kind::DATA_END | kind::TRIGGER => Err(wire::ONE_CHANNEL),
            _ => Err(wire::BAD_START),
        };
        let (session, inbox) = match served {
            Ok(served) => served,
            Err(why) => return wire::write(&mut to, &Frame::error(kind::FATAL_ERROR, why)).await,
        };
        let Some(inbox) = inbox else {
            let [high, low, ..] = frame.parameter.to_be_bytes();
            let version = u16::from_be_bytes([high, low]).min(VERSION);
            let parameter = (u32::from(version) << 16) | u32::from(session.id);
            // Control code 0: synchronised mode.
            let welcome = Frame::new(kind::INITIALIZE_RESPONSE, 0, parameter);
            let serve = async {
                wire::write(&mut to, &welcome).await?;
                serve_sync(self, &session, from, &mut to).await
            };
            let outcome = tokio::select! {
                biased;
                () = session.over.cancelled() => Ok(()),
                outcome = serve => outcome,
            };
            self.close(&session);
            return outcome;
        };
        let serve = async {
            wire::write(&mut to, &Frame::new(kind::ASYNC_INITIALIZE_RESPONSE, 0, VENDOR)).await?;
            tokio::select! {
                outcome = serve_async(self, &session, from) => outcome,
                outcome = deliver(inbox, &mut to) => outcome,
                () = watch_status(&session) => Ok(()),
            }
        };
        let outcome = tokio::select! {
            biased;
            () = session.over.cancelled() => Ok(()),
            outcome = serve => outcome,
        };
        self.close(&session);
        outcome
    }

    fn open(&self, frame: &Frame) -> Result<Opened, (u8, &'static str)> {
        // Sub-addresses are compared without regard to case; none at all means the first.
        if !frame.payload.is_empty() && !frame.payload.eq_ignore_ascii_case(SUB_ADDRESS.as_bytes()) {
            return Err((0, "there is no such sub-address"));
        }
        let mut clients = lock(&self.clients);
        if clients.sessions.len() >= MOST_CLIENTS {
            return Err(wire::TOO_MANY);
        }
        let id = loop {
            clients.last = clients.last.wrapping_add(1);
            if !clients.sessions.contains_key(&clients.last) {
                break clients.last;
            }
        };
        let session = Arc::new(Session::new(id, Arc::clone(&self.device)));
        clients.sessions.insert(id, Arc::clone(&session));
        Ok((session, None))
    }

    fn join(&self, frame: &Frame) -> Result<Opened, (u8, &'static str)> {
        let id = u16::try_from(frame.parameter).map_err(|_| wire::BAD_START)?;
        let session = lock(&self.clients).sessions.get(&id).cloned().ok_or(wire::BAD_START)?;
        let inbox = session.take_inbox().ok_or(wire::BAD_START)?;
        Ok((session, Some(inbox)))
    }

    fn close(&self, session: &Session) {
        session.over.cancel();
        lock(&self.clients).sessions.remove(&session.id);
        self.locks.forget(session.id);
    }
}

/// A client, and what waits for its asynchronous connection if this is that one.
type Opened = (Arc<Session>, Option<tokio::sync::mpsc::Receiver<Frame>>);

#[cfg(test)]
mod tests;
