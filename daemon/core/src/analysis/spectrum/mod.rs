//! Fourier transforms of real records, and the power spectrum of a windowed one.
//!
//! Forward: `X[k] = Σ x[i]·e^{−j2πik/n}`, `k = 0..=n/2`, not scaled; inverse: its exact inverse, scaled by 1/n. Cost:
//! O(n log n), fastest for the lengths of [`fast_length`].

use realfft::num_complex::Complex;
use realfft::{ComplexToReal, RealFftPlanner, RealToComplex};
use std::cell::RefCell;
use std::sync::Arc;

/// A transform was asked of buffers that do not fit it: a mistake of the program, not of the data.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("a Fourier transform of {length} samples could not be made: {reason}; please report this")]
pub struct SpectrumError {
    /// The transform's length.
    pub length: usize,
    /// What the library said.
    pub reason: String,
}

/// The longest transform whose plan is kept for the next time: planning takes as long as several transforms. There are
/// about 150 such fast lengths, so that all together stay below 50 MB a thread; of those met in practice, 2 MB.
const LONGEST_KEPT: usize = 32_768;

thread_local! {
    static PLANS: RefCell<RealFftPlanner<f64>> = RefCell::new(RealFftPlanner::new());
}

/// The two transforms of one length.
pub struct Fourier {
    length: usize,
    forward: Arc<dyn RealToComplex<f64>>,
    inverse: Arc<dyn ComplexToReal<f64>>,
}

impl Fourier {
    /// Plans transforms of `length` samples.
    #[must_use]
    pub fn new(length: usize) -> Self {
        let plan = |planner: &mut RealFftPlanner<f64>| Self {
            length,
            forward: planner.plan_fft_forward(length),
            inverse: planner.plan_fft_inverse(length),
        };
        if length <= LONGEST_KEPT {
            return PLANS.with_borrow_mut(plan);
        }
        plan(&mut RealFftPlanner::new())
    }

    /// The transform's length in samples.
    #[must_use]
    pub fn length(&self) -> usize {
        self.length
    }

    /// The spectrum of `signal`, which is used as scratch; it must have the transform's length.
    ///
    /// # Errors
    /// A signal of another length.
    pub fn forward(&self, signal: &mut [f64]) -> Result<Vec<Complex<f64>>, SpectrumError> {
        let mut spectrum = self.forward.make_output_vec();
        self.forward.process(signal, &mut spectrum).map_err(|error| self.mistake(&error))?;
        Ok(spectrum)
    }

    /// The signal of `spectrum`, which is used as scratch. The imaginary parts of the first bin, and of the last for
    /// an even length, have no meaning for a real signal and are dropped.
    ///
    /// # Errors
    /// A spectrum of another length.
    pub fn inverse(&self, spectrum: &mut [Complex<f64>]) -> Result<Vec<f64>, SpectrumError> {
        let mut signal = self.inverse.make_output_vec();
        if let Some(first) = spectrum.first_mut() {
            first.im = 0.0;
        }
        if self.length.is_multiple_of(2)
            && let Some(last) = spectrum.last_mut()
        {
            last.im = 0.0;
        }
        self.inverse.process(spectrum, &mut signal).map_err(|error| self.mistake(&error))?;
        let scale = 1.0 / self.length as f64;
        signal.iter_mut().for_each(|value| *value *= scale);
        Ok(signal)
    }

    fn mistake(&self, error: &realfft::FftError) -> SpectrumError {
        SpectrumError { length: self.length, reason: error.to_string() }
    }
}

/// The smallest even number from `length` on whose only prime factors are 2, 3 and 5.
#[must_use]
pub fn fast_length(length: usize) -> usize {
    let mut candidate = length.max(2).next_multiple_of(2);
    loop {
        let mut rest = candidate;
        for factor in [2, 3, 5] {
            while rest.is_multiple_of(factor) {
                rest /= factor;
            }
        }
        if rest == 1 {
            return candidate;
        }
        candidate += 2;
    }
}

/// The spectrum of `signal` about its mean under a Hann window, extended by zeros to a fast length, and scaled so that
/// white noise of variance σ² has `|X[k]|² = σ²` on average in every bin but the first and last. Bin k lies at
/// `k/length` of the sample rate, `length` being the second value.
///
/// The window falls to zero with its slope, so that a record that cuts a period leaks little.
///
/// # Errors
/// Only a mistake of the program, see [`SpectrumError`].
pub fn hann(signal: &[f64]) -> Result<(Vec<Complex<f64>>, usize), SpectrumError> {
    let n = signal.len();
    let mean = super::line::mean(signal);
    let fourier = Fourier::new(fast_length(n));
    let mut buffer = vec![0.0; fourier.length()];
    let mut power = 0.0;
    let step = std::f64::consts::TAU / n as f64;
    for ((out, value), cosine) in buffer.iter_mut().zip(signal).zip(cosines(step / 2.0, step)) {
        let weight = (1.0 - cosine) / 2.0;
        power += weight * weight;
        *out = weight * (value - mean);
    }
    let mut spectrum = fourier.forward(&mut buffer)?;
    let scale = if power > 0.0 { 1.0 / power.sqrt() } else { 0.0 };
    spectrum.iter_mut().for_each(|bin| *bin *= scale);
    Ok((spectrum, fourier.length()))
}

/// `cos(first + k·step)` for k = 0, 1, 2, …, by rotation with a fresh start every 64 values: right to about 1e-14, and
/// ten times faster than as many cosines.
pub(crate) fn cosines(first: f64, step: f64) -> impl Iterator<Item = f64> {
    let (turn_sin, turn_cos) = step.sin_cos();
    let (mut sin, mut cos) = (0.0, 1.0);
    (0usize..).map(move |k| {
        if k.is_multiple_of(64) {
            (sin, cos) = (first + k as f64 * step).sin_cos();
        }
        let value = cos;
        (cos, sin) = (cos * turn_cos - sin * turn_sin, sin * turn_cos + cos * turn_sin);
        value
    })
}

#[cfg(test)]
mod tests;
