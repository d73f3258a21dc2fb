//! What can go wrong between an intent and an instrument's words.

use super::Intent;
use crate::scpi::value::ValueError;
use crate::scpi::write::WriteError;

/// Why a call could not be put into words, or its reply not be understood.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum DialectError {
    /// The dialect does not speak this intent.
    #[error("the dialect `{dialect}` has no words for `{intent}`; add `[intent.\"{intent}\"]` to it")]
    Unsupported {
        /// The dialect's name.
        dialect: String,
        /// What was wanted.
        intent: Intent,
    },
    /// A value that is needed is not there.
    #[error("`{name}` is missing")]
    Missing {
        /// The argument's or the field's name.
        name: String,
    },
    /// A value of another kind.
    #[error("`{name}` must be {wanted}, but it is {found}")]
    WrongKind {
        /// The argument's or the field's name.
        name: String,
        /// What it must be.
        wanted: &'static str,
        /// What it is.
        found: &'static str,
    },
    /// An argument that the intent does not have.
    #[error("`{intent}` has no argument `{name}`; it has: {known}")]
    UnknownArgument {
        /// The intent.
        intent: Intent,
        /// The argument's name.
        name: String,
        /// What it has.
        known: String,
    },
    /// A value outside what is allowed.
    #[error("`{name}` of `{intent}` is {found}; allowed: {allowed}")]
    OutOfRange {
        /// The intent.
        intent: Intent,
        /// The argument's name.
        name: String,
        /// What it is.
        found: String,
        /// What is allowed.
        allowed: String,
    },
    /// The dialect has no word for this value.
    #[error("the dialect's words `{words}` have nothing for `{value}`; add it to `[words.{words}]`")]
    NoWord {
        /// The map's name.
        words: String,
        /// The value or the instrument's word that was looked up.
        value: String,
    },
    /// A value cannot be written into a command.
    #[error("`{name}` of `{intent}` cannot be sent: {source}")]
    Write {
        /// The intent.
        intent: Intent,
        /// The argument's name.
        name: String,
        /// Why.
        source: WriteError,
    },
    /// Text as it was typed cannot be sent.
    #[error("the text cannot be sent: {source}")]
    Raw {
        /// Why.
        source: WriteError,
    },
    /// A reply's field cannot be read.
    #[error("the reply to `{command}` was `{reply}`: `{name}` cannot be read: {source}")]
    Read {
        /// What was sent.
        command: String,
        /// What came, shortened.
        reply: String,
        /// The field's name.
        name: String,
        /// Why.
        source: ValueError,
    },
    /// A reply has the wrong number of parts.
    #[error("the reply to `{command}` was `{reply}`: it has {found} parts, but the dialect expects {wanted}")]
    Parts {
        /// What was sent.
        command: String,
        /// What came, shortened.
        reply: String,
        /// How many parts the dialect expects.
        wanted: usize,
        /// How many came.
        found: usize,
    },
    /// A reply is no list of the parts that it should have.
    #[error("the reply to `{command}` was `{reply}`: {source}")]
    Reply {
        /// What was sent.
        command: String,
        /// What came, shortened.
        reply: String,
        /// Why.
        source: ValueError,
    },
    /// There are more or fewer replies than questions.
    #[error("`{intent}` asks {wanted} questions, but {found} replies are there")]
    Replies {
        /// The intent.
        intent: Intent,
        /// How many questions it asks.
        wanted: usize,
        /// How many replies there are.
        found: usize,
    },
    /// A block came where a line belongs, or the other way round.
    #[error("the reply to `{command}` is {found}, but the dialect expects {wanted}")]
    WrongMessage {
        /// What was sent.
        command: String,
        /// What the dialect expects.
        wanted: &'static str,
        /// What came.
        found: &'static str,
    },
    /// A record does not hold as many samples as its preamble says.
    #[error("the record has {found} samples, but its preamble says {wanted}; was another acquisition made in between?")]
    Length {
        /// How many the preamble says.
        wanted: i64,
        /// How many there are.
        found: usize,
    },
    /// A block's length is no whole number of samples.
    #[error("the block has {bytes} bytes, which is no whole number of samples of {each} bytes; see `samples.format`")]
    Ragged {
        /// The block's length.
        bytes: usize,
        /// The bytes of one sample.
        each: usize,
    },
    /// A sample in text is no number.
    #[error("sample {index} cannot be read: {source}")]
    Sample {
        /// Which one, from 0.
        index: usize,
        /// Why.
        source: ValueError,
    },
    /// An expression of the dialect cannot be evaluated.
    #[error("the expression `{text}` at the dialect's `{name}` cannot be evaluated: {reason}")]
    Expression {
        /// The key it stands at.
        name: String,
        /// The expression.
        text: String,
        /// Why.
        reason: String,
    },
    /// An expression gives a number with a fraction where a whole one belongs.
    #[error("the dialect's expression for `{name}` gives {found}, which is no whole number")]
    NotWhole {
        /// The field's name.
        name: &'static str,
        /// What it gives.
        found: f64,
    },
    /// A reply lacks a key.
    #[error("the reply to `{command}` was `{reply}`: it has {found} entries for `{key}`, but must have one")]
    Key {
        /// What was sent.
        command: String,
        /// What came, shortened.
        reply: String,
        /// The instrument's key.
        key: String,
        /// How many there are.
        found: usize,
    },
    /// A window of a record does not hold as many samples as were asked for.
    #[error(
        "the samples from number {first} on were asked for by {wanted}, but {found} came; see the dialect's `[window]`"
    )]
    Window {
        /// The first sample's number, from 0.
        first: i64,
        /// How many were asked for.
        wanted: i64,
        /// How many came.
        found: usize,
    },
    /// A preamble says something that cannot be.
    #[error("the preamble says `{name}` = {found}, which cannot be: {allowed} is expected")]
    Preamble {
        /// The field's name.
        name: String,
        /// What it says.
        found: f64,
        /// What would do.
        allowed: &'static str,
    },
}
