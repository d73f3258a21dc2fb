//! Carrying out a correction: two records in, the corrected difference and the common mode out.
//!
//! `D(t) = P(t) − (N(t + τ) − o)/g`, `C(t) = (P(t) + N_c(t))/2`, `N_c = (N(t + τ) − o)/g`, at the sampling instants of
//! the positive leg. Each record brings its own time axis: the scope's skew setting may have moved one of them, so that
//! the delay that is left to do here is the difference of the axes plus the software's part of the skew. Samples that
//! the interpolation cannot reach with all its taps are left out at both ends.

use super::interpolate::Interpolator;
use super::{Correction, Record};

/// The least number of valid samples that is worth calling a result.
const LEAST_POINTS: usize = 16;

/// A capture after correction. All three waveforms share one time axis and one length.
#[derive(Debug, Clone, PartialEq)]
pub struct Corrected {
    /// D in volts: positive leg minus corrected negative leg.
    pub difference_v: Vec<f64>,
    /// C in volts: the mean of the positive leg and the corrected negative leg.
    pub common_v: Vec<f64>,
    /// The corrected negative leg in volts, `(N(t + τ) − o)/g`.
    pub negative_v: Vec<f64>,
    /// Index, in the positive leg's record, of the first sample here.
    pub first: usize,
    /// Seconds between two samples.
    pub interval_s: f64,
    /// Time of the first sample here relative to the trigger, in seconds.
    pub start_s: f64,
    /// `Σ h²` of the interpolation: the factor on the power of the negative leg's white noise (before division by g²).
    pub noise_gain: f64,
}

impl Corrected {
    /// The slope of the corrected negative leg in volts per second, by the five-point central difference (Abramowitz
    /// and Stegun, 25.3.6): with the sign reversed, what D changes per second of skew. The two samples at each end
    /// repeat their neighbour.
    #[must_use]
    pub fn negative_slope(&self) -> Vec<f64> {
        let x = &self.negative_v;
        let n = x.len();
        if n < 5 {
            return vec![0.0; n];
        }
        let scale = 1.0 / (12.0 * self.interval_s);
        let mut slope = vec![0.0; n];
        for (i, w) in x.windows(5).enumerate() {
            slope[i + 2] = (8.0 * (w[3] - w[1]) - (w[4] - w[0])) * scale;
        }
        slope[0] = slope[2];
        slope[1] = slope[2];
        slope[n - 1] = slope[n - 3];
        slope[n - 2] = slope[n - 3];
        slope
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
/// the records' time axes.
///
/// # Errors
/// When the records do not belong together, hold something that is not a number, or are too short for the shift.
pub fn correct(p: &Record, n: &Record, correction: &Correction) -> Result<Corrected, ApplyError> {
    let gain = correction.gain.value;
    if !(gain.is_finite() && gain.abs() > 1e-6) {
        return Err(ApplyError::Gain { gain });
    }
    let (positive, negative) = volts(p, n)?;
    let shift = (p.start_s - n.start_s + correction.skew_s.value) / p.interval_s;
    let points = positive.len();
    let too_short = |valid| ApplyError::TooShort { points, valid, shift_samples: shift };
    if !(shift.is_finite() && shift.abs() < points as f64) {
        return Err(too_short(0));
    }
    let interpolator = Interpolator::new(shift);
    let valid = interpolator.support(points);
    if valid.len() < LEAST_POINTS {
        return Err(too_short(valid.len()));
    }
    let mut negative_v = interpolator.apply(&negative);
    let offset = correction.offset_v.value;
    negative_v.iter_mut().for_each(|v| *v = (*v - offset) / gain);
    let pairs = || positive[valid.clone()].iter().zip(&negative_v);
    Ok(Corrected {
        difference_v: pairs().map(|(p, n)| p - n).collect(),
        common_v: pairs().map(|(p, n)| 0.5 * (p + n)).collect(),
        first: valid.start,
        interval_s: p.interval_s,
        start_s: (valid.start as f64).mul_add(p.interval_s, p.start_s),
        noise_gain: interpolator.noise_gain(),
        negative_v,
    })
}

/// Plain subtraction in volts: each sample of P less the sample of N that is nearest in time, nothing else done. Where
/// the time axes agree that is sample by sample; samples without a partner are left out.
///
/// # Errors
/// When the records do not belong together, hold something that is not a number, or do not overlap in time.
pub fn plain(p: &Record, n: &Record) -> Result<Vec<f64>, ApplyError> {
    Ok(nearest(p, n)?.into_iter().map(|(p, n)| p - n).collect())
}

/// Pairs of samples nearest in time, in volts.
pub(super) fn nearest(p: &Record, n: &Record) -> Result<Vec<(f64, f64)>, ApplyError> {
    let (positive, negative) = volts(p, n)?;
    let shift = (p.start_s - n.start_s) / p.interval_s;
    let points = positive.len();
    if !(shift.is_finite() && shift.abs() < points as f64) {
        return Err(ApplyError::TooShort { points, valid: 0, shift_samples: shift });
    }
    let whole = shift.round() as isize;
    let skip_p = usize::try_from(-whole).unwrap_or(0);
    let skip_n = usize::try_from(whole).unwrap_or(0);
    let pairs: Vec<(f64, f64)> =
        positive.iter().skip(skip_p).zip(negative.iter().skip(skip_n)).map(|(p, n)| (*p, *n)).collect();
    if pairs.len() < LEAST_POINTS {
        return Err(ApplyError::TooShort { points, valid: pairs.len(), shift_samples: shift });
    }
    Ok(pairs)
}

/// Both legs in volts, once they are known to belong together.
fn volts(p: &Record, n: &Record) -> Result<(Vec<f64>, Vec<f64>), ApplyError> {
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
    let (positive, negative) = (p.volts(), n.volts());
    for (leg, samples) in [("positive", &positive), ("negative", &negative)] {
        if let Some(index) = samples.iter().position(|v| !v.is_finite()) {
            return Err(ApplyError::NotFinite { leg, what: format!("sample {index}") });
        }
    }
    Ok((positive, negative))
}

#[cfg(test)]
mod tests;
