//! The figures of a corrected capture, each with its uncertainty, its grade, and what plain subtraction would have
//! given. Terms after IEEE Std 181 for pulses and JCGM 100 for uncertainty.
//!
//! What every figure has in its budget: *noise* (type A, measured per leg; the interpolation's noise gain is in it),
//! *gain*, *skew* and *offset* of the correction with sensitivities from the capture itself (`∂D/∂g = N_c/g`,
//! `∂D/∂τ = −N_c'`, `∂D/∂o = 1/g`) and the correlation of gain and offset, what each of them may have drifted since
//! (rectangular), *compensation* (slow and fast gain of the legs may differ, so that an offset holds at its reference's mean
//! only), *response* (what an applied response leaves of the common mode: its rms for levels and the rms, its peak as a
//! half-width for extremes, times and ratios), *scale* (the scope's gain specification, rectangular) or *calibration* (a scale that was measured,
//! normal), *quantisation* (what a converter without enough noise leaves) and, for the rms, *common mode*: the
//! second-order part of gain, skew and offset, which can only make it larger. The scope's time base is not among them: no
//! specification of it is known here.
//!
//! Every valid figure has an interval of 95 % ([`Coverage`]): from the budget, its largest rectangular term convolved with
//! the rest, which is as wide as Student's distribution where few repeats made it (JCGM 100, G.4); for an rms that the common mode limits, or that is hardly more than its uncertainty, by propagation
//! ([`super::montecarlo`]).

pub use super::correction::{Drift, Freedom};

use super::Correction;
use super::apply::{Corrected, Plain};
use super::budget::{Coverage, Term};
use super::compensation::Left;
use super::grade::Grade;
use super::leak::{LeakBound, Moving};

mod asked;
mod before;
mod compute;
mod distortion;
mod dwell;
mod jitter;
mod kind;
mod moving;
mod plain;
mod power;
mod settle;
mod shape;
mod slew;
mod sources;
mod sums;

pub use asked::{Asked, SETTLING_BAND, Thresholds};
pub use compute::compute;
pub use kind::FigureKind;

/// What the figures are computed from.
#[derive(Debug, Clone, Copy)]
pub struct FigureInput<'a> {
    /// The corrected capture.
    pub corrected: &'a Corrected,
    /// Plain subtraction of the two records, where it is to be shown beside.
    pub plain_v: Option<&'a Plain<'a>>,
    /// The correction that was applied.
    pub correction: &'a Correction,
    /// The capture's leak bound.
    pub leak: &'a LeakBound,
    /// Rms noise per sample of the positive leg's record in volts, quantisation noise included.
    pub noise_p_v: f64,
    /// The same of the negative leg's record, before correction.
    pub noise_n_v: f64,
    /// Converter step of the positive leg at the tip in volts.
    pub step_p_v: f64,
    /// Converter step of the negative leg at the tip in volts.
    pub step_n_v: f64,
    /// Half-width of the scope's gain specification, relative: 0.015 for ±1.5 %.
    pub scale_spec: f64,
    /// Clipped samples of the positive leg.
    pub clipped_p: usize,
    /// Clipped samples of the negative leg.
    pub clipped_n: usize,
    /// How many acquisitions were averaged into each record, at least 1.
    pub averages: u32,
    /// What the budget allows for beside that.
    pub allowance: Allowance,
    /// Thresholds and bands that figures are read at.
    pub asked: Asked,
}

/// What a budget allows for beside the correction's own uncertainty and the scope's specification. The default allows
/// for nothing.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Allowance {
    /// Relative standard uncertainty of the scale, where it was calibrated against a known amplitude.
    pub scale_u: f64,
    /// How many bins of the spectrum the noise was read from ([`super::noise::PairNoise`]); 0 for noise that is known.
    pub noise_bins: usize,
    /// How far the correction may have drifted since it was made.
    pub drift: Drift,
    /// What the legs' low-frequency compensation leaves, as standard uncertainties in volts.
    pub compensation: Left,
    /// What a response that was applied leaves of the common mode, its mean apart: rms, and peak of its envelope.
    pub response: Moving,
    /// How well the correction's standard uncertainties are known themselves.
    pub freedom: Freedom,
}

/// A figure of the corrected difference (or of the common mode).
#[derive(Debug, Clone, PartialEq)]
pub struct Figure {
    /// Which.
    pub kind: FigureKind,
    /// Its value in `kind.unit()`; 0 when there is none (then it is not valid either).
    pub value: f64,
    /// Its standard uncertainty, in the same unit.
    pub u: f64,
    /// The interval that holds the true value with 95 %; `None` when the figure is not valid.
    pub coverage: Option<Coverage>,
    /// What plain subtraction gives, where it has such a figure.
    pub plain: Option<f64>,
    /// False when clipping or a missing feature makes it meaningless.
    pub valid: bool,
    /// Why it is not valid.
    pub why: Option<String>,
    /// The terms of its uncertainty, largest first.
    pub budget: Vec<Term>,
    /// How far the common mode could explain it.
    pub grade: Grade,
}

#[cfg(test)]
mod coverage;
#[cfg(test)]
mod gtc;
#[cfg(test)]
mod hostile;
#[cfg(test)]
mod tests;
#[cfg(test)]
mod vectors;
