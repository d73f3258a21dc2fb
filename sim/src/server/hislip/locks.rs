//! Who may speak to an instrument: one client alone (exclusive lock), or those who know a name (shared lock).
//!
//! After IVI-6.1, lock transactions (from memory). A client that holds the shared lock may take the exclusive one on top.

use std::collections::BTreeSet;
use std::time::Duration;

use tokio::sync::watch;

/// Control codes of `AsyncLockResponse`.
pub(super) mod answer {
    /// The lock was not to be had in time.
    pub(in super::super) const REFUSED: u8 = 0;
    /// The lock is granted, or the exclusive lock released.
    pub(in super::super) const DONE: u8 = 1;
    /// The shared lock is released.
    pub(in super::super) const SHARED_RELEASED: u8 = 2;
    /// It is held already, or there is none to release.
    pub(in super::super) const INVALID: u8 = 3;
}

/// The locks of one instrument.
#[derive(Debug, Default)]
pub(super) struct Locks {
    held: watch::Sender<Held>,
}

#[derive(Debug, Default)]
struct Held {
    exclusive: Option<u16>,
    name: Vec<u8>,
    shared: BTreeSet<u16>,
}

impl Held {
    /// Tries to grant; `None` if it must wait.
    fn grant(&mut self, client: u16, name: &[u8]) -> Option<u8> {
        let ours = self.shared.contains(&client);
        if self.exclusive == Some(client) || (ours && !name.is_empty()) {
            return Some(answer::INVALID);
        }
        if self.exclusive.is_some() || (!self.shared.is_empty() && !ours && self.name != name) {
            return None;
        }
        if name.is_empty() {
            self.exclusive = Some(client);
        } else {
            self.name = name.to_vec();
            self.shared.insert(client);
        }
        Some(answer::DONE)
    }

    fn release(&mut self, client: u16) -> u8 {
        if self.exclusive == Some(client) {
            self.exclusive = None;
            return answer::DONE;
        }
        if self.shared.remove(&client) { answer::SHARED_RELEASED } else { answer::INVALID }
    }

    fn admits(&self, client: u16) -> bool {
        match self.exclusive {
            Some(holder) => holder == client,
            None => self.shared.is_empty() || self.shared.contains(&client),
        }
    }
}

impl Locks {
    /// Asks for a lock, shared if it has a name, and waits no longer than `within`.
    pub(super) async fn request(&self, client: u16, name: &[u8], within: Duration) -> u8 {
        let mut changes = self.held.subscribe();
        let granted = async {
            loop {
                let mut answer = None;
                self.held.send_if_modified(|held| {
                    answer = held.grant(client, name);
                    answer == Some(answer::DONE)
                });
                match answer {
                    Some(answer) => return answer,
                    // The sender lives in `self`.
                    None => drop(changes.changed().await),
                }
            }
        };
        tokio::time::timeout(within, granted).await.unwrap_or(answer::REFUSED)
    }

    /// Gives back the exclusive lock, or else the shared one.
    pub(super) fn release(&self, client: u16) -> u8 {
        let mut answer = answer::INVALID;
        self.held.send_modify(|held| answer = held.release(client));
        answer
    }

    /// Gives back whatever a client that is gone still held.
    pub(super) fn forget(&self, client: u16) {
        while self.release(client) != answer::INVALID {}
    }

    /// Waits until a client may speak.
    pub(super) async fn admitted(&self, client: u16) {
        let mut changes = self.held.subscribe();
        // The sender lives in `self`.
        let _ = changes.wait_for(|held| held.admits(client)).await;
    }

    /// Whether somebody holds the exclusive lock, and how many clients hold any.
    pub(super) fn info(&self) -> (bool, u32) {
        let held = self.held.borrow();
        let more = held.exclusive.iter().filter(|holder| !held.shared.contains(holder)).count();
        (held.exclusive.is_some(), u32::try_from(held.shared.len() + more).unwrap_or(u32::MAX))
    }
}
