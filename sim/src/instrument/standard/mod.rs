//! The standard personality: the message exchange of IEEE 488.2 and the headers of SCPI-99's instrument classes.

mod generator;
mod scope;
mod supply;
mod switch;
mod system;

use super::bench::lock;
use super::personality::Personality;
use super::plain::Manner;
use super::system::System;
use super::tree::{Call, Instrument, Table};
use super::{Device, generator::Generator, scope::Scope, supply::Supply, switch::Switch};
use crate::message::{Args, Header, Path, Reply, Unit, Units};
use crate::status::Fault;

/// The headers of SCPI-99's instrument classes.
pub(crate) struct Standard;

impl Personality for Standard {
    const MANNER: Option<&'static Manner> = None;

    fn generator() -> Table<Generator> {
        generator::table()
    }

    fn scope() -> Table<Scope> {
        scope::table()
    }

    fn supply() -> Table<Supply> {
        supply::table()
    }

    fn switch() -> Table<Switch> {
        switch::table()
    }

    fn system() -> Table<System> {
        system::table()
    }
}

impl Device {
    /// Carries out one program message and returns the response message, which is empty when nothing was asked. Mistakes
    /// go to the error queue: a command error ends the message, any other only the unit it is in.
    ///
    /// # Cancel safety
    /// Waits only at `*OPC?` and `*WAI`; if dropped there, what stood before has been done and the rest is not.
    pub(super) async fn exchange(&self, message: &[u8]) -> Vec<u8> {
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
        reply.finish()
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
                let mut call = Call { index: 0, args, reply, units: false, core: &self.core };
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
