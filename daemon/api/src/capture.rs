//! Captures and their figures.

use jiff::Timestamp;
use serde::{Deserialize, Serialize};
use utoipa::ToSchema;
use uuid::Uuid;

use crate::{CorrectionState, Quantity};

/// One acquisition of a pair, corrected, with its figures.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct Capture {
    /// The run it belongs to.
    pub run: Uuid,
    /// Its number within the run, from 1.
    pub number: u32,
    /// The pair.
    pub pair: String,
    /// When the acquisition was read.
    #[schema(value_type = String, format = DateTime)]
    pub made_at: Timestamp,
    /// The sweep's values at this capture, outermost axis first.
    pub conditions: Vec<Condition>,
    /// The correction that was applied.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub correction: Option<Uuid>,
    /// Its state at that time.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub correction_state: Option<CorrectionState>,
    /// The figures of the corrected difference.
    pub figures: Vec<Figure>,
    /// What of its common mode this capture can have leaked into its difference.
    pub leak: LeakBound,
    /// Limits that were set, and whether they were kept.
    pub limits: Vec<LimitVerdict>,
    /// What a person should know about it: clipping, a void correction, too little dither.
    pub warnings: Vec<String>,
    /// How many points each record has.
    pub points: u64,
    /// Time between two samples.
    pub sample_interval: Quantity,
    /// The waveform's file, relative to the daemon's data folder.
    pub file: String,
}

/// One axis of a sweep at one capture.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct Condition {
    /// The setting's name.
    pub setting: String,
    /// Its value.
    pub value: Quantity,
}

/// A figure of the corrected difference.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct Figure {
    /// Its name, such as `high_level`, `rms`, `rise_time`.
    pub name: String,
    /// The figure with its standard uncertainty.
    #[serde(flatten)]
    pub quantity: Quantity,
    /// The interval that holds the true value with 95 %; absent where the figure is not valid.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub coverage: Option<Coverage>,
    /// What plain subtraction of the two records would have given; absent where that has no such figure.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub plain: Option<f64>,
    /// How far the common mode could explain it.
    pub grade: Grade,
    /// False when clipping, overload or a missing feature makes the figure meaningless.
    pub valid: bool,
    /// Why it is not valid.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub why: Option<String>,
    /// The terms of its uncertainty.
    pub budget: Vec<UncertaintyTerm>,
}

/// How far the common mode of a capture could explain a figure.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, ToSchema)]
#[serde(rename_all = "lowercase")]
pub enum Grade {
    /// The leak bound is below the figure's uncertainty.
    Clean,
    /// The leak bound is comparable to it.
    Shaded,
    /// The leak bound could explain the figure.
    Swamped,
}

/// One term of an uncertainty budget (JCGM 100, 5.1).
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct UncertaintyTerm {
    /// What it comes from: `noise`, `gain`, `skew`, `offset` (and their `drift`), `scale`, `calibration`,
    /// `quantisation`, `common mode`.
    pub name: String,
    /// Its contribution to the figure's standard uncertainty, in the figure's unit.
    pub u: f64,
    /// What the figure changes per unit of the source (1, s or V), sign included; absent where the source is no single
    /// number, as for noise.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub sensitivity: Option<f64>,
    /// `normal` or `rectangular`.
    pub distribution: String,
    /// The term that this one is correlated with; both say it.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub correlated: Option<CorrelatedTerm>,
    /// `A` (from repeats) or `B` (from other knowledge).
    pub kind: String,
    /// Degrees of freedom of `u`, where it is that of a few repeats; absent where it is taken as well known.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub freedom: Option<f64>,
    /// Its share of the variance, half of the covariance with its partner included; all shares sum to 1.
    pub share: f64,
}

/// How a term is correlated with another.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct CorrelatedTerm {
    /// The other term's name.
    pub with: String,
    /// Correlation coefficient of the two contributions, −1 to 1.
    pub coefficient: f64,
}

/// An interval that holds the true value with a probability of 95 % (JCGM 100, 6.2; JCGM 101, 7.7).
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct Coverage {
    /// Lower end, in the figure's unit.
    pub low: f64,
    /// Upper end, in the figure's unit.
    pub high: f64,
    /// Where it comes from.
    pub basis: CoverageBasis,
}

/// Where a coverage interval comes from.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, ToSchema)]
#[serde(rename_all = "snake_case")]
pub enum CoverageBasis {
    /// Common-mode limited: what the correction leaves of the common mode adds to the figure in second order. The
    /// interval is propagated by Monte Carlo and reaches down to where the common mode is taken off as far as the
    /// correction's uncertainty allows.
    CommonMode,
    /// All terms as normal ones.
    Normal,
    /// Propagated by Monte Carlo, because the figure is hardly more than its uncertainty.
    Propagated,
    /// The largest rectangular term convolved with the others.
    Rectangular,
}

/// The most that the common mode can have added to the difference.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct LeakBound {
    /// As rms.
    pub rms: Quantity,
    /// As peak.
    pub peak: Quantity,
    /// The rms of the capture's common mode.
    pub common_rms: Quantity,
    /// The swing (peak-to-peak) of the capture's common mode.
    pub common_swing: Quantity,
}

/// A limit and its verdict.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct LimitVerdict {
    /// The figure's name.
    pub figure: String,
    /// Lowest value allowed, in the figure's unit.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub min: Option<f64>,
    /// Highest value allowed, in the figure's unit.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub max: Option<f64>,
    /// Whether the value lies within. A figure that is not valid never does.
    pub passed: bool,
    /// Whether the expanded uncertainty reaches over the limit, so that the verdict could be either.
    pub uncertain: bool,
}

/// A page of captures.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct Captures {
    /// The captures, by number.
    pub items: Vec<Capture>,
    /// How many the run has in all, now.
    pub total: u32,
    /// The `after` to ask the next page with; absent on the last page.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub next: Option<u32>,
}
