//! The instruments: what they can do, and the personalities by which they are spoken to.
//!
//! One [`Device`] serves all connections to an instrument: settings, status and pending work are shared, the input buffer
//! and the output queue belong to the connection. What an instrument can do ([`scope`], [`generator`], [`supply`],
//! [`switch`]) knows no header; the personalities ([`standard`], [`terse`], [`wordy`], [`slow`]) are tables of headers
//! with a manner of speaking.

mod bench;
mod core;
#[cfg(test)]
pub(crate) mod fixture;
mod generator;
mod personality;
mod plain;
mod scope;
mod slow;
mod standard;
mod supply;
mod switch;
mod system;
mod terse;
mod tree;
mod wordy;

use std::sync::Arc;
use std::sync::atomic::{AtomicUsize, Ordering};
use std::time::Duration;

use tokio::sync::watch;

pub(crate) use bench::{Bench, lock};

use self::core::Core;
use crate::faults::Faults;
use crate::scenario::{InstrumentSpec, Kind, PersonalitySpec};
use crate::status::{Fault, QUEUE_LENGTH};
use personality::Personality;
use plain::Manner;
use system::System;
use tree::{Bound, Instrument};

/// One instrument.
pub(crate) struct Device {
    identity: String,
    core: Arc<Core>,
    instrument: Arc<dyn Instrument>,
    system: Bound<System>,
    /// How it speaks; none for the exchange of IEEE 488.2.
    manner: Option<&'static Manner>,
    guests: Arc<AtomicUsize>,
}

impl Device {
    /// An instrument as the scenario describes it, just switched on: its outputs are off, its settings those of a reset.
    pub(crate) fn new(spec: &InstrumentSpec, bench: &Arc<Bench>) -> Self {
        match spec.personality {
            PersonalitySpec::Slow => Self::speaking::<slow::Slow>(spec, bench),
            PersonalitySpec::Standard => Self::speaking::<standard::Standard>(spec, bench),
            PersonalitySpec::Terse => Self::speaking::<terse::Terse>(spec, bench),
            PersonalitySpec::Wordy => Self::speaking::<wordy::Wordy>(spec, bench),
        }
    }

    fn speaking<P: Personality>(spec: &InstrumentSpec, bench: &Arc<Bench>) -> Self {
        let core = Arc::new(Core::new(Arc::new(bench.faults(&spec.name))));
        let instrument: Arc<dyn Instrument> = match spec.kind {
            Kind::Generator => Arc::new(Bound::new(generator::Generator::new(Arc::clone(bench)), P::generator())),
            Kind::Scope => {
                let scope = scope::Scope::new(Arc::clone(bench), Arc::clone(&core));
                Arc::new(Bound::with_preset(scope, P::scope(), P::preset_scope))
            }
            Kind::Supply => Arc::new(Bound::new(supply::Supply::new(Arc::clone(bench)), P::supply())),
            Kind::Switch => Arc::new(Bound::new(switch::Switch::new(Arc::clone(bench)), P::switch())),
        };
        instrument.reset();
        let identity = spec.identity.clone().unwrap_or_else(|| {
            let serial = spec.serial.as_deref().unwrap_or("0");
            format!("EVENPAIR-SIM,{},{serial},1.0", kind_name(spec.kind).to_ascii_uppercase())
        });
        let system =
            System { core: Arc::clone(&core), instrument: Arc::clone(&instrument), identity: identity.clone() };
        Self {
            identity,
            core,
            instrument,
            system: Bound::new(system, P::system()),
            manner: P::MANNER,
            guests: Arc::default(),
        }
    }

    /// Carries out one message and returns the reply, which is empty when nothing was asked or the question was wrong.
    ///
    /// A supply's reading waits for an acquisition that is being computed, as both need the world.
    ///
    /// # Cancel safety
    /// Waits only for an acquisition to end; if dropped there, what stood before has been done and the rest is not.
    pub(crate) async fn run(&self, message: &[u8]) -> Vec<u8> {
        let reply = match self.manner {
            None => self.exchange(message).await,
            Some(manner) => self.converse(manner, message).await,
        };
        // Masks, events and the queue of errors may have changed.
        self.core.touch();
        reply
    }

    /// Reports a message that was thrown away because it was too long.
    pub(crate) fn overrun(&self) {
        self.core.report(Fault::InputOverrun);
    }

    /// Reports that a reply was thrown away because the next message came before it was taken. On a raw socket, where
    /// nobody says that a reply was taken, this cannot be seen.
    pub(crate) fn interrupted(&self) {
        self.core.report(Fault::QueryInterrupted);
    }

    /// The status byte with MSS in bit 6, and the mask of `*SRE`.
    pub(crate) fn status_byte(&self, message_available: bool) -> (u8, u8) {
        let status = lock(&self.core.status);
        (status.status_byte(message_available), status.request_enable())
    }

    /// Says that the part of the status that belongs to a connection has changed.
    pub(crate) fn touch_status(&self) {
        self.core.touch();
    }

    /// Notices whenever the status may have changed.
    pub(crate) fn status_changes(&self) -> watch::Receiver<u64> {
        self.core.changes()
    }

    /// What goes wrong with it.
    pub(crate) fn faults(&self) -> &Faults {
        &self.core.faults
    }

    /// Changes whenever it is switched off and on: its connections are gone then.
    pub(crate) fn life(&self) -> watch::Receiver<u64> {
        self.core.life()
    }

    /// Switches it off and on: settings and status are those of the first moment.
    pub(crate) fn reboot(&self) {
        self.instrument.reset();
        self.core.restart();
    }

    /// Lets the error queue run over.
    pub(crate) fn overflow(&self) {
        for _ in 0..=QUEUE_LENGTH {
            self.core.report(Fault::System);
        }
    }

    /// What it says by itself to whoever connects.
    pub(crate) fn greeting(&self) -> Vec<u8> {
        self.manner.map_or_else(Vec::new, |manner| {
            manner.greeting.map_or_else(Vec::new, |text| [text.as_bytes(), manner.ending].concat())
        })
    }

    /// For how long it is deaf after each message.
    pub(crate) fn deafness(&self) -> Option<Duration> {
        self.manner.and_then(|manner| manner.deafness)
    }

    /// Lets a connection in, for as long as the guest is kept; nobody if it serves one client and has it, or
    /// if a fault says so.
    pub(crate) fn admit(&self) -> Option<Guest> {
        if self.core.faults.refuses() {
            return None;
        }
        let before = self.guests.fetch_add(1, Ordering::SeqCst);
        let guest = Guest { guests: Arc::clone(&self.guests) };
        let alone = self.manner.is_some_and(|manner| manner.one_client);
        if alone && before > 0 { None } else { Some(guest) }
    }
}

/// A connection that was let in.
pub(crate) struct Guest {
    guests: Arc<AtomicUsize>,
}

impl Drop for Guest {
    fn drop(&mut self) {
        self.guests.fetch_sub(1, Ordering::SeqCst);
    }
}

/// The name of a kind, as the scenario writes it.
pub(crate) fn kind_name(kind: Kind) -> &'static str {
    match kind {
        Kind::Generator => "generator",
        Kind::Scope => "scope",
        Kind::Supply => "supply",
        Kind::Switch => "switch",
    }
}

#[cfg(test)]
mod tests;
