//! What makes two legs agree: skew, gain and offset, each with its standard uncertainty.

/// A value with its standard uncertainty (JCGM 100, 2.3.1), in whatever unit the field's name says.
#[derive(Debug, Clone, Copy, PartialEq, serde::Serialize, serde::Deserialize)]
pub struct Estimate {
    /// The estimate.
    pub value: f64,
    /// Its standard uncertainty, not negative.
    pub u: f64,
}

/// A correction of the negative leg, in the sense of JCGM 200, 2.53.
///
/// Skew comes from edges, gain and offset from levels, so that skew is taken as uncorrelated with the other two. Gain
/// and offset are not: on a reference whose levels are not balanced about 0 V a gain read too high goes with an offset
/// read too low. Their correlation is carried along; without it the mean of a capture on a node that swings between 0
/// and 48 V would seem less certain than it is.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Correction {
    /// τ in seconds, positive when the negative leg arrives late.
    pub skew_s: Estimate,
    /// g, negative leg relative to positive leg.
    pub gain: Estimate,
    /// o in volts at the tips: what the negative leg reads too much when both tips are at 0 V.
    pub offset_v: Estimate,
    /// Correlation coefficient of the errors of `gain` and `offset_v`, −1 to 1; 0 where it is not known.
    pub gain_offset: f64,
}

/// How far a correction may have moved since it was made, as half-widths of rectangular distributions (JCGM 100, 4.3.7).
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Drift {
    /// Of the gain, relative: 0.002 for ±0.2 %.
    pub gain: f64,
    /// Of the skew in seconds.
    pub skew_s: f64,
    /// Of the offset in volts at the tips of the negative leg.
    pub offset_v: f64,
}

impl Drift {
    /// What may have moved after `age_s`, where these are the half-widths within `max_age_s`: they count whole from the
    /// beginning, for warming up and a probe that is touched do not wait, and in proportion once it is older than that.
    #[must_use]
    pub fn after(self, age_s: f64, max_age_s: f64) -> Self {
        let part = if age_s > max_age_s && max_age_s > 0.0 { age_s / max_age_s } else { 1.0 };
        Self { gain: self.gain * part, skew_s: self.skew_s * part, offset_v: self.offset_v * part }
    }
}

/// Degrees of freedom of a correction's standard uncertainties (JCGM 100, G.3): `None` where an uncertainty is not that of
/// a few repeats' scatter, and is taken as well known.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Freedom {
    /// Of the gain's.
    pub gain: Option<f64>,
    /// Of the skew's.
    pub skew: Option<f64>,
    /// Of the offset's.
    pub offset: Option<f64>,
}

impl Correction {
    /// The correction that changes nothing and claims nothing: plain subtraction.
    #[must_use]
    pub fn none() -> Self {
        Self {
            skew_s: Estimate { value: 0.0, u: 0.0 },
            gain: Estimate { value: 1.0, u: 0.0 },
            offset_v: Estimate { value: 0.0, u: 0.0 },
            gain_offset: 0.0,
        }
    }
}
