//! The leak bound: the most that the common mode of this very capture can have added to its difference.
//!
//! Per frequency the residual `|D/C|` is taken as the larger of two bounds on the same thing: what a verification found
//! (`10^(−after/20)`, interpolated in dB over log f, flat below its first band, growing with f above its last) and
//! what the correction's uncertainty allows (k = 2). They are not added: the verification already contains
//! the correction's present error, the uncertainty says what that error may be where the verification cannot tell.
//!
//! *Rms* follows from the powers. *Peak*: if every frequency's residual had the worst phase the sum of all
//! magnitudes would be the peak, but then noise in a million bins alone would make volts of it, and no gain error,
//! skew or bandwidth difference behaves so: their phase changes slowly with frequency. Taken here is the worst over
//! all phases that are common to all frequencies, which is the peak of the envelope (analytic signal) of the
//! common mode weighted by the residual.
//!
//! Records beyond `LONGEST` samples are done in two parts that add up, see the module `long`.
//!
//! The record is mirrored before the transform: a record whose ends differ then makes no jump that was never there. Its
//! last value is held for up to a percent of its length, to one that transforms fast.

use realfft::num_complex::Complex;

use super::rejection::{RejectionBand, residual_of_uncertainty};
use super::signal::{Signal, mean_and_square};
use super::{Correction, band, peaks};

mod long;

/// The longest record that is transformed as a whole.
const LONGEST: usize = 32_768;

/// The most that the common mode can have added to the difference.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LeakBound {
    /// As rms, in volts, the part at zero frequency included.
    pub rms_v: f64,
    /// As peak, in volts, the part at zero frequency included.
    pub peak_v: f64,
    /// The part at zero frequency, in volts: the mean common mode times its residual, and the offset's uncertainty.
    pub mean_v: f64,
    /// Rms of the common mode, in volts.
    pub common_rms_v: f64,
    /// Highest less lowest value of the common mode (local fits, not single samples), in volts.
    pub common_swing_v: f64,
}

/// The leak bound of a capture whose common mode is `common_v`, corrected with `correction`, for which `rejection` was
/// found (may be empty).
#[must_use]
pub fn bound<S: Signal + ?Sized>(
    common_v: &S,
    interval_s: f64,
    correction: &Correction,
    rejection: &[RejectionBand],
) -> LeakBound {
    let n = common_v.points();
    if n == 0 {
        return LeakBound { rms_v: 0.0, peak_v: 0.0, mean_v: 0.0, common_rms_v: 0.0, common_swing_v: 0.0 };
    }
    let mut bands: Vec<RejectionBand> = rejection.iter().copied().filter(|b| b.frequency_hz > 0.0).collect();
    bands.sort_by(|a, b| a.frequency_hz.total_cmp(&b.frequency_hz));
    let residual = |f: f64| measured(&bands, f).max(residual_of_uncertainty(correction, f));
    let (mean, square) = mean_and_square(common_v);
    let offset_v = 2.0 * (correction.offset_v.u / correction.gain.value).abs();
    let mean_v = (mean * residual(0.0)).abs() + offset_v;
    let noise = peaks::noise_of(common_v);
    let moving = if n > LONGEST {
        long::filtered(common_v, interval_s, mean, noise, &residual)
    } else {
        let mut values = vec![0.0f32; n];
        common_v.load(0, &mut values);
        let wave: Vec<f64> = values.iter().map(|x| f64::from(*x) - mean).collect();
        let (in_phase, in_quadrature, power) = quadrature(wave, interval_s, &residual);
        let square = in_phase.iter().zip(&in_quadrature).map(|(a, b)| a * a + b * b).fold(0.0, f64::max);
        Moving { rms: power.sqrt(), peak: square.sqrt() }
    };
    let extremes = peaks::extremes(common_v, noise);
    LeakBound {
        rms_v: moving.rms.hypot(mean_v),
        peak_v: moving.peak + mean_v,
        mean_v,
        common_rms_v: square.sqrt(),
        common_swing_v: extremes.1.value - extremes.0.value,
    }
}

/// What the alternating part of a common mode leaks.
struct Moving {
    rms: f64,
    peak: f64,
}

/// A waveform without its mean, weighted by the residual: in phase, in quadrature, and its mean square.
fn quadrature(mut wave: Vec<f64>, interval_s: f64, residual: &impl Fn(f64) -> f64) -> (Vec<f64>, Vec<f64>, f64) {
    let n = wave.len();
    let half = band::fast_from(n);
    let points = 2 * half;
    let bin_hz = 1.0 / (points as f64 * interval_s);
    wave.resize(half, wave.last().copied().unwrap_or(0.0));
    wave.extend_from_within(..);
    wave[half..].reverse();
    let mut spectrum = band::forward(wave);
    let mut power = 0.0;
    for (k, x) in spectrum.iter_mut().enumerate() {
        *x *= residual(k as f64 * bin_hz);
        // Bins stand for both signs of frequency, but for the first and the last, at half the sample rate.
        power += x.norm_sqr() * if k == 0 || k == half { 1.0 } else { 2.0 };
    }
    // All of the power is put down to the record itself, none to the part that was held.
    let power = power / points as f64 / (2 * n) as f64;
    let quarter = spectrum.iter().map(|x| x * Complex::i()).collect();
    let mut in_phase = band::inverse(spectrum, points);
    let mut in_quadrature = band::inverse(quarter, points);
    in_phase.truncate(n);
    in_quadrature.truncate(n);
    (in_phase, in_quadrature, power)
}

/// `|D/C|` after the verification's bands, sorted by frequency; 0 without any.
fn measured(bands: &[RejectionBand], frequency_hz: f64) -> f64 {
    let magnitude = |db: f64| 10.0f64.powf(-db / 20.0);
    let next = bands.partition_point(|b| b.frequency_hz <= frequency_hz);
    match (next.checked_sub(1).and_then(|i| bands.get(i)), bands.get(next)) {
        (None, None) => 0.0,
        (None, Some(first)) => magnitude(first.after_db),
        (Some(last), None) => magnitude(last.after_db) * frequency_hz / last.frequency_hz,
        (Some(a), Some(b)) => {
            let share = (frequency_hz / a.frequency_hz).ln() / (b.frequency_hz / a.frequency_hz).ln();
            magnitude(share.mul_add(b.after_db - a.after_db, a.after_db))
        }
    }
}

#[cfg(test)]
mod tests;
