//! How far the converters' non-linearity limits the rejection, from captures that sweep through the levels.
//!
//! With both tips on one node the corrected difference should be nought at every level. What is left as a function of
//! the level, when noise has been averaged away and the best straight line taken off, is the difference of the two
//! converters' (and amplifiers') non-linearities. Nothing linear removes it: as a ratio to the amplitude it is the best
//! rejection of a signal of that amplitude, `20·log10(amplitude/error)`; near 50 to 55 dB for the 8-bit front ends of
//! real scopes (common practice, no source).
//!
//! A reference of two levels does not show it: to such a signal it is a gain error. A sine or a ramp does. Its edges do not
//! count: what a fast signal leaves in the difference is the legs' responses more than their converters.

use super::super::apply::ApplyError;
use super::super::signal::Signal;
use super::super::{Correction, Record};
use super::{Response, correct};

/// Steps that the swing is divided into.
const STEPS: usize = 64;

/// Samples over which the signal's slope is taken, to either side.
const REACH: usize = 8;

/// The fastest that a sample may move, in steps per sample.
const FASTEST: f64 = 0.5;

/// The least part of the steps that must be seen often.
const SEEN: usize = STEPS * 3 / 4;

/// How often: fewer samples of a step say nothing.
const OFTEN: usize = 16;

/// The non-linearity that is left in the difference.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Nonlinearity {
    /// Half of the common mode's swing in volts.
    pub amplitude_v: f64,
    /// The largest departure from a straight line in volts, with what noise adds to a largest value taken off.
    pub error_v: f64,
    /// Its rms over the levels in volts, noise taken off.
    pub rms_v: f64,
    /// The standard uncertainty that noise leaves in the curve at one level, in volts.
    pub u_v: f64,
    /// The rejection beyond which no linear correction goes, in dB: `20·log10(amplitude/error)`.
    pub cap_db: f64,
    /// Whether noise hides it: the cap is then "at least".
    pub at_least: bool,
}

/// Estimates the non-linearity from acquisitions of both tips on one node; best others than those of the deskew. `None`
/// when the signal does not sweep through the levels, as a square wave does not.
///
/// # Errors
/// When the records cannot be corrected.
pub fn nonlinearity(
    p: &[Record],
    n: &[Record],
    correction: &Correction,
    response: Option<&Response>,
) -> Result<Option<Nonlinearity>, ApplyError> {
    let mut points: Vec<(f64, f64)> = Vec::new();
    for (p, n) in p.iter().zip(n) {
        let corrected = correct(p, n, correction, response)?;
        let common = corrected.common();
        let count = corrected.difference_v.len();
        let values: Vec<f64> = (0..count).map(|i| common.at(i)).collect();
        let (low, high) = values.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |(l, h), v| (l.min(*v), h.max(*v)));
        let fastest = FASTEST * (high - low) / STEPS as f64 * 2.0 * REACH as f64;
        for i in REACH..count.saturating_sub(REACH) {
            if (values[i + REACH] - values[i - REACH]).abs() <= fastest {
                points.push((values[i], f64::from(corrected.difference_v[i])));
            }
        }
    }
    Ok(of_points(&points))
}

/// From pairs of common mode and difference.
fn of_points(points: &[(f64, f64)]) -> Option<Nonlinearity> {
    let low = points.iter().fold(f64::INFINITY, |low, (c, _)| low.min(*c));
    let high = points.iter().fold(f64::NEG_INFINITY, |high, (c, _)| high.max(*c));
    if !(high > low && high.is_finite() && low.is_finite()) {
        return None;
    }
    let mut steps = [(0usize, 0.0f64, 0.0f64, 0.0f64); STEPS];
    for (c, d) in points {
        let index = ((c - low) / (high - low) * STEPS as f64) as usize;
        let step = &mut steps[index.min(STEPS - 1)];
        *step = (step.0 + 1, step.1 + c, step.2 + d, step.3 + d * d);
    }
    let curve: Vec<Level> = steps.iter().filter(|step| step.0 >= OFTEN).map(Level::of).collect();
    if curve.len() < SEEN {
        return None;
    }
    let departures = off_the_line(&curve);
    let count = curve.len() as f64;
    let noise = (curve.iter().map(|level| level.variance).sum::<f64>() / count).sqrt();
    let rms = (departures.iter().map(|d| d * d).sum::<f64>() / (count - 2.0)).sqrt();
    let rms_v = (rms * rms - noise * noise).max(0.0).sqrt();
    let peak = departures.iter().fold(0.0f64, |peak, d| peak.max(d.abs()));
    // A peak is taken over many levels; noise raises it about as much as it raises the rms.
    let error_v = if rms > 0.0 { peak * rms_v / rms } else { 0.0 };
    let at_least = rms_v < noise;
    let shown = if at_least { error_v.max(2.0 * noise) } else { error_v };
    let amplitude_v = 0.5 * (high - low);
    let cap_db = 20.0 * (amplitude_v / shown.max(f64::MIN_POSITIVE)).log10();
    Some(Nonlinearity { amplitude_v, error_v, rms_v, u_v: noise, cap_db, at_least })
}

/// The difference at one level.
struct Level {
    common: f64,
    difference: f64,
    /// Variance of the mean difference.
    variance: f64,
}

impl Level {
    fn of(&(count, common, difference, square): &(usize, f64, f64, f64)) -> Self {
        let size = count as f64;
        let mean = difference / size;
        let variance = ((square / size - mean * mean) / (size - 1.0)).max(0.0);
        Self { common: common / size, difference: mean, variance }
    }
}

/// What is left of the curve when the best straight line is taken off.
fn off_the_line(curve: &[Level]) -> Vec<f64> {
    let count = curve.len() as f64;
    let middle = curve.iter().map(|level| level.common).sum::<f64>() / count;
    let mean = curve.iter().map(|level| level.difference).sum::<f64>() / count;
    let (mut product, mut square) = (0.0, 0.0);
    for level in curve {
        product += (level.common - middle) * (level.difference - mean);
        square += (level.common - middle).powi(2);
    }
    let slope = if square > 0.0 { product / square } else { 0.0 };
    curve.iter().map(|level| level.difference - mean - slope * (level.common - middle)).collect()
}
