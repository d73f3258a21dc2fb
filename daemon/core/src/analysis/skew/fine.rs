//! The estimate itself: from the coarse lag to the root of the score, then the uncertainties.

use super::super::interpolate::Interpolator;
use super::super::line::mean;
use super::super::noise::{PairNoise, out_of_band};
use super::super::{Estimate, coarse};
use super::score::Solved;
use super::template::{Template, build};
use super::{Reference, SkewError, SkewEstimate, Warning};

/// Fewest samples of a record that are worth an estimate.
pub(super) const LEAST_SAMPLES: usize = 256;
/// Fewest samples left in common after the shift.
const LEAST_LEFT: usize = 128;
/// A correlation below this is no common signal whatever its significance (a signal to noise ratio of −2 dB).
pub(super) const LEAST_CORRELATION: f64 = 0.4;
/// Gains outside are no pair of like legs.
pub(super) const GAINS: std::ops::RangeInclusive<f64> = 0.05..=20.0;
/// Gains outside are worth a warning.
const USUAL_GAINS: std::ops::RangeInclusive<f64> = 0.8..=1.25;
/// Steps after which the search is given up; it needs three or four from a lag that is right to a sample.
const STEPS: usize = 40;
/// Longest step of the skew, in samples.
const LONGEST_STEP: f64 = 4.0;
/// The noise is measured anew in this many first steps, then kept, so that the steps can come to rest.
const NOISE_STEPS: usize = 3;
/// Steps after which a template made half a sample off is kept too.
const PATIENCE: usize = 12;
/// Samples left out at each end, so that a template still fits when the skew passes a whole sample.
const MARGIN: usize = 2;
/// Residual over expected noise, in power, from which the legs' responses are said to differ.
pub(super) const DIFFERENT: f64 = 1.3;

pub(super) fn estimate(
    p: &[f64],
    n: &[f64],
    interval_s: f64,
    reference: &Reference,
) -> Result<SkewEstimate, SkewError> {
    check(p, n, interval_s, reference)?;
    let (start, ambiguity) = begin(p, n, interval_s, reference)?;
    let mut at = start;
    let mut noise = None;
    let mut kept: Option<Kept> = None;
    for step in 0..STEPS {
        let mut view = View::at(p, n, at.tau, interval_s)?;
        let measured = match noise {
            Some(noise) if step >= NOISE_STEPS => noise,
            _ => Noise::measure(&view, &at)?,
        };
        noise = Some(measured);
        let held = match kept.take().filter(|kept| view.covers(&kept.range)) {
            Some(kept) => kept,
            None => {
                view.narrow(&(view.range.start + MARGIN..view.range.end - MARGIN));
                Kept { template: view.template(&at, &measured, reference)?, range: view.range.clone() }
            }
        };
        view.narrow(&held.range);
        let solved = Solved::new(&view, &at, &measured, &held.template);
        let [tau, gain, offset] = solved.step;
        if !(tau.is_finite() && gain.is_finite() && offset.is_finite()) {
            break;
        }
        at.tau += tau.clamp(-LONGEST_STEP, LONGEST_STEP);
        at.gain += gain;
        at.offset += offset;
        if !GAINS.contains(&at.gain) {
            return Err(SkewError::Gain { gain: at.gain });
        }
        let still = |step: f64, u: f64, floor: f64| step.abs() <= (0.01 * u).max(floor);
        let [u_tau, u_gain, _] = solved.u();
        if step + 1 >= NOISE_STEPS && still(tau, u_tau, 1e-9) && still(gain, u_gain, 1e-12) {
            return Ok(report(&at, &view, &measured, &held.template, &solved, interval_s, ambiguity));
        }
        // A gate that opens and closes from step to step would never let the search rest, so a template made near
        // the end is kept; so near, it is as good as uncorrelated with the residual.
        let near = tau.abs() <= u_tau || (step >= PATIENCE && tau.abs() < 0.5);
        if step >= NOISE_STEPS && near {
            kept = Some(held);
        }
    }
    Err(SkewError::NotSettled { steps: STEPS, skew_s: at.tau * interval_s })
}

