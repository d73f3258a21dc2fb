//! The intents of a dialect file: what is sent and what comes back.

use std::collections::BTreeMap;

use super::{Maps, pause, refuse};
use crate::dialect::Intent;
use crate::dialect::reply::Shape;
use crate::dialect::step::{Step, Wanted};
use crate::dialect::template::Template;
use crate::document::{Item, Table};

/// Every intent that the file has words for.
pub(super) fn intents(top: &mut Table<'_>, words: &Maps, pause_s: f64) -> BTreeMap<Intent, Vec<Step>> {
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
