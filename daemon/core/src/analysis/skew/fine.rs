//! The estimate itself: from the coarse lag to the root of the score, then the uncertainties.

use super::super::coarse;
use super::super::interpolate::Interpolator;
use super::super::line::mean;
use super::super::noise::{PairNoise, out_of_band};
use super::report::report;
use super::score::Solved;
use super::template::{Template, build};
use super::{Reference, Shape, SkewError, SkewEstimate};

/// Fewest samples of a record that are worth an estimate.
pub(super) const LEAST_SAMPLES: usize = 256;
/// Fewest samples left in common after the shift.
const LEAST_LEFT: usize = 128;
/// A correlation below this is no common signal whatever its significance (a signal to noise ratio of −2 dB).
pub(super) const LEAST_CORRELATION: f64 = 0.4;
/// Gains outside are no pair of like legs.
pub(super) const GAINS: std::ops::RangeInclusive<f64> = 0.05..=20.0;
/// Share of white noise in a leg's variance above which it shows nothing else, and below which it shows a signal.
const ONLY_NOISE: f64 = 0.8;
const SOME_SIGNAL: f64 = 0.5;
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

/// The estimate from all samples of both legs.
pub(super) fn estimate(
    p: &[f64],
    n: &[f64],
    interval_s: f64,
    reference: &Reference,
) -> Result<SkewEstimate, SkewError> {
    check(p, n, interval_s, reference)?;
    let (start, ambiguity) = begin(p, n, interval_s, reference)?;
    let whole = Whole { p, n, interval_s };
    let settled = settle(&whole, start, interval_s, reference.shape)?;
    let alternative = ambiguity.map(|lag| lag as f64);
    report(&settled, interval_s, alternative_lag(settled.at.tau, interval_s, reference, alternative))
}

/// Another skew, in samples, that fits as well and is less than three times as far from zero.
pub(super) fn alternative_lag(tau: f64, interval_s: f64, reference: &Reference, seen: Option<f64>) -> Option<f64> {
    // Within the half period that is searched a periodic reference shows no second hill; there is one all the same.
    let told = reference.period_s.map(|period| tau - (period / interval_s).copysign(tau));
    told.or(seen).filter(|other| other.abs() < 3.0 * tau.abs())
}

/// Where both legs can be had at a trial skew.
pub(super) trait Legs {
    /// Both legs at the skew `tau` in samples.
    fn at(&self, tau: f64) -> Result<View<'_>, SkewError>;

    /// Where samples that follow one another did not do so in time: there a slope has no meaning.
    fn joins(&self) -> &[usize] {
        &[]
    }
}

/// All samples of both records.
struct Whole<'a> {
    p: &'a [f64],
    n: &'a [f64],
    interval_s: f64,
}

impl Legs for Whole<'_> {
    fn at(&self, tau: f64) -> Result<View<'_>, SkewError> {
        let interpolator = Interpolator::new(-tau);
        let range = interpolator.support(self.p.len());
        if range.len() < LEAST_LEFT {
            return Err(SkewError::NothingLeft { skew_s: tau * self.interval_s, samples: range.len() });
        }
        let noise_gain = interpolator.noise_gain();
        Ok(View { p: interpolator.apply(self.p), n: &self.n[range.clone()], noise_gain, range })
    }
}

/// The root of the score, with what it was found from.
pub(super) struct Settled<'a> {
    pub(super) at: Point,
    pub(super) view: View<'a>,
    pub(super) noise: Noise,
    pub(super) template: Template,
    pub(super) solved: Solved,
}

/// Steps from `start` to the root of the score.
pub(super) fn settle<'a>(
    legs: &'a impl Legs,
    start: Point,
    interval_s: f64,
    shape: Shape,
) -> Result<Settled<'a>, SkewError> {
    let mut at = start;
    let mut noise = None;
    let mut kept: Option<Kept> = None;
    for step in 0..STEPS {
        let mut view = legs.at(at.tau)?;
        let measured = match noise {
            Some(noise) if step >= NOISE_STEPS => noise,
            _ => Noise::measure(&view, &at)?,
        };
        noise = Some(measured);
        let held = match kept.take().filter(|kept| view.covers(&kept.range)) {
            Some(kept) => kept,
            None => {
                view.narrow(&(view.range.start + MARGIN..view.range.end - MARGIN));
                let mut template = view.template(&at, &measured, shape)?;
                template.close(legs.joins(), view.range.start);
                Kept { template, range: view.range.clone() }
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
            return Ok(Settled { at, view, noise: measured, template: held.template, solved });
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

/// The coarse estimate, and another lag that fits as well.
pub(super) fn begin(
    p: &[f64],
    n: &[f64],
    interval_s: f64,
    reference: &Reference,
) -> Result<(Point, Option<isize>), SkewError> {
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
        return Err(nothing_common(p, n, alike.correlation, needed));
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
    Ok((Point { tau: alike.lag as f64, gain, offset: mean_n - gain * mean_p }, alike.alternative))
}

/// The error for legs without a common signal: names the leg that shows nothing but noise, if only one does.
fn nothing_common(p: &[f64], n: &[f64], correlation: f64, needed: f64) -> SkewError {
    // Half the mean square step from sample to sample is white noise's whole variance, and little of a signal's.
    let spread = |x: &[f64]| {
        let level = mean(x);
        x.iter().map(|x| (x - level).powi(2)).sum::<f64>() / x.len() as f64
    };
    let noise_share = |x: &[f64]| {
        let steps = x.windows(2).map(|pair| (pair[1] - pair[0]).powi(2)).sum::<f64>() / (x.len() as f64 - 1.0);
        steps / 2.0 / spread(x)
    };
    let (share_p, share_n) = (noise_share(p), noise_share(n));
    match (share_p > ONLY_NOISE, share_n > ONLY_NOISE) {
        (true, false) if share_n < SOME_SIGNAL => SkewError::OnlyNoise { leg: "positive", rms_v: spread(p).sqrt() },
        (false, true) if share_p < SOME_SIGNAL => SkewError::OnlyNoise { leg: "negative", rms_v: spread(n).sqrt() },
        _ => SkewError::NoCommonSignal { correlation, needed },
    }
}

/// A template with the samples that it was made for.
struct Kept {
    template: Template,
    range: std::ops::Range<usize>,
}

/// Both legs on the samples that are valid at a trial skew, the positive one delayed by it.
pub(super) struct View<'a> {
    pub(super) p: Vec<f64>,
    pub(super) n: &'a [f64],
    pub(super) noise_gain: f64,
    /// Which samples of the record these are.
    pub(super) range: std::ops::Range<usize>,
}

impl<'a> View<'a> {
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
    fn template(&self, at: &Point, noise: &Noise, shape: Shape) -> Result<Template, SkewError> {
        let (weight_p, weight_n) = (1.0 / noise.p2, at.gain / noise.n2);
        let total = weight_p + at.gain * weight_n;
        let estimate: Vec<f64> =
            self.p.iter().zip(self.n).map(|(p, n)| (weight_p * p + weight_n * (n - at.offset)) / total).collect();
        Ok(build(&estimate, 1.0 / total, shape)?)
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
    pub(super) bins: usize,
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
