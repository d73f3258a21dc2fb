//! What is told of a settled search: values, uncertainties, bound and warnings.

use super::super::Estimate;
use super::super::noise::correlated;
use super::fine::Settled;
use super::{SkewError, SkewEstimate, Warning};

/// Gains outside are worth a warning.
const USUAL_GAINS: std::ops::RangeInclusive<f64> = 0.8..=1.25;
/// Residual over expected noise, in power, from which the legs' responses are said to differ.
pub(super) const DIFFERENT: f64 = 1.3;
/// A correlation of the legs' noise below this does no harm that could be seen.
const LEAST_CORRELATION: f64 = 0.1;
/// Standard deviations by which it must stand out of chance.
const SIGNIFICANT: f64 = 5.0;

/// The estimate of a settled search; `alternative` is another skew in samples that fits as well.
pub(super) fn report(
    settled: &Settled<'_>,
    interval_s: f64,
    alternative: Option<f64>,
) -> Result<SkewEstimate, SkewError> {
    let Settled { at, view, noise, template, solved } = settled;
    let mut warnings = Vec::new();
    if let Some(other) = alternative {
        warnings.push(Warning::Ambiguous { alternative_s: other * interval_s });
    }
    warnings.extend(about_gain(at.gain));
    if noise.bins == 0 {
        warnings.push(Warning::NoiseSplitAssumed);
    }
    if let Some(found) = correlated(&view.p, view.n, at.tau)?
        && found.value.abs() > LEAST_CORRELATION.max(SIGNIFICANT * found.u)
    {
        warnings.push(Warning::NoiseCorrelated { correlation: found.value });
    }
    // Few bins make the noise itself uncertain; under the window neighbours share half of theirs.
    let doubt = 4.0 * (4.0 / noise.bins.max(1) as f64).sqrt();
    if noise.bins > 0 && solved.ratio > DIFFERENT + doubt {
        let excess_v = (solved.residual2 * (1.0 - 1.0 / solved.ratio)).sqrt();
        warnings.push(Warning::ResponsesDiffer { excess_v });
    }
    let units = [interval_s, 1.0, 1.0];
    let u = solved.u();
    let power = template.signal.iter().map(|s| s * s).sum::<f64>() / view.n.len() as f64;
    Ok(SkewEstimate {
        skew_s: Estimate { value: at.tau * interval_s, u: u[0] * interval_s },
        gain: Estimate { value: at.gain, u: u[1] },
        offset_v: Estimate { value: at.offset, u: u[2] },
        covariance: [0, 1, 2].map(|i| [0, 1, 2].map(|j| solved.covariance[(i, j)] * units[i] * units[j])),
        bound: [0, 1, 2].map(|i| solved.bound[(i, i)].sqrt() * units[i]),
        noise_p_v: noise.p2.sqrt(),
        noise_n_v: noise.n2.sqrt(),
        residual_v: solved.residual2.sqrt(),
        signal_rms_v: (power - template.signal_noise).max(0.0).sqrt(),
        level_v: template.level,
        samples: view.n.len(),
        dither_steps: None,
        warnings,
    })
}

/// What a gain far from one suggests.
fn about_gain(gain: f64) -> Option<Warning> {
    if USUAL_GAINS.contains(&gain) {
        return None;
    }
    // Probe attenuations are powers of ten (common practice, no source); a leg's own gain error is a few percent.
    let power = gain.log10();
    let wrong = power.abs() > 0.5 && (power - power.round()).abs() < 0.08;
    Some(if wrong { Warning::Attenuation { gain } } else { Warning::GainFarFromOne { gain } })
}
