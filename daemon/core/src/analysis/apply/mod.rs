//! Carrying out a correction: two records in, the corrected difference and the common mode out.
//!
//! `D(t) = P(t) − (N(t + τ) − o)/g`, `C(t) = (P(t) + N_c(t))/2`, `N_c = (N(t + τ) − o)/g`, at the sampling instants of
//! the positive leg. Each record brings its own time axis: the scope's skew setting may have moved one of them, so that
//! the delay that is left to do here is the difference of the axes plus the software's part of the skew. Samples that
//! the interpolation cannot reach with all its taps are left out at both ends.

use super::interpolate::Interpolator;
use super::signal::{BLOCK, Outline, Signal, extremes_of};
use super::wide::widest;
use super::{Correction, Record, Samples};

mod fused;
mod plain;
mod sums;
mod wave;

pub use plain::{Plain, plain};
pub use sums::{Moments, Sums};
pub use wave::Wave;

/// The least number of valid samples that is worth calling a result.
const LEAST_POINTS: usize = 16;

/// A capture after correction. All waveforms share one time axis and one length. Difference and negative leg are kept in
/// single precision, a hundred times finer than any converter; the common mode follows from them.
#[derive(Debug, Clone, PartialEq)]
pub struct Corrected {
    /// D in volts: positive leg minus corrected negative leg.
    pub difference_v: Wave,
    /// The corrected negative leg in volts, `(N(t + τ) − o)/g`.
    pub negative_v: Wave,
    /// Sums of both, of the slope, and of their products.
    pub sums: Sums,
    /// Index, in the positive leg's record, of the first sample here.
    pub first: usize,
    /// Seconds between two samples.
    pub interval_s: f64,
    /// Time of the first sample here relative to the trigger, in seconds.
    pub start_s: f64,
    /// Lowest and highest value per block, of the difference and of the common mode.
    pub(in crate::analysis) outlines: [Outline; 2],
    /// `Σ h²` of the interpolation: the factor on the power of the negative leg's white noise (before division by g²).
    pub noise_gain: f64,
}

impl Corrected {
    /// From a difference and a corrected negative leg of equal length that were made elsewhere.
    #[must_use]
    pub fn of(difference_v: Vec<f32>, negative_v: Vec<f32>, interval_s: f64, start_s: f64, noise_gain: f64) -> Self {
        let sums = Sums::of(&difference_v, &negative_v);
        let mut outlines = [(); 2].map(|()| Outline::with_capacity(difference_v.len()));
        for (d, n) in difference_v.chunks(BLOCK).zip(negative_v.chunks(BLOCK)) {
            outlines.iter_mut().zip(extremes_of(d, n)).for_each(|(outline, both)| outline.push(both));
        }
        let (difference_v, negative_v) = (difference_v.into(), negative_v.into());
        Self { difference_v, negative_v, sums, outlines, first: 0, interval_s, start_s, noise_gain }
    }

    /// Means of difference, negative leg, its slope and of their products.
    #[must_use]
    pub fn moments(&self) -> Moments {
        self.sums.moments(self.interval_s)
    }

    /// D in volts.
    #[must_use]
    pub fn difference(&self) -> Difference<'_> {
        Difference(self)
    }

    /// C in volts: the mean of the positive leg and the corrected negative leg.
    #[must_use]
    pub fn common(&self) -> Common<'_> {
        Common(self)
    }

    /// The slope of the corrected negative leg in volts per second, by the five-point central difference (Abramowitz
    /// and Stegun, 25.3.6): with the sign reversed, what D changes per second of skew. The two samples at each end
    /// repeat their neighbour.
    #[must_use]
    pub fn slope(&self) -> Slope<'_> {
        Slope(self)
    }
}

/// The difference of a corrected capture, in volts.
#[derive(Debug, Clone, Copy)]
pub struct Difference<'a>(&'a Corrected);

