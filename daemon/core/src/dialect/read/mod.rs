//! A dialect's text read into a checked dialect, with every mistake collected.

mod asking;
mod convert;
mod intents;
mod record;

use std::collections::BTreeMap;
use std::ops::Range;

use super::reply::{Manner, is_name};
use super::split::refuse_sign;
use super::template::{Refusal, Spelling};
use super::words::Words;
use super::{Dialect, Intent, SkewSetting};
use crate::document::Table;
use crate::units::Unit;

/// Every map of words that the file holds.
type Maps = BTreeMap<String, Words>;

/// The longest pause that a dialect may ask for after a command: longer ones belong into a sequence.
const LONGEST_PAUSE_S: f64 = 60.0;

/// The shortest and the longest window: a record of 64 Mi samples must not become as many questions, and a 32-bit counter
/// holds no more.
const WINDOWS: std::ops::RangeInclusive<i64> = 16..=u32::MAX as i64;

/// What holds for all intents of a file.
#[derive(Debug, Clone, Copy)]
struct General {
    manner: Manner,
    pause_s: f64,
    /// Whether samples are read in windows.
    windowed: bool,
}

/// What `[line]` says.
struct Line {
    ending: &'static str,
    pause_s: f64,
    greeting: bool,
    one_client: bool,
}

/// Reads the top of a dialect file. Every part is read even when an earlier one had mistakes.
pub(super) fn dialect(top: &mut Table<'_>) -> Option<Dialect> {
    let name = top.text("name").or_else(|| top.missing("name", "such as `name = \"my-scope\"`"));
    // Whom it is like was looked at before the texts were laid over one another.
    let _ = top.text("like");
    let about = top.text("about").map(|item| item.value).unwrap_or_default();
    let words = words(top);
    let line = line(top);
    let manner = manner(top);
    let window = top.table("window").and_then(window);
    let general = General { manner, pause_s: line.pause_s, windowed: top.has("window") };
    let intents = intents::intents(top, &words, general);
    let errors = top.table("errors").and_then(|table| asking::errors(table, &words));
    let completion = top.table("completion").and_then(asking::completion);
    let free = free_running(top, intents.contains_key(&Intent::AcquireAbort));
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
        ending: line.ending,
        greeting: line.greeting,
        one_client: line.one_client,
        manner,
        words,
        intents,
        errors,
        completion,
        free,
        window,
        skew,
        reading,
        pause_s: line.pause_s,
    })
}

fn refuse(table: &Table<'_>, span: Range<usize>, (what, help): Refusal) {
    table.mistakes().add(span, what, help);
}

fn words(top: &mut Table<'_>) -> Maps {
    let mut maps = Maps::new();
    for (name, mut table) in top.named_tables("words") {
        if !is_name(&name.value) || !matches!(Spelling::parse(&name.value), Spelling::Words(_)) {
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

fn line(top: &mut Table<'_>) -> Line {
    let mut line = Line { ending: "\n", pause_s: 0.0, greeting: false, one_client: false };
    let Some(mut table) = top.table("line") else { return line };
    line.ending = choice(&mut table, "ending", &[("lf", "\n"), ("crlf", "\r\n")]).unwrap_or("\n");
    line.pause_s = pause(&mut table).unwrap_or(0.0);
    line.greeting = table.flag("greeting").is_some_and(|item| item.value);
    line.one_client = table.flag("one_client").is_some_and(|item| item.value);
    table.refuse_others();
    line
}

/// The most samples that are asked for at once.
fn window(mut table: Table<'_>) -> Option<i64> {
    let most = table.whole("most").or_else(|| table.missing("most", "such as `most = 25_000`, in samples"));
    table.refuse_others();
    let most = most?;
    if WINDOWS.contains(&most.value) {
        return Some(most.value);
    }
    let help = format!("{} to {}", WINDOWS.start(), WINDOWS.end());
    table.mistakes().add(most.span, format!("a window of {} samples", most.value), help);
    None
}

/// Whether the scope goes on acquiring by itself, so that it must be stopped before it is read.
fn free_running(top: &mut Table<'_>, stops: bool) -> bool {
    let Some(mut table) = top.table("acquisition") else { return false };
    let free = choice(&mut table, "mode", &[("held", false), ("free", true)])
        .or_else(|| table.missing("mode", "`\"held\"`, or `\"free\"` when each read may be of a new acquisition"));
    table.refuse_others();
    let free = free.unwrap_or(false);
    if free {
        let complain = |what: &str, help: &str| table.mistakes().add(table.span(), what, help);
        if !stops {
            complain(
                "a scope that goes on acquiring and cannot be stopped cannot give both legs of one acquisition",
                "give `[intent.\"acquire.abort\"]` the command that stops it; without one, it serves no pair",
            );
        }
        if !top.has("completion") {
            complain(
                "a scope that goes on acquiring must tell when an acquisition with the new settings is there",
                "give `[completion]`",
            );
        }
    }
    free
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

/// A sign that stands between the parts of a reply.
fn choice_of_sign(table: &mut Table<'_>, key: &str, usual: char) -> char {
    let Some(item) = table.text(key) else { return usual };
    match refuse_sign(&item.value) {
        None => item.value.chars().next().unwrap_or(usual),
        Some(why) => {
            table.mistakes().add(item.span, format!("`{key}` cannot be `{}`", item.value), why);
            usual
        }
    }
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
