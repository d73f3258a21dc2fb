//! The instruments: an IEEE 488.2 device around a table of commands.
//!
//! One [`Device`] serves all connections to an instrument: settings, status and pending work are shared, the input buffer
//! and the output queue belong to the connection.

mod bench;
mod core;
mod generator;
mod outputs;
mod scope;
mod supply;
mod switch;
mod system;
mod tree;

use std::sync::Arc;

use tokio::sync::watch;

pub(crate) use bench::{Bench, lock};

use self::core::Core;
use crate::message::{Args, Header, Path, Reply, Unit, Units};
use crate::scenario::{InstrumentSpec, Kind};
use crate::status::Fault;
use system::System;
use tree::{Bound, Call, Instrument};

/// One instrument.
pub(crate) struct Device {
    identity: String,
    core: Arc<Core>,
    instrument: Arc<dyn Instrument>,
    system: Bound<System>,
}

impl Device {
    /// An instrument as the scenario describes it, just switched on: its outputs are off, its settings those of `*RST`.
    pub(crate) fn new(spec: &InstrumentSpec, bench: &Arc<Bench>) -> Self {
        let core = Arc::new(Core::new());
        let instrument: Arc<dyn Instrument> = match spec.kind {
            Kind::Generator => Arc::new(Bound::new(generator::Generator::new(Arc::clone(bench)))),
            Kind::Scope => Arc::new(Bound::new(scope::Scope::new(Arc::clone(bench), Arc::clone(&core)))),
            Kind::Supply => Arc::new(Bound::new(supply::Supply::new(Arc::clone(bench)))),
            Kind::Switch => Arc::new(Bound::new(switch::Switch::new(Arc::clone(bench)))),
        };
        instrument.reset();
        let identity = spec.identity.clone().unwrap_or_else(|| {
            let serial = spec.serial.as_deref().unwrap_or("0");
            format!("EVENPAIR-SIM,{},{serial},1.0", kind_name(spec.kind).to_ascii_uppercase())
        });
        let system = Bound::new(System { core: Arc::clone(&core), instrument: Arc::clone(&instrument) });
        Self { identity, core, instrument, system }
    }

    /// Carries out one program message and returns the response message, which is empty when nothing was asked. Mistakes
    /// go to the error queue: a command error ends the message, any other only the unit it is in.
    ///
    /// A supply's reading waits for an acquisition that is being computed, as both need the world.
    ///
    /// # Cancel safety
    /// Waits only at `*OPC?` and `*WAI`; if dropped there, what stood before has been done and the rest is not.
    pub(crate) async fn run(&self, message: &[u8]) -> Vec<u8> {
        let mut reply = Reply::default();
        let mut path = Path::default();
        for unit in Units::new(message) {
            let done = match unit {
                Ok(unit) if unit.query && reply.is_indefinite() => Err(Fault::QueryAfterIndefinite),
                Ok(unit) => self.execute(unit, &mut path, &mut reply).await,
                Err(fault) => Err(fault),
            };
            if let Err(fault) = done {
                self.core.report(fault);
                if fault.ends_message() {
                    break;
                }
            }
        }
        // Masks, events and the queue of errors may have changed.
        self.core.touch();
        reply.finish()
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

    async fn execute(&self, unit: Unit, path: &mut Path, reply: &mut Reply) -> Result<(), Fault> {
        let mut args = Args::new(unit.data);
        match unit.header {
            Header::Common(name) => {
                if matches!((name.as_str(), unit.query), ("OPC", true) | ("WAI", false)) {
                    self.core.idle().await;
                }
                self.common(&name, unit.query, &mut args, reply)
            }
            Header::Tree { from_root, nodes } => {
                let nodes = path.resolve(from_root, &nodes);
                let mut call = Call { index: 0, args, reply, core: &self.core };
                let done = self.instrument.execute(&nodes, unit.query, &mut call);
                done.or_else(|| self.system.execute(&nodes, unit.query, &mut call))
                    .unwrap_or(Err(Fault::UndefinedHeader))
            }
        }
    }

    /// The common commands (IEEE 488.2 chapter 10, from memory).
    fn common(&self, name: &str, query: bool, args: &mut Args, reply: &mut Reply) -> Result<(), Fault> {
        let mask = match (name, query) {
            ("ESE" | "SRE", false) => args.mask(0xFF)?,
            _ => 0,
        };
        args.finish()?;
        // Both masks have eight bits; `mask` has seen to it.
        let mask = u8::try_from(mask).unwrap_or(u8::MAX);
        let number = match (name, query) {
            ("CLS", false) => {
                self.core.disarm();
                lock(&self.core.status).clear();
                return Ok(());
            }
            ("ESE", false) => {
                lock(&self.core.status).event_enable = mask;
                return Ok(());
            }
            ("ESE", true) => lock(&self.core.status).event_enable,
            ("ESR", true) => lock(&self.core.status).take_events(),
            ("IDN", true) => {
                reply.add_indefinite(self.identity.as_bytes());
                return Ok(());
            }
            ("OPC", false) => {
                self.core.arm();
                return Ok(());
            }
            ("OPC", true) => 1,
            // No options are fitted (IEEE 488.2 10.20).
            ("OPT", true) => 0,
            ("RST", false) => {
                self.core.disarm();
                self.instrument.reset();
                return Ok(());
            }
            ("SRE", false) => {
                lock(&self.core.status).enable_requests(mask);
                return Ok(());
            }
            ("SRE", true) => lock(&self.core.status).request_enable(),
            ("STB", true) => lock(&self.core.status).status_byte(reply.waits()),
            ("TST", true) => 0,
            ("WAI", false) => return Ok(()),
            _ => return Err(Fault::UndefinedHeader),
        };
        reply.add(number.to_string().as_bytes());
        Ok(())
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
