//! The intents of a dialect file: what is sent and what comes back.

use std::collections::BTreeMap;

use super::convert::{self, Draft, arguments};
use super::{General, Maps, choice_of_sign, pause, refuse};
use crate::dialect::Intent;
use crate::dialect::reply::{Manner, Shape, Signs, Whose};
use crate::dialect::step::{Spoken, Step, Wanted};
use crate::dialect::template::{Places, Template};
use crate::document::{Item, Table};

/// Every intent that the file has words for.
pub(super) fn intents(top: &mut Table<'_>, words: &Maps, general: General) -> BTreeMap<Intent, Spoken> {
    let mut drafts = convert::drafts(top, general.windowed);
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
                let draft = drafts.remove(&intent).unwrap_or_default();
                if let Some(spoken) = spoken(table, intent, words, general, &name, draft) {
                    intents.insert(intent, spoken);
                }
            }
            None => {
                let known: Vec<&str> = Intent::all().map(Intent::name).collect();
                let help = format!("known: {}", known.join(", "));
                table.mistakes().add(name.span, format!("`{}` is no intent", name.value), help);
            }
        }
    }
    convert::refuse_left(top, drafts);
    intents
}

fn spoken(
    mut table: Table<'_>,
    intent: Intent,
    words: &Maps,
    general: General,
    name: &Item<String>,
    draft: Draft,
) -> Option<Spoken> {
    let pause_s = pause(&mut table).unwrap_or(general.pause_s);
    let args = arguments(intent, general.windowed);
    let places = Places { args: args.clone(), derived: draft.derived() };
    let whose = Whose { intent, free: intent == Intent::RecordPreamble || draft.reads_replies(), words };
    let mut good = true;
    let mut steps = Vec::new();
    for command in table.texts("send").unwrap_or_default() {
        let template = Template::parse(&command.value, &places, words).and_then(|template| {
            if template.asks() {
                let help = "an unread reply would be taken for the next one: put it under `ask`";
                return Err((format!("`{}` asks for something", command.value), help.to_owned()));
            }
            Ok(template)
        });
        match template {
            Ok(template) => steps.push(Step { template, wanted: Wanted::Nothing, manner: general.manner, pause_s }),
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
            match question(ask, whose, &places, General { pause_s, ..general }) {
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
    for (argument, _) in &args {
        let used = steps.iter().any(|step| step.template.uses().any(|name| name == *argument)) || draft.uses(argument);
        if used == ignored.iter().any(|item| item.value == *argument) {
            let what = if used { "is used and ignored at once" } else { "is used nowhere" };
            complaint(
                format!("`{argument}` of `{intent}` {what}"),
                format!("use it, or say `ignore = [\"{argument}\"]`"),
            );
        }
    }
    for item in &ignored {
        if !args.iter().any(|(name, _)| *name == item.value) {
            let what = format!("`{}` is no argument of `{intent}`", item.value);
            table.mistakes().add(item.span.clone(), what, "leave it out of `ignore`");
        }
    }
    let given = |field: &str| steps.iter().any(|step| step.wanted.gives(field));
    // A preamble's fields may also come from `[record]`; that is looked at when both are known.
    let gives = |field: &&str| given(field) || draft.gives(field);
    let lacking: Vec<&str> = intent.spec().reply.iter().map(|(name, _)| *name).filter(|field| !gives(field)).collect();
    if !lacking.is_empty() && intent != Intent::RecordPreamble {
        let help = "name them in `reply`, `keys` or `line` of an `ask`, or make them under `[convert]`".to_owned();
        complaint(format!("no reply of `{intent}` gives {}", lacking.join(", ")), help);
    }
    let conversions = convert::finish(&table, intent, draft, &steps, general.windowed);
    Some(Spoken { steps, conversions })
}

fn question(mut table: Table<'_>, whose: Whose<'_>, places: &Places<'_>, general: General) -> Option<Step> {
    let pause_s = pause(&mut table).unwrap_or(general.pause_s);
    let header = table.flag("header").map_or(general.manner.header, |item| item.value);
    let send = table.text("send").or_else(|| table.missing("send", "give the question"));
    let template = send.and_then(|send| {
        Template::parse(&send.value, places, whose.words).map_err(|refusal| refuse(&table, send.span, refusal)).ok()
    });
    let ways = ["reply", "keys", "line", "block"].iter().filter(|key| table.has(key)).count();
    let wanted = if ways != 1 {
        let help = "one of `reply = [\"…\"]` (a comma list), `keys = { … }` (entries with keys), `line = \"…\"` (the \
                    whole line), `block = true`";
        table.mistakes().add(table.span(), "how the reply looks must be said once", help);
        None
    } else if let Some(places) = table.texts("reply") {
        let begin = places.first().map_or_else(|| table.span(), |first| first.span.clone());
        let between = choice_of_sign(&mut table, "between", ',');
        Shape::list(places.iter().map(|item| item.value.as_str()), between, whose)
            .map_err(|refusal| refuse(&table, begin, refusal))
            .ok()
            .map(Wanted::Line)
    } else if let Some(keys) = table.table("keys") {
        let between = choice_of_sign(&mut table, "between", ',');
        let joint = choice_of_sign(&mut table, "joint", ' ');
        keyed(keys, Signs { between, joint }, whose)
    } else if let Some(place) = table.text("line") {
        let span = place.span.clone();
        Shape::line(&place.value, whose).map_err(|refusal| refuse(&table, span, refusal)).ok().map(Wanted::Line)
    } else if let Some(block) = table.flag("block") {
        if block.value && whose.intent == Intent::RecordData {
            Some(Wanted::Block)
        } else {
            table.mistakes().add(block.span, "a block belongs to `record.data` alone", "leave `block` out");
            None
        }
    } else {
        None
    };
    table.refuse_others();
    let manner = Manner { header, ..general.manner };
    Some(Step { template: template?, wanted: wanted?, manner, pause_s })
}

/// A reply of entries with keys: each field, and the instrument's key for it.
fn keyed(mut table: Table<'_>, signs: Signs, whose: Whose<'_>) -> Option<Wanted> {
    let mut entries = Vec::new();
    for place in table.keys() {
        let key = table.text(&place.value)?;
        if key.value.trim().is_empty() || key.value.contains([signs.between, signs.joint]) {
            let help = "the signs are `between` (two entries, a comma unless given) and `joint` (a key and its value, a \
                        blank unless given)";
            table.mistakes().add(key.span, format!("`{}` cannot be found between its signs", key.value), help);
            return None;
        }
        entries.push((place.value, key.value));
    }
    let refused = |refusal| refuse(&table, table.span(), refusal);
    Shape::keyed(&entries, signs, whose).map_err(refused).ok().map(Wanted::Line)
}
