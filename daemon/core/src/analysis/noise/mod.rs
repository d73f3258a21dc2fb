//! How much noise each leg has, measured: from two repeats, or from the quiet part of an aligned pair's spectrum.
//!
//! The noise is taken as white: a leg's value is its rms per sample, quantisation included.

use super::Estimate;
use super::line::{mean, sum};
use super::spectrum::{SpectrumError, hann};
use realfft::num_complex::Complex;

/// The noise of a pair's legs.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PairNoise {
    /// Positive leg, volts rms per sample.
    pub p_v: f64,
    /// Negative leg, volts rms per sample.
    pub n_v: f64,
    /// How many bins of the spectrum it was read from; relative uncertainty of each variance about `√(2/bins)`.
    pub bins: usize,
}

/// A bin counts as quiet below this multiple of the floor: pure noise passes whole (all but one bin in a million, or
/// its loud bins would be missing from its power), and what signal passes shows in the cross-spectrum.
const QUIET: f64 = 14.0;
/// Fewer quiet bins than this say nothing about the noise (18 % of the variance).
const ENOUGH_BINS: usize = 64;
/// Highest frequency looked at, relative to the sample rate: beyond it the interpolator changes the noise.
const HIGHEST: f64 = super::interpolate::BAND;

/// The noise of one leg from two acquisitions of the same signal: rms of their difference about its mean, over √2.
/// Trigger jitter between the two counts as noise on the edges. `None` without two records of one length (at least 2).
#[must_use]
pub fn from_repeats(first: &[f64], second: &[f64]) -> Option<f64> {
    if first.len() != second.len() || first.len() < 2 {
        return None;
    }
    let difference: Vec<f64> = first.iter().zip(second).map(|(a, b)| a - b).collect();
    let level = mean(&difference);
    let squares = sum(difference.iter().map(|d| (d - level).powi(2)));
    Some((squares / (difference.len() as f64 - 1.0) / 2.0).sqrt())
}

/// The noise of both legs from the bins in which neither has a signal. `p` and `n` are aligned in time (one of them
/// interpolated) and `gain` is N relative to P.
///
/// What the legs still have in common in the quiet bins (the tail of an edge's spectrum) shows in their cross-spectrum
/// and is taken off. `None` when too few bins are quiet: then the signal fills the band.
///
/// # Errors
/// Only a mistake of the program, see [`SpectrumError`].
pub fn out_of_band(p: &[f64], n: &[f64], gain: f64) -> Result<Option<PairNoise>, SpectrumError> {
    let Some(quiet) = Quiet::of(p, n)? else { return Ok(None) };
    let count = quiet.bins.len() as f64;
    let common = sum(quiet.cross().map(|(_, cross)| cross.re)) / count;
    // Chance may make the common part too large; it never explains nearly all of the noise of either leg. Cutting it
    // off at zero, where chance makes it negative, would bias the noise.
    let rest = |total: f64, common: f64| (total - common).max(total / 10.0).sqrt();
    let (total_p, total_n) = (quiet.power(&quiet.p), quiet.power(&quiet.n));
    Ok(Some(PairNoise { p_v: rest(total_p, common / gain), n_v: rest(total_n, common * gain), bins: quiet.bins.len() }))
}

