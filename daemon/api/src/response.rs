//! What is known of a pair beyond gain, skew and offset: the legs' compensation, the response that is left, the converters'
//! limit. And their way from and to the mathematics.

use evenpair_core::analysis::compensation::Compensation as CoreCompensation;
use evenpair_core::analysis::response::{BandGain, Nonlinearity, PoleZero as CorePoleZero, Response as CoreResponse};
use evenpair_core::analysis::{Beyond, Estimate};
use serde::{Deserialize, Serialize};
use utoipa::ToSchema;

use crate::Quantity;

/// How far the legs' slow gains differ from those of their edges.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct Compensation {
    /// ε: by how much the negative leg is too large for fast signals against slow ones, relative to the positive leg.
    pub relative: Quantity,
    /// Its time constant T in seconds.
    pub time_constant: Quantity,
    /// The mean of the gain's reference in volts: the common mode at which the offset holds whatever ε is.
    pub level: Quantity,
}

/// What is done to the negative leg beyond gain, skew and offset.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct Response {
    /// The sample interval that the filter holds for.
    pub interval: Quantity,
    /// Seconds to be added to the correction's skew.
    pub skew: Quantity,
    /// The first-order term of low frequencies, if it helps.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub pole_zero: Option<PoleZero>,
    /// An odd number of taps about the sample itself; a single one is a factor on the gain.
    pub taps: Vec<f64>,
    /// Standard uncertainty of the taps' sum.
    pub gain_u: f64,
    /// Volts to be added to the corrected negative leg.
    pub level: Quantity,
    /// Rejection without and with it, by bands of half a decade, on acquisitions that were not fitted.
    pub improved: Vec<ResponseBand>,
    /// What helped and what to do about it, in words.
    pub words: Vec<String>,
}

/// A first-order low-frequency error of the negative leg relative to the positive one: `(1 + jωT(1 + ε))/(1 + jωT)`.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct PoleZero {
    /// T in seconds.
    pub time_constant: Quantity,
    /// ε; positive: the negative leg is over-compensated.
    pub relative: Quantity,
}

/// What a response did for one band of frequencies.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct ResponseBand {
    /// Lower end in hertz.
    pub from_hz: f64,
    /// Upper end in hertz.
    pub to_hz: f64,
    /// Rejection with gain, skew and offset alone.
    pub before_db: f64,
    /// Rejection with the response; equal to `floor_db` where noise hides the residual.
    pub after_db: f64,
    /// The rejection above which noise hides the residual.
    pub floor_db: f64,
}

/// How far the converters' non-linearity lets any correction go.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct RejectionLimit {
    /// `20·log10(amplitude/error)` in dB.
    pub limit_db: f64,
    /// Whether noise hides the non-linearity: the limit is then `limit_db` or better, and nothing is made of it.
    pub at_least: bool,
    /// Half of the swing that it was seen on.
    pub amplitude: Quantity,
    /// The largest departure from a straight line.
    pub error: Quantity,
}

fn quantity(estimate: Estimate, unit: &str) -> Quantity {
    Quantity::new(estimate.value, estimate.u, unit)
}

fn estimate(quantity: &Quantity) -> Estimate {
    Estimate { value: quantity.value, u: quantity.u.unwrap_or(0.0) }
}

impl From<&CoreCompensation> for Compensation {
    fn from(found: &CoreCompensation) -> Self {
        Self {
            relative: quantity(found.relative, "1"),
            time_constant: Quantity::exact(found.time_constant_s, "s"),
            level: Quantity::exact(found.level_v, "V"),
        }
    }
}

impl From<&Compensation> for CoreCompensation {
    fn from(told: &Compensation) -> Self {
        Self {
            relative: estimate(&told.relative),
            time_constant_s: told.time_constant.value,
            level_v: told.level.value,
        }
    }
}

impl From<&CoreResponse> for Response {
    fn from(found: &CoreResponse) -> Self {
        Self {
            interval: Quantity::exact(found.interval_s, "s"),
            skew: Quantity::exact(found.skew_s, "s"),
            pole_zero: found.pole_zero.map(|term| PoleZero {
                time_constant: quantity(term.time_constant_s, "s"),
                relative: quantity(term.relative, "1"),
            }),
            taps: found.taps.clone(),
            gain_u: found.gain_u,
            level: Quantity::exact(found.level_v, "V"),
            improved: found.improved.iter().map(ResponseBand::from).collect(),
            words: found.words.clone(),
        }
    }
}

impl From<&Response> for CoreResponse {
    fn from(told: &Response) -> Self {
        let band = |band: &ResponseBand| BandGain {
            from_hz: band.from_hz,
            to_hz: band.to_hz,
            before_db: band.before_db,
            after_db: band.after_db,
            floor_db: band.floor_db,
        };
        Self {
            interval_s: told.interval.value,
            skew_s: told.skew.value,
            pole_zero: told.pole_zero.as_ref().map(|term| CorePoleZero {
                time_constant_s: estimate(&term.time_constant),
                relative: estimate(&term.relative),
            }),
            taps: told.taps.clone(),
            level_v: told.level.value,
            improved: told.improved.iter().map(band).collect(),
            words: told.words.clone(),
            gain_u: told.gain_u,
        }
    }
}

impl From<&BandGain> for ResponseBand {
    fn from(band: &BandGain) -> Self {
        Self {
            from_hz: band.from_hz,
            to_hz: band.to_hz,
            before_db: band.before_db,
            after_db: band.after_db,
            floor_db: band.floor_db,
        }
    }
}

impl From<&Nonlinearity> for RejectionLimit {
    fn from(found: &Nonlinearity) -> Self {
        Self {
            limit_db: found.cap_db,
            at_least: found.at_least,
            amplitude: Quantity::exact(found.amplitude_v, "V"),
            error: Quantity::new(found.error_v, found.u_v, "V"),
        }
    }
}

impl crate::Correction {
    /// What is known beyond gain, skew and offset, as the mathematics takes it. A response that helped nothing is left out:
    /// what it would leave is no different from what there is.
    #[must_use]
    pub fn beyond(&self) -> Beyond {
        Beyond {
            response: self.response.as_ref().map(CoreResponse::from).filter(CoreResponse::corrects),
            compensation: self.compensation.as_ref().map(CoreCompensation::from),
            limit_db: self.limit.as_ref().filter(|limit| !limit.at_least).map(|limit| limit.limit_db),
        }
    }
}