impl Signal for Difference<'_> {
    fn points(&self) -> usize {
        self.0.difference_v.len()
    }

    fn at(&self, index: usize) -> f64 {
        f64::from(self.0.difference_v[index])
    }

    fn load(&self, from: usize, out: &mut [f32]) {
        self.0.difference_v.load(from, out);
    }

    fn samples(&self) -> Option<&[f32]> {
        Some(&self.0.difference_v)
    }

    fn outline(&self) -> Option<&Outline> {
        Some(&self.0.outlines[0])
    }
}

/// The common mode of a corrected capture, in volts.
#[derive(Debug, Clone, Copy)]
pub struct Common<'a>(&'a Corrected);

impl Signal for Common<'_> {
    fn points(&self) -> usize {
        self.0.negative_v.len()
    }

    fn at(&self, index: usize) -> f64 {
        0.5f64.mul_add(f64::from(self.0.difference_v[index]), f64::from(self.0.negative_v[index]))
    }

    fn load(&self, from: usize, out: &mut [f32]) {
        let range = from..from + out.len();
        common_of(&self.0.negative_v[range.clone()], &self.0.difference_v[range], out);
    }

    fn means(&self) -> Option<(f64, f64)> {
        let moments = self.0.moments();
        Some((moments.common(), moments.common_square()))
    }

    fn outline(&self) -> Option<&Outline> {
        Some(&self.0.outlines[1])
    }
}

widest! {
    fn common_of(negative: &[f32], difference: &[f32], out: &mut [f32]) {
        let both = negative.iter().zip(difference);
        out.iter_mut().zip(both).for_each(|(out, (n, d))| *out = n + 0.5 * d);
    }
}

/// The slope of the corrected negative leg, in volts per second.
#[derive(Debug, Clone, Copy)]
pub struct Slope<'a>(&'a Corrected);

impl Signal for Slope<'_> {
    fn points(&self) -> usize {
        self.0.negative_v.len()
    }

    fn at(&self, index: usize) -> f64 {
        f64::from(sums::slope_at(&self.0.negative_v, index)) / self.0.interval_s
    }

    fn load(&self, from: usize, out: &mut [f32]) {
        let scale = (1.0 / self.0.interval_s) as f32;
        sums::slopes(&self.0.negative_v, from, out);
        out.iter_mut().for_each(|slope| *slope *= scale);
    }
}

/// Why two records cannot be subtracted.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum ApplyError {
    /// The gain cannot be divided by.
    #[error("the correction has a gain of {gain}, by which nothing can be divided; deskew the pair again")]
    Gain {
        /// The gain.
        gain: f64,
    },
    /// The records have different sample intervals.
    #[error(
        "the positive leg has a sample every {positive_s} s, the negative leg every {negative_s} s; read both from one \
         acquisition"
    )]
    Intervals {
        /// Interval of the positive leg in seconds.
        positive_s: f64,
        /// Interval of the negative leg in seconds.
        negative_s: f64,
    },
    /// The records have different lengths.
    #[error("the positive leg has {positive} samples, the negative leg {negative}; read both from one acquisition")]
    Lengths {
        /// Samples of the positive leg.
        positive: usize,
        /// Samples of the negative leg.
        negative: usize,
    },
    /// A sample or a time is not a finite number.
    #[error("{what} of the {leg} leg is not a finite number; read the record again")]
    NotFinite {
        /// `positive` or `negative`.
        leg: &'static str,
        /// What of it.
        what: String,
    },
    /// A response that does not fit the records.
    #[error(transparent)]
    Response(#[from] super::response::ResponseError),
    /// Nothing, or almost nothing, is left where both legs have samples.
    #[error(
        "of {points} samples only {valid} are left after a shift of {shift_samples} samples; use a longer record or \
         bring the legs' delays closer"
    )]
    TooShort {
        /// Samples in each record.
        points: usize,
        /// Samples for which the interpolation has support.
        valid: usize,
        /// By how many samples the negative leg must be moved.
        shift_samples: f64,
    },
}

