//! The slow scope.

use crate::instrument::scope::{self, Encoding, Scope, channel_index, set_sweeps, tell_sweeps};
use crate::instrument::tree::{Action, Call, Model, Number, Table};
use crate::message::{Limits, Quantity};
use crate::status::Fault;
use crate::world::TriggerSource;

/// Most samples of one reading.
const WINDOW: usize = 4096;

/// Half the span, in volts.
const HALF: Limits = Limits { min: 5e-3, max: 50.0, default: 5.0 };
/// Percent of the record.
const PERCENT: Limits = Limits { min: 0.0, max: 100.0, default: 50.0 };

/// By how much codes without a sign are higher than those with one.
const SHIFT: i32 = 128;

/// Bits of `TELL STATE`.
mod bit {
    /// An acquisition is under way.
    pub(super) const TAKING: u8 = 1;
    /// It waits for its trigger.
    pub(super) const WAITING: u8 = 2;
    /// The scope does not run free.
    pub(super) const HELD: u8 = 4;
    /// There is a record.
    pub(super) const RECORD: u8 = 8;
}

/// The headers.
pub(super) fn table() -> Table<Scope> {
    use Action::{Command, Query, Word};
    let half = Number { limits: &[HALF], shown: |span_v| span_v / 2.0, meant: |half_v| half_v * 2.0, ..scope::span() };
    // 0 − x keeps nought without a sign.
    let shift = Number { shown: |offset_v| 0.0 - offset_v, meant: |shift_v| 0.0 - shift_v, ..scope::offset() };
    let before = Number {
        limits: &[PERCENT],
        shown: |position| position * 100.0,
        meant: |percent| percent / 100.0,
        ..scope::position()
    };
    vec![
        (":HALF#", Action::Number(half)),
        (":SHIFT#", Action::Number(shift)),
        (":COUPLE#", Word(scope::coupling(&["MOVING", "ALL", "NONE"]))),
        (":LAG#", Action::Number(scope::delay())),
        (":GAP", Action::Number(scope::interval())),
        (":DEPTH", Action::Number(scope::points())),
        (":BEFORE", Action::Number(before)),
        (":MEAN", Command(set_sweeps)),
        (":MEAN", Query(tell_sweeps)),
        (":CAUSE", Command(set_source)),
        (":CAUSE", Query(tell_source)),
        (":BAR", Action::Number(scope::level())),
        (":WAY", Word(scope::slope(&["UPWARD", "DOWNWARD"]))),
        (":RUN", Command(run)),
        (":HOLD", Command(hold)),
        (":ONCE", Command(once)),
        (":STATE", Query(state)),
        (":FACTS#", Query(facts)),
        (":CODES#", Query(codes)),
    ]
}

/// A channel's number, 0 for the external input, -1 for none.
fn set_source(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    let limits = Limits { min: -1.0, max: 4.0, default: 1.0 };
    let number = call.args.number(&limits, Quantity::Count)?.round().clamp(limits.min, limits.max);
    call.args.finish()?;
    scope.set_source(match number as i32 {
        -1 => TriggerSource::Immediate,
        0 => TriggerSource::External,
        number => TriggerSource::Channel(channel_index(number.unsigned_abs())?),
    });
    Ok(())
}

fn tell_source(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    match scope.source() {
        TriggerSource::Channel(index) => call.answer((index + 1).to_string()),
        TriggerSource::External => call.answer("0"),
        TriggerSource::Immediate => call.answer("-1"),
    }
    Ok(())
}

/// Lets acquisitions follow one another; what was taken before is forgotten.
fn run(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    scope.abort();
    scope.with(|settings| settings.free = true);
    scope.start()
}

/// Holds what was taken last; what is under way is dropped.
fn hold(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    scope.with(|settings| settings.free = false);
    scope.abort();
    Ok(())
}

/// Takes one acquisition and holds it.
fn once(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    hold(scope, call)?;
    scope.start()
}

fn state(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    let (busy, empty) = (call.core.busy(), scope.record().is_err());
    let bits = [
        (busy, bit::TAKING),
        (call.core.waiting(), bit::WAITING),
        (!scope.with(|settings| settings.free), bit::HELD),
        (!empty, bit::RECORD),
    ];
    let state = bits.iter().filter(|(set, _)| *set).fold(0, |sum, (_, bit)| sum | bit);
    call.answer(state.to_string());
    // What runs free has its first record without being asked for it.
    if empty && !busy { scope.renew().map(|_| ()) } else { Ok(()) }
}

/// Number of the acquisition, samples, seconds from one to the next, seconds of the first, volts at code 0, volts from
/// code to code, lowest and highest code, sweeps.
fn facts(model: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    let (record, channel) = scope::asked(model, call)?;
    let facts = scope::facts(&record, channel, Encoding::Integer8)?;
    let zero_v = facts.zero_v - f64::from(SHIFT) * facts.volts_per_code;
    call.answer(format!(
        "{},{},{:e},{:e},{:e},{:e},{},{},{}",
        facts.number,
        facts.points,
        facts.interval_s,
        facts.start_s,
        zero_v,
        facts.volts_per_code,
        facts.low_code + SHIFT,
        facts.high_code + SHIFT,
        facts.averages,
    ));
    Ok(())
}

/// `TELL CODES/1 FIRST COUNT`: codes from the sample `FIRST`, counted from 1; at most [`WINDOW`] of them, and none beyond
/// the record's end.
fn codes(model: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    let (record, channel) = scope::asked(model, call)?;
    let first = call.args.optional_number()?.unwrap_or(1.0).round().max(1.0) as usize;
    let count = call.args.optional_number()?.unwrap_or(WINDOW as f64).round().clamp(0.0, WINDOW as f64) as usize;
    call.args.finish()?;
    let bytes = scope::binary(&record, channel, Encoding::Integer8, false)?;
    let from = first.saturating_sub(1).min(bytes.len());
    let to = from.saturating_add(count).min(bytes.len());
    // Turning the top bit adds 128 to a code with a sign.
    let window: Vec<u8> = bytes.get(from..to).unwrap_or_default().iter().map(|byte| byte ^ 0x80).collect();
    call.reply.add_block(&window);
    Ok(())
}
