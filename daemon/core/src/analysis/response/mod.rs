//! The response that is left between the legs when gain and delay agree: a first-order pole–zero term and a short filter.
//!
//! The negative leg's response relative to the positive one's is taken as
//! `g·e^{−jωτ}·(1 + jωT(1 + ε))/(1 + jωT)·R(ω)`: a probe whose low-frequency compensation is off by `ε` with the time
//! constant `T` (`ε > 0`: over-compensated, too large at high frequencies), and a rest `R` near one, as legs of unequal
//! bandwidth have. The correction of the negative leg, after gain and delay, is
//! `y[i] = Σ_m taps[m]·x[i + m − h] + β·u[i]`, with `u` the first-order low-pass of time constant `T' = T(1 + ε)` and
//! `β = ε·Σ taps`: `(1 + jωT)/(1 + jωT')` in partial fractions, times the filter.
//!
//! **Fit.** For a given T' the correction is linear in its coefficients, so that least squares of `P − y` over the bins
//! that the reference excites (only odd harmonics for a square wave) has one solution; T' is sought by its profile. All
//! columns are made in the time domain, with the low-pass's unknown history as one more column: records need
//! not hold whole periods. Weights are uniform, which is maximum likelihood for white noise. Noise in the columns biases
//! least squares (errors in variables); its power, measured from the repeats, is taken out of the normal equations.
//! Cost: O(n log n), some forty transforms in each of a few rounds.
//!
//! **Choice.** Half of the acquisitions are fitted, the other half judges: a term is kept if it gains at least a decibel
//! of rejection, summed over bands of half a decade; changes within three standard deviations of chance, or below what
//! noise hides, do not count. Then all are fitted once more.
//!
//! **What it cannot see.** A converter's non-linearity looks like a gain error to a signal of two levels; captures that
//! sweep through the levels show it ([`nonlinearity`]), and no linear correction reaches beyond it.

mod align;
mod bins;
mod carry;
mod choose;
mod columns;
mod combine;
mod error;
mod nonlinear;
mod solve;
mod words;

use serde::{Deserialize, Serialize};

use super::skew::Reference;
use super::{Correction, Estimate, Record};

pub(in crate::analysis) use carry::LowPass;
pub use carry::correct;
pub use combine::{Acquired, combined};
pub use error::ResponseError;
pub use nonlinear::{Nonlinearity, nonlinearity};

/// A first-order low-frequency error of the negative leg relative to the positive one.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct PoleZero {
    /// T in seconds.
    pub time_constant_s: Estimate,
    /// ε: by how much the negative leg is too large above `1/(2πT)`, as a ratio; negative when it is too small.
    pub relative: Estimate,
}

/// What the response did for one band of frequencies, on acquisitions that were not fitted.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct BandGain {
    /// Lower end in hertz.
    pub from_hz: f64,
    /// Upper end in hertz.
    pub to_hz: f64,
    /// Rejection in dB with gain and delay of the correction alone.
    pub before_db: f64,
    /// Rejection in dB with the response; equal to `floor_db` where noise hides the residual.
    pub after_db: f64,
    /// The rejection in dB above which noise hides the residual.
    pub floor_db: f64,
}

/// What is done to the negative leg beyond gain, skew and offset.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Response {
    /// Seconds per sample of the records it was fitted to; more than one tap holds for this interval only.
    pub interval_s: f64,
    /// Skew in seconds to be added to the correction's.
    pub skew_s: f64,
    /// The pole–zero term, if it helps.
    pub pole_zero: Option<PoleZero>,
    /// An odd number of taps about the sample itself; one tap is a factor on the gain.
    pub taps: Vec<f64>,
    /// Volts to be added to the corrected negative leg, so that the reference's mean agrees.
    pub level_v: f64,
    /// Rejection before and after, by bands of half a decade.
    pub improved: Vec<BandGain>,
    /// What helped, what did not and what to do about it, in words.
    pub words: Vec<String>,
    /// Standard uncertainty of the factor on the gain, `Σ taps`.
    pub gain_u: f64,
}

impl Response {
    /// Whether it changes anything.
    #[must_use]
    pub fn corrects(&self) -> bool {
        self.pole_zero.is_some() || self.skew_s != 0.0 || self.level_v != 0.0 || self.taps != [1.0]
    }

    /// `|D/C|` that judging acquisitions still showed, or that noise hid from them, at a frequency in hertz: of the band's
    /// middle, interpolated in dB over log f, flat below the lowest band and growing with f above the highest.
    #[must_use]
    pub fn residual(&self, frequency_hz: f64) -> f64 {
        self.ratio(frequency_hz, |band| band.after_db)
    }

    /// The same where the response is not applied.
    #[must_use]
    pub fn residual_without(&self, frequency_hz: f64) -> f64 {
        self.ratio(frequency_hz, |band| band.before_db)
    }

    fn ratio(&self, frequency_hz: f64, db: impl Fn(&BandGain) -> f64) -> f64 {
        let points: Vec<(f64, f64)> =
            self.improved.iter().map(|band| ((band.from_hz * band.to_hz).sqrt(), db(band))).collect();
        super::leak::interpolated(&points, frequency_hz)
    }
}

/// What is known before a response is fitted.
#[derive(Debug, Clone, Copy, Default)]
pub struct Prior<'a> {
    /// The time constant of the legs' low-frequency compensation in seconds, taken where the records are too short or too
    /// noisy to show it: of a probe the product of its input resistance and capacitance.
    pub time_constant_s: Option<f64>,
    /// A response whose filter is carried out first; then only gain, delay and the low-frequency term are fitted.
    pub filter: Option<&'a Response>,
}

/// Fits the response that is left after `correction`, from acquisitions of a reference that both legs see.
///
/// The result corrects nothing (one tap of 1, no pole–zero term) when nothing helps. `reference` says the period, if it
/// has one: of a record that holds whole periods only excited harmonics are used.
///
/// # Errors
/// See [`ResponseError`]: fewer than two acquisitions, records that do not belong together, no signal.
pub fn fit(
    p: &[Record],
    n: &[Record],
    correction: &Correction,
    reference: &Reference,
) -> Result<Response, ResponseError> {
    fit_after(p, n, correction, reference, &Prior::default())
}

/// As [`fit`], with what is known before.
///
/// # Errors
/// As [`fit`].
pub fn fit_after(
    p: &[Record],
    n: &[Record],
    correction: &Correction,
    reference: &Reference,
    prior: &Prior<'_>,
) -> Result<Response, ResponseError> {
    choose::fit(p, n, correction, reference, prior)
}

#[cfg(test)]
pub(in crate::analysis) mod tests;
