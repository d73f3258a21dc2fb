//! The wordy personality: whole words with points between, an equals sign to set, numbers with units, lines that end
//! with CR LF.
//!
//! It greets whoever connects and serves one client. Vertical ranges are told as the full span with its centre, the time
//! base in seconds per division of ten at a given record length, samples as text with units, the preamble as keys with
//! values. Errors have numbers of its own and an unquoted text. Whether an acquisition is under way is told by a word.

mod scope;
#[cfg(test)]
mod tests;

use super::generator::{self, Generator};
use super::personality::Personality;
use super::plain::{Manner, Spoken, Wait, parameters};
use super::scope::Scope;
use super::supply::{self, Supply};
use super::switch::{self, Switch};
use super::system::{self, System};
use super::tree::{Action, Call, Table, Word};
use crate::message::Mnemonic;
use crate::status::Fault;
use crate::world::Controls;

/// Whole words.
pub(crate) struct Wordy;

static MANNER: Manner = Manner {
    read,
    dress: |_, answer| answer,
    wrong: None,
    ending: b"\r\n",
    greeting: Some("Good day. One guest at a time, please."),
    one_client: true,
    deafness: None,
    units: true,
};

impl Personality for Wordy {
    const MANNER: Option<&'static Manner> = Some(&MANNER);

    fn generator() -> Table<Generator> {
        use Action::Number;
        let shape = generator::shape(&["LEVEL", "TONES", "PULSE", "SINE", "SQUARE"]);
        vec![
            (":OUTPUT#:SHAPE", Action::Word(shape)),
            (":OUTPUT#:FREQUENCY", Number(generator::frequency())),
            (":OUTPUT#:SWING", Number(generator::amplitude())),
            (":OUTPUT#:MIDDLE", Number(generator::offset())),
            (":OUTPUT#:DUTY", Number(generator::duty())),
            (":OUTPUT#:EDGE", Number(generator::edge())),
            (":OUTPUT#:STATE", generator_state()),
        ]
    }

    fn scope() -> Table<Scope> {
        scope::table()
    }

    fn supply() -> Table<Supply> {
        vec![
            (":OUTPUT#:VOLTAGE", Action::Number(supply::voltage())),
            (":OUTPUT#:CURRENT", Action::Number(supply::current())),
            (":OUTPUT#:STATE", supply_state()),
            (":OUTPUT#:VOLTAGE:NOW", Action::Query(supply::measure_voltage)),
            (":OUTPUT#:CURRENT:NOW", Action::Query(supply::measure_current)),
        ]
    }

    fn switch() -> Table<Switch> {
        vec![
            (":PATH:JOIN", Action::Command(switch::close)),
            (":PATH:PART", Action::Command(switch::open)),
            (":PATH:CLEAR", Action::Command(switch::open_all)),
            (":PATH:JOINED", Action::Query(|switch, call| switch.tell(call, true))),
        ]
    }

    fn system() -> Table<System> {
        vec![
            (":IDENTITY", Action::Query(system::identity)),
            (":RESTORE", Action::Command(system::reset)),
            (":TROUBLE", Action::Query(next_error)),
            (":TROUBLE:FORGET", Action::Command(system::clear)),
        ]
    }
}

/// `CHANNEL1.SPAN=10 V`, `CHANNEL1.SPAN?`, `PATH.JOINED?(@101)`, `ACQUIRE.BEGIN`.
fn read(line: &str) -> Result<Spoken, Fault> {
    let end = line.find(['=', '?']).unwrap_or(line.len());
    let (header, rest) = line.split_at(end);
    let nodes: Vec<Mnemonic> = header.trim().to_ascii_uppercase().split('.').map(Mnemonic::new).collect();
    if nodes.iter().any(|node| node.name.is_empty() || !node.name.bytes().all(|byte| byte.is_ascii_alphabetic())) {
        return Err(Fault::UndefinedHeader);
    }
    let query = rest.starts_with('?');
    let data = parameters(rest.get(1..).unwrap_or_default(), ',')?;
    Ok(Spoken { nodes, query, data, wait: Wait::Nothing })
}

const STATES: [&str; 2] = ["OFF", "ON"];

fn generator_state() -> Action<Generator> {
    Action::Word(Word {
        forms: &STATES,
        count: generator::OUTPUTS,
        read: |all: &Controls, output| usize::from(all.generator[output].on),
        write: |all: &mut Controls, output, place| all.generator[output].on = place == 1,
    })
}

fn supply_state() -> Action<Supply> {
    Action::Word(Word {
        forms: &STATES,
        count: supply::OUTPUTS,
        read: |all: &Controls, output| usize::from(all.supply[output].on),
        write: |all: &mut Controls, output, place| all.supply[output].on = place == 1,
    })
}

/// The oldest error: a number of this personality's own and a text without quotes.
fn next_error(system: &System, call: &mut Call<'_>) -> Result<(), Fault> {
    system.tell(call, |status| match status.next_error() {
        Some(fault) => format!("{}, {}", 1000 - i32::from(fault.number()), fault.to_string().to_ascii_lowercase()),
        None => "0, all is well".to_owned(),
    })
}
