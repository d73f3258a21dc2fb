//! A dialect's text read into a checked dialect, with every mistake collected.

use std::collections::BTreeMap;
use std::ops::Range;

use super::expression::Expression;
use super::intent::PREAMBLE;
use super::record::Reading;
use super::reply::{Manner, Shape, is_name};
use super::samples::{Format, Order};
use super::step::{Errors, Step, Until, Waiting, Wanted};
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
    let intents = intents(top, &words, pause_s);
    let errors = top.table("errors").and_then(|table| errors(table, &words));
    let completion = top.table("completion").and_then(completion);
    let skew = top.table("skew").and_then(skew);
    let reading = reading(top, &intents);
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

fn intents(top: &mut Table<'_>, words: &Maps, pause_s: f64) -> BTreeMap<Intent, Vec<Step>> {
    let mut intents = BTreeMap::new();
    for (name, table) in top.named_tables("intent") {
        match Intent::parse(&name.value) {
            Some(intent @ (Intent::Error | Intent::Complete)) => {
                let (key, what) =
                    if intent == Intent::Error { ("errors", "error queue") } else { ("completion", "completion") };
                let help = format!("write `[{key}]`");
                table.mistakes().add(name.span, format!("the {what} has a table of its own"), help);
            }
            Some(intent) => {
                if let Some(steps) = steps(table, intent, words, pause_s, &name) {
                    intents.insert(intent, steps);
                }
            }
            None => {
                let known: Vec<&str> = Intent::all().map(Intent::name).collect();
                let help = format!("known: {}", known.join(", "));
                table.mistakes().add(name.span, format!("`{}` is no intent", name.value), help);
            }
        }
    }
    intents
}

fn steps(mut table: Table<'_>, intent: Intent, words: &Maps, pause_s: f64, name: &Item<String>) -> Option<Vec<Step>> {
    let pause_s = pause(&mut table).unwrap_or(pause_s);
    let mut good = true;
    let mut steps = Vec::new();
    for command in table.texts("send").unwrap_or_default() {
        let template = Template::parse(&command.value, intent, words).and_then(|template| {
            if template.asks() {
                let help = "an unread reply would be taken for the next one: put it under `ask`";
                return Err((format!("`{}` asks for something", command.value), help.to_owned()));
            }
            Ok(template)
        });
        match template {
            Ok(template) => steps.push(Step { template, wanted: Wanted::Nothing, pause_s }),
            Err(refusal) => {
                refuse(&table, command.span, refusal);
                good = false;
            }
        }
    }
    if table.has("ask") {
        let asks = table.tables("ask");
        good &= asks.is_some();
        for ask in asks.unwrap_or_default() {
            match question(ask, intent, words, pause_s) {
                Some(step) => steps.push(step),
                None => good = false,
            }
        }
    }
    let ignored = table.texts("ignore").unwrap_or_default();
    table.refuse_others();
    if !good {
        return None;
    }
    let complaint = |what: String, help: String| table.mistakes().add(name.span.clone(), what, help);
    if steps.is_empty() {
        complaint(format!("`{intent}` says nothing"), "give it `send` or `ask`".to_owned());
    }
    let spec = intent.spec();
    for (argument, _) in spec.args {
        let used = steps.iter().any(|step| step.template.uses().any(|name| name == *argument));
        if used == ignored.iter().any(|item| item.value == *argument) {
            let what = if used { "is used and ignored at once" } else { "is used nowhere" };
            complaint(
                format!("`{argument}` of `{intent}` {what}"),
                format!("use it, or say `ignore = [\"{argument}\"]`"),
            );
        }
    }
    for item in &ignored {
        if !spec.args.iter().any(|(name, _)| *name == item.value) {
            let what = format!("`{}` is no argument of `{intent}`", item.value);
            table.mistakes().add(item.span.clone(), what, "leave it out of `ignore`");
        }
    }
    let given = |field: &str| steps.iter().any(|step| step.wanted.gives(field));
    // A preamble's fields may also come from `[record]`; that is looked at when both are known.
    let lacking: Vec<&str> = spec.reply.iter().map(|(name, _)| *name).filter(|field| !given(field)).collect();
    if !lacking.is_empty() && intent != Intent::RecordPreamble {
        let help = "name them in `reply` or `line` of an `ask`".to_owned();
        complaint(format!("no reply of `{intent}` gives {}", lacking.join(", ")), help);
    }
    Some(steps)
}

