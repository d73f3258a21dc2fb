//! What both connections of one client share.

use std::sync::{Arc, Mutex};

use tokio::sync::{mpsc, watch};
use tokio_util::sync::CancellationToken;

use super::wire::{Frame, HEADER, kind};
use crate::instrument::{Device, lock};
use crate::status::byte;

/// Messages that may wait for the asynchronous connection: a client that does not read holds up only itself.
const WAITING: usize = 16;

/// Bytes of a message as long as a client has not said how many it takes.
const FIRST_SIZE: usize = 64 * 1024;

/// One client.
pub(super) struct Session {
    pub(super) id: u16,
    pub(super) device: Arc<Device>,
    /// Ends everything that belongs to it.
    pub(super) over: CancellationToken,
    /// Where messages for its asynchronous connection go.
    pub(super) outbox: mpsc::Sender<Frame>,
    /// A device clear is under way.
    pub(super) clearing: watch::Sender<bool>,
    state: Mutex<State>,
}

struct State {
    /// The other end of the outbox, until the asynchronous connection is there.
    inbox: Option<mpsc::Receiver<Frame>>,
    /// A reply was said and the client has not said that it took it.
    unread: bool,
    /// Payload that the client takes in one message.
    most_payload: usize,
    /// Enabled bits of the status byte when they were last looked at.
    enabled: u8,
    /// A service request was made and the status not read since (the RQS bit).
    requested: bool,
}

impl Session {
    pub(super) fn new(id: u16, device: Arc<Device>) -> Self {
        let (outbox, inbox) = mpsc::channel(WAITING);
        let state = State { inbox: Some(inbox), unread: false, most_payload: FIRST_SIZE, enabled: 0, requested: false };
        let (over, clearing) = (CancellationToken::new(), watch::Sender::new(false));
        Self { id, device, over, outbox, clearing, state: Mutex::new(state) }
    }

    /// What waits for the asynchronous connection; only the first that asks gets it.
    pub(super) fn take_inbox(&self) -> Option<mpsc::Receiver<Frame>> {
        lock(&self.state).inbox.take()
    }

    /// Whether both connections are there.
    pub(super) fn complete(&self) -> bool {
        lock(&self.state).inbox.is_none()
    }

    /// The client takes messages of so many bytes. Whether that counts the header can be read both ways.
    pub(super) fn set_size(&self, size: u64) {
        let size = usize::try_from(size).unwrap_or(usize::MAX);
        lock(&self.state).most_payload = size.saturating_sub(HEADER).max(1);
    }

    pub(super) fn most_payload(&self) -> usize {
        lock(&self.state).most_payload
    }

    /// A reply goes out.
    pub(super) fn replied(&self) {
        lock(&self.state).unread = true;
        self.device.touch_status();
    }

    /// The client says something; true if it had not taken the reply before (the standard's interrupted error).
    pub(super) fn interrupts(&self, delivered: bool) -> bool {
        let unread = std::mem::take(&mut lock(&self.state).unread);
        self.device.touch_status();
        unread && !delivered
    }

    /// Forgets the reply that waits, in a device clear.
    pub(super) fn forget_reply(&self) {
        lock(&self.state).unread = false;
    }

    /// A new reason for service, as the message to be said about it (488.2, 11.3.3, from memory: each enabled bit that
    /// becomes true is one).
    pub(super) fn service_request(&self) -> Option<Frame> {
        let mut state = lock(&self.state);
        let (status, mask) = self.device.status_byte(state.unread);
        let enabled = status & mask;
        let new = enabled & !std::mem::replace(&mut state.enabled, enabled);
        if new == 0 {
            return None;
        }
        state.requested = true;
        Some(Frame::new(kind::ASYNC_SERVICE_REQUEST, status | byte::MASTER, 0))
    }

    /// The status byte as a serial poll gives it: bit 6 is the request, which reading takes back.
    pub(super) fn poll_status(&self, delivered: bool) -> u8 {
        let mut state = lock(&self.state);
        state.unread &= !delivered;
        let (status, _) = self.device.status_byte(state.unread);
        let requested = std::mem::take(&mut state.requested);
        (status & !byte::MASTER) | if requested { byte::MASTER } else { 0 }
    }
}