fn check(p: &[f64], n: &[f64], interval_s: f64, reference: &Reference) -> Result<(), SkewError> {
    if p.len() != n.len() {
        return Err(SkewError::Lengths { p: p.len(), n: n.len() });
    }
    if p.len() < LEAST_SAMPLES {
        return Err(SkewError::TooShort { samples: p.len(), needed: LEAST_SAMPLES });
    }
    let usable = |value: f64| value.is_finite() && value > 0.0;
    let bad = [
        (p.iter().any(|x| !x.is_finite()), "a sample of the positive leg"),
        (n.iter().any(|x| !x.is_finite()), "a sample of the negative leg"),
        (!usable(interval_s), "the sample interval"),
        (reference.period_s.is_some_and(|period| !usable(period)), "the reference's period"),
    ];
    if let Some((_, what)) = bad.into_iter().find(|(bad, _)| *bad) {
        return Err(SkewError::NotFinite { what });
    }
    for (leg, signal) in [("positive", p), ("negative", n)] {
        let level = mean(signal);
        // Below the digits of its own level a movement is rounding.
        if signal.iter().all(|x| (x - level).abs() <= 1e-12 * level.abs()) {
            return Err(SkewError::Flat { leg, level_v: level });
        }
    }
    Ok(())
}

/// Where the search stands: skew in samples, gain, offset in volts.
#[derive(Clone, Copy)]
pub(super) struct Point {
    pub(super) tau: f64,
    pub(super) gain: f64,
    pub(super) offset: f64,
}

/// The coarse estimate, and another lag that fits as well, if one is near enough to matter.
fn begin(p: &[f64], n: &[f64], interval_s: f64, reference: &Reference) -> Result<(Point, Option<isize>), SkewError> {
    let half = reference.period_s.map_or(p.len() / 2, |period| (period / interval_s / 2.0).ceil() as usize + 1);
    let found = coarse::find(p, n, half)?;
    let (alike, opposite) = (found.alike, found.opposite);
    let needed = LEAST_CORRELATION.max(7.0 / (p.len() as f64 / 2.0).sqrt());
    let mirrored = -opposite.correlation;
    // A symmetric reference mirrored is also a reference half a period late: the nearer of the two is believed.
    let nearer = opposite.lag.unsigned_abs() * 3 < alike.lag.unsigned_abs();
    if mirrored >= needed
        && (mirrored > alike.correlation + found.tolerance
            || (nearer && mirrored >= alike.correlation - found.tolerance))
    {
        return Err(SkewError::Inverted { correlation: opposite.correlation });
    }
    if alike.correlation < needed {
        return Err(SkewError::NoCommonSignal { correlation: alike.correlation, needed });
    }
    let late = alike.lag.max(0).unsigned_abs();
    let early = (-alike.lag).max(0).unsigned_abs();
    let (p, n) = (&p[early..p.len() - late], &n[late..n.len() - early]);
    let (mean_p, mean_n) = (mean(p), mean(n));
    let power = |signal: &[f64], level: f64| signal.iter().map(|x| (x - level).powi(2)).sum::<f64>();
    let gain = (power(n, mean_n) / power(p, mean_p)).sqrt();
    if !GAINS.contains(&gain) {
        return Err(SkewError::Gain { gain });
    }
    let ambiguity = alike.alternative.filter(|other| other.unsigned_abs() < 3 * alike.lag.unsigned_abs());
    Ok((Point { tau: alike.lag as f64, gain, offset: mean_n - gain * mean_p }, ambiguity))
}

/// A template with the samples that it was made for.
struct Kept {
    template: Template,
    range: std::ops::Range<usize>,
}

