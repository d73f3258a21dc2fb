//! Common-mode rejection against frequency: the closed form for a gain and a skew, and the measured one.
//!
//! With `H = N/P` of two tips on one node, `CMRR = |1 + H|/(2·|1 − H|) = |C/D|`. For `H = g·e^{−jφ}`, `φ = 2πfτ`, this is
//! `½·√{[(1+g)² − S]/[(1−g)² + S]}`, `S = 4g·sin²(φ/2)`: no difference of nearly equal numbers, so small errors keep
//! all their digits.

use super::Correction;

mod measure;
mod residual;
mod spectra;

pub use measure::{measure, measure_with};

/// The rejection in one band.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RejectionBand {
    /// The band's frequency in hertz, as it was asked for.
    pub frequency_hz: f64,
    /// Rejection of plain subtraction in dB.
    pub before_db: f64,
    /// Rejection after correction in dB; equal to `floor_db` when `at_least` is set.
    pub after_db: f64,
    /// The rejection above which the noise hides the residual, in dB.
    pub floor_db: f64,
    /// Whether the residual after correction could not be told from noise: the rejection is `after_db` or better.
    pub at_least: bool,
    /// How many spectral bins with signal the band has.
    pub bins: usize,
}

/// The rejection in dB of a pair whose only faults are a gain ratio `gain` (N relative to P) and a skew.
/// Infinite when there is no fault.
#[must_use]
pub fn cmrr_db(gain: f64, skew_s: f64, frequency_hz: f64) -> f64 {
    let half = (std::f64::consts::PI * frequency_hz * skew_s).sin();
    let s = 4.0 * gain * half * half;
    let numerator = ((1.0 + gain) * (1.0 + gain) - s).max(0.0);
    let denominator = (1.0 - gain) * (1.0 - gain) + s;
    10.0 * (numerator / (4.0 * denominator)).log10()
}

/// The largest `|D/C|` that the uncertainties of a correction allow at a frequency, at a coverage factor of 2:
/// `2·√((u_g/g)² + (2πf·u_τ)²)`, the first order of the closed form.
#[must_use]
pub fn residual_of_uncertainty(correction: &Correction, frequency_hz: f64) -> f64 {
    let gain = correction.gain.u / correction.gain.value;
    let skew = std::f64::consts::TAU * frequency_hz * correction.skew_s.u;
    2.0 * gain.hypot(skew)
}

#[cfg(test)]
mod tests;
