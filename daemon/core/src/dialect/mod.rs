//! A dialect: data that say how a kind of instrument is asked for what the daemon wants.
//!
//! A [`Call`] is an [`Intent`] with typed arguments; a [`Dialect`] plans it into [`Exchange`]s of SCPI text, and reads
//! the [`Message`]s that come back into [`Fields`]. No value can bring a second command with it: each is written by
//! its type. What a dialect file may hold is described in `configs/dialects/README.md`.

mod call;
mod convert;
mod error;
mod exchange;
mod expression;
mod intent;
mod like;
mod read;
mod record;
mod reply;
mod samples;
mod split;
mod step;
mod template;
mod value;
mod words;

use std::collections::BTreeMap;

pub use call::{Call, MOST_CHANNELS};
pub use error::DialectError;
pub use exchange::{Completion, Exchange, Expect, Message, RawRecord, SkewSetting};
pub use intent::{ArgKind, COUPLINGS, HIGHEST_CHANNEL, Intent, IntentKind, IntentSpec, ReplyKind, SLOPES};
pub use like::{Mistaken, Source};
pub use value::{Args, Fields, Value};

use record::Reading;
use reply::Manner;
use step::{Errors, Spoken, Step, Waiting, Wanted};
use words::Words;

use crate::analysis::record::Samples;
use crate::document::Mistake;
use crate::scpi::write;

/// A checked dialect.
#[derive(Debug)]
pub struct Dialect {
    name: String,
    about: String,
    ending: &'static str,
    greeting: bool,
    one_client: bool,
    manner: Manner,
    words: BTreeMap<String, Words>,
    intents: BTreeMap<Intent, Spoken>,
    errors: Option<Errors>,
    completion: Option<Waiting>,
    /// Whether it goes on acquiring by itself.
    free: bool,
    /// The most samples that are asked for at once.
    window: Option<i64>,
    /// The setting, and whether a positive value shifts a record later.
    skew: Option<(SkewSetting, bool)>,
    reading: Option<Reading>,
    pause_s: f64,
}

/// The dialects that come with the program.
const BUNDLED: [(&str, &str); 1] = [("scpi-99", include_str!("../../../../configs/dialects/scpi-99.toml"))];

/// The text of a dialect that comes with the program, by name.
#[must_use]
pub fn bundled(name: &str) -> Option<&'static str> {
    BUNDLED.iter().find(|(known, _)| *known == name).map(|(_, text)| *text)
}

/// The names of the dialects that come with the program.
pub fn bundled_names() -> impl Iterator<Item = &'static str> {
    BUNDLED.iter().map(|(name, _)| *name)
}

impl Dialect {
    /// Reads a dialect's text, which may be `like` one that comes with the program, but not like another file.
    ///
    /// # Errors
    /// Every mistake in it.
    pub fn read(text: &str) -> Result<Self, Vec<Mistake>> {
        like::read_alone(text)
    }

    /// Reads a dialect file. When it is `like` another file, `find` is asked for that with the path as it is written
    /// and the place of the file that says so; the place that it gives back must be the same for the same file.
    ///
    /// # Errors
    /// Every mistake, by the file it stands in.
    pub fn read_from(
        source: Source,
        find: &mut dyn FnMut(&str, &str) -> Result<Source, String>,
    ) -> Result<Self, Vec<Mistaken>> {
        like::read(source, find)
    }

    /// Its name.
    #[must_use]
    pub fn name(&self) -> &str {
        &self.name
    }

    /// What it is for, in a sentence; empty when the file does not say.
    #[must_use]
    pub fn about(&self) -> &str {
        &self.about
    }

    /// Whether it has words for this intent.
    #[must_use]
    pub fn supports(&self, intent: Intent) -> bool {
        match intent {
            Intent::Complete => self.completion.is_some(),
            Intent::Error => self.errors.is_some(),
            other => self.intents.contains_key(&other),
        }
    }

    /// What to send for a call, in order.
    ///
    /// # Errors
    /// When the call is wrong, or the dialect has no words for it.
    pub fn plan(&self, call: &Call) -> Result<Vec<Exchange>, DialectError> {
        call.check()?;
        match call.intent {
            Intent::Complete => {
                self.completion_query().map(|exchange| vec![exchange]).ok_or_else(|| self.unsupported(call.intent))
            }
            Intent::Error => {
                self.error_query().map(|exchange| vec![exchange]).ok_or_else(|| self.unsupported(call.intent))
            }
            intent => {
                let spoken = self.spoken(intent)?;
                let args = spoken.conversions.outwards(self.turned(call)?)?;
                let exchange = |step: &Step| {
                    let command = step.template.render(intent, &args, &self.words)?;
                    Ok(self.exchange(&command, step.wanted.expect(), step.pause_s))
                };
                spoken.steps.iter().map(exchange).collect()
            }
        }
    }

