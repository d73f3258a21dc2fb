//! The slow personality: verbs and names with blanks between, nothing told unless asked, and no error queue.
//!
//! After each line it is deaf for some milliseconds: what comes too soon is lost without a word. Whether an acquisition
//! is complete is a matter of bits that must be polled. It runs free unless it is held: then every reading is of a new
//! acquisition. Samples are read in windows of at most 4096, counted from 1, as one-byte codes without a sign. Vertical
//! ranges are told as half the span, offsets with the opposite sign. What is out of range is clamped and never
//! mentioned. A question that cannot be answered is answered `?`.

mod scope;
#[cfg(test)]
mod tests;

use std::time::Duration;

use super::generator::{self, Generator};
use super::personality::Personality;
use super::plain::{Manner, Spoken, Wait, parameters};
use super::scope::Scope;
use super::supply::{self, Supply};
use super::switch::{self, Switch};
use super::system::{self, System};
use super::tree::{Action, Call, Model, Table};
use crate::message::{Limits, Mnemonic, Quantity};
use crate::status::Fault;

/// For how long it is deaf after a line.
const DEAFNESS: Duration = Duration::from_millis(5);

/// Verbs and names.
pub(crate) struct Slow;

static MANNER: Manner = Manner {
    read,
    dress: |_, answer| answer,
    wrong: Some("?"),
    ending: b"\n",
    greeting: None,
    one_client: false,
    deafness: Some(DEAFNESS),
    units: false,
};

impl Personality for Slow {
    const MANNER: Option<&'static Manner> = Some(&MANNER);

    fn generator() -> Table<Generator> {
        use Action::{Command, Flag, Number, Query, Word};
        vec![
            (":SHAPE#", Word(generator::shape(&["FIX", "MANY", "BLIP", "WAVE", "BOX"]))),
            (":PACE#", Number(generator::frequency())),
            (":LEVELS#", Command(set_levels)),
            (":LEVELS#", Query(tell_levels)),
            (":SHARE#", Number(generator::duty())),
            (":RAMP#", Number(generator::edge())),
            (":LIVE#", Flag(generator::state())),
        ]
    }

    fn scope() -> Table<Scope> {
        scope::table()
    }

    fn supply() -> Table<Supply> {
        vec![
            (":VOLTS#", Action::Number(supply::voltage())),
            (":AMPS#", Action::Number(supply::current())),
            (":LIVE#", Action::Flag(supply::state())),
            (":METER#", Action::Query(meter)),
        ]
    }

    fn switch() -> Table<Switch> {
        vec![
            (":LINK", Action::Command(switch::close)),
            (":LINK", Action::Query(|switch, call| switch.tell(call, true))),
            (":CUT", Action::Command(switch::open)),
            (":CUTALL", Action::Command(switch::open_all)),
        ]
    }

    fn system() -> Table<System> {
        vec![
            (":NAME", Action::Query(system::identity)),
            (":FRESH", Action::Command(system::reset)),
            (":FORGET", Action::Command(system::clear)),
        ]
    }

    fn preset_scope(scope: &Scope) {
        scope.with(|settings| settings.free = true);
    }
}

/// `PUT HALF/1 5.0`, `TELL HALF/1`, `DO HOLD`.
fn read(line: &str) -> Result<Spoken, Fault> {
    let (verb, rest) = line.split_once(' ').unwrap_or((line, ""));
    let query = match verb.to_ascii_uppercase().as_str() {
        "TELL" => true,
        "DO" | "PUT" => false,
        _ => return Err(Fault::UndefinedHeader),
    };
    let rest = rest.trim_start();
    let (name, rest) = rest.split_once(' ').unwrap_or((rest, ""));
    let name = name.to_ascii_uppercase();
    let (name, suffix) = match name.split_once('/') {
        Some((name, digits)) => (name.to_owned(), Some(digits.parse().map_err(|_| Fault::HeaderSuffix)?)),
        None => (name, None),
    };
    let wait = if query && matches!(name.as_str(), "FACTS" | "CODES") { Wait::Renewed } else { Wait::Nothing };
    Ok(Spoken { nodes: vec![Mnemonic { name, suffix }], query, data: parameters(rest, ' ')?, wait })
}

/// The low and the high level without a load, which give amplitude and offset together.
fn set_levels(generator: &Generator, call: &mut Call<'_>) -> Result<(), Fault> {
    let limits = Limits { min: -20.0, max: 20.0, default: 0.0 };
    let low_v = call.args.number(&limits, Quantity::Volt)?.clamp(limits.min, limits.max);
    let high_v = call.args.number(&limits, Quantity::Volt)?.clamp(limits.min, limits.max);
    call.args.finish()?;
    let amplitude = generator::AMPLITUDE;
    let offset = generator::OFFSET;
    generator.with(|controls| {
        let output = controls.generator.get_mut(call.index).ok_or(Fault::HeaderSuffix)?;
        output.amplitude_vpp = (high_v - low_v).clamp(amplitude.min, amplitude.max);
        output.offset_v = ((high_v + low_v) / 2.0).clamp(offset.min, offset.max);
        Ok(())
    })?;
    generator.changed();
    Ok(())
}

fn tell_levels(generator: &Generator, call: &mut Call<'_>) -> Result<(), Fault> {
    call.args.finish()?;
    let (low_v, high_v) = generator.with(|controls| {
        let output = controls.generator.get(call.index).ok_or(Fault::HeaderSuffix)?;
        let half_v = output.amplitude_vpp / 2.0;
        Ok((output.offset_v - half_v, output.offset_v + half_v))
    })?;
    call.answer(format!("{low_v} {high_v}"));
    Ok(())
}

/// Volts and amperes in one answer.
fn meter(supply: &Supply, call: &mut Call<'_>) -> Result<(), Fault> {
    let (voltage_v, current_a) = supply.reading(call)?;
    call.answer(format!("{voltage_v:.6},{current_a:.6}"));
    Ok(())
}
