//! The wordy scope.

use crate::instrument::scope::{
    self, Encoding, Scope, channel_index, delay_step, interval_step, set_sweeps, tell_sweeps,
};
use crate::instrument::tree::{Action, Call, Model, Number, Table};
use crate::message::{Limits, Quantity, nr3};
use crate::scenario::Setting;
use crate::status::Fault;
use crate::world::TriggerSource;

/// Divisions of a record.
const DIVISIONS: f64 = 10.0;

/// Seconds per division: the shortest and the longest record.
const DIVISION: Limits = Limits { min: 100e-12, max: 1e3, default: 1e-6 };

/// The headers.
pub(super) fn table() -> Table<Scope> {
    use Action::{Command, Query, Word};
    let delay = Number { snap: delay_step, ..scope::delay() };
    vec![
        (":CHANNEL#:SPAN", Action::Number(scope::span())),
        (":CHANNEL#:CENTRE", Action::Number(scope::offset())),
        (":CHANNEL#:COUPLING", Word(scope::coupling(&["BLOCKED", "DIRECT", "NOUGHT"]))),
        (":CHANNEL#:ADVANCE", Action::Number(delay)),
        (":CHANNEL#:SCALE", Query(scale)),
        (":CHANNEL#:SAMPLES", Query(samples)),
        (":RECORD:LENGTH", Action::Number(scope::points())),
        (":RECORD:DIVISION", Command(set_division)),
        (":RECORD:DIVISION", Query(tell_division)),
        (":RECORD:BEFORE", Action::Number(scope::position())),
        (":RECORD:SWEEPS", Command(set_sweeps)),
        (":RECORD:SWEEPS", Query(tell_sweeps)),
        (":TRIGGER:FROM", Command(set_source)),
        (":TRIGGER:FROM", Query(tell_source)),
        (":TRIGGER:LEVEL", Action::Number(scope::level())),
        (":TRIGGER:EDGE", Word(scope::slope(&["RISE", "FALL"]))),
        (":ACQUIRE:BEGIN", Command(scope::start)),
        (":ACQUIRE:CEASE", Command(scope::abort)),
        (":ACQUIRE:STATE", Query(state)),
    ]
}

/// The sample interval follows from the division and the record length of this moment.
fn set_division(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    let asked_s = call.args.number(&DIVISION, Quantity::Second)?;
    call.args.finish()?;
    let division_s = asked_s.clamp(DIVISION.min, DIVISION.max);
    let interval_s = interval_step(DIVISIONS * division_s / scope.with(|settings| settings.points));
    let interval_s = call.core.faults.clamped(Setting::Interval, interval_s);
    scope.with(|settings| settings.interval_s = interval_s);
    scope.changed();
    Ok(())
}

fn tell_division(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    let division_s = scope.with(|settings| settings.interval_s * settings.points / DIVISIONS);
    call.answer_number(division_s, Quantity::Second);
    Ok(())
}

/// `CHANNEL1` to `CHANNEL4`, `OUTSIDE`, `NOTHING`.
fn set_source(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    let source = match call.args.word(&["CHANNEL", "OUTSIDE", "NOTHING"])? {
        (0, Some(number)) => TriggerSource::Channel(channel_index(number)?),
        (1, None) => TriggerSource::External,
        (2, None) => TriggerSource::Immediate,
        _ => return Err(Fault::InvalidCharacterData),
    };
    call.args.finish()?;
    scope.set_source(source);
    Ok(())
}

fn tell_source(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    match scope.source() {
        TriggerSource::Channel(index) => call.answer(format!("CHANNEL{}", index + 1)),
        TriggerSource::External => call.answer("OUTSIDE"),
        TriggerSource::Immediate => call.answer("NOTHING"),
    }
    Ok(())
}

/// `IDLE`, `TAKING` or `WAITING`.
fn state(_: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    let state = match (call.core.busy(), call.core.waiting()) {
        (false, _) => "IDLE",
        (true, false) => "TAKING",
        (true, true) => "WAITING",
    };
    call.answer(state);
    Ok(())
}

/// Keys with values: the volts of the converter's ends instead of codes, for the samples are volts themselves.
fn scale(model: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    let (record, channel) = scope::asked(model, call)?;
    let facts = scope::facts(&record, channel, Encoding::Text)?;
    let volts = |code: i32| nr3(facts.zero_v + f64::from(code) * facts.volts_per_code);
    call.answer(format!(
        "NUMBER={}; SAMPLES={}; SWEEPS={}; SPACING={} S; FIRST={} S; LOWEST={} V; HIGHEST={} V; GRAIN={} V; \
         STEP={} V",
        facts.number,
        facts.points,
        facts.averages,
        nr3(facts.interval_s),
        nr3(facts.start_s),
        volts(facts.low_code),
        volts(facts.high_code),
        nr3(facts.volts_per_code),
        nr3(facts.step_v),
    ));
    Ok(())
}

/// Volts with their unit.
fn samples(model: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    let (record, channel) = scope::asked(model, call)?;
    call.answer(scope::text(&record, channel, " V")?);
    Ok(())
}
