//! A call to one instrument of the bench, and its reading from a table such as
//! `{ instrument = "supply", call = "output.set", channel = 1, state = false }`.

use super::field;
use crate::dialect::{ArgKind, Call, HIGHEST_CHANNEL, Intent, Value};
use crate::document::Table;
use crate::units::Unit;

/// What is asked of one instrument: an intent with its arguments, never SCPI text.
#[derive(Debug, Clone, PartialEq)]
pub struct BenchCall {
    /// The instrument's name.
    pub instrument: String,
    /// What it is to do.
    pub call: Call,
}

/// What came of reading a call.
pub(super) struct Reading {
    /// The call, if it is complete and right.
    pub(super) call: Option<BenchCall>,
    /// Whether the intent is known, so that left-over keys of the table are mistakes and not its arguments.
    pub(super) intent_known: bool,
}

/// Reads every call of the list `key`; none if the key is absent.
pub(super) fn read_list(table: &mut Table<'_>, key: &str, instruments: &[String]) -> Vec<BenchCall> {
    let mut calls = Vec::new();
    for mut entry in table.tables(key).unwrap_or_default() {
        let reading = read(&mut entry, instruments, None);
        if reading.intent_known {
            entry.refuse_others();
        }
        calls.extend(reading.call);
    }
    calls
}

/// Reads the keys `instrument`, `call` and the call's arguments but `without`, which is filled in later.
pub(super) fn read(table: &mut Table<'_>, instruments: &[String], without: Option<&str>) -> Reading {
    let instrument = field::name(table, "instrument", "instrument", instruments)
        .or_else(|| table.missing("instrument", "name the instrument that is to do it"));
    let wanted = table.text("call").or_else(|| table.missing("call", "name what it is to do, such as `output.set`"));
    let Some(wanted) = wanted else { return Reading { call: None, intent_known: false } };
    let Some(intent) = Intent::parse(&wanted.value) else {
        table.mistakes().add(
            wanted.span,
            format!("there is no call `{}`", wanted.value),
            "the calls and their arguments are listed in configs/README.md",
        );
        return Reading { call: None, intent_known: false };
    };
    let mut call = Call::new(intent);
    let mut whole = true;
    for &(name, kind) in intent.spec().args {
        if without == Some(name) {
            continue;
        }
        let value = argument(table, intent, name, kind)
            .or_else(|| table.missing(name, &format!("`{}` needs it", intent.name())));
        match value {
            Some(value) => call = call.with(name, value),
            None => whole = false,
        }
    }
    if whole
        && without.is_none()
        && let Err(error) = call.check()
    {
        table.mistakes().add(table.span(), error.to_string(), "see the calls and their arguments in configs/README.md");
        whole = false;
    }
    let call = instrument.filter(|_| whole).map(|instrument| BenchCall { instrument, call });
    Reading { call, intent_known: true }
}

/// The unit of a number among an intent's arguments: its suffix says it, but for the supply's two plain values.
pub(super) fn unit_of(intent: Intent, argument: &str) -> Unit {
    match (intent.name(), argument) {
        ("source.voltage", "value") => Unit::Volt,
        ("source.current", "value") => Unit::Ampere,
        _ if argument.ends_with("_hz") => Unit::Hertz,
        _ if argument.ends_with("_s") => Unit::Second,
        _ if argument.ends_with("_v") => Unit::Volt,
        _ => Unit::One,
    }
}

fn argument(table: &mut Table<'_>, intent: Intent, name: &str, kind: ArgKind) -> Option<Value> {
    match kind {
        ArgKind::Channel | ArgKind::Whole(..) => table.whole(name).map(|item| Value::Whole(item.value)),
        ArgKind::Channels => list(table, name),
        ArgKind::Flag => table.flag(name).map(|item| Value::Flag(item.value)),
        ArgKind::Keyword(_) => table.text(name).map(|item| Value::Keyword(item.value)),
        ArgKind::Number => table.amount(name, unit_of(intent, name)).map(|item| Value::Number(item.value)),
    }
}

fn list(table: &mut Table<'_>, name: &str) -> Option<Value> {
    let items = table.amounts(name, Unit::One)?;
    let mut whole = Vec::with_capacity(items.len());
    for item in items {
        if item.value.fract() != 0.0 || !(0.0..=HIGHEST_CHANNEL as f64).contains(&item.value) {
            table.mistakes().add(
                item.span,
                format!("`{name}` holds {}, which is no channel", item.value),
                "write whole numbers, such as `[101, 102]`",
            );
            return None;
        }
        whole.push(item.value as i64);
    }
    Some(Value::List(whole))
}
