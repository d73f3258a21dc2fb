//! Carrying out a response: the filter and the low-pass on the corrected negative leg, with the valid range they leave.

use super::super::apply::{self, ApplyError, Corrected};
use super::super::interpolate::{Interpolator, TAPS};
use super::super::{Correction, Record};
use super::{Response, ResponseError};

/// What the low-pass's unknown history may still add at the first valid sample, relative to the signal (−100 dB).
const HISTORY: f64 = 1e-5;

/// A first-order low-pass in discrete time, exact for a signal that is straight between its samples:
/// `u[i + 1] = ρ·u[i] + c0·x[i] + c1·x[i + 1]`.
#[derive(Debug, Clone, Copy)]
pub(in crate::analysis) struct LowPass {
    pub(super) rho: f64,
    pub(super) c0: f64,
    pub(super) c1: f64,
}

impl LowPass {
    /// For a time constant of `samples` samples.
    pub(in crate::analysis) fn new(samples: f64) -> Self {
        let a = 1.0 / samples;
        let rho = (-a).exp();
        let mean = -(-a).exp_m1() / a;
        Self { rho, c0: mean - rho, c1: 1.0 - mean }
    }

    /// Its output for `signal`, as if that had been at its mean before.
    pub(super) fn apply(&self, signal: &[f64]) -> Vec<f64> {
        self.from(super::super::line::mean(signal), signal)
    }

    /// Its output for `signal`, as if the first `repeats` samples had always repeated: it is there at their end where it
    /// was at their beginning, and has their mean. The way for records that are short beside the time constant, and that
    /// show the signal's mean.
    pub(in crate::analysis) fn settled(&self, signal: &[f64], repeats: usize) -> Vec<f64> {
        let repeats = repeats.min(signal.len());
        let mean = super::super::line::mean(&signal[..repeats]);
        let mut slow = self.from(mean, signal);
        let Some(&end) = slow[..repeats].last() else { return slow };
        // Whatever is added to the beginning comes out so many times smaller at the end.
        let mut more = (end - mean) / (1.0 - self.rho.powf(repeats as f64));
        for u in &mut slow {
            more *= self.rho;
            *u += more;
        }
        slow
    }

    fn from(&self, state: f64, signal: &[f64]) -> Vec<f64> {
        let mut state = state;
        let mut last = state;
        signal
            .iter()
            .map(|&x| {
                state = self.rho.mul_add(state, self.c0.mul_add(last, self.c1 * x));
                last = x;
                state
            })
            .collect()
    }
}

/// The corrected difference and the common mode of one capture, as [`apply::correct`] and then with the response.
///
/// The low-frequency term needs the past. A record that is long beside its time constant loses its beginning to it; one
/// that is not is taken to go on as it is, so that its mean is the signal's (`LowPass::settled`).
///
/// # Errors
/// As [`apply::correct`]; also when the response does not hold for the records' sample interval.
pub fn correct(
    p: &Record,
    n: &Record,
    correction: &Correction,
    response: Option<&Response>,
) -> Result<Corrected, ApplyError> {
    let Some(response) = response else { return apply::correct(p, n, correction) };
    let mut moved = *correction;
    moved.skew_s.value += response.skew_s;
    let corrected = apply::correct(p, n, &moved)?;
    let shift = (p.start_s - n.start_s + moved.skew_s.value) / p.interval_s;
    Ok(response.carry_out(&corrected, shift)?)
}

impl Response {
    /// β, the low-pass's factor, and its time constant in samples of `interval_s`.
    fn low_pass(&self, interval_s: f64) -> Option<(f64, f64)> {
        let term = self.pole_zero?;
        let relative = term.relative.value;
        let samples = term.time_constant_s.value * (1.0 + relative) / interval_s;
        Some((relative * self.taps.iter().sum::<f64>(), samples))
    }

    fn carry_out(&self, corrected: &Corrected, shift: f64) -> Result<Corrected, ResponseError> {
        let interval_s = corrected.interval_s;
        if self.taps.len() > 1 && (interval_s / self.interval_s - 1.0).abs() > 1e-6 {
            return Err(ResponseError::Interval { fitted_s: self.interval_s, interval_s });
        }
        let x: Vec<f64> = corrected.negative_v.iter().map(|n| f64::from(*n)).collect();
        let half = self.taps.len() / 2;
        let low_pass = self.low_pass(interval_s);
        let settle = low_pass.map_or(0, |(beta, samples)| {
            let periods = (beta.abs() / HISTORY).ln().max(0.0);
            (samples * periods).ceil() as usize
        });
        let points = x.len();
        let repeats = settle > points / 2;
        let first = if repeats { half } else { settle.max(half) };
        if points < first + half + 16 {
            return Err(ResponseError::TooShort { points });
        }
        let mut negative_v = convolve(&x[first - half..], &self.taps);
        negative_v.iter_mut().for_each(|y| *y += self.level_v);
        if let Some((beta, samples)) = low_pass {
            let filter = LowPass::new(samples);
            let slow = if repeats { filter.settled(&x, points) } else { filter.apply(&x) };
            negative_v.iter_mut().zip(&slow[first..]).for_each(|(y, u)| *y += beta * u);
        }
        // P is the corrected negative leg, as it was before the response, plus the difference.
        let positive = x[first..].iter().zip(&corrected.difference_v[first..]).map(|(n, d)| n + f64::from(*d));
        let difference_v = positive.zip(&negative_v).map(|(p, n)| (p - n) as f32).collect();
        let negative_v = negative_v.iter().map(|n| *n as f32).collect();
        let start_s = (first as f64).mul_add(interval_s, corrected.start_s);
        let made = Corrected::of(difference_v, negative_v, interval_s, start_s, self.noise_gain(shift));
        Ok(Corrected { first: corrected.first + first, ..made })
    }

    /// `Σ h²` of interpolation and filter together. The low-pass adds `β²/2T'`, which is nothing beside them.
    fn noise_gain(&self, shift: f64) -> f64 {
        let interpolator = Interpolator::new(shift.fract());
        let length = 4 * TAPS + 2 * self.taps.len();
        let mut impulse = vec![0.0; length];
        impulse[length / 2] = 1.0;
        convolve(&interpolator.apply(&impulse), &self.taps).iter().map(|h| h * h).sum()
    }
}

/// `y[i] = Σ_j taps[j]·x[i + j]`, where all taps have a sample.
fn convolve(x: &[f64], taps: &[f64]) -> Vec<f64> {
    x.windows(taps.len()).map(|w| w.iter().zip(taps).map(|(x, h)| x * h).sum()).collect()
}
