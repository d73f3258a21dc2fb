//! The terse personality: two letters and a number, one command per line, replies that repeat the header, samples as
//! 16-bit codes with the most significant byte first.
//!
//! Vertical ranges are told per division (ten of them make the span), the time base as a rate, the trigger's place in
//! percent. The scope's own skew setting counts the other way, positive shifts a record later, in steps of 0.5 ns. The
//! error queue holds numbers of its own and no text.

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
use super::tree::{Action, Call, Table};
use crate::message::Mnemonic;
use crate::status::Fault;

/// Two letters and a number.
pub(crate) struct Terse;

static MANNER: Manner =
    Manner { read, dress, wrong: None, ending: b"\n", greeting: None, one_client: false, deafness: None, units: false };

impl Personality for Terse {
    const MANNER: Option<&'static Manner> = Some(&MANNER);

    fn generator() -> Table<Generator> {
        use Action::{Flag, Number, Word};
        vec![
            (":WV#", Word(generator::shape(&["K", "M", "P", "S", "Q"]))),
            (":HZ#", Number(generator::frequency())),
            (":PP#", Number(generator::amplitude())),
            (":OF#", Number(generator::offset())),
            (":DU#", Number(generator::duty())),
            (":ED#", Number(generator::edge())),
            (":ON#", Flag(generator::state())),
        ]
    }

    fn scope() -> Table<Scope> {
        scope::table()
    }

    fn supply() -> Table<Supply> {
        vec![
            (":VS#", Action::Number(supply::voltage())),
            (":AS#", Action::Number(supply::current())),
            (":ON#", Action::Flag(supply::state())),
            (":VM#", Action::Query(supply::measure_voltage)),
            (":AM#", Action::Query(supply::measure_current)),
        ]
    }

    fn switch() -> Table<Switch> {
        vec![
            (":JN", Action::Command(switch::close)),
            (":JN", Action::Query(|switch, call| switch.tell(call, true))),
            (":PT", Action::Command(switch::open)),
            (":PA", Action::Command(switch::open_all)),
        ]
    }

    fn system() -> Table<System> {
        vec![
            (":ID", Action::Query(system::identity)),
            (":ZE", Action::Command(system::reset)),
            (":CE", Action::Command(system::clear)),
            (":ER", Action::Query(next_error)),
            (":DN", Action::Query(done)),
        ]
    }
}

/// `VD1 0.5`, `VD1?`, `JN?(@101)`.
fn read(line: &str) -> Result<Spoken, Fault> {
    let end = line.find(|letter: char| !letter.is_ascii_alphanumeric()).unwrap_or(line.len());
    let (header, rest) = line.split_at(end);
    let node = Mnemonic::new(&header.to_ascii_uppercase());
    if node.name.len() != 2 {
        return Err(Fault::UndefinedHeader);
    }
    let (query, rest) = rest.strip_prefix('?').map_or((false, rest), |rest| (true, rest));
    let wait = if node.name == "DN" { Wait::Idle } else { Wait::Nothing };
    Ok(Spoken { nodes: vec![node], query, data: parameters(rest, ',')?, wait })
}

fn dress(spoken: &Spoken, answer: Vec<u8>) -> Vec<u8> {
    let mut reply = Vec::with_capacity(answer.len() + 8);
    if let Some(node) = spoken.nodes.first() {
        reply.extend_from_slice(node.name.as_bytes());
        if let Some(suffix) = node.suffix {
            reply.extend_from_slice(suffix.to_string().as_bytes());
        }
        reply.push(b' ');
    }
    reply.extend_from_slice(&answer);
    reply
}

/// The oldest error as a number of this personality's own; 0 when there is none.
fn next_error(system: &System, call: &mut Call<'_>) -> Result<(), Fault> {
    system.tell(call, |status| status.next_error().map_or(0, number).to_string())
}

fn number(fault: Fault) -> u8 {
    match fault.number() {
        -350 => 99,
        -363 => 9,
        -113 | -114 => 1,
        -222 => 3,
        -221 => 4,
        -230 => 5,
        -213 => 6,
        -199..=-100 => 2,
        _ => 8,
    }
}

/// Answers when nothing is pending any more.
fn done(system: &System, call: &mut Call<'_>) -> Result<(), Fault> {
    system.tell(call, |_| "1".to_owned())
}
