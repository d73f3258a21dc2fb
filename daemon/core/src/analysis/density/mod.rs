//! The power spectrum of a waveform for people: averaged over segments (Welch's method), with both scales right.
//!
//! Segments of even length, half overlapping, each about its own mean under a periodic Hann window
//! `w[i] = ½·(1 − cos(2πi/L))`. One-sided: every bin but the first and the last stands for both signs of frequency.
//!
//! - *rms per bin*, `√(2·mean|X|²)/Σw`: a sine in the middle of a bin shows its rms value (the coherent gain Σw/L = ½ is
//!   taken out). Half-way between two bins it shows 15 % less.
//! - *density*, `√(2·mean|X|²/(f_s·Σw²))` in V/√Hz: white noise of rms σ shows σ/√(f_s/2), whatever the window.
//!
//! The two differ by the square root of the equivalent noise bandwidth, `f_s·Σw²/(Σw)²` = 1.5 bins. A record's samples
//! behind the last whole half segment are not used.

use super::signal::Signal;
use super::spectrum::{Fourier, SpectrumError, cosines};

/// The window's name.
pub const WINDOW: &str = "hann";

/// Σw/L of the window.
pub const COHERENT_GAIN: f64 = 0.5;

/// Equivalent noise bandwidth of the window in bins: L·Σw²/(Σw)².
pub const NOISE_BANDWIDTH: f64 = 1.5;

/// The shortest segment in samples.
pub const SHORTEST: usize = 16;

/// The longest segment in samples: a spectrum of 32,769 bins; what a person looks at has fewer, and longer transforms are
/// slow and their plans large.
pub const LONGEST: usize = 65_536;

/// A spectrum from zero to half the sample rate.
#[derive(Debug, Clone, PartialEq)]
pub struct Density {
    /// Distance of two bins in hertz; bin k is at k times that.
    pub bin_hz: f64,
    /// Samples in a segment.
    pub segment: usize,
    /// Segments that were averaged, half overlapping.
    pub segments: usize,
    /// Rms per bin, in the signal's unit.
    pub rms: Vec<f64>,
    /// Density, in the signal's unit per root hertz.
    pub density: Vec<f64>,
}

/// The spectrum of a signal with samples `interval_s` apart, in segments of at most `longest` samples: the largest power of
/// two that neither exceeds that nor the record, nor lies outside [`SHORTEST`] to [`LONGEST`]. `None` for a record that is
/// shorter than the shortest segment.
///
/// # Errors
/// Only a mistake of the program, see [`SpectrumError`].
pub fn density<S: Signal + ?Sized>(
    signal: &S,
    interval_s: f64,
    longest: usize,
) -> Result<Option<Density>, SpectrumError> {
    let points = signal.points();
    if points < SHORTEST {
        return Ok(None);
    }
    let most = longest.clamp(SHORTEST, LONGEST).min(points);
    let segment = 1usize << most.ilog2();
    let fourier = Fourier::new(segment);
    let window: Vec<f64> =
        cosines(0.0, std::f64::consts::TAU / segment as f64).take(segment).map(|cos| 0.5 * (1.0 - cos)).collect();
    let (sum, squares) = window.iter().fold((0.0, 0.0), |(sum, squares), w| (sum + w, w.mul_add(*w, squares)));
    let mut power = vec![0.0; segment / 2 + 1];
    let mut samples = vec![0.0f32; segment];
    let mut buffer = vec![0.0; segment];
    let mut segments = 0;
    for from in (0..=points - segment).step_by(segment / 2) {
        signal.load(from, &mut samples);
        let mean = samples.iter().map(|x| f64::from(*x)).sum::<f64>() / segment as f64;
        for ((out, x), w) in buffer.iter_mut().zip(&samples).zip(&window) {
            *out = w * (f64::from(*x) - mean);
        }
        let spectrum = fourier.forward(&mut buffer)?;
        power.iter_mut().zip(&spectrum).for_each(|(power, bin)| *power += bin.norm_sqr());
        segments += 1;
    }
    let last = power.len() - 1;
    for (k, power) in power.iter_mut().enumerate() {
        *power *= if k == 0 || k == last { 1.0 } else { 2.0 } / f64::from(segments);
    }
    let rate_hz = 1.0 / interval_s;
    Ok(Some(Density {
        bin_hz: rate_hz / segment as f64,
        segment,
        segments: segments as usize,
        rms: power.iter().map(|p| p.sqrt() / sum).collect(),
        density: power.iter().map(|p| (p / (rate_hz * squares)).sqrt()).collect(),
    }))
}

#[cfg(test)]
mod tests;