    /// Reads the replies to a call: one message for each exchange that expects one, in order.
    ///
    /// The samples of `record.data` are no field: see [`Dialect::record`].
    ///
    /// # Errors
    /// When a reply is not what the dialect says.
    pub fn parse(&self, call: &Call, replies: &[Message]) -> Result<Fields, DialectError> {
        let planned = self.plan(call)?;
        let asked: Vec<&Exchange> = planned.iter().filter(|exchange| exchange.expect != Expect::Nothing).collect();
        if asked.len() != replies.len() {
            return Err(DialectError::Replies { intent: call.intent, wanted: asked.len(), found: replies.len() });
        }
        let mut pairs = Vec::with_capacity(replies.len());
        for (exchange, reply) in asked.into_iter().zip(replies) {
            pairs.push((exchange.command(), reply.fitting(exchange)?));
        }
        let mut fields = Fields::new();
        match (call.intent, &self.errors, &self.completion, pairs.as_slice()) {
            (Intent::Error, Some(errors), _, [(command, Some(line))]) => {
                let (number, text) = errors.read(line, command, self.manner)?.unwrap_or_default();
                fields.set("number", number);
                fields.set("text", Value::Text(text));
            }
            (Intent::Complete, _, Some(waiting), [(command, Some(line))]) => {
                fields.set("done", waiting.done(line, command, self.manner)?);
            }
            (intent, ..) => {
                let spoken = self.spoken(intent)?;
                let asking = spoken.steps.iter().filter(|step| !matches!(step.wanted, Wanted::Nothing));
                for (step, (command, line)) in asking.zip(&pairs) {
                    // Megabytes of samples in text are not copied into a field.
                    if let (Wanted::Line(shape), Some(line), true) = (&step.wanted, line, intent != Intent::RecordData)
                    {
                        shape.read(line, command, step.manner, &self.words, &mut fields)?;
                    }
                }
                fields = spoken.conversions.inwards(intent, &call.args, fields)?;
            }
        }
        match (call.intent, &self.reading) {
            (Intent::RecordPreamble, Some(reading)) => reading.complete(&mut fields)?,
            (Intent::AverageGet, _) => {
                // Switched off, whatever count stands by.
                let off = fields.take("state") == Some(Value::Flag(false));
                if off {
                    fields.set("count", 1);
                }
            }
            (Intent::SkewGet, _) if self.shifts_later() => {
                let delay_s = fields.number("delay_s")?;
                fields.set("delay_s", 0.0 - delay_s);
            }
            _ => {}
        }
        Ok(fields)
    }

    /// The calls that ask for the `points` samples of one channel, in order: one, or one for each window.
    pub fn data_calls(&self, channel: i64, points: i64) -> impl Iterator<Item = Call> + use<> {
        let windowed = self.window.is_some();
        self.windows(points).map(move |(first, count)| {
            let call = Call::new(Intent::RecordData).with("channel", channel);
            if windowed { call.with("first", first).with("count", count) } else { call }
        })
    }

    /// The windows that so many samples are read in: the first sample of each, and how many there are.
    fn windows(&self, points: i64) -> impl Iterator<Item = (i64, i64)> + use<> {
        let points = points.max(1);
        let most = self.window.unwrap_or(points);
        let step = usize::try_from(most).unwrap_or(usize::MAX);
        (0..points).step_by(step).map(move |first| (first, most.min(points - first)))
    }

    /// Reads a record out of its preamble's fields and the replies to [`Dialect::data_calls`].
    ///
    /// # Errors
    /// When they do not fit each other or the dialect.
    pub fn record(&self, preamble: &Fields, data: &[Message]) -> Result<RawRecord, DialectError> {
        let reading = self.reading.as_ref().ok_or_else(|| self.unsupported(Intent::RecordData))?;
        let steps = self.intents.get(&Intent::RecordData).map(|spoken| spoken.steps.as_slice()).unwrap_or_default();
        let manner = steps.last().map_or(self.manner, |step| step.manner);
        let windows = self.windows(preamble.whole("points")?);
        let wanted = self.windows(preamble.whole("points")?).count();
        if wanted != data.len() {
            return Err(DialectError::Replies { intent: Intent::RecordData, wanted, found: data.len() });
        }
        let mut all: Option<Samples> = None;
        for ((first, wanted), message) in windows.zip(data) {
            let samples = reading.samples(message, Intent::RecordData.name(), manner)?;
            if self.window.is_some() && i64::try_from(samples.len()).ok() != Some(wanted) {
                return Err(DialectError::Window { first, wanted, found: samples.len() });
            }
            match (&mut all, samples) {
                (Some(Samples::Codes(all)), Samples::Codes(more)) => all.extend(more),
                (Some(Samples::Numbers(all)), Samples::Numbers(more)) => all.extend(more),
                // A dialect has one format, so the first is the only one that is left.
                (_, first) => all = Some(first),
            }
        }
        reading.record(preamble, all.unwrap_or_else(|| Samples::Codes(Vec::new())))
    }