/// The correlation of the legs' noise at the same instant, from the quiet bins; `p` was delayed by `skew` samples to
/// align it with `n`. `None` when too few bins are quiet.
///
/// What is left of the signal is in phase there; noise that both legs got at the same time is out of phase by ωτ. So
/// only the imaginary part counts: `ρ = Σ Im(P*N)·sin ωτ / (Σ sin² ωτ·σ_P·σ_N)`. At no skew there is none, and the
/// uncertainty is infinite: noise in step with the signal cannot be told from it, nor does it pull the skew.
///
/// # Errors
/// Only a mistake of the program, see [`SpectrumError`].
pub fn correlated(p: &[f64], n: &[f64], skew: f64) -> Result<Option<Estimate>, SpectrumError> {
    let Some(quiet) = Quiet::of(p, n)? else { return Ok(None) };
    let scale = (quiet.power(&quiet.p) * quiet.power(&quiet.n)).sqrt();
    let sine = |k: usize| (std::f64::consts::TAU * k as f64 / quiet.length as f64 * skew).sin();
    let weight = sum(quiet.bins.iter().map(|&k| sine(k).powi(2)));
    let along = sum(quiet.cross().map(|(k, cross)| cross.im * sine(k)));
    if weight.is_nan() || scale.is_nan() || weight <= 0.0 || scale <= 0.0 {
        return Ok(None);
    }
    // Each bin's part has variance ½; Hann's window makes neighbours alike: 1 + 2·(4/9 + 1/36) = 1.94, and more with
    // the zeros that the record was extended by.
    let alike = 1.94 * quiet.length as f64 / p.len() as f64;
    Ok(Some(Estimate { value: along / (weight * scale), u: (alike / 2.0 / weight).sqrt() }))
}

/// The spectra of both legs and the bins in which neither has a signal.
struct Quiet {
    p: Vec<Complex<f64>>,
    n: Vec<Complex<f64>>,
    length: usize,
    bins: Vec<usize>,
}

impl Quiet {
    fn of(p: &[f64], n: &[f64]) -> Result<Option<Self>, SpectrumError> {
        let (spectrum_p, length) = hann(p)?;
        let (spectrum_n, _) = hann(n)?;
        let last = ((HIGHEST * length as f64) as usize).min(spectrum_p.len());
        if last < 2 * ENOUGH_BINS {
            return Ok(None);
        }
        let power =
            |spectrum: &[Complex<f64>]| -> Vec<f64> { spectrum[..last].iter().map(|bin| bin.norm_sqr()).collect() };
        let (power_p, power_n) = (power(&spectrum_p), power(&spectrum_n));
        let (floor_p, floor_n) = (floor(&power_p), floor(&power_n));
        let loud = |k: usize| power_p[k] > QUIET * floor_p || power_n[k] > QUIET * floor_n;
        // A window's main lobe reaches two bins to either side of a line.
        let mut quiet = vec![true; last];
        for k in (0..last).filter(|&k| k < 3 || loud(k)) {
            quiet[k.saturating_sub(2)..(k + 3).min(last)].fill(false);
        }
        let bins: Vec<usize> = (0..last).filter(|&k| quiet[k]).collect();
        Ok((bins.len() >= ENOUGH_BINS).then_some(Self { p: spectrum_p, n: spectrum_n, length, bins }))
    }

    /// Mean power of a leg per quiet bin.
    fn power(&self, spectrum: &[Complex<f64>]) -> f64 {
        sum(self.bins.iter().map(|&k| spectrum[k].norm_sqr())) / self.bins.len() as f64
    }

    /// Number and cross-spectrum of each quiet bin.
    fn cross(&self) -> impl Iterator<Item = (usize, Complex<f64>)> {
        self.bins.iter().map(|&k| (k, self.p[k].conj() * self.n[k]))
    }
}

/// A first value of the noise power per bin: lower quartile of the medians of bands in the upper half. A median does
/// not see lines, the quartile not the bands that an edge's tail fills. (An exponential's median is ln 2 of its mean.)
fn floor(power: &[f64]) -> f64 {
    let upper = &power[power.len() / 2..];
    let mut medians: Vec<f64> = upper.chunks(upper.len().div_ceil(16)).map(median).collect();
    medians.sort_by(f64::total_cmp);
    medians[medians.len() / 4] / std::f64::consts::LN_2
}

fn median(values: &[f64]) -> f64 {
    let mut sorted = values.to_vec();
    let middle = sorted.len() / 2;
    *sorted.select_nth_unstable_by(middle, f64::total_cmp).1
}

#[cfg(test)]
mod tests;
