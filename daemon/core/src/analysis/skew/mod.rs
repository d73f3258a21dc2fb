//! Skew, gain and offset of a pair from one acquisition of a reference that both legs see.
//!
//! Model: `P[i] = s(t_i) + w`, `N[i] = g·s(t_i − τ) + o + v`, with an unknown common signal s and white noise of
//! *measured* size on both legs. τ > 0: the negative leg arrives late. o in volts at s = 0.
//!
//! The bound (Fisher information with s eliminated): with residual `e = N − g·P(t − τ) − o` of variance
//! `σ_N² + g²σ_P²`, `cov(τ, g, o) = (σ_N² + g²σ_P²)·(GᵀG)⁻¹`, `G = [−g·s′(t − τ), s(t − τ), 1]`.
//!
//! The estimator reaches it in the time domain, on the samples for which the interpolator has support, so that
//! records need not hold whole periods: a whole lag from the correlation ([`super::coarse`]), then steps towards the
//! root of `Zᵀe = 0`, whose regressors Z come from the denoised estimate of s that is uncorrelated with e. Denoising
//! may be as non-linear as it likes: it costs efficiency, never bias. Cost: O(n log n).
//!
//! Two kinds of record go another way to the same bound. Long records with few edges (`gated`): only the samples
//! round the edges tell of the skew, and block means of the rest of gain and offset. One sine (`sine`): a fit of both
//! legs with one frequency.

mod error;
mod fine;
mod gain;
mod gated;
mod leg;
mod limit;
mod report;
mod score;
mod sine;
mod template;

pub use error::{SkewError, Warning};
pub use gain::{LevelEstimate, gain_and_offset};
use leg::Leg;
pub use limit::Limit;
pub(in crate::analysis) use limit::of_warnings as limit_of;
pub use sine::{Sine, SineFit, fit_two_sines};

use super::record::Record;
use super::{Correction, Estimate};

/// What kind of signal the reference is; it decides how the template is denoised.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Shape {
    /// A square wave or pulses: the skew is in the edges.
    Edges,
    /// One sine.
    Sine,
    /// A sum of sines.
    Multitone,
    /// Not known, as the common node of a device: whichever denoising tells more is used.
    Unknown,
}

/// What is known of the reference.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Reference {
    /// Its kind.
    pub shape: Shape,
    /// Its period in seconds. If given, the skew is sought within half a period.
    pub period_s: Option<f64>,
}

/// Skew, gain and offset from one acquisition.
#[derive(Debug, Clone, PartialEq)]
pub struct SkewEstimate {
    /// τ in seconds, positive when the negative leg arrives late.
    pub skew_s: Estimate,
    /// g, N relative to P.
    pub gain: Estimate,
    /// o in volts at the tips: N's reading at s = 0.
    pub offset_v: Estimate,
    /// Covariance of skew, gain and offset, in this order and in their units.
    pub covariance: [[f64; 3]; 3],
    /// The least standard uncertainty that any unbiased estimator could have (Cramér–Rao) for skew, gain and offset.
    pub bound: [f64; 3],
    /// Noise of the positive leg, volts rms per sample.
    pub noise_p_v: f64,
    /// Noise of the negative leg, volts rms per sample.
    pub noise_n_v: f64,
    /// Rms of `N − g·P(t − τ) − o` in volts.
    pub residual_v: f64,
    /// Rms of the common signal about its mean, in volts.
    pub signal_rms_v: f64,
    /// The common signal's mean over the samples used, in volts.
    pub level_v: f64,
    /// How many samples were used.
    pub samples: usize,
    /// The smaller of the legs' noise before averaging, in converter steps; `None` when the step is not known.
    pub dither_steps: Option<f64>,
    /// What to tell the user.
    pub warnings: Vec<Warning>,
}

impl SkewEstimate {
    /// What N reads too much, in volts, when both tips are at `level_v`: `o + (g − 1)·level`. At the reference's
    /// own mean its uncertainty is least.
    #[must_use]
    pub fn offset_at(&self, level_v: f64) -> Estimate {
        let [_, [_, gg, go], [.., oo]] = self.covariance;
        Estimate {
            value: self.offset_v.value + (self.gain.value - 1.0) * level_v,
            u: (oo + 2.0 * level_v * go + level_v * level_v * gg).max(0.0).sqrt(),
        }
    }

    /// The estimates as a correction.
    #[must_use]
    pub fn correction(&self) -> Correction {
        Correction { skew_s: self.skew_s, gain: self.gain, offset_v: self.offset_v, gain_offset: self.gain_offset() }
    }

    /// Correlation coefficient of gain and offset, from their covariance; 0 where either has no uncertainty.
    #[must_use]
    pub fn gain_offset(&self) -> f64 {
        let [_, [_, gg, go], [.., oo]] = self.covariance;
        let product = (gg * oo).sqrt();
        if product > 0.0 { (go / product).clamp(-1.0, 1.0) } else { 0.0 }
    }

