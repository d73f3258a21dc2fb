//! Corrections, their conditions, and the requests that make and verify them.

use jiff::Timestamp;
use serde::{Deserialize, Serialize};
use utoipa::ToSchema;
use uuid::Uuid;

use crate::{Compensation, Quantity, RejectionLimit, Response, TransferredFrom};

/// What makes the two legs of a pair agree, and how well.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct Correction {
    /// Its identity.
    pub id: Uuid,
    /// The pair it belongs to.
    pub pair: String,
    /// When its last acquisition was made.
    #[schema(value_type = String, format = DateTime)]
    pub made_at: Timestamp,
    /// τ in seconds: positive when the negative leg arrives late. All of it: what the scope takes off and what software does.
    pub skew: Quantity,
    /// g: the negative leg relative to the positive one.
    pub gain: Quantity,
    /// o: volts at the tips that the negative leg has too much.
    pub offset: Quantity,
    /// Correlation coefficient of the errors of `gain` and `offset`, −1 to 1; absent where it is not known.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub gain_offset_correlation: Option<f64>,
    /// How far slow and fast gain of the legs differ; absent where the reference could not show it.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub compensation: Option<Compensation>,
    /// The response that is applied after gain, skew and offset; absent where none was fitted.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub response: Option<Response>,
    /// The rejection beyond which nothing linear goes, where a verification swept through the converters' levels.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub limit: Option<RejectionLimit>,
    /// Degrees of freedom of the three standard uncertainties.
    #[serde(default)]
    pub freedom: CorrectionFreedom,
    /// What limits the skew most, and what would help, in words; absent where it is not known.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub limited_by: Option<String>,
    /// The part of `skew` that was written into the scope's own skew setting; 0 s where none was.
    pub scope_skew: Quantity,
    /// Whether it holds now.
    pub state: CorrectionState,
    /// Why `state` is not `fresh`, in words.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub reasons: Vec<String>,
    /// The rejection that it reaches, from the last verification; empty until one was made.
    pub rejection: Vec<RejectionPoint>,
    /// What was in force when it was made.
    pub conditions: CorrectionConditions,
    /// Set when it was transferred from another vertical range.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub transferred_from: Option<TransferredFrom>,
    /// How many acquisitions of the pair went into it.
    pub acquisitions: u32,
    /// What a person should know about it.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub warnings: Vec<String>,
}

/// Degrees of freedom of a correction's standard uncertainties (JCGM 100, G.3); one that is absent is not that of a few
/// repeats' scatter, and its uncertainty is taken as well known.
#[derive(Debug, Clone, Copy, Default, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct CorrectionFreedom {
    /// Of the skew's.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub skew: Option<f64>,
    /// Of the gain's.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub gain: Option<f64>,
    /// Of the offset's.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub offset: Option<f64>,
}

/// Whether a correction holds.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, ToSchema)]
#[serde(rename_all = "lowercase")]
pub enum CorrectionState {
    /// It holds.
    Fresh,
    /// Too old, or drift was seen.
    Stale,
    /// Settings, probe or instrument differ from those it was made with.
    Void,
}

/// The conditions under which a correction holds.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct CorrectionConditions {
    /// What the scope answered to `*IDN?`.
    pub scope_identity: String,
    /// The positive leg.
    pub positive: LegConditions,
    /// The negative leg.
    pub negative: LegConditions,
    /// The reference that skew was taken from.
    pub skew_reference: String,
    /// The reference that gain and offset were taken from.
    pub gain_reference: String,
    /// Whether skew was taken on other vertical ranges than gain and offset, and what that adds.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub carried: Option<Carried>,
}

/// The settings of a leg that a correction depends on.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct LegConditions {
    /// The scope's channel.
    pub channel: u32,
    /// Full vertical span at the tip.
    pub span: Quantity,
    /// Vertical offset at the tip.
    pub offset: Quantity,
    /// `DC` or `AC`.
    pub coupling: String,
    /// Attenuation of the probe.
    pub attenuation: f64,
    /// The probe's name in the bench file.
    pub probe: String,
}

/// Skew that was taken on one vertical range and is used on another.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct Carried {
    /// The span at the tip that skew was taken on.
    pub from_span: Quantity,
    /// The standard uncertainty that carrying it adds, already contained in the skew's `u`.
    pub added: Quantity,
}

/// Common-mode rejection at one frequency, before and after the correction.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct RejectionPoint {
    /// Centre of the band in hertz.
    pub frequency_hz: f64,
    /// Rejection of plain subtraction.
    pub before_db: f64,
    /// Rejection of the corrected difference; where it equals `floor_db`, noise hides the residual: "at least".
    pub after_db: f64,
    /// The rejection above which noise hides the residual.
    pub floor_db: f64,
    /// Whether `after_db` is a lower bound rather than a measured value.
    pub at_least: bool,
}

/// Body of `POST /pairs/{pair}/deskew`; everything is optional.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub struct DeskewRequest {
    /// The reference for skew; default: the pair's.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub skew_reference: Option<String>,
    /// The reference for gain and offset; default: the pair's.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub gain_reference: Option<String>,
    /// Wanted standard uncertainty of skew in seconds; default: the pair's.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub target_u_skew_s: Option<f64>,
    /// The most acquisitions to spend on each reference; default: the pair's.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub most_acquisitions: Option<u32>,
    /// Whether to write the rounded skew into the scope's own skew setting; default: no.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub use_scope_skew: Option<bool>,
    /// Whether to fit the response that is left between the legs, and to apply it; default: the pair's.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub response: Option<bool>,
}

/// Body of `POST /pairs/{pair}/verify`; everything is optional.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub struct VerifyRequest {
    /// The reference to verify on; default: the one that gain was taken from.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub reference: Option<String>,
}