fn question(mut table: Table<'_>, intent: Intent, words: &Maps, pause_s: f64) -> Option<Step> {
    let pause_s = pause(&mut table).unwrap_or(pause_s);
    let send = table.text("send").or_else(|| table.missing("send", "give the question"));
    let template = send.and_then(|send| {
        Template::parse(&send.value, intent, words).map_err(|refusal| refuse(&table, send.span, refusal)).ok()
    });
    let ways = ["reply", "line", "block"].iter().filter(|key| table.has(key)).count();
    let wanted = if ways != 1 {
        let help = "one of `reply = [\"…\"]` (a comma list), `line = \"…\"` (the whole line), `block = true`";
        table.mistakes().add(table.span(), "how the reply looks must be said once", help);
        None
    } else if let Some(places) = table.texts("reply") {
        let begin = places.first().map_or_else(|| table.span(), |first| first.span.clone());
        Shape::list(places.iter().map(|item| item.value.as_str()), intent, words)
            .map_err(|refusal| refuse(&table, begin, refusal))
            .ok()
            .map(Wanted::Line)
    } else if let Some(place) = table.text("line") {
        let span = place.span.clone();
        Shape::line(&place.value, intent, words).map_err(|refusal| refuse(&table, span, refusal)).ok().map(Wanted::Line)
    } else if let Some(block) = table.flag("block") {
        if block.value && intent == Intent::RecordData {
            Some(Wanted::Block)
        } else {
            table.mistakes().add(block.span, "a block belongs to `record.data` alone", "leave `block` out");
            None
        }
    } else {
        None
    };
    table.refuse_others();
    Some(Step { template: template?, wanted: wanted?, pause_s })
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

fn reading(top: &mut Table<'_>, intents: &BTreeMap<Intent, Vec<Step>>) -> Option<Reading> {
    let samples = top.table("samples").map(|mut table| {
        let span = table.span();
        let format = choice(&mut table, "format", &Format::NAMES);
        let format = format.or_else(|| table.missing("format", "one of i8, u8, i16, u16, f32, text"));
        let order = choice(&mut table, "order", &[("big", Order::Big), ("little", Order::Little)]);
        let single = matches!(format, Some(Format::I8 | Format::U8 | Format::Text));
        let order = order
            .or_else(|| if single { Some(Order::Big) } else { table.missing("order", "`\"big\"` or `\"little\"`") });
        table.refuse_others();
        (span, format, order)
    });
    let steps = intents.get(&Intent::RecordPreamble).map(Vec::as_slice).unwrap_or_default();
    let names: Vec<&str> = steps.iter().flat_map(|step| step.wanted.names()).collect();
    let (mut volts, mut seconds, mut fields) = (None, None, Vec::new());
    if let Some(mut table) = top.table("record") {
        volts = expression(&mut table, "volts", &names, Some("raw"));
        seconds = expression(&mut table, "seconds", &names, Some("index"));
        let single = ["points", "low_code", "high_code", "step_v", "averages", "acquisition"];
        fields = single
            .into_iter()
            .filter_map(|name| expression(&mut table, name, &names, None).map(|expression| (name, expression)))
            .collect();
        table.refuse_others();
    }
    let (span, format, order) = samples?;
    let reading = Reading { format: format?, order: order?, volts, seconds, fields };
    let given = reading.gives();
    let lacking: Vec<&str> =
        PREAMBLE.iter().map(|(name, _)| *name).filter(|name| !names.contains(name) && !given.contains(name)).collect();
    if !lacking.is_empty() && intents.contains_key(&Intent::RecordPreamble) {
        let help = "name them in the reply of `record.preamble`, or give `volts` (of `raw`), `seconds` (of `index`) or \
                    an expression of their name under `[record]`";
        top.mistakes().add(span, format!("nothing gives {}", lacking.join(", ")), help);
    }
    Some(reading)
}

fn expression(table: &mut Table<'_>, key: &'static str, names: &[&str], variable: Option<&str>) -> Option<Expression> {
    let text = table.text(key)?;
    let known: Vec<&str> = names.iter().copied().chain(variable).collect();
    match Expression::compile(key, &text.value, &known) {
        Ok(expression) => Some(expression),
        Err(why) => {
            table.mistakes().add(text.span, format!("`{key}`: {why}"), format!("names here: {}", known.join(", ")));
            None
        }
    }
}