    /// Takes the converter into account: `step_p_v` and `step_n_v` volts per step, records averaged over `averages`
    /// acquisitions. Below half a step of noise quantisation is no noise: repeats agree better than they are right.
    ///
    /// There the legs' noise is taken as at least `step/√12`, and gain and offset get the level error
    /// `q/(π√2)·exp(−2π²s²/q²)` of a converter with step q and noise s, which averaging does not lessen.
    #[must_use]
    pub fn with_converter(mut self, step_p_v: f64, step_n_v: f64, averages: u32) -> Self {
        let count = f64::from(averages.max(1));
        // What is measured holds the quantisation's own step²/12.
        let dither = |noise: f64, step: f64| ((noise * noise * count - step * step / 12.0).max(0.0)).sqrt() / step;
        let (p, n) = (dither(self.noise_p_v, step_p_v), dither(self.noise_n_v, step_n_v));
        let steps = p.min(n);
        if !steps.is_finite() {
            return self;
        }
        self.dither_steps = Some(steps);
        if steps >= super::deskew::LEAST_DITHER {
            return self;
        }
        self.warnings.push(Warning::LittleDither { steps });
        let g2 = self.gain.value.powi(2);
        let have = self.noise_n_v.powi(2) + g2 * self.noise_p_v.powi(2);
        let least = |noise: f64, step: f64| noise.powi(2).max(step * step / 12.0);
        let need = least(self.noise_n_v, step_n_v) + g2 * least(self.noise_p_v, step_p_v);
        let scale = if have > 0.0 { (need / have).max(1.0) } else { 1.0 };
        self.covariance.iter_mut().flatten().for_each(|term| *term *= scale);
        let level = |steps: f64, step: f64| {
            let pi = std::f64::consts::PI;
            (step / (pi * std::f64::consts::SQRT_2) * (-2.0 * (pi * steps).powi(2)).exp()).powi(2)
        };
        let levels = level(n, step_n_v) + g2 * level(p, step_p_v);
        self.covariance[1][1] += levels / self.signal_rms_v.powi(2);
        self.covariance[2][2] += levels * (1.0 + (self.level_v / self.signal_rms_v).powi(2));
        self.covariance[1][2] -= levels * self.level_v / self.signal_rms_v.powi(2);
        self.covariance[2][1] = self.covariance[1][2];
        self.skew_s.u = self.covariance[0][0].sqrt();
        self.gain.u = self.covariance[1][1].sqrt();
        self.offset_v.u = self.covariance[2][2].sqrt();
        self
    }
}

/// Estimates skew, gain and offset from the two records `p` and `n` in volts, one sample every `interval_s` seconds.
///
/// # Errors
/// See [`SkewError`]; each says what is wrong with the records and what to try.
pub fn estimate(p: &[f64], n: &[f64], interval_s: f64, reference: &Reference) -> Result<SkewEstimate, SkewError> {
    front(&Leg::Volts(p), &Leg::Volts(n), interval_s, reference)
}

/// As [`estimate`], from the records of one acquisition, with the converter's step taken into account. The skew is in
/// true time: records that start at different times are compared as what they are.
///
/// # Errors
/// As [`estimate`]; also clipped records, and sample intervals that differ.
pub fn estimate_records(p: &Record, n: &Record, reference: &Reference) -> Result<SkewEstimate, SkewError> {
    let (leg_p, leg_n) = (Leg::of(p), Leg::of(n));
    if leg_p.reaches(p.end_codes) || leg_n.reaches(n.end_codes) {
        return Err(SkewError::Clipped { p: p.clipped(), n: n.clipped() });
    }
    if (p.interval_s - n.interval_s).abs() > 1e-9 * p.interval_s.abs() {
        return Err(SkewError::Intervals { p_s: p.interval_s, n_s: n.interval_s });
    }
    let mut found = front(&leg_p, &leg_n, p.interval_s, reference)?;
    found.skew_s.value += n.start_s - p.start_s;
    Ok(found.with_converter(p.step_v, n.step_v, p.averages_on_finer_codes().min(n.averages_on_finer_codes())))
}

/// Chooses the way: the windows round the edges where that tells all, all samples otherwise; for a sine the better of
/// two estimates.
fn front(p: &Leg<'_>, n: &Leg<'_>, interval_s: f64, reference: &Reference) -> Result<SkewEstimate, SkewError> {
    if let Some(found) = gated::estimate(p, n, interval_s, reference) {
        return Ok(found);
    }
    let (p, n) = (p.volts(), n.volts());
    let found = fine::estimate(&p, &n, interval_s, reference)?;
    Ok(match reference.shape {
        Shape::Sine => sine::better(&p, &n, interval_s, found),
        Shape::Edges | Shape::Multitone | Shape::Unknown => found,
    })
}

#[cfg(test)]
mod quality;
#[cfg(test)]
pub(crate) mod signals;
#[cfg(test)]
mod tests;
#[cfg(test)]
mod traps;
