//! What goes out and what comes back, between a dialect and the task that owns the connection.

use super::DialectError;
use crate::analysis::record::Samples;

/// What comes back for one exchange.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Expect {
    /// Nothing.
    Nothing,
    /// One line.
    Line,
    /// One definite-length block. How long it may be: [`super::Dialect::most_block_bytes`].
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

    /// The line, or `None` for a block, when it is what the exchange expects.
    pub(super) fn fitting(&self, exchange: &Exchange) -> Result<Option<&str>, DialectError> {
        let wrong = |wanted, found| DialectError::WrongMessage { command: exchange.command(), wanted, found };
        match (self, exchange.expect) {
            (Self::Line(line), Expect::Line) => Ok(Some(line)),
            (Self::Block(_), Expect::Block) => Ok(None),
            (Self::Line(_), _) => Err(wrong("a block", "a line of text")),
            (Self::Block(_), _) => Err(wrong("a line of text", "a block")),
        }
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
        // Rounding must not take the last step away: 100 ns in steps of 50 ps are 2000, not 1999.999….
        let steps = (self.range_s / self.step_s * (1.0 + 1e-9)).floor();
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
