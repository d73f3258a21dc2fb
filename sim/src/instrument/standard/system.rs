//! `STATus` and `SYSTem`: the commands that SCPI-99 wants of every instrument (vol. 1, 4.2.1; from memory).

use crate::instrument::system::{self, System};
use crate::instrument::tree::{Action, Call, Model, Table};
use crate::status::{Fault, Register, Status};

/// The headers.
pub(super) fn table() -> Table<System> {
    use Action::{Command, Query};
    vec![
        (":SYSTem:ERRor[:NEXT]", Query(next_error)),
        (":SYSTem:ERRor:COUNt", Query(|system, call| system.tell(call, |status| status.error_count().to_string()))),
        (":SYSTem:PRESet", Command(system::reset)),
        (":SYSTem:VERSion", Query(|system, call| system.tell(call, |_| "1999.0".to_owned()))),
        (":STATus:PRESet", Command(preset_status)),
        (":STATus:OPERation[:EVENt]", Query(|s, call| s.register(call, |status| status.operation.take_events()))),
        (":STATus:OPERation:CONDition", Query(|s, call| s.register(call, |status| status.operation.condition()))),
        (":STATus:OPERation:ENABle", Query(|s, call| s.register(call, |status| status.operation.enable))),
        (":STATus:OPERation:ENABle", Command(|s, call| s.mask(call, |status| &mut status.operation, enable))),
        (":STATus:OPERation:PTRansition", Query(|s, call| s.register(call, |status| status.operation.positive))),
        (":STATus:OPERation:PTRansition", Command(|s, call| s.mask(call, |status| &mut status.operation, positive))),
        (":STATus:OPERation:NTRansition", Query(|s, call| s.register(call, |status| status.operation.negative))),
        (":STATus:OPERation:NTRansition", Command(|s, call| s.mask(call, |status| &mut status.operation, negative))),
        (":STATus:QUEStionable[:EVENt]", Query(|s, call| s.register(call, |status| status.questionable.take_events()))),
        (":STATus:QUEStionable:CONDition", Query(|s, call| s.register(call, |status| status.questionable.condition()))),
        (":STATus:QUEStionable:ENABle", Query(|s, call| s.register(call, |status| status.questionable.enable))),
        (":STATus:QUEStionable:ENABle", Command(|s, call| s.mask(call, |status| &mut status.questionable, enable))),
        (":STATus:QUEStionable:PTRansition", Query(|s, call| s.register(call, |status| status.questionable.positive))),
        (
            ":STATus:QUEStionable:PTRansition",
            Command(|s, call| s.mask(call, |status| &mut status.questionable, positive)),
        ),
        (":STATus:QUEStionable:NTRansition", Query(|s, call| s.register(call, |status| status.questionable.negative))),
        (
            ":STATus:QUEStionable:NTRansition",
            Command(|s, call| s.mask(call, |status| &mut status.questionable, negative)),
        ),
    ]
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

fn preset_status(system: &System, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    system.with(Status::preset);
    Ok(())
}
