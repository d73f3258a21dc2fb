//! `STATus` and `SYSTem`: the commands that SCPI-99 wants of every instrument (vol. 1, 4.2.1; from memory).

use std::sync::Arc;

use super::bench::lock;
use super::core::Core;
use super::tree::{Action, Call, Instrument, Model};
use crate::status::{Fault, Register, Status};

/// Largest mask a 16-bit register takes: bit 15 is never used.
const LARGEST_MASK: u16 = 0x7FFF;

/// The part of an instrument that all kinds have.
pub(crate) struct System {
    /// The instrument's status.
    pub(crate) core: Arc<Core>,
    /// The instrument itself, for `SYSTem:PRESet`.
    pub(crate) instrument: Arc<dyn Instrument>,
}

impl Model for System {
    type Settings = Status;

    fn with<R>(&self, act: impl FnOnce(&mut Status) -> R) -> R {
        act(&mut lock(&self.core.status))
    }

    fn reset(&self) {}

    fn commands() -> Vec<(&'static str, Action<Self>)> {
        use Action::{Command, Query};
        vec![
            (":SYSTem:ERRor[:NEXT]", Query(next_error)),
            (":SYSTem:ERRor:COUNt", Query(|system, call| system.tell(call, |status| status.error_count().to_string()))),
            (":SYSTem:PRESet", Command(preset_instrument)),
            (":SYSTem:VERSion", Query(|system, call| system.tell(call, |_| "1999.0".to_owned()))),
            (":STATus:PRESet", Command(preset_status)),
            (":STATus:OPERation[:EVENt]", Query(|s, call| s.register(call, |status| status.operation.take_events()))),
            (":STATus:OPERation:CONDition", Query(|s, call| s.register(call, |status| status.operation.condition()))),
            (":STATus:OPERation:ENABle", Query(|s, call| s.register(call, |status| status.operation.enable))),
            (":STATus:OPERation:ENABle", Command(|s, call| s.mask(call, |status| &mut status.operation, enable))),
            (":STATus:OPERation:PTRansition", Query(|s, call| s.register(call, |status| status.operation.positive))),
            (
                ":STATus:OPERation:PTRansition",
                Command(|s, call| s.mask(call, |status| &mut status.operation, positive)),
            ),
            (":STATus:OPERation:NTRansition", Query(|s, call| s.register(call, |status| status.operation.negative))),
            (
                ":STATus:OPERation:NTRansition",
                Command(|s, call| s.mask(call, |status| &mut status.operation, negative)),
            ),
            (
                ":STATus:QUEStionable[:EVENt]",
                Query(|s, call| s.register(call, |status| status.questionable.take_events())),
            ),
            (
                ":STATus:QUEStionable:CONDition",
                Query(|s, call| s.register(call, |status| status.questionable.condition())),
            ),
            (":STATus:QUEStionable:ENABle", Query(|s, call| s.register(call, |status| status.questionable.enable))),
            (":STATus:QUEStionable:ENABle", Command(|s, call| s.mask(call, |status| &mut status.questionable, enable))),
            (
                ":STATus:QUEStionable:PTRansition",
                Query(|s, call| s.register(call, |status| status.questionable.positive)),
            ),
            (
                ":STATus:QUEStionable:PTRansition",
                Command(|s, call| s.mask(call, |status| &mut status.questionable, positive)),
            ),
            (
                ":STATus:QUEStionable:NTRansition",
                Query(|s, call| s.register(call, |status| status.questionable.negative)),
            ),
            (
                ":STATus:QUEStionable:NTRansition",
                Command(|s, call| s.mask(call, |status| &mut status.questionable, negative)),
            ),
        ]
    }
}

impl System {
    fn tell(&self, call: &mut Call<'_>, text: impl FnOnce(&mut Status) -> String) -> Result<(), Fault> {
        call.args.finish()?;
        let text = self.with(text);
        call.answer(text);
        Ok(())
    }

    fn register(&self, call: &mut Call<'_>, value: fn(&mut Status) -> u16) -> Result<(), Fault> {
        self.tell(call, |status| value(status).to_string())
    }

    fn mask(
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

fn enable(register: &mut Register) -> &mut u16 {
    &mut register.enable
}

fn positive(register: &mut Register) -> &mut u16 {
    &mut register.positive
}

fn negative(register: &mut Register) -> &mut u16 {
    &mut register.negative
}

fn next_error(system: &System, call: &mut Call<'_>) -> Result<(), Fault> {
    system.tell(call, |status| match status.next_error() {
        Some(fault) => format!("{},\"{fault}\"", fault.number()),
        None => "0,\"No error\"".to_owned(),
    })
}

fn preset_instrument(system: &System, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    system.instrument.reset();
    Ok(())
}

fn preset_status(system: &System, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    system.with(Status::preset);
    Ok(())
}
