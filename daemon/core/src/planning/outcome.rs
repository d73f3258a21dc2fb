//! What a budget says. Errors in volts are expanded uncertainties, k = 2, at the tips.

use serde::{Deserialize, Serialize};

/// A predicted error budget.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "schema", derive(utoipa::ToSchema))]
pub struct Budget {
    /// The answer in one word.
    pub verdict: Verdict,
    /// The answer in sentences, the most important first.
    pub words: Vec<String>,
    /// The accuracy wanted, in volts.
    pub wanted_v: f64,
    /// The largest difference expected, in volts.
    pub difference_v: f64,
    /// How high the common mode reaches: the sine's frequency, or 0.35 over the edge's 10–90 % duration, in hertz.
    pub frequency_hz: f64,
    /// What a tip sees, and what it is rated for.
    pub tip: TipVoltage,
    /// The vertical range of each leg; absent where two probes cannot be used at all.
    pub range: Option<RangeChoice>,
    /// The terms; none where two probes cannot be used at all.
    pub terms: Vec<Term>,
    /// Their sums.
    pub totals: Option<Totals>,
    /// Common-mode rejection at `frequency_hz`.
    pub rejection: Rejection,
    /// How well the legs must agree; absent where no deskew is enough.
    pub needed: Option<Needed>,
    /// What each node loses to the probe on it.
    pub loading: Vec<Loading>,
    /// What a differential probe must offer instead; absent where two probes will do, or where it would not help.
    pub differential: Option<Differential>,
    /// What was assumed because the plan does not say it.
    pub assumed: Vec<String>,
    /// What else to know.
    pub notes: Vec<String>,
}

/// The answer.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[cfg_attr(feature = "schema", derive(utoipa::ToSchema), schema(as = BudgetVerdict))]
#[serde(rename_all = "kebab-case")]
pub enum Verdict {
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

impl Verdict {
    /// Whether two single-ended probes are enough.
    #[must_use]
    pub fn two_probes_do(self) -> bool {
        matches!(self, Self::AfterDeskew | Self::AsTheyAre)
    }
}

/// The voltage that a tip sees, to earth.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "schema", derive(utoipa::ToSchema), schema(as = BudgetTip))]
pub struct TipVoltage {
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
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "schema", derive(utoipa::ToSchema), schema(as = BudgetRange))]
pub struct RangeChoice {
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
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[cfg_attr(feature = "schema", derive(utoipa::ToSchema), schema(as = BudgetWhen))]
#[serde(rename_all = "kebab-case")]
pub enum When {
    /// Always.
    Always,
    /// While the common mode moves.
    Moving,
}

/// One source of error.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "schema", derive(utoipa::ToSchema), schema(as = BudgetTerm))]
pub struct Term {
    /// What it comes from.
    pub name: String,
    /// Before a deskew, in volts, k = 2.
    pub before_v: f64,
    /// After it, in volts, k = 2.
    pub after_v: f64,
    /// When it is there.
    pub when: When,
    /// How it was computed.
    pub formula: String,
    /// Where the formula comes from.
    pub source: String,
}

/// Root sums of squares of the terms (JCGM 100, 5.1.2), in volts, k = 2.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "schema", derive(utoipa::ToSchema), schema(as = BudgetTotals))]
pub struct Totals {
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
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "schema", derive(utoipa::ToSchema), schema(as = BudgetRejection))]
pub struct Rejection {
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
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "schema", derive(utoipa::ToSchema), schema(as = BudgetNeeded))]
pub struct Needed {
    /// The largest skew in seconds; absent where any will do.
    pub skew_s: Option<f64>,
    /// The largest gain mismatch.
    pub gain: f64,
}

/// What one node loses to the probe on it, as a ratio of its voltage.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "schema", derive(utoipa::ToSchema), schema(as = BudgetLoading))]
pub struct Loading {
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
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[cfg_attr(feature = "schema", derive(utoipa::ToSchema), schema(as = BudgetDifferential))]
pub struct Differential {
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