    /// The most bytes that a block of so many samples may have.
    #[must_use]
    pub fn most_block_bytes(&self, points: u64) -> usize {
        let each = self.reading.as_ref().map_or(0, |reading| reading.format.bytes());
        usize::try_from(points).unwrap_or(usize::MAX).saturating_mul(each)
    }

    /// The question that takes one entry out of the error queue; `None` when the instrument has no such queue.
    #[must_use]
    pub fn error_query(&self) -> Option<Exchange> {
        self.errors.as_ref().and_then(|errors| self.plain(&errors.ask, Intent::Error))
    }

    /// Reads one reply to [`Dialect::error_query`]: number and text, or `None` when the queue is empty.
    ///
    /// # Errors
    /// When the reply holds no number, so that it cannot be a reply to this question.
    pub fn parse_error(&self, line: &str) -> Result<Option<(i64, String)>, DialectError> {
        match &self.errors {
            Some(errors) => errors.read(line, Intent::Error.name(), self.manner),
            None => Err(self.unsupported(Intent::Error)),
        }
    }

    /// How it tells that something is complete; `None` when its commands are complete as soon as they are taken. The
    /// question is planned from [`Intent::Complete`], whose reply has `done`.
    #[must_use]
    pub fn completion(&self) -> Option<&Completion> {
        self.completion.as_ref().map(|waiting| &waiting.how)
    }

    /// The scope's own skew setting, if it has one.
    #[must_use]
    pub fn skew(&self) -> Option<SkewSetting> {
        self.skew.map(|(setting, _)| setting)
    }

    /// Whether the scope goes on acquiring by itself: it must be stopped by [`Intent::AcquireAbort`] before both legs
    /// are read.
    #[must_use]
    pub fn runs_freely(&self) -> bool {
        self.free
    }

    /// Whether the instrument serves one connection at a time.
    #[must_use]
    pub fn one_client(&self) -> bool {
        self.one_client
    }

    /// Whether the instrument sends a line by itself when a connection is made.
    #[must_use]
    pub fn greeting(&self) -> bool {
        self.greeting
    }

    /// The most bytes of text that may stand before a block: the repeated header, where replies have one, or what the
    /// dialect allows.
    #[must_use]
    pub fn most_lead_bytes(&self) -> usize {
        // A header is no longer than the longest command that a dialect may hold.
        let header = if self.manner.header { template::LONGEST } else { 0 };
        self.reading.as_ref().map_or(header, |reading| reading.most_lead_bytes.max(header))
    }

    /// Text as it was typed, for benches that allow it. It is one line; what it does is its author's business.
    ///
    /// # Errors
    /// When it holds a character that cannot be sent, such as a line end.
    pub fn raw(&self, text: &str, expects_reply: bool) -> Result<Exchange, DialectError> {
        write::printable(text).map_err(|source| DialectError::Raw { source })?;
        let expect = if expects_reply { Expect::Line } else { Expect::Nothing };
        Ok(self.exchange(text, expect, self.pause_s))
    }

    fn completion_query(&self) -> Option<Exchange> {
        self.completion.as_ref().and_then(|waiting| self.plain(&waiting.ask, Intent::Complete))
    }

    fn plain(&self, template: &template::Template, intent: Intent) -> Option<Exchange> {
        // A template without places cannot fail.
        let command = template.render(intent, &Args::new(), &self.words).ok()?;
        Some(self.exchange(&command, Expect::Line, self.pause_s))
    }

    fn exchange(&self, command: &str, expect: Expect, pause_after_s: f64) -> Exchange {
        Exchange { send: format!("{command}{}", self.ending).into_bytes(), expect, pause_after_s }
    }

    fn spoken(&self, intent: Intent) -> Result<&Spoken, DialectError> {
        self.intents.get(&intent).ok_or_else(|| self.unsupported(intent))
    }

    fn shifts_later(&self) -> bool {
        self.skew.is_some_and(|(_, later)| later)
    }

    /// The arguments as the instrument means them: its skew may count the other way.
    fn turned(&self, call: &Call) -> Result<Args, DialectError> {
        let mut args = call.args.clone();
        if call.intent == Intent::SkewSet && self.shifts_later() {
            args.set("delay_s", 0.0 - args.number("delay_s")?);
        }
        Ok(args)
    }

    fn unsupported(&self, intent: Intent) -> DialectError {
        DialectError::Unsupported { dialect: self.name.clone(), intent }
    }
}

#[cfg(test)]
mod tests;
