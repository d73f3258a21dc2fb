//! A dialect: data that say how a kind of instrument is asked for what the daemon wants.
//!
//! A [`Call`] is an [`Intent`] with typed arguments; a [`Dialect`] plans it into [`Exchange`]s of SCPI text, and reads
//! the [`Message`]s that come back into [`Fields`]. No value can bring a second command with it: each is written by
//! its type. What a dialect file may hold is described in `configs/dialects/README.md`.

mod call;
mod error;
mod intent;
mod value;

pub use call::{Call, MOST_CHANNELS};
pub use error::DialectError;
pub use intent::{ArgKind, COUPLINGS, HIGHEST_CHANNEL, Intent, IntentKind, IntentSpec, ReplyKind, SLOPES};
pub use value::{Args, Fields, Value};

use crate::analysis::record::Samples;
use crate::document::Mistake;

/// What comes back for one exchange.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Expect {
    /// Nothing.
    Nothing,
    /// One line.
    Line,
    /// One definite-length block. How long it may be: [`Dialect::most_block_bytes`].
    Block,
}

/// Something to send, and what to wait for.
#[derive(Debug, Clone, PartialEq)]
pub struct Exchange {
    /// The bytes, with the line ending.
    pub send: Vec<u8>,
    /// What comes back.
    pub expect: Expect,
    /// How long to wait after it (after the reply, if there is one) before anything else is sent, in seconds.
    pub pause_after_s: f64,
}

impl Exchange {
    /// The command without its line ending, for messages and logs.
    #[must_use]
    pub fn command(&self) -> String {
        String::from_utf8_lossy(&self.send).trim_end().to_owned()
    }
}

/// Something that came back.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Message {
    /// A line of text, without its ending.
    Line(String),
    /// The data of a block.
    Block(Vec<u8>),
}

impl Message {
    /// A line out of bytes; what is not UTF-8 is replaced, for a stray byte in a name is no reason to fail.
    #[must_use]
    pub fn line(bytes: &[u8]) -> Self {
        Self::Line(String::from_utf8_lossy(bytes).into_owned())
    }
}

/// How an instrument tells that what it was doing is complete.
#[derive(Debug, Clone, PartialEq)]
pub enum Completion {
    /// It answers only when everything is complete, as `*OPC?` does: ask once and wait.
    Answer,
    /// It answers at once: ask again every so many seconds until the reply says that it is complete.
    Poll {
        /// How long to wait between two questions, in seconds.
        every_s: f64,
    },
}

/// The scope's own skew setting.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SkewSetting {
    /// Its step in seconds.
    pub step_s: f64,
    /// The largest delay either way, in seconds.
    pub range_s: f64,
}

impl SkewSetting {
    /// The delay nearest to `delay_s` that the scope can set.
    #[must_use]
    pub fn round(&self, delay_s: f64) -> f64 {
        let steps = (self.range_s / self.step_s).floor();
        (delay_s / self.step_s).round().clamp(-steps, steps) * self.step_s
    }
}

/// One leg's record at the scope's input, before the probe's attenuation is applied.
#[derive(Debug, Clone, PartialEq)]
pub struct RawRecord {
    /// Raw samples.
    pub samples: Samples,
    /// Volts at the input per code.
    pub volts_per_code: f64,
    /// Volts at the input at code 0.
    pub zero_v: f64,
    /// Seconds between two samples.
    pub interval_s: f64,
    /// Time of sample 0 relative to the trigger, in seconds.
    pub start_s: f64,
    /// The converter's lowest and highest code.
    pub end_codes: (f64, f64),
    /// One converter step in volts at the input.
    pub step_v: f64,
    /// How many acquisitions were averaged into it, at least 1.
    pub averages: u32,
    /// Which acquisition it is from: equal for both channels of one acquisition, different for the next.
    pub acquisition: i64,
}

/// A checked dialect.
#[derive(Debug)]
pub struct Dialect {
    name: String,
}

/// The text of a dialect that comes with the program, by name.
#[must_use]
pub fn bundled(name: &str) -> Option<&'static str> {
    let _ = name;
    None
}

impl Dialect {
    /// Reads a dialect file.
    ///
    /// # Errors
    /// Every mistake in it.
    pub fn read(text: &str) -> Result<Self, Vec<Mistake>> {
        crate::document::read(text, |top| Some(Self { name: top.text("name")?.value }))
    }

    /// Its name.
    #[must_use]
    pub fn name(&self) -> &str {
        &self.name
    }

    /// Whether it has words for this intent.
    #[must_use]
    pub fn supports(&self, intent: Intent) -> bool {
        let _ = intent;
        false
    }

    /// What to send for a call, in order.
    ///
    /// # Errors
    /// When the call is wrong, or the dialect has no words for it.
    pub fn plan(&self, call: &Call) -> Result<Vec<Exchange>, DialectError> {
        call.check()?;
        Err(DialectError::Unsupported { dialect: self.name.clone(), intent: call.intent })
    }

    /// Reads the replies to a call: one message for each exchange that expects one, in order.
    ///
    /// # Errors
    /// When a reply is not what the dialect says.
    pub fn parse(&self, call: &Call, replies: &[Message]) -> Result<Fields, DialectError> {
        let _ = replies;
        Err(DialectError::Unsupported { dialect: self.name.clone(), intent: call.intent })
    }

    /// Reads a record out of its preamble's fields and the reply to `record.data`.
    ///
    /// # Errors
    /// When they do not fit each other or the dialect.
    pub fn record(&self, preamble: &Fields, data: &Message) -> Result<RawRecord, DialectError> {
        let _ = (preamble, data);
        Err(DialectError::Unsupported { dialect: self.name.clone(), intent: Intent::RecordData })
    }

    /// The most bytes that a block of so many samples may have.
    #[must_use]
    pub fn most_block_bytes(&self, points: u64) -> usize {
        usize::try_from(points).unwrap_or(usize::MAX).saturating_mul(2)
    }

    /// The question that takes one entry out of the error queue; `None` when the instrument has no such queue.
    #[must_use]
    pub fn error_query(&self) -> Option<Exchange> {
        None
    }

    /// Reads one reply to [`Dialect::error_query`]: number and text, or `None` when the queue is empty.
    #[must_use]
    pub fn parse_error(&self, line: &str) -> Option<(i64, String)> {
        let _ = line;
        None
    }

    /// How it tells that something is complete. The question is planned from [`Intent::Complete`], whose reply has
    /// `done`.
    #[must_use]
    pub fn completion(&self) -> &Completion {
        &Completion::Answer
    }

    /// The scope's own skew setting, if it has one.
    #[must_use]
    pub fn skew(&self) -> Option<SkewSetting> {
        None
    }

    /// Text as bytes with the line ending, for commands that a bench allows to be typed in.
    ///
    /// # Errors
    /// When it holds a line end or what cannot be sent.
    pub fn raw(&self, text: &str, expects_reply: bool) -> Result<Exchange, DialectError> {
        let _ = (text, expects_reply);
        Err(DialectError::Unsupported { dialect: self.name.clone(), intent: Intent::Clear })
    }
}
