//! What is known of a pair beyond gain, skew and offset, and what of it stays in a capture.

use serde::{Deserialize, Serialize};

use super::apply::Corrected;
use super::compensation::{Compensation, Left};
use super::leak::{self, Moving};
use super::peaks;
use super::response::Response;
use super::signal::{Signal, mean_and_square};

/// What is known beyond gain, skew and offset. The default: nothing.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct Beyond {
    /// The response that is applied.
    pub response: Option<Response>,
    /// How the slow gains of the legs differ from the fast ones.
    pub compensation: Option<Compensation>,
    /// The rejection in dB beyond which nothing linear goes, where the converters' non-linearity was seen.
    pub limit_db: Option<f64>,
}

impl Beyond {
    /// The same where the response is not applied.
    #[must_use]
    pub fn without_response(&self) -> Self {
        Self { response: None, ..self.clone() }
    }

    /// The largest `|D/C|` that it allows at a frequency above zero, in hertz.
    #[must_use]
    pub fn residual(&self, frequency_hz: f64) -> f64 {
        let slow = self.known().map_or(0.0, |(found, corrected)| found.residual(frequency_hz, corrected));
        slow.max(self.of_response(frequency_hz)).max(self.least())
    }

    /// What the legs' compensation leaves in a capture with this common mode, or corrected negative leg: they differ by no
    /// more than the difference does from nought.
    #[must_use]
    pub fn left<S: Signal + ?Sized>(&self, common_v: &S, interval_s: f64) -> Left {
        self.known().map_or_else(Left::default, |(found, corrected)| found.left(common_v, interval_s, corrected))
    }

    /// What an applied response still leaves of a capture's common mode, rms and peak in volts, its mean apart: what judging
    /// acquisitions showed, or what noise hid from them, and no less than the converters' non-linearity.
    #[must_use]
    pub fn remains(&self, corrected: &Corrected) -> Moving {
        if self.response.is_none() && self.limit_db.is_none() {
            return Moving::default();
        }
        let common = corrected.common();
        let (mean, _) = mean_and_square(&common);
        let residual = |f: f64| self.of_response(f).max(self.least());
        leak::weighted(&common, corrected.interval_s, mean, peaks::noise_of(&common), &residual)
    }

    fn known(&self) -> Option<(Compensation, bool)> {
        self.compensation.map(|found| found.with(self.response.as_ref()))
    }

    fn of_response(&self, frequency_hz: f64) -> f64 {
        self.response.as_ref().map_or(0.0, |response| response.residual(frequency_hz))
    }

    fn least(&self) -> f64 {
        self.limit_db.map_or(0.0, |db| 10.0f64.powf(-db / 20.0))
    }
}
