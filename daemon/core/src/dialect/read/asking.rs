//! How a dialect file asks about errors and completion.

use super::{LONGEST_PAUSE_S, Maps, choice_of_sign, refuse};
use crate::dialect::reply::{Shape, Whose};
use crate::dialect::step::{Empty, Errors, Until, Waiting};
use crate::dialect::template::Template;
use crate::dialect::{Completion, Intent};
use crate::document::{Item, Table};
use crate::units::Unit;

/// How the error queue is read.
pub(super) fn errors(mut table: Table<'_>, words: &Maps) -> Option<Errors> {
    let ask = table.text("ask").or_else(|| table.missing("ask", "such as `ask = \"SYSTem:ERRor?\"`"));
    let template =
        ask.and_then(|ask| Template::plain(&ask.value).map_err(|refusal| refuse(&table, ask.span, refusal)).ok());
    let places = table.texts("reply").or_else(|| table.missing("reply", "such as `reply = [\"number\", \"text\"]`"));
    let shape = places.and_then(|places| {
        let span = places.first().map_or_else(|| table.span(), |first| first.span.clone());
        let whose = Whose { intent: Intent::Error, free: false, words };
        let shape = Shape::list(places.iter().map(|item| item.value.as_str()), ',', whose);
        match shape {
            Ok(shape) if shape.place_of("number").is_some() => Some(shape),
            Ok(_) => {
                refuse(&table, span, ("the reply has no `number`".to_owned(), "name it in `reply`".to_owned()));
                None
            }
            Err(refusal) => {
                refuse(&table, span, refusal);
                None
            }
        }
    });
    let between = choice_of_sign(&mut table, "between", ',');
    let empty = if table.is_text("empty") {
        table.text("empty").map(|item| Empty::Text(item.value))
    } else {
        table.whole("empty").map(|item| Empty::Number(item.value))
    };
    table.refuse_others();
    Some(Errors { ask: template?, shape: shape?, between, empty: empty.unwrap_or(Empty::Number(0)) })
}

/// How completion is asked for.
pub(super) fn completion(mut table: Table<'_>) -> Option<Waiting> {
    let ask = table.text("ask").or_else(|| table.missing("ask", "such as `ask = \"*OPC?\"`"));
    let ask = ask.and_then(|ask| Template::plain(&ask.value).map_err(|refusal| refuse(&table, ask.span, refusal)).ok());
    let equals = table.text("equals").map(|item| Until::Equals(item.value));
    let bits = |item: Item<i64>, make: fn(u16) -> Until, table: &Table<'_>| match u16::try_from(item.value) {
        Ok(bits) if bits != 0 => Some(make(bits)),
        _ => {
            table.mistakes().add(item.span, format!("{} is no set of bits", item.value), "1 to 65535");
            None
        }
    };
    let clear = table.whole("clear").and_then(|item| bits(item, Until::Clear, &table));
    let set = table.whole("set").and_then(|item| bits(item, Until::Set, &table));
    let ways = ["equals", "clear", "set"].iter().filter(|key| table.has(key)).count();
    if ways != 1 {
        let help = "one of `equals = \"1\"`, `clear = 56` (these bits are 0), `set = 1` (these bits are 1)";
        table.mistakes().add(table.span(), "which reply means complete must be said once", help);
    }
    let every = table.amount("every", Unit::Second);
    let how = match &every {
        None => Completion::Answer,
        Some(every) if every.value > 0.0 && every.value <= LONGEST_PAUSE_S => Completion::Poll { every_s: every.value },
        Some(every) => {
            let help = format!("more than 0 and at most {LONGEST_PAUSE_S} s");
            table.mistakes().add(every.span.clone(), format!("asking every {} s", every.value), help);
            return None;
        }
    };
    table.refuse_others();
    Some(Waiting { ask: ask?, until: equals.or(clear).or(set)?, how })
}