/// The corrected difference and the common mode of one capture.
///
/// `correction.skew_s` is the part of the skew that the scope has not taken away already; what the scope did shows in
/// the records' time axes. Records of half a million samples and more are shared between two threads where the processor
/// has room for them; the result has the same bits as with one.
///
/// # Errors
/// When the records do not belong together, hold something that is not a number, or are too short for the shift.
pub fn correct(p: &Record, n: &Record, correction: &Correction) -> Result<Corrected, ApplyError> {
    carry_out(p, n, correction, true)
}

/// As [`correct`], for those who need the waveforms only: the sums are left at nothing.
pub(in crate::analysis) fn correct_without_sums(
    p: &Record,
    n: &Record,
    correction: &Correction,
) -> Result<Corrected, ApplyError> {
    carry_out(p, n, correction, false)
}

fn carry_out(p: &Record, n: &Record, correction: &Correction, summed: bool) -> Result<Corrected, ApplyError> {
    let gain = correction.gain.value;
    if !(gain.is_finite() && gain.abs() > 1e-6) {
        return Err(ApplyError::Gain { gain });
    }
    let points = belong(p, n)?;
    let shift = (p.start_s - n.start_s + correction.skew_s.value) / p.interval_s;
    let too_short = |valid| ApplyError::TooShort { points, valid, shift_samples: shift };
    if !(shift.is_finite() && shift.abs() < points as f64) {
        return Err(too_short(0));
    }
    let interpolator = Interpolator::new(shift);
    let valid = interpolator.support(points);
    if valid.len() < LEAST_POINTS {
        return Err(too_short(valid.len()));
    }
    let first = valid.start;
    let offset_v = correction.offset_v.value;
    let pass = fused::pass(&fused::Task { p, n, interpolator: &interpolator, gain, offset_v, summed, valid });
    Ok(Corrected {
        difference_v: pass.difference_v,
        negative_v: pass.negative_v,
        sums: pass.sums,
        outlines: pass.outlines,
        first,
        interval_s: p.interval_s,
        start_s: (first as f64).mul_add(p.interval_s, p.start_s),
        noise_gain: interpolator.noise_gain(),
    })
}

/// The number of samples of two records, once they are known to belong together.
fn belong(p: &Record, n: &Record) -> Result<usize, ApplyError> {
    for (leg, record) in [("positive", p), ("negative", n)] {
        let axis = record.interval_s.is_finite() && record.interval_s > 0.0 && record.start_s.is_finite();
        if !axis {
            return Err(ApplyError::NotFinite { leg, what: "the time axis".to_owned() });
        }
    }
    let (points, other) = (p.samples.len(), n.samples.len());
    if points != other {
        return Err(ApplyError::Lengths { positive: points, negative: other });
    }
    // The intervals may differ in their last digits as text; over the whole record that must stay below a thousandth
    // of a sample.
    if (p.interval_s - n.interval_s).abs() * points as f64 > 1e-3 * p.interval_s {
        return Err(ApplyError::Intervals { positive_s: p.interval_s, negative_s: n.interval_s });
    }
    for (leg, record) in [("positive", p), ("negative", n)] {
        let scaled = record.volts_per_code.is_finite() && record.zero_v.is_finite();
        let odd = match &record.samples {
            Samples::Codes(_) => None,
            // Infinities and what is no number survive a sum of magnitudes; only then the culprit is looked for.
            Samples::Numbers(numbers) => (!numbers.iter().map(|x| x * 0.0).sum::<f32>().is_finite())
                .then(|| numbers.iter().position(|x| !x.is_finite()))
                .flatten(),
        };
        if let Some(index) = odd.or_else(|| (!scaled).then_some(0)) {
            return Err(ApplyError::NotFinite { leg, what: format!("sample {index}") });
        }
    }
    Ok(points)
}

#[cfg(test)]
mod tests;