/// Both legs on the samples that are valid at a trial skew, the positive one delayed by it.
pub(super) struct View<'a> {
    p: Vec<f64>,
    pub(super) n: &'a [f64],
    pub(super) noise_gain: f64,
    /// Which samples of the record these are.
    range: std::ops::Range<usize>,
}

impl<'a> View<'a> {
    fn at(p: &[f64], n: &'a [f64], tau: f64, interval_s: f64) -> Result<Self, SkewError> {
        let interpolator = Interpolator::new(-tau);
        let range = interpolator.support(p.len());
        if range.len() < LEAST_LEFT {
            return Err(SkewError::NothingLeft { skew_s: tau * interval_s, samples: range.len() });
        }
        Ok(Self { p: interpolator.apply(p), n: &n[range.clone()], noise_gain: interpolator.noise_gain(), range })
    }

    fn covers(&self, range: &std::ops::Range<usize>) -> bool {
        self.range.start <= range.start && range.end <= self.range.end
    }

    /// Leaves only `range`, which must be covered.
    fn narrow(&mut self, range: &std::ops::Range<usize>) {
        let from = range.start - self.range.start;
        self.p.truncate(from + range.len());
        self.p.drain(..from);
        self.n = &self.n[from..from + range.len()];
        self.range = range.clone();
    }

    /// Denoised best estimate of the common signal: the weighted mean of both legs that the residual does not know.
    fn template(&self, at: &Point, noise: &Noise, reference: &Reference) -> Result<Template, SkewError> {
        let (weight_p, weight_n) = (1.0 / noise.p2, at.gain / noise.n2);
        let total = weight_p + at.gain * weight_n;
        let estimate: Vec<f64> =
            self.p.iter().zip(self.n).map(|(p, n)| (weight_p * p + weight_n * (n - at.offset)) / total).collect();
        Ok(build(&estimate, 1.0 / total, reference.shape)?)
    }

    pub(super) fn residual(&self, at: &Point) -> impl Iterator<Item = f64> {
        let Point { gain, offset, .. } = *at;
        self.p.iter().zip(self.n).map(move |(p, n)| n - gain * p - offset)
    }
}

/// Variances of the legs' noise.
#[derive(Clone, Copy)]
pub(super) struct Noise {
    pub(super) p2: f64,
    pub(super) n2: f64,
    /// Bins of the spectrum that it was read from; none if it was split equally by assumption.
    bins: usize,
}

impl Noise {
    fn measure(view: &View<'_>, at: &Point) -> Result<Self, SkewError> {
        let found = match out_of_band(&view.p, view.n, at.gain)? {
            Some(found) => found,
            None => {
                let squares: f64 = view.residual(at).map(|e| e * e).sum();
                let each = (squares / view.n.len() as f64 / (1.0 + at.gain * at.gain)).sqrt();
                PairNoise { p_v: each, n_v: each, bins: 0 }
            }
        };
        // Data without noise, or a leg whose noise is below one step, must not make a weight infinite.
        let level = mean(view.n);
        let power = view.n.iter().map(|x| (x - level).powi(2)).sum::<f64>() / view.n.len() as f64;
        let (p2, n2) = (found.p_v.powi(2), found.n_v.powi(2));
        let least = (1e-16 * power).max(1e-4 * p2.max(n2));
        Ok(Self { p2: p2.max(least), n2: n2.max(least), bins: found.bins })
    }
}

fn report(
    at: &Point,
    view: &View<'_>,
    noise: &Noise,
    template: &Template,
    solved: &Solved,
    interval_s: f64,
    ambiguity: Option<isize>,
) -> SkewEstimate {
    let mut warnings = Vec::new();
    if let Some(other) = ambiguity {
        warnings.push(Warning::Ambiguous { alternative_s: other as f64 * interval_s });
    }
    if !USUAL_GAINS.contains(&at.gain) {
        warnings.push(Warning::GainFarFromOne { gain: at.gain });
    }
    if noise.bins == 0 {
        warnings.push(Warning::NoiseSplitAssumed);
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
    SkewEstimate {
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
    }
}
