//! A dialect's text read into a checked dialect, with every mistake collected.

mod intents;
mod record;

use std::collections::BTreeMap;
use std::ops::Range;

use super::reply::{Manner, Shape, is_name};
use super::step::{Errors, Until, Waiting};
use super::template::{Refusal, Template};
use super::words::Words;
use super::{Completion, Dialect, Intent, SkewSetting};
use crate::document::{Item, Table};
use crate::units::Unit;

/// Every map of words that the file holds.
type Maps = BTreeMap<String, Words>;

/// The longest pause that a dialect may ask for after a command: longer ones belong into a sequence.
const LONGEST_PAUSE_S: f64 = 60.0;

/// Reads the top of a dialect file. Every part is read even when an earlier one had mistakes.
pub(super) fn dialect(top: &mut Table<'_>) -> Option<Dialect> {
    let name = top.text("name").or_else(|| top.missing("name", "such as `name = \"my-scope\"`"));
    let about = top.text("about").map(|item| item.value).unwrap_or_default();
    let words = words(top);
    let (ending, pause_s, greeting) = line(top);
    let manner = manner(top);
    let intents = intents::intents(top, &words, pause_s);
    let errors = top.table("errors").and_then(|table| errors(table, &words));
    let completion = top.table("completion").and_then(completion);
    let skew = top.table("skew").and_then(skew);
    let reading = record::reading(top, &intents);
    for (intent, needed, there) in [
        (Intent::SkewSet, "skew", skew.is_some()),
        (Intent::SkewGet, "skew", skew.is_some()),
        (Intent::RecordPreamble, "samples", reading.is_some()),
        (Intent::RecordData, "samples", reading.is_some()),
    ] {
        if intents.contains_key(&intent) && !there {
            top.missing::<()>(needed, &format!("`{intent}` needs `[{needed}]`"));
        }
    }
    Some(Dialect {
        name: name?.value,
        about,
        ending,
        greeting,
        manner,
        words,
        intents,
        errors,
        completion,
        skew,
        reading,
        pause_s,
    })
}

fn refuse(table: &Table<'_>, span: Range<usize>, (what, help): Refusal) {
    table.mistakes().add(span, what, help);
}

fn words(top: &mut Table<'_>) -> Maps {
    let mut maps = Maps::new();
    for (name, mut table) in top.named_tables("words") {
        if !is_name(&name.value)
            || matches!(name.value.as_str(), "flag" | "list" | "number" | "percent" | "text" | "whole")
        {
            let help = "use small letters, digits and `_`, and none of the names of spellings";
            table.mistakes().add(name.span, format!("`{}` cannot name a map of words", name.value), help);
            continue;
        }
        let mut entries = Vec::new();
        for key in table.keys() {
            let Some(word) = table.text(&key.value) else { continue };
            match Words::refuse(&key.value, &word.value) {
                Some(why) => table.mistakes().add(word.span, format!("`{}`: {why}", word.value), "write another word"),
                None => entries.push((key.value, word.value)),
            }
        }
        maps.insert(name.value.clone(), Words::new(name.value, entries));
    }
    maps
}

/// The ending of a line, the pause after a command in seconds, and whether the instrument greets.
fn line(top: &mut Table<'_>) -> (&'static str, f64, bool) {
    let Some(mut table) = top.table("line") else { return ("\n", 0.0, false) };
    let ending = choice(&mut table, "ending", &[("lf", "\n"), ("crlf", "\r\n")]).unwrap_or("\n");
    let pause_s = pause(&mut table).unwrap_or(0.0);
    let greeting = table.flag("greeting").is_some_and(|item| item.value);
    table.refuse_others();
    (ending, pause_s, greeting)
}

fn manner(top: &mut Table<'_>) -> Manner {
    let Some(mut table) = top.table("reply") else { return Manner::default() };
    let mut flag = |key| table.flag(key).is_some_and(|item| item.value);
    let manner = Manner { header: flag("header"), units: flag("units") };
    table.refuse_others();
    manner
}

fn pause(table: &mut Table<'_>) -> Option<f64> {
    let pause = table.amount("pause", Unit::Second)?;
    if (0.0..=LONGEST_PAUSE_S).contains(&pause.value) {
        return Some(pause.value);
    }
    table.mistakes().add(pause.span, format!("a pause of {} s", pause.value), format!("0 to {LONGEST_PAUSE_S} s"));
    None
}

fn choice<T: Copy>(table: &mut Table<'_>, key: &str, choices: &[(&str, T)]) -> Option<T> {
    let item = table.text(key)?;
    let found = choices.iter().find(|(name, _)| *name == item.value).map(|(_, value)| *value);
    if found.is_none() {
        let known: Vec<&str> = choices.iter().map(|(name, _)| *name).collect();
        table.mistakes().add(
            item.span,
            format!("`{key}` cannot be `{}`", item.value),
            format!("known: {}", known.join(", ")),
        );
    }
    found
}

fn errors(mut table: Table<'_>, words: &Maps) -> Option<Errors> {
    let ask = table.text("ask").or_else(|| table.missing("ask", "such as `ask = \"SYSTem:ERRor?\"`"));
    let template =
        ask.and_then(|ask| Template::plain(&ask.value).map_err(|refusal| refuse(&table, ask.span, refusal)).ok());
    let places = table.texts("reply").or_else(|| table.missing("reply", "such as `reply = [\"number\", \"text\"]`"));
    let shape = places.and_then(|places| {
        let span = places.first().map_or_else(|| table.span(), |first| first.span.clone());
        let shape = Shape::list(places.iter().map(|item| item.value.as_str()), Intent::Error, words);
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
    let empty = table.whole("empty").map_or(0, |item| item.value);
    table.refuse_others();
    Some(Errors { ask: template?, shape: shape?, empty })
}

fn completion(mut table: Table<'_>) -> Option<Waiting> {
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

/// The skew setting, and whether a positive value shifts a record later.
fn skew(mut table: Table<'_>) -> Option<(SkewSetting, bool)> {
    let mut amount = |key, help| table.amount(key, Unit::Second).or_else(|| table.missing(key, help));
    let step = amount("step", "such as `step = \"50 ps\"`");
    let range = amount("range", "such as `range = \"100 ns\"`, the largest delay either way");
    let positive = choice(&mut table, "positive", &[("earlier", false), ("later", true)]);
    let later = positive.or_else(|| {
        table.missing("positive", "which way a positive value shifts the record: `\"earlier\"` or `\"later\"`")
    });
    table.refuse_others();
    let (step, range) = (step?, range?);
    if step.value <= 0.0 || range.value < step.value {
        table.mistakes().add(step.span, "the step must be above 0 and no larger than the range", "see the data sheet");
        return None;
    }
    Some((SkewSetting { step_s: step.value, range_s: range.value }, later?))
}
