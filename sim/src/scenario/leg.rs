//! A leg as it truly is: probe, cable, input, attenuator, amplifier.

use serde::Deserialize;

/// One leg.
#[derive(Debug, Clone, PartialEq, Deserialize)]
#[serde(deny_unknown_fields)]
pub(crate) struct LegSpec {
    /// The scope's channel, counted from 1.
    pub(crate) channel: usize,
    /// Which tip of the pair it is.
    pub(crate) tip: Tip,
    /// The probe's nominal attenuation: 10 for ×10.
    pub(crate) attenuation: f64,
    /// Resistance of the tip to earth, in ohms.
    pub(crate) resistance_ohm: f64,
    /// Capacitance of the tip to earth, in farads.
    pub(crate) capacitance_f: f64,
    /// True gain over nominal gain, on every range.
    pub(crate) gain: f64,
    /// Delay from tip to converter, in seconds.
    pub(crate) delay_s: f64,
    /// −3 dB bandwidth of the leg's one pole, in hertz.
    pub(crate) bandwidth_hz: f64,
    /// Time constant of the probe's divider, in seconds.
    #[serde(default = "LegSpec::usual_compensation_s")]
    pub(crate) compensation_time_s: f64,
    /// Fraction by which fast signals come out larger than slow ones.
    #[serde(default)]
    pub(crate) compensation_error: f64,
    /// White noise, rms at the input, as a fraction of the span.
    #[serde(default)]
    pub(crate) noise_of_span: f64,
    /// White noise that does not depend on the span, rms at the input, in volts.
    #[serde(default)]
    pub(crate) noise_v: f64,
    /// Change of the gain, as a fraction per hour of virtual time.
    #[serde(default)]
    pub(crate) gain_drift_per_h: f64,
    /// Change of the delay, in seconds per hour of virtual time.
    #[serde(default)]
    pub(crate) delay_drift_s_per_h: f64,
    /// Within what the ranges lie that are not listed.
    #[serde(default)]
    pub(crate) unlisted: UnlistedSpec,
    /// The vertical ranges whose errors are given.
    #[serde(rename = "range", default)]
    pub(crate) ranges: Vec<RangeSpec>,
}

impl LegSpec {
    /// 10 MΩ ∥ 9.5 pF.
    fn usual_compensation_s() -> f64 {
        95e-6
    }
}

/// A tip of the pair.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Deserialize)]
pub(crate) enum Tip {
    /// The negative leg's.
    N,
    /// The positive leg's.
    P,
}

/// Limits, either way, within which the seed places the errors of a range that is not listed.
#[derive(Debug, Clone, PartialEq, Deserialize, Default)]
#[serde(deny_unknown_fields, default)]
pub(crate) struct UnlistedSpec {
    /// Of the gain, as a fraction.
    pub(crate) gain: f64,
    /// Of the offset, as a fraction of the span.
    pub(crate) offset_of_span: f64,
    /// Of the delay, in seconds.
    pub(crate) delay_s: f64,
}

/// The errors of one vertical range.
#[derive(Debug, Clone, PartialEq, Deserialize)]
#[serde(deny_unknown_fields)]
pub(crate) struct RangeSpec {
    /// Which: the full span at the input, in volts.
    pub(crate) span_v: f64,
    /// Multiplies the leg's gain.
    pub(crate) gain: f64,
    /// Added at the input, in volts.
    pub(crate) offset_v: f64,
    /// Added to the leg's delay, in seconds.
    #[serde(default)]
    pub(crate) delay_s: f64,
}
