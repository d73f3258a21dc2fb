//! What all kinds of instruments have: identity, status, errors, reset.

use std::sync::Arc;

use super::bench::lock;
use super::core::Core;
use super::tree::{Call, Instrument, Model};
use crate::status::{Fault, Register, Status};

/// Largest mask a 16-bit register takes: bit 15 is never used.
const LARGEST_MASK: u16 = 0x7FFF;

/// The part of an instrument that all kinds have.
pub(crate) struct System {
    /// The instrument's status.
    pub(crate) core: Arc<Core>,
    /// The instrument itself, for a reset.
    pub(crate) instrument: Arc<dyn Instrument>,
    /// Who it says it is.
    pub(crate) identity: String,
}

impl Model for System {
    type Settings = Status;

    fn with<R>(&self, act: impl FnOnce(&mut Status) -> R) -> R {
        act(&mut lock(&self.core.status))
    }

    fn reset(&self) {}
}

impl System {
    /// Answers with what `text` makes of the status.
    pub(crate) fn tell(&self, call: &mut Call<'_>, text: impl FnOnce(&mut Status) -> String) -> Result<(), Fault> {
        call.args.finish()?;
        let text = self.with(text);
        call.answer(text);
        Ok(())
    }

    /// Answers with a register.
    pub(crate) fn register(&self, call: &mut Call<'_>, value: fn(&mut Status) -> u16) -> Result<(), Fault> {
        self.tell(call, |status| value(status).to_string())
    }

    /// Sets a mask of a register group.
    pub(crate) fn mask(
        &self,
        call: &mut Call<'_>,
        group: fn(&mut Status) -> &mut Register,
        part: fn(&mut Register) -> &mut u16,
    ) -> Result<(), Fault> {
        let mask = call.args.mask(LARGEST_MASK)?;
        call.args.finish()?;
        self.with(|status| *part(group(status)) = mask);
        Ok(())
    }
}

/// Answers with the identity.
pub(crate) fn identity(system: &System, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    call.answer(&system.identity);
    Ok(())
}

/// Resets the instrument.
pub(crate) fn reset(system: &System, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    system.core.disarm();
    system.instrument.reset();
    Ok(())
}

/// Clears events and errors.
pub(crate) fn clear(system: &System, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    system.core.disarm();
    system.with(Status::clear);
    Ok(())
}
