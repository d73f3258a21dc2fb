//! The terse scope.

use crate::instrument::scope::{self, Encoding, Scope, channel_index, set_sweeps, tell_sweeps};
use crate::instrument::tree::{Action, Call, Number, Table};
use crate::message::{Limits, Quantity, nr3};
use crate::status::Fault;
use crate::world::TriggerSource;

/// Divisions of a span.
const DIVISIONS: f64 = 10.0;

/// Volts per division.
const PER_DIVISION: Limits = Limits { min: 1e-3, max: 10.0, default: 1.0 };
/// Samples per second.
const RATE: Limits = Limits { min: 100.0, max: 10e9, default: 1e9 };
/// Percent of the record.
const PERCENT: Limits = Limits { min: 0.0, max: 100.0, default: 50.0 };
/// Seconds.
const SKEW: Limits = Limits { min: -50e-9, max: 50e-9, default: 0.0 };

/// The headers.
pub(super) fn table() -> Table<Scope> {
    use Action::{Command, Query, Word};
    let per_division = Number {
        limits: &[PER_DIVISION],
        shown: |span_v| span_v / DIVISIONS,
        meant: |per_division_v| per_division_v * DIVISIONS,
        ..scope::span()
    };
    let rate = Number {
        quantity: Quantity::Hertz,
        limits: &[RATE],
        shown: |interval_s| 1.0 / interval_s,
        meant: |rate_hz| 1.0 / rate_hz,
        ..scope::interval()
    };
    let place = Number {
        limits: &[PERCENT],
        shown: |position| position * 100.0,
        meant: |percent| percent / 100.0,
        ..scope::position()
    };
    // Half a nanosecond, by a division that gives the double nearest to each step; 0 − x keeps nought without a sign.
    let skew = Number {
        limits: &[SKEW],
        shown: |delay_s| 0.0 - delay_s,
        meant: |skew_s| 0.0 - skew_s,
        snap: |delay_s| (delay_s * 2e9).round() / 2e9,
        ..scope::delay()
    };
    vec![
        (":VD#", Action::Number(per_division)),
        (":VO#", Action::Number(scope::offset())),
        (":CP#", Word(scope::coupling(&["A", "D", "G"]))),
        (":SK#", Action::Number(skew)),
        (":SR", Action::Number(rate)),
        (":LN", Action::Number(scope::points())),
        (":PO", Action::Number(place)),
        (":AV", Command(set_sweeps)),
        (":AV", Query(tell_sweeps)),
        (":TS", Command(set_source)),
        (":TS", Query(tell_source)),
        (":TL", Action::Number(scope::level())),
        (":TG", Word(scope::slope(&["U", "D"]))),
        (":GO", Command(scope::start)),
        (":HA", Command(scope::abort)),
        (":PR#", Query(preamble)),
        (":WF#", Query(samples)),
    ]
}

/// `1` to `4`, `E` for the external input, `N` for none.
fn set_source(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    let limits = Limits { min: 1.0, max: 4.0, default: 1.0 };
    let source = match call.args.number_or_word(&limits, &["E", "N"])? {
        Err(0) => TriggerSource::External,
        Err(_) => TriggerSource::Immediate,
        Ok(number) => TriggerSource::Channel(channel_index(number.round() as u32)?),
    };
    call.args.finish()?;
    scope.set_source(source);
    Ok(())
}

fn tell_source(scope: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    match scope.source() {
        TriggerSource::Channel(index) => call.answer((index + 1).to_string()),
        TriggerSource::External => call.answer("E"),
        TriggerSource::Immediate => call.answer("N"),
    }
    Ok(())
}

/// Volts at code 0, volts per code, one converter step in volts, its end codes, samples per second, time of the first
/// sample, samples, averages, number of the acquisition.
fn preamble(model: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    let (record, channel) = scope::asked(model, call)?;
    let facts = scope::facts(&record, channel, Encoding::Integer16)?;
    let fields = [
        nr3(facts.zero_v),
        nr3(facts.volts_per_code),
        nr3(facts.step_v),
        facts.low_code.to_string(),
        facts.high_code.to_string(),
        nr3(1.0 / facts.interval_s),
        nr3(facts.start_s),
        facts.points.to_string(),
        facts.averages.to_string(),
        facts.number.to_string(),
    ];
    call.answer(fields.join(","));
    Ok(())
}

fn samples(model: &Scope, call: &mut Call<'_>) -> Result<(), Fault> {
    let (record, channel) = scope::asked(model, call)?;
    call.reply.add_block(&scope::binary(&record, channel, Encoding::Integer16, false)?);
    Ok(())
}
