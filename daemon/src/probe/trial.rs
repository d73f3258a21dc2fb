//! Trying one intent after the other.

use std::time::Duration;

use evenpair_core::dialect::{ArgKind, Call, Fields, Intent, IntentKind, Message, Value};
use evenpair_core::scpi::value::shorten;

use super::adjust::{Agreement, PAIRS, compare, other};
use super::findings::{Findings, Outcome, Row};
use crate::arguments::{DialectArguments, Role};
use crate::session::{Caps, Handle, SessionError};

/// How many times the time for one reply an acquisition may take.
const ACQUISITION: u32 = 5;

/// Why something that drives what is connected is not tried.
const NEVER: &str = "never tried: it drives what is connected; try it from a bench";

/// Why the instrument's settings are not all taken away.
const RESET: &str = "never tried: it would take every setting away";

/// Tries every intent that the dialect has words for.
pub(super) async fn all(handle: &Handle, arguments: &DialectArguments, findings: &mut Findings) {
    let trial = Trial { handle, arguments };
    // Samples are asked for by what their preamble says.
    let mut preamble = None;
    for intent in Intent::all().filter(|intent| handle.dialect().supports(*intent)) {
        if arguments.role.is_some_and(|role| !serves(role, intent)) {
            continue;
        }
        let row = match intent {
            Intent::RecordData => trial.data(preamble.as_ref()).await,
            Intent::Reset => skipped(intent, RESET),
            _ if never(intent) => skipped(intent, NEVER),
            _ if intent.spec().kind == IntentKind::Query || intent == Intent::Error => {
                let (mut row, fields) = trial.ask(trial.call(intent)).await;
                if intent == Intent::RecordPreamble {
                    if fields.is_none() && !arguments.allow_set {
                        row.why += "; before an acquisition there is no record: `--allow-set` starts one";
                    }
                    preamble = fields;
                }
                row
            }
            _ if !arguments.allow_set => skipped(intent, "it changes the instrument: `--allow-set` tries it"),
            Intent::AcquireStart => trial.acquire().await,
            _ => match PAIRS.iter().find(|(set, _)| *set == intent) {
                Some((set, get)) => trial.set(*set, *get).await,
                None => trial.ask(trial.call(intent)).await.0,
            },
        };
        findings.add(row);
    }
}

/// What is not tried whatever is allowed.
fn never(intent: Intent) -> bool {
    let drives = ["source.", "output.set", "route.close", "route.open"];
    drives.iter().any(|head| intent.name().starts_with(head))
}

/// Whether an instrument in this role needs this intent.
fn serves(role: Role, intent: Intent) -> bool {
    let head = intent.name().split('.').next().unwrap_or_default();
    match head {
        "vertical" | "coupling" | "timebase" | "trigger" | "average" | "format" | "acquire" | "record" | "skew" => {
            role == Role::Scope
        }
        "source" | "output" => matches!(role, Role::Source | Role::Supply),
        "measure" => role == Role::Supply,
        "route" => role == Role::Switch,
        _ => true,
    }
}

fn skipped(intent: Intent, why: &str) -> Row {
    let (sent, received) = (String::new(), String::new());
    Row { intent, outcome: Outcome::Skipped, sent, received, why: why.to_owned() }
}

struct Trial<'t> {
    handle: &'t Handle,
    arguments: &'t DialectArguments,
}

