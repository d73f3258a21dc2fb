//! The leak bound: the most that the common mode of this very capture can have added to its difference.
//!
//! Per frequency the residual `|D/C|` is taken as the larger of two bounds on the same thing: what a verification found
//! (`10^(−after/20)`, interpolated in dB over log f, flat below its first band, growing with f above its last) and
//! what the correction's uncertainty allows (k = 2; what it may have drifted is part of that). They are not added: the verification already contains
//! the correction's present error, the uncertainty says what that error may be where the verification cannot tell.
//!
//! *Rms* follows from the powers. *Peak*: if every frequency's residual had the worst phase the sum of all
//! magnitudes would be the peak, but then noise in a million bins alone would make volts of it, and no gain error,
//! skew or bandwidth difference behaves so: their phase changes slowly with frequency. Taken here is the worst over
//! all phases that are common to all frequencies, which is the peak of the envelope (analytic signal) of the
//! common mode weighted by the residual.
//!
//! What is known beyond gain, skew and offset ([`Beyond`]) bounds it too: what a response that was applied still leaves, what
//! the legs' slow gains may differ by, and the converters' non-linearity, below which no residual is claimed.
//!
//! Records beyond `LONGEST` samples are done in two parts that add up, see the module `long`.
//!
//! The record is mirrored before the transform: a record whose ends differ then makes no jump that was never there. Its
//! last value is held for up to a percent of its length, to one that transforms fast.

use realfft::num_complex::Complex;

use super::rejection::{RejectionBand, residual_of_uncertainty};
use super::signal::{Signal, mean_and_square};
use super::{Beyond, Correction, Drift, band, peaks};

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
/// found (may be empty), as if the correction had been made just now.
#[must_use]
pub fn bound<S: Signal + ?Sized>(
    common_v: &S,
    interval_s: f64,
    correction: &Correction,
    rejection: &[RejectionBand],
) -> LeakBound {
    bound_with(common_v, interval_s, correction, rejection, &Beyond::default(), &Drift::default())
}

/// As [`bound`], with what is known beyond gain, skew and offset, for a correction that may have drifted.
#[must_use]
pub fn bound_with<S: Signal + ?Sized>(
    common_v: &S,
    interval_s: f64,
    correction: &Correction,
    rejection: &[RejectionBand],
    beyond: &Beyond,
    drift: &Drift,
) -> LeakBound {
    let n = common_v.points();
    if n == 0 {
        return LeakBound { rms_v: 0.0, peak_v: 0.0, mean_v: 0.0, common_rms_v: 0.0, common_swing_v: 0.0 };
    }
    let mut bands: Vec<RejectionBand> = rejection.iter().copied().filter(|b| b.frequency_hz > 0.0).collect();
    bands.sort_by(|a, b| a.frequency_hz.total_cmp(&b.frequency_hz));
    let points: Vec<(f64, f64)> = bands.iter().map(|b| (b.frequency_hz, b.after_db)).collect();
    let wide = widened(correction, drift);
    let residual = |f: f64| {
        let linear = interpolated(&points, f).max(residual_of_uncertainty(&wide, f));
        if f > 0.0 { linear.max(beyond.residual(f)) } else { linear }
    };
    let (mean, square) = mean_and_square(common_v);
    let mean_v =
        at_zero(mean, interpolated(&points, 0.0), correction, drift) + 2.0 * beyond.left(common_v, interval_s).mean_v;
    let noise = peaks::noise_of(common_v);
    let moving = weighted(common_v, interval_s, mean, noise, &residual);
    let extremes = peaks::extremes(common_v, noise);
    LeakBound {
        rms_v: moving.rms.hypot(mean_v),
        peak_v: moving.peak + mean_v,
        mean_v,
        common_rms_v: square.sqrt(),
        common_swing_v: extremes.1.value - extremes.0.value,
    }
}

/// The correction with what gain and skew may have drifted in their standard uncertainties.
fn widened(correction: &Correction, drift: &Drift) -> Correction {
    let mut wide = *correction;
    wide.gain.u = wide.gain.u.hypot(wide.gain.value * drift.gain / 3.0f64.sqrt());
    wide.skew_s.u = wide.skew_s.u.hypot(drift.skew_s / 3.0f64.sqrt());
    wide
}

/// What a mean common mode can leave in the difference's mean: `δD = C·δg/g + δo/g`, the errors of gain and offset
/// correlated, at a coverage factor of 2; or what the verification found of the gain, with what the offset may be off
/// once the gain is known.
fn at_zero(mean: f64, verified: f64, correction: &Correction, drift: &Drift) -> f64 {
    let gain = correction.gain.value;
    let r = correction.gain_offset.clamp(-1.0, 1.0);
    let (of_gain, of_offset) = (mean * correction.gain.u / gain.abs(), (correction.offset_v.u / gain).abs());
    let drifted = [mean * drift.gain, drift.offset_v / gain].map(|half| half * half / 3.0);
    let both = of_gain * of_gain + of_offset * of_offset + 2.0 * r * of_gain * of_offset;
    let sure = 2.0 * (both + drifted[0] + drifted[1]).max(0.0).sqrt();
    let left = of_offset * (1.0 - r * r).sqrt();
    sure.max((mean * verified).abs() + 2.0 * (left * left + drifted[1]).sqrt())
}

/// What the alternating part of a common mode leaks, in volts.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Moving {
    /// As rms.
    pub rms: f64,
    /// As peak.
    pub peak: f64,
}

/// What is left of a common mode of the given mean and noise, weighted by a residual that is a function of frequency.
pub(super) fn weighted<S: Signal + ?Sized>(
    common_v: &S,
    interval_s: f64,
    mean: f64,
    noise: f64,
    residual: &impl Fn(f64) -> f64,
) -> Moving {
    let n = common_v.points();
    if n > LONGEST {
        return long::filtered(common_v, interval_s, mean, noise, residual);
    }
    let mut values = vec![0.0f32; n];
    common_v.load(0, &mut values);
    let wave: Vec<f64> = values.iter().map(|x| f64::from(*x) - mean).collect();
    let (in_phase, in_quadrature, power) = quadrature(wave, interval_s, residual);
    let square = in_phase.iter().zip(&in_quadrature).map(|(a, b)| a * a + b * b).fold(0.0, f64::max);
    Moving { rms: power.sqrt(), peak: square.sqrt() }
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

/// `|D/C|` from a rejection in dB at some frequencies in hertz, which rise; 0 without any.
pub(super) fn interpolated(points: &[(f64, f64)], frequency_hz: f64) -> f64 {
    let magnitude = |db: f64| 10.0f64.powf(-db / 20.0);
    let next = points.partition_point(|(f, _)| *f <= frequency_hz);
    match (next.checked_sub(1).and_then(|i| points.get(i)), points.get(next)) {
        (None, None) => 0.0,
        (None, Some((_, first))) => magnitude(*first),
        (Some((f, last)), None) => magnitude(*last) * frequency_hz / f,
        (Some((low, a)), Some((high, b))) => {
            let share = (frequency_hz / low).ln() / (high / low).ln();
            magnitude(share.mul_add(b - a, *a))
        }
    }
}

#[cfg(test)]
mod tests;
