//! The analysis of saved records: what is sent, and what comes back.

use serde::{Deserialize, Serialize};
use utoipa::ToSchema;

use crate::{Figure, LeakBound, Quantity, RejectionPoint, Response};

/// Body of `POST /analyse`: records that some scope saved, as text.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub struct AnalysisRequest {
    /// One acquisition with both tips on a reference.
    pub reference: SavedText,
    /// Another one, to verify the correction on; without it the reference's second half is used.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub verification: Option<SavedText>,
    /// One acquisition with the tips on the device.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub device: Option<SavedText>,
    /// `edges`, `sine`, `multitone` or `unknown`; default: `unknown`.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub shape: Option<ReferenceShape>,
    /// The reference's period in seconds; skew is then sought within half of it.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub period_s: Option<f64>,
    /// Half-width of the scope's gain specification, relative: 0.015 for ±1.5 %.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub scale_spec: Option<f64>,
    /// Whether to fit the response that is left between the legs, and to apply it; needs `period_s`.
    #[serde(default, skip_serializing_if = "std::ops::Not::not")]
    pub response: bool,
}

/// What a reference looks like; it decides how its edges or lines are found in noise.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, ToSchema)]
#[serde(rename_all = "lowercase")]
pub enum ReferenceShape {
    /// A square wave or pulses.
    Edges,
    /// A sum of sines.
    Multitone,
    /// One sine.
    Sine,
    /// Not known.
    Unknown,
}

/// One acquisition of a pair as text: a row a sample.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub struct SavedText {
    /// The text that holds both legs, or the positive leg only.
    pub text: String,
    /// The negative leg's text, where it has one of its own.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub negative_text: Option<String>,
    /// How to read it.
    #[serde(default)]
    pub reading: Reading,
}

/// How saved records are to be read; what is not told is guessed, and the answer says what was guessed.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize, ToSchema)]
#[serde(deny_unknown_fields, default)]
pub struct Reading {
    /// `comma`, `semicolon`, `tab` or `blank`.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub separator: Option<String>,
    /// `point` or `comma`.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub decimal: Option<String>,
    /// How many lines stand before the first row of numbers.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub header_lines: Option<u32>,
    /// The time column: its name, or its number from 1.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub time: Option<String>,
    /// The negative leg's own time column, where it has one.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub negative_time: Option<String>,
    /// The positive leg's column.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub positive: Option<String>,
    /// The negative leg's column.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub negative: Option<String>,
    /// The unit of the time column: `s`, `ms`, `us`, `ns`, `ps`.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub time_unit: Option<String>,
    /// The unit of both legs: `V`, `mV`, `uV`, `kV`.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub volt_unit: Option<String>,
    /// Seconds between two samples.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub interval_s: Option<f64>,
    /// What the positive leg's volts are to be multiplied by to be volts at the tip; default 1.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub attenuation: Option<f64>,
    /// The same for the negative leg; default: as the positive leg.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub negative_attenuation: Option<f64>,
    /// The converter's resolution in bits; needs `span_v`.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub bits: Option<u32>,
    /// Full vertical span at the tip in volts.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub span_v: Option<f64>,
    /// How many acquisitions the scope averaged; default 1.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub averages: Option<u32>,
}

/// What saved records show.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct Analysis {
    /// How the reference was read.
    pub reference: SavedRecords,
    /// How the acquisition for verification was read.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub verification: Option<SavedRecords>,
    /// How the device's acquisition was read.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub device: Option<SavedRecords>,
    /// τ in seconds: positive when the negative leg arrives late.
    pub skew: Quantity,
    /// g: the negative leg relative to the positive one.
    pub gain: Quantity,
    /// o: volts at the tips that the negative leg has too much.
    pub offset: Quantity,
    /// The response that is applied after gain, skew and offset; absent where none was fitted or none helps.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub response: Option<Response>,
    /// Rejection before and after the correction.
    pub rejection: Vec<RejectionPoint>,
    /// What the rejection was measured on.
    pub verified_on: VerifiedOn,
    /// Whether that was an acquisition of its own.
    pub independent: bool,
    /// The figures of the device's corrected difference; empty without a device.
    pub figures: Vec<Figure>,
    /// What the device's common mode can have leaked into its difference.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub leak: Option<LeakBound>,
    /// What a person should know.
    pub warnings: Vec<String>,
}

/// What a rejection was measured on.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, ToSchema)]
#[serde(rename_all = "kebab-case")]
pub enum VerifiedOn {
    /// An acquisition of its own.
    Fresh,
    /// The half of the reference's record that the verified correction was not fitted to.
    OtherHalf,
    /// The very record that the correction was fitted to.
    Itself,
}

/// How one acquisition was read.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct SavedRecords {
    /// How many samples each leg has.
    pub points: u64,
    /// Time between two samples.
    pub sample_interval: Quantity,
    /// Time of the positive leg's first sample.
    pub start: Quantity,
    /// What was guessed since it was not told.
    pub guesses: Vec<Guess>,
    /// What a person should know about the file.
    pub notes: Vec<String>,
}

/// Something that was guessed.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize, ToSchema)]
pub struct Guess {
    /// The field of `Reading` that would have told it.
    pub option: String,
    /// What was taken.
    pub taken: String,
}
