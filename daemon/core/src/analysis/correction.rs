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
/// The three estimates are treated as uncorrelated: skew comes from edges, gain from levels, and the offset is
/// referred to the middle of the reference's levels, where it does not depend on the gain (findings of the
/// estimator's covariance; the correlation that remains is far below the other terms of a figure's budget).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Correction {
    /// τ in seconds, positive when the negative leg arrives late.
    pub skew_s: Estimate,
    /// g, negative leg relative to positive leg.
    pub gain: Estimate,
    /// o in volts at the tips: what the negative leg reads too much when both tips are at 0 V.
    pub offset_v: Estimate,
}

impl Correction {
    /// The correction that changes nothing and claims nothing: plain subtraction.
    #[must_use]
    pub fn none() -> Self {
        Self {
            skew_s: Estimate { value: 0.0, u: 0.0 },
            gain: Estimate { value: 1.0, u: 0.0 },
            offset_v: Estimate { value: 0.0, u: 0.0 },
        }
    }
}
