//! The error budget of a measurement not yet made: `POST /budget` takes a plan and answers with the predicted errors and
//! a verdict.
//!
//! Numbers carry their unit in their name: these are plans and predictions, not measured quantities with an
//! uncertainty. Errors in volts are expanded uncertainties, k = 2, at the probes' tips. What may be left out is absent
//! or `null` alike.

use serde::{Deserialize, Serialize};
use utoipa::ToSchema;

/// Body of `POST /budget`: everything that a budget is made from; what is left out is assumed and told, or asked for. Volts are at the probes' tips, but the scope's, which are at its input.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize, ToSchema)]
#[serde(default, deny_unknown_fields)]
pub struct BudgetRequest {
    /// What is to be measured, and how well.
    pub signal: BudgetSignal,
    /// What the tips are put on.
    pub source: BudgetSource,
    /// Each of the two probes.
    pub probe: BudgetProbe,
    /// The scope that both are on.
    pub scope: BudgetScope,
    /// How far the two legs agree before a deskew.
    pub before: BudgetAgreement,
    /// How far they agree after one.
    pub after: BudgetAgreement,
}

/// The common mode, the difference, and the accuracy wanted of it.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize, ToSchema)]
#[serde(default, deny_unknown_fields)]
pub struct BudgetSignal {
    /// Swing of the common mode in volts, peak to peak.
    pub swing_v: Option<f64>,
    /// The common mode's lowest voltage to earth; 0 V if absent.
    pub low_v: Option<f64>,
    /// 10–90 % transition duration of its edges in seconds; this or a frequency.
    pub edge_s: Option<f64>,
    /// Frequency of a sinusoidal common mode in hertz; this or an edge.
    pub frequency_hz: Option<f64>,
    /// The largest difference expected, in volts; it may have either sign.
    pub difference_v: Option<f64>,
    /// What the tips may see beyond swing and difference (ringing), in volts; none if absent.
    pub headroom_v: Option<f64>,
    /// Wanted accuracy (k = 2) in volts; this or a ratio.
    pub accuracy_v: Option<f64>,
    /// Wanted accuracy (k = 2) as a ratio of the difference; this or volts.
    pub accuracy_ratio: Option<f64>,
}

/// Source resistance of the two nodes in ohms.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize, ToSchema)]
#[serde(default, deny_unknown_fields)]
pub struct BudgetSource {
    /// Under the positive tip.
    pub positive_ohm: Option<f64>,
    /// Under the negative tip; 0 Ω if absent, which is the worst for a difference.
    pub negative_ohm: Option<f64>,
}

/// A single-ended probe: two of a kind are used.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize, ToSchema)]
#[serde(default, deny_unknown_fields)]
pub struct BudgetProbe {
    /// Volts at the tip per volt at the scope.
    pub attenuation: Option<f64>,
    /// Input resistance at the tip in ohms.
    pub resistance_ohm: Option<f64>,
    /// Input capacitance at the tip in farads.
    pub capacitance_f: Option<f64>,
    /// −3 dB bandwidth in hertz.
    pub bandwidth_hz: Option<f64>,
    /// The highest voltage to earth at low frequency, in volts.
    pub rating_v: Option<f64>,
    /// The frequency from which the rating falls, in hertz.
    pub rating_corner_hz: Option<f64>,
    /// How it falls: as (corner/f)^slope; 1, which is 20 dB per decade, if absent.
    pub rating_slope: Option<f64>,
    /// The rating at some frequencies instead, in rising order.
    pub derating: Vec<BudgetDerating>,
}

/// A point of a rating that falls with frequency.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub struct BudgetDerating {
    /// In hertz.
    pub frequency_hz: f64,
    /// The highest voltage to earth there, in volts.
    pub rating_v: f64,
}

