//! Gain and offset alone, where the skew is known already: in situ, on the ranges of the measurement.

use super::super::Estimate;
use super::super::interpolate::Interpolator;
use super::super::line::{Line, deming, mean, sum};
use super::super::noise::{PairNoise, out_of_band};
use super::fine::{GAINS, LEAST_CORRELATION, LEAST_SAMPLES};
use super::report::DIFFERENT;
use super::{SkewError, Warning};

/// Gain and offset at a given skew.
#[derive(Debug, Clone, PartialEq)]
pub struct LevelEstimate {
    /// g, N relative to P.
    pub gain: Estimate,
    /// o in volts at the tips: N's reading at s = 0.
    pub offset_v: Estimate,
    /// Covariance of gain and offset, in volts.
    pub covariance: f64,
    /// Noise of the positive leg, volts rms per sample.
    pub noise_p_v: f64,
    /// Noise of the negative leg, volts rms per sample.
    pub noise_n_v: f64,
    /// What to tell the user.
    pub warnings: Vec<Warning>,
}

/// Passes of noise and line; each needs the other's result, and two are enough.
const PASSES: usize = 3;

/// Gain and offset of `n` against `p` (volts), the skew of `skew_samples` samples (positive: n is late) being known:
/// Deming's regression of the advanced negative leg on the positive one, with the noise of both legs measured in the
/// quiet part of the spectrum. An error of the skew hardly matters over whole periods; it leaves its mark at the
/// edges of a record that holds only one.
///
/// # Errors
/// Records of unequal length, too short, not finite, without spread or without a common signal, an absurd gain.
pub fn gain_and_offset(p: &[f64], n: &[f64], skew_samples: f64) -> Result<LevelEstimate, SkewError> {
    if p.len() != n.len() {
        return Err(SkewError::Lengths { p: p.len(), n: n.len() });
    }
    if !skew_samples.is_finite() {
        return Err(SkewError::NotFinite { what: "the given skew" });
    }
    let interpolator = Interpolator::new(skew_samples);
    let range = interpolator.support(n.len());
    if range.len() < LEAST_SAMPLES {
        return Err(SkewError::TooShort { samples: range.len(), needed: LEAST_SAMPLES });
    }
    let late = interpolator.apply(n);
    let p = &p[range];
    let correlation = correlation(p, &late);
    if correlation < -LEAST_CORRELATION {
        return Err(SkewError::Inverted { correlation });
    }
    // The correlation of a flat leg is not a number.
    if correlation.is_nan() || correlation < LEAST_CORRELATION {
        return Err(SkewError::NoCommonSignal { correlation, needed: LEAST_CORRELATION });
    }
    let fit = |noise: PairNoise| {
        let (u_p, u_n) = (noise.p_v, noise.n_v * interpolator.noise_gain().sqrt());
        deming(p, &late, u_p, u_n).map_err(|_| SkewError::NotFinite { what: "a sample, its noise or their spread" })
    };
    let equal = PairNoise { p_v: 1.0, n_v: 1.0, bins: 0 };
    let mut line = fit(equal)?;
    let mut noise = equal;
    let mut assumed = false;
    for _ in 0..PASSES {
        if !GAINS.contains(&line.slope.value) {
            return Err(SkewError::Gain { gain: line.slope.value });
        }
        (noise, assumed) = measured(p, &late, &line)?;
        line = fit(noise)?;
    }
    // The scatter about the line, where it is more than the noise explains, counts.
    let scale = line.residual.max(1.0);
    let mut warnings = Vec::new();
    if assumed {
        warnings.push(Warning::NoiseSplitAssumed);
    }
    if line.residual.powi(2) > DIFFERENT {
        let expected2 = noise.n_v.powi(2) + (line.slope.value * noise.p_v).powi(2);
        warnings.push(Warning::ResponsesDiffer { excess_v: (expected2 * (line.residual.powi(2) - 1.0)).sqrt() });
    }
    Ok(LevelEstimate {
        gain: Estimate { value: line.slope.value, u: line.slope.u * scale },
        offset_v: Estimate { value: line.intercept.value, u: line.intercept.u * scale },
        covariance: line.covariance * scale * scale,
        noise_p_v: noise.p_v,
        noise_n_v: noise.n_v,
        warnings,
    })
}

fn correlation(p: &[f64], n: &[f64]) -> f64 {
    let (mean_p, mean_n) = (mean(p), mean(n));
    let moment = |f: fn(f64, f64) -> f64| sum(p.iter().zip(n).map(|(p, n)| f(p - mean_p, n - mean_n)));
    moment(|p, n| p * n) / (moment(|p, _| p * p) * moment(|_, n| n * n)).sqrt()
}

fn measured(p: &[f64], late: &[f64], line: &Line) -> Result<(PairNoise, bool), SkewError> {
    let gain = line.slope.value;
    let squares: f64 = p.iter().zip(late).map(|(p, n)| (n - gain * p - line.intercept.value).powi(2)).sum();
    let each = (squares / p.len() as f64 / (1.0 + gain * gain)).sqrt();
    let spread = p.iter().fold(0.0f64, |top, x| top.max(x.abs()));
    let floor = (1e-8 * spread).max(f64::MIN_POSITIVE);
    let (found, assumed) = match out_of_band(p, late, gain)? {
        Some(found) => (found, false),
        None => (PairNoise { p_v: each, n_v: each, bins: 0 }, true),
    };
    let least = floor.max(0.01 * found.p_v.max(found.n_v));
    Ok((PairNoise { p_v: found.p_v.max(least), n_v: found.n_v.max(least), bins: found.bins }, assumed))
}
