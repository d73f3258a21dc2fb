//! Signals for tests: known at every instant, with their slope, so that a record is computed at each leg's own times
//! and the Cramér–Rao bound from the truth.

#![allow(clippy::unwrap_used)]

use nalgebra::{Matrix3, Vector3};
use rand_chacha::ChaCha8Rng;
use rand_chacha::rand_core::SeedableRng;
use rand_distr::{Distribution, StandardNormal, Uniform};
use statrs::function::erf::erf;

/// A signal of time in samples.
#[derive(Debug, Clone)]
pub(crate) enum Signal {
    /// ±1 with error-function edges of this 10–90 % duration; half a period between edges, from the phase on.
    Square { period: f64, rise: f64, phase: f64 },
    /// One pulse from 0 to 1 and back.
    Pulse { start: f64, width: f64, rise: f64 },
    /// Amplitude, cycles per sample and phase of each tone.
    Tones(Vec<(f64, f64, f64)>),
}

/// Ratio of the 10–90 % duration of an error-function edge to its standard deviation.
const RISE: f64 = 2.563_103_131;

/// Standard deviations from which an edge is complete to the last digit.
const FAR: f64 = 9.0;

fn step(t: f64, rise: f64) -> f64 {
    if (t * RISE / rise).abs() > FAR {
        return if t > 0.0 { 1.0 } else { 0.0 };
    }
    (1.0 + erf(t * RISE / rise / std::f64::consts::SQRT_2)) / 2.0
}

fn bell(t: f64, rise: f64) -> f64 {
    let x = t * RISE / rise;
    if x.abs() > FAR {
        return 0.0;
    }
    (-x * x / 2.0).exp() * RISE / rise / std::f64::consts::TAU.sqrt()
}

impl Signal {
    pub(crate) fn sine(period: f64, phase: f64) -> Self {
        Self::Tones(vec![(1.0, 1.0 / period, phase)])
    }

    /// Twenty tones up to a fifth of the sample rate.
    pub(crate) fn twenty(phase: f64) -> Self {
        Self::Tones((1..=20).map(|k| (0.3, 0.010_037 * f64::from(k), phase * f64::from(k * k))).collect())
    }

    /// Value and slope per sample at time `t` (samples).
    pub(crate) fn at(&self, t: f64) -> (f64, f64) {
        match self {
            Self::Square { period, rise, phase } => {
                // The edges nearest to t; farther ones are complete.
                let half = period / 2.0;
                let nearest = ((t - phase) / half).round();
                let (mut value, mut slope) = (if nearest.rem_euclid(2.0) < 0.5 { 1.0 } else { -1.0 }, 0.0);
                for k in [nearest - 1.0, nearest, nearest + 1.0] {
                    let sign = if k.rem_euclid(2.0) < 0.5 { 2.0 } else { -2.0 };
                    let distance = t - phase - k * half;
                    value += sign * (step(distance, *rise) - if k <= nearest { 1.0 } else { 0.0 });
                    slope += sign * bell(distance, *rise);
                }
                (value, slope)
            }
            Self::Pulse { start, width, rise } => (
                step(t - start, *rise) - step(t - start - width, *rise),
                bell(t - start, *rise) - bell(t - start - width, *rise),
            ),
            Self::Tones(tones) => tones.iter().fold((0.0, 0.0), |(value, slope), (size, frequency, phase)| {
                let omega = std::f64::consts::TAU * frequency;
                let (sin, cos) = (omega * t + phase).sin_cos();
                (value + size * sin, slope + size * omega * cos)
            }),
        }
    }

    /// Rms about the mean over a record.
    pub(crate) fn rms(&self, samples: usize) -> f64 {
        let values: Vec<f64> = (0..samples).map(|i| self.at(i as f64).0).collect();
        let mean = values.iter().sum::<f64>() / samples as f64;
        (values.iter().map(|x| (x - mean).powi(2)).sum::<f64>() / samples as f64).sqrt()
    }
}

/// The truth of a pair; times in samples, levels in volts.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Truth {
    pub(crate) tau: f64,
    pub(crate) gain: f64,
    pub(crate) offset: f64,
    pub(crate) noise_p: f64,
    pub(crate) noise_n: f64,
}

impl Truth {
    pub(crate) fn with_noise(noise: f64) -> Self {
        Self { tau: 3.3, gain: 0.97, offset: 0.02, noise_p: noise, noise_n: noise }
    }

    /// The errors of skew, gain and offset that an estimator which knows signal and noise would make on these records,
    /// `(GᵀG)⁻¹Gᵀe`: it reaches the bound exactly, so that its spread over the trials of a case says how lucky these
    /// were. (The noise of P enters at the nearest whole sample: right in spread, and for gain and offset in value.)
    #[allow(dead_code, reason = "for the example estimator_marks, which includes this file")]
    pub(crate) fn efficient(&self, signal: &Signal, p: &[f64], n: &[f64]) -> [f64; 3] {
        let (mut information, mut score) = (Matrix3::zeros(), Vector3::zeros());
        let whole = self.tau.round();
        for (i, reading) in n.iter().enumerate() {
            let (value, slope) = signal.at(i as f64 - self.tau);
            let row = Vector3::new(-self.gain * slope, value, 1.0);
            information += row * row.transpose();
            // Beyond the record's ends nothing is known of P; its nearest sample stands in.
            let at = (i as f64 - whole).clamp(0.0, p.len() as f64 - 1.0);
            let noise_p = p[at as usize] - signal.at(at).0;
            score += row * (reading - self.gain * value - self.offset - self.gain * noise_p);
        }
        let error = information.try_inverse().unwrap() * score;
        [0, 1, 2].map(|i| error[i])
    }

    /// Cramér–Rao standard uncertainties of τ (samples), g and o for a record of `samples`, from the true signal.
    pub(crate) fn bound(&self, signal: &Signal, samples: usize) -> [f64; 3] {
        let mut information = Matrix3::zeros();
        for i in 0..samples {
            let (value, slope) = signal.at(i as f64 - self.tau);
            let row = Vector3::new(-self.gain * slope, value, 1.0);
            information += row * row.transpose();
        }
        let variance = self.noise_n.powi(2) + (self.gain * self.noise_p).powi(2);
        let inverse = information.try_inverse().unwrap();
        [0, 1, 2].map(|i| (variance * inverse[(i, i)]).sqrt())
    }
}

/// A seeded source of random numbers.
pub(crate) struct Dice(ChaCha8Rng);

impl Dice {
    pub(crate) fn new(seed: u64) -> Self {
        Self(ChaCha8Rng::seed_from_u64(seed))
    }

    pub(crate) fn normal(&mut self) -> f64 {
        StandardNormal.sample(&mut self.0)
    }

    pub(crate) fn uniform(&mut self, from: f64, to: f64) -> f64 {
        Uniform::new(from, to).unwrap().sample(&mut self.0)
    }

    /// Both records of a pair.
    pub(crate) fn records(&mut self, signal: &Signal, truth: &Truth, samples: usize) -> (Vec<f64>, Vec<f64>) {
        let p = (0..samples).map(|i| signal.at(i as f64).0 + truth.noise_p * self.normal()).collect();
        let n = (0..samples)
            .map(|i| {
                let value = signal.at(i as f64 - truth.tau).0;
                truth.gain * value + truth.offset + truth.noise_n * self.normal()
            })
            .collect();
        (p, n)
    }
}

/// Rounds to whole converter steps.
pub(crate) fn quantise(signal: &mut [f64], step: f64) {
    signal.iter_mut().for_each(|x| *x = (*x / step).round() * step);
}