impl Trial<'_> {
    /// The call with the channel that was chosen.
    fn call(&self, intent: Intent) -> Call {
        let channel = self.arguments.channel;
        intent.spec().args.iter().fold(Call::new(intent), |call, (name, kind)| match kind {
            ArgKind::Channel => call.with(*name, channel),
            ArgKind::Channels => call.with(*name, vec![channel]),
            _ => call,
        })
    }

    /// What a call sends, as one line.
    fn sent(&self, call: &Call) -> String {
        let plan = self.handle.dialect().plan(call).unwrap_or_default();
        plan.iter().map(evenpair_core::dialect::Exchange::command).collect::<Vec<_>>().join("; ")
    }

    /// Makes a call and looks at what comes back.
    async fn ask(&self, call: Call) -> (Row, Option<Fields>) {
        let (intent, sent) = (call.intent, self.sent(&call));
        match self.handle.look(call, Caps::default().block_bytes).await {
            Ok((messages, fields)) => {
                let received = messages.iter().map(shown).collect::<Vec<_>>().join("; ");
                (Row { intent, outcome: Outcome::Works, sent, received, why: String::new() }, Some(fields))
            }
            Err(error) => (failed(intent, sent, &error), None),
        }
    }

    /// Changes a setting, asks for it, compares, and gives the old one back.
    async fn set(&self, set: Intent, get: Intent) -> Row {
        if !self.handle.dialect().supports(get) {
            return skipped(set, &format!("without words for `{get}` it could not be given back"));
        }
        let (asked_first, before) = self.ask(self.call(get)).await;
        let Some(before) = before else {
            return skipped(set, &format!("`{get}`: {}; so it could not be given back", asked_first.why));
        };
        let skew = self.handle.dialect().skew();
        let wanted = other(set, &before, skew);
        let row = self.change(set, get, &wanted, &before).await;
        let back = self.change(set, get, &before, &wanted).await;
        match (&row.outcome, &back.outcome) {
            (Outcome::Works | Outcome::Differs | Outcome::Refused, Outcome::Works) => row,
            _ => {
                let why = format!("IT COULD NOT BE GIVEN BACK: {}; look at the instrument. {}", back.why, row.why);
                Row { outcome: Outcome::Differs, why: why.trim_end().to_owned(), ..back }
            }
        }
    }

    /// Sets, asks and compares.
    async fn change(&self, set: Intent, get: Intent, wanted: &Fields, before: &Fields) -> Row {
        let call = wanted.iter().fold(self.call(set), |call, (name, value)| call.with(name.clone(), value.clone()));
        let (row, done) = self.ask(call).await;
        if done.is_none() {
            return row;
        }
        let (answer, said) = self.ask(self.call(get)).await;
        let Some(said) = said else {
            return Row { outcome: Outcome::Differs, received: answer.received, why: answer.why, ..row };
        };
        let (outcome, why) = match compare(wanted, &said, before, self.handle.dialect().skew()) {
            Agreement::Same => (Outcome::Works, String::new()),
            Agreement::Rounded(words) => (Outcome::Works, format!("it rounds: {words}")),
            Agreement::Differs(words) => (Outcome::Differs, words),
        };
        Row { outcome, received: answer.received, why, ..row }
    }

    /// Starts an acquisition, without waiting for a trigger where the dialect has words for that, and waits for its end.
    async fn acquire(&self) -> Row {
        let speaks = |intent| self.handle.dialect().supports(intent);
        let mut old = None;
        if speaks(Intent::TriggerGet) && speaks(Intent::TriggerSet) {
            old = self.ask(self.call(Intent::TriggerGet)).await.1;
        }
        let trigger = |fields: &Fields| {
            fields
                .iter()
                .fold(Call::new(Intent::TriggerSet), |call, (name, value)| call.with(name.clone(), value.clone()))
        };
        if let Some(old) = &old {
            let at_once = trigger(old).with("channel", Value::Whole(-1));
            if self.handle.dialect().plan(&at_once).is_ok() {
                // Refused, the acquisition waits for the trigger that is set.
                let _ = self.handle.call(at_once).await;
            }
        }
        let (mut row, started) = self.ask(self.call(Intent::AcquireStart)).await;
        if started.is_some() {
            let within = Duration::from_secs_f64(self.arguments.timeout_s) * ACQUISITION;
            if let Err(error) = self.handle.complete(within).await {
                row = failed(row.intent, row.sent, &error);
                if speaks(Intent::AcquireAbort) {
                    let _ = self.handle.call(self.call(Intent::AcquireAbort)).await;
                }
            }
        }
        if let Some(old) = &old
            && let Err(error) = self.handle.call(trigger(old)).await
        {
            row.why = format!("THE TRIGGER COULD NOT BE GIVEN BACK: {error}. {}", row.why);
            row.outcome = Outcome::Differs;
        }
        row
    }

    /// Reads the samples that the preamble tells of.
    async fn data(&self, preamble: Option<&Fields>) -> Row {
        let dialect = self.handle.dialect();
        let Some((preamble, points)) = preamble.and_then(|fields| Some((fields, fields.whole("points").ok()?))) else {
            return skipped(Intent::RecordData, "there is no preamble that says how many samples there are");
        };
        let mut first = None;
        let mut blocks = Vec::new();
        for call in dialect.data_calls(self.arguments.channel, points) {
            let expected = u64::try_from(call.args.whole("count").unwrap_or(points)).unwrap_or(0);
            let (intent, sent) = (call.intent, self.sent(&call));
            let sent = first.get_or_insert(sent).clone();
            match self.handle.data(call, expected).await {
                Ok(block) => blocks.push(block),
                Err(error) => return failed(intent, sent, &error),
            }
        }
        let received = blocks.first().map(shown).unwrap_or_default();
        let (outcome, mut why) = match dialect.record(preamble, &blocks) {
            Ok(record) => {
                (Outcome::Works, format!("{} samples of acquisition {}", record.samples.len(), record.acquisition))
            }
            Err(error) => (Outcome::Differs, error.to_string()),
        };
        if blocks.len() > 1 {
            why = format!("{why}, in {} windows", blocks.len());
        }
        Row { intent: Intent::RecordData, outcome, sent: first.unwrap_or_default(), received, why }
    }
}

fn shown(message: &Message) -> String {
    match message {
        Message::Line(line) => shorten(line),
        Message::Block(bytes) => format!("a block of {} bytes", bytes.len()),
    }
}

/// What an error says about an intent.
fn failed(intent: Intent, sent: String, error: &SessionError) -> Row {
    let (outcome, received, why) = match error {
        SessionError::Refused { command, number, text, more, .. } => {
            let others = if *more == 0 { String::new() } else { format!(", and {more} more in its queue") };
            let at = if *command == sent { String::new() } else { format!(" after `{command}`") };
            (Outcome::Refused, String::new(), format!("error {number}, \"{text}\"{others}{at}"))
        }
        SessionError::TimedOut { command, after, .. } => {
            (Outcome::Differs, "nothing".to_owned(), format!("no answer to `{command}` within {after:?}"))
        }
        SessionError::Unreadable { source, .. } | SessionError::Dialect { source, .. } => {
            (Outcome::Differs, String::new(), source.to_string())
        }
        other => (Outcome::Differs, String::new(), other.to_string()),
    };
    Row { intent, outcome, sent, received, why }
}