/// The scope. Its volts are at its input, behind the probe.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize, ToSchema)]
#[serde(default, deny_unknown_fields)]
pub struct BudgetScope {
    /// Bits of the converter; this or an effective number.
    pub bits: Option<f64>,
    /// Effective number of bits (IEEE Std 1057), which counts noise and non-linearity too.
    pub enob: Option<f64>,
    /// The full vertical spans it offers, in volts, in rising order.
    pub spans_v: Vec<f64>,
    /// Whether its range can be shifted, so that its middle need not be at earth; it can if absent.
    pub shifts: Option<bool>,
    /// Half-width of the vertical scale's specification, as a ratio.
    pub scale_spec: Option<f64>,
    /// Noise, rms, in volts; this or a ratio.
    pub noise_v: Option<f64>,
    /// Noise, rms, as a ratio of the span.
    pub noise_ratio: Option<f64>,
    /// Integral non-linearity of the converter, in steps.
    pub linearity_steps: Option<f64>,
    /// −3 dB bandwidth in hertz.
    pub bandwidth_hz: Option<f64>,
    /// The highest voltage that its input is rated for, in volts.
    pub rating_v: Option<f64>,
    /// Sweeps averaged; 1 if absent.
    pub averages: Option<f64>,
}

/// How far two legs agree; each is a limit, either way.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize, ToSchema)]
#[serde(default, deny_unknown_fields)]
pub struct BudgetAgreement {
    /// Skew in seconds.
    pub skew_s: Option<f64>,
    /// Gain of the one relative to the other, less 1.
    pub gain: Option<f64>,
    /// Offset between them, as a ratio of the span.
    pub offset: Option<f64>,
    /// Absolute scale of both as a ratio; only after a deskew on a reference of known levels.
    pub scale: Option<f64>,
}

/// A predicted error budget.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct Budget {
    /// The answer in one word.
    pub verdict: BudgetVerdict,
    /// The answer in sentences, the most important first.
    pub words: Vec<String>,
    /// The accuracy wanted, in volts.
    pub wanted_v: f64,
    /// The largest difference expected, in volts.
    pub difference_v: f64,
    /// How high the common mode reaches: the sine's frequency, or 0.35 over the edge's 10–90 % duration, in hertz.
    pub frequency_hz: f64,
    /// What a tip sees, and what it is rated for.
    pub tip: BudgetTip,
    /// The vertical range of each leg; absent where two probes cannot be used at all.
    pub range: Option<BudgetRange>,
    /// The terms; none where two probes cannot be used at all.
    pub terms: Vec<BudgetTerm>,
    /// Their sums.
    pub totals: Option<BudgetTotals>,
    /// Common-mode rejection at `frequency_hz`.
    pub rejection: BudgetRejection,
    /// How well the legs must agree; absent where no deskew is enough.
    pub needed: Option<BudgetNeeded>,
    /// What each node loses to the probe on it.
    pub loading: Vec<BudgetLoading>,
    /// What a differential probe must offer instead; absent where two probes will do, or where it would not help.
    pub differential: Option<BudgetDifferential>,
    /// What was assumed because the plan does not say it.
    pub assumed: Vec<String>,
    /// What else to know.
    pub notes: Vec<String>,
}

/// The answer.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, ToSchema)]
#[serde(rename_all = "kebab-case")]
pub enum BudgetVerdict {
    /// Two probes will do once they are deskewed.
    AfterDeskew,
    /// Two probes will do without a deskew.
    AsTheyAre,
    /// Two probes will not do; a differential probe may.
    DifferentialProbe,
    /// Neither will do with this scope.
    OutOfReach,
    /// The voltages exceed a stated rating: do not connect.
    Refused,
}

/// The voltage that a tip sees, to earth.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct BudgetTip {
    /// The lowest, in volts.
    pub low_v: f64,
    /// The highest, in volts.
    pub high_v: f64,
    /// The largest magnitude of both, in volts.
    pub most_v: f64,
    /// The probe's rating at the budget's frequency, in volts; absent where it is not stated that far up.
    pub rating_v: Option<f64>,
}

/// A vertical range.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct BudgetRange {
    /// Full span at the scope's input, in volts.
    pub input_span_v: f64,
    /// Full span at the tip, in volts.
    pub span_v: f64,
    /// The voltage at the tip in its middle, in volts.
    pub middle_v: f64,
    /// One step of the converter (with an effective number of bits: its equivalent) at the tip, in volts.
    pub step_v: f64,
    /// Noise of one leg, rms, at the tip, in volts; 0 where an effective number of bits contains it.
    pub noise_v: f64,
}

/// When an error is there.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, ToSchema)]
#[serde(rename_all = "kebab-case")]
pub enum BudgetWhen {
    /// Always.
    Always,
    /// While the common mode moves.
    Moving,
}

/// One source of error.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct BudgetTerm {
    /// What it comes from.
    pub name: String,
    /// Before a deskew, in volts, k = 2.
    pub before_v: f64,
    /// After it, in volts, k = 2.
    pub after_v: f64,
    /// When it is there.
    pub when: BudgetWhen,
    /// How it was computed.
    pub formula: String,
    /// Where the formula comes from.
    pub source: String,
}

/// Root sums of squares of the terms (JCGM 100, 5.1.2), in volts, k = 2.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct BudgetTotals {
    /// Before a deskew, all terms.
    pub before_v: f64,
    /// After it, all terms.
    pub after_v: f64,
    /// Before it, once the edges have settled; absent for a sine, which never does.
    pub settled_before_v: Option<f64>,
    /// After it, once the edges have settled; absent for a sine.
    pub settled_after_v: Option<f64>,
}

/// Common-mode rejection at the budget's frequency in dB; absent where the fault is absent.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct BudgetRejection {
    /// Before a deskew, with the gain mismatch alone.
    pub gain_before_db: Option<f64>,
    /// After it, with the gain mismatch alone.
    pub gain_after_db: Option<f64>,
    /// Before a deskew, with the skew alone.
    pub skew_before_db: Option<f64>,
    /// After it, with the skew alone.
    pub skew_after_db: Option<f64>,
    /// Before a deskew, with both.
    pub before_db: Option<f64>,
    /// After it, with both.
    pub after_db: Option<f64>,
}

/// How well two legs must agree for the accuracy that is wanted, with everything else as it is.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct BudgetNeeded {
    /// The largest skew in seconds; absent where any will do.
    pub skew_s: Option<f64>,
    /// The largest gain mismatch.
    pub gain: f64,
}

/// What one node loses to the probe on it, as a ratio of its voltage.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct BudgetLoading {
    /// `positive` or `negative`.
    pub tip: String,
    /// At DC.
    pub at_dc: f64,
    /// Magnitude of the complex loss at the budget's frequency.
    pub at_frequency: f64,
    /// How late the loaded node comes, in seconds: source resistance times the probe's capacitance.
    pub lag_s: f64,
}

/// What a differential probe must offer.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct BudgetDifferential {
    /// −3 dB bandwidth of at least this, in hertz.
    pub bandwidth_hz: f64,
    /// The usual attenuations with which the scope's ranges and rating hold and its channel is fine enough.
    pub attenuations: Vec<f64>,
    /// Differential range: plus and minus this, in volts.
    pub differential_v: f64,
    /// Common-mode range and rating of each input to earth: plus and minus this, in volts, at `frequency_hz`.
    pub common_v: f64,
    /// The frequency at which range, rating and `rejection_db` must hold, in hertz.
    pub frequency_hz: f64,
    /// Rejection of at least this at `frequency_hz`, in dB.
    pub rejection_db: f64,
    /// Rejection of at least this at DC, in dB.
    pub rejection_dc_db: f64,
    /// Gain accuracy of this or better, as a ratio.
    pub gain: f64,
    /// Input capacitance to earth of at most this, in farads; absent where the sources are stiff.
    pub capacitance_f: Option<f64>,
    /// Input resistance to earth of at least this, in ohms; absent where the sources are stiff.
    pub resistance_ohm: Option<f64>,
}
