//! Computing all figures of a capture with their budgets and grades.

use super::super::apply::Moments;
use super::super::budget::{self, Coverage};
use super::super::signal::{Moved, Signal};
use super::super::transition::{duration_per_part, middle_per_part};
use super::super::{grade, peaks};
use super::plain::Plain;
use super::power;
use super::shape::{Layout, Read, Reading, Shape};
use super::sources::{Parts, Sources};
use super::sums::without_noise;
use super::{Figure, FigureInput, FigureKind};

/// A figure before it is graded.
pub(super) struct Found {
    pub(super) value: f64,
    pub(super) parts: Parts,
    /// What the leak bound can have added to it, in its unit.
    pub(super) leak: f64,
    /// The magnitude the leak is weighed against: the figure's own, for a level the amplitude.
    pub(super) size: f64,
}

impl Found {
    /// The same in another unit.
    pub(super) fn times(self, factor: f64) -> Self {
        Self {
            value: self.value * factor,
            parts: self.parts.times(factor),
            leak: self.leak * factor,
            size: self.size * factor,
        }
    }
}

/// Every figure of a capture, in the order of [`FigureKind::all`].
///
/// The leak bound counts for a figure as follows: its part at zero frequency for the mean and the area; its rms for the
/// rms and each level, twice for the amplitude; its peak for the extremes, twice from peak to peak; its peak over the
/// amplitude for overshoot, undershoot and the pre-transition aberration; its peak over the slopes for times and slopes; its
/// rms over the fundamental's for the distortion. The common mode's own figures have none.
///
/// A figure that needs a threshold is left out where none is asked for.
#[must_use]
pub fn compute(input: &FigureInput<'_>) -> Vec<Figure> {
    let bench = Bench::of(input);
    let plain = Plain::of(input);
    let clipped = input.clipped_p + input.clipped_n;
    let asked = input.asked.thresholds;
    FigureKind::all()
        .filter(|kind| match kind {
            FigureKind::TimeAbove => asked.high_v.is_some(),
            FigureKind::TimeBelow => asked.low_v.is_some(),
            _ => true,
        })
        .map(|kind| {
            let found = bench.figure(kind).and_then(|f| {
                let sum = f.value + budget::combined(&f.parts.budget(&bench.sources));
                if sum.is_finite() { Ok(f) } else { Err("it cannot be computed from these samples".to_owned()) }
            });
            let plain = plain.as_ref().and_then(|plain| plain.figure(kind)).filter(|v| v.is_finite());
            match found {
                Ok(found) => {
                    let budget = found.parts.budget(&bench.sources);
                    let u = budget::combined(&budget);
                    let why = (clipped > 0).then(|| {
                        format!(
                            "{} samples of the positive and {} of the negative leg are clipped; use a larger span",
                            input.clipped_p, input.clipped_n
                        )
                    });
                    let grade = grade::grade(found.size, u, found.leak);
                    let valid = why.is_none();
                    let coverage = valid.then(|| match kind {
                        FigureKind::Rms => power::coverage(input, &bench.sources, &bench.moments, found.value, &budget),
                        // A magnitude is not below nothing.
                        FigureKind::PreAberration => {
                            let whole = Coverage::of(found.value, &budget);
                            Coverage { low: whole.low.max(0.0), ..whole }
                        }
                        FigureKind::Jitter | FigureKind::Thd => power::of_root(found.value, u, &budget),
                        _ => Coverage::of(found.value, &budget),
                    });
                    Figure { kind, value: found.value, u, coverage, plain, valid, why, budget, grade }
                }
                Err(why) => Figure {
                    kind,
                    value: 0.0,
                    u: 0.0,
                    coverage: None,
                    plain,
                    valid: false,
                    why: Some(why),
                    budget: Vec::new(),
                    grade: grade::Grade::Clean,
                },
            }
        })
        .collect()
}

/// The capture, its shape, and its shape with gain and skew moved by their uncertainties.
pub(super) struct Bench<'a> {
    pub(super) input: &'a FigureInput<'a>,
    pub(super) sources: Sources,
    pub(super) layout: Layout,
    pub(super) shape: Shape,
    /// Means of D, N_c, its slope N_c' and their products.
    pub(super) moments: Moments,
    /// Means of N_c and of N_c' over the samples of the low and of the high state.
    at_states: [(f64, f64); 2],
    /// Shapes with the gain a standard uncertainty up and down.
    by_gain: Option<[Shape; 2]>,
    /// The same for the skew.
    by_skew: Option<[Shape; 2]>,
}

impl<'a> Bench<'a> {
    fn of(input: &'a FigureInput<'a>) -> Self {
        let sources = Sources::of(input);
        let corrected = input.corrected;
        let d = &corrected.difference();
        let layout = Layout::of(d, sources.mean_noise_v);
        let shape = layout.read(d, sources.mean_noise_v, layout.between());
        let (negative, slope) = (&corrected.negative_v, corrected.slope());
        let at_states = layout.levels.as_ref().map_or([(0.0, 0.0); 2], |levels| {
            [
                (levels.mean_at_low(d, negative), levels.mean_at_high(d, negative)),
                (levels.mean_at_low(d, &slope), levels.mean_at_high(d, &slope)),
            ]
        });
        let known = |derivative: usize, step: f64| {
            let (low, high) = layout.between();
            (low + step * at_states[derivative].0, high + step * at_states[derivative].1)
        };
        let noise_v = sources.mean_noise_v;
        let step = sources.step(0);
        let by_gain = (step > 0.0).then(|| moved(&layout, &shape, d, negative, noise_v, step, |step| known(0, step)));
        let step = sources.step(1);
        let by_skew = (step > 0.0).then(|| moved(&layout, &shape, d, &slope, noise_v, step, |step| known(1, step)));
        Self { input, moments: corrected.moments(), sources, layout, shape, at_states, by_gain, by_skew }
    }

    /// The levels once the difference is moved by `step` along what the gain (0) or the skew (1) adds to it.
    pub(super) fn between(&self, derivative: usize, step: f64) -> (f64, f64) {
        let ((low, high), at) = (self.layout.between(), self.at_states[derivative]);
        (low + step * at.0, high + step * at.1)
    }

    fn figure(&self, kind: FigureKind) -> Result<Found, String> {
        let interval_s = self.input.corrected.interval_s;
        match kind {
            FigureKind::Mean => Ok(self.mean()),
            FigureKind::Area => {
                let duration_s = self.input.corrected.difference_v.len() as f64 * interval_s;
                Ok(self.mean().times(duration_s))
            }
            FigureKind::Rms => Ok(self.rms()),
            FigureKind::CommonRms => Ok(self.common_rms()),
            FigureKind::CommonSwing => Ok(self.common_swing()),
            FigureKind::CommonSlew => self.common_slew(),
            FigureKind::RiseSlew => self.transition_slew(|s| &s.rise),
            FigureKind::FallSlew => self.transition_slew(|s| &s.fall),
            FigureKind::PreAberration => self.pre_aberration(),
            FigureKind::SettlingTime => self.settling(),
            FigureKind::Jitter => self.jitter(),
            FigureKind::TimeAbove => self.dwell(self.input.asked.thresholds.high_v.unwrap_or(0.0), true),
            FigureKind::TimeBelow => self.dwell(self.input.asked.thresholds.low_v.unwrap_or(0.0), false),
            FigureKind::Thd => self.distortion(),
            FigureKind::HighLevel | FigureKind::LowLevel | FigureKind::Amplitude => self.level(kind),
            FigureKind::Maximum => Ok(self.extreme(|s| Ok(s.maximum), 1.0, 1.0)),
            FigureKind::Minimum => Ok(self.extreme(|s| Ok(s.minimum), 1.0, 1.0)),
            FigureKind::PeakToPeak => {
                let range = |s: &Shape| {
                    Ok(Read { value: s.maximum.value - s.minimum.value, u: s.maximum.u.hypot(s.minimum.u) })
                };
                Ok(self.extreme(range, 2.0, 0.0))
            }
            FigureKind::Overshoot => self.ratio(|s| s.overshoot.clone(), |part, _| part),
            FigureKind::Undershoot => self.ratio(|s| s.undershoot.clone(), |part, _| part),
            FigureKind::RiseTime => self.time(|s| s.rise.clone(), |part, v| duration_per_part(part) * v),
            FigureKind::FallTime => self.time(|s| s.fall.clone(), |part, v| duration_per_part(part) * v),
            FigureKind::Period => self.period(),
            FigureKind::Frequency => {
                let period = self.period()?;
                let value = 1.0 / period.value;
                let factor = value * value;
                Ok(Found { value, parts: period.parts.times(factor), leak: period.leak * factor, size: value })
            }
            FigureKind::Duty => {
                let period = self.shape.period.clone()?.value;
                let per_part = 2.0 * self.shape.slowest / period;
                self.ratio(|s| s.duty.clone(), move |part, _| per_part * middle_per_part(part))
            }
        }
    }

    fn mean(&self) -> Found {
        let Sources { mean_noise_v, quantisation_v, .. } = self.sources;
        let corrected = self.input.corrected;
        let value = self.moments.d;
        let parts = Parts {
            noise: mean_noise_v / (corrected.difference_v.len().max(1) as f64).sqrt(),
            gain: self.moments.n,
            skew: -self.moments.s,
            offset: 1.0,
            scale: value,
            quantisation: quantisation_v,
            compensation: self.sources.compensation.mean_v,
            ..Parts::default()
        };
        Found { value, parts, leak: self.input.leak.mean_v, size: value }
    }

    fn rms(&self) -> Found {
        let s = &self.sources;
        let corrected = self.input.corrected;
        let (value, noise, size) = without_noise(self.moments.dd, corrected.difference_v.len(), s.noise_v);
        let model = power::model(self.input, s, &self.moments);
        // Second order: what gain, skew and offset errors of this size add to the mean square whatever their sign.
        let second = model.second_order(&s.power_errors());
        // The noise power that is taken away is not known exactly itself.
        let own = 0.5 * model.u_noise * model.noise / size;
        let parts = Parts {
            noise: noise.hypot(own),
            gain: model.linear[0] / size,
            skew: model.linear[1] / size,
            offset: model.linear[2] / size,
            scale: value,
            quantisation: s.quantisation_v,
            // The mean square cannot rise by more than its square root does.
            common_mode: (0.5 * second / size).min(second.sqrt()),
            // As an offset at low frequencies; what it adds in second order is in the interval.
            compensation: (self.moments.d / size * s.compensation.mean_v).hypot(s.compensation.swing_v),
            response: s.response.rms,
        };
        Found { value, parts, leak: self.input.leak.rms_v, size: value }
    }

    fn common_rms(&self) -> Found {
        let s = &self.sources;
        let m = &self.moments;
        let points = self.input.corrected.difference_v.len();
        let (value, noise, size) = without_noise(m.common_square(), points, s.common_noise_v);
        let parts = Parts {
            noise,
            gain: -0.5 * m.common_negative() / size,
            skew: 0.5 * m.common_slope() / size,
            offset: -0.5 * m.common() / size,
            scale: value,
            quantisation: 0.5 * s.quantisation_v,
            compensation: 0.5 * s.compensation.level_v,
            response: 0.5 * s.response.rms,
            ..Parts::default()
        };
        Found { value, parts, leak: 0.0, size: value }
    }

    fn common_swing(&self) -> Found {
        let s = &self.sources;
        let (low, high) = peaks::extremes(&self.input.corrected.common(), s.common_noise_v);
        let value = high.value - low.value;
        // At the top and the bottom the slope is nil, so that skew does nothing to first order.
        let parts = Parts {
            noise: low.u.hypot(high.u),
            gain: -0.5 * value,
            scale: value,
            quantisation: s.quantisation_v * std::f64::consts::FRAC_1_SQRT_2,
            ..Parts::default()
        };
        Found { value, parts, leak: 0.0, size: value }
    }

    pub(super) fn level(&self, kind: FigureKind) -> Result<Found, String> {
        let levels = self.layout.levels.as_ref().map_err(ToString::to_string)?;
        let s = &self.sources;
        // With noise unknown or too small a claim the samples' own spread counts.
        let noise =
            |level: &super::super::levels::Level| s.mean_noise_v.max(level.spread) / (level.count.max(1) as f64).sqrt();
        let [(gain_low, gain_high), (skew_low, skew_high)] = self.at_states;
        let (low, high) = (&levels.low, &levels.high);
        let (value, noise, gain, skew, offset, steps, leak) = match kind {
            FigureKind::LowLevel => (low.value, noise(low), gain_low, skew_low, 1.0, 1.0, 1.0),
            FigureKind::HighLevel => (high.value, noise(high), gain_high, skew_high, 1.0, 1.0, 1.0),
            _ => {
                let steps = std::f64::consts::SQRT_2;
                let (gain, skew) = (gain_high - gain_low, skew_high - skew_low);
                (levels.amplitude(), noise(low).hypot(noise(high)), gain, skew, 0.0, steps, 2.0)
            }
        };
        let parts = Parts {
            noise,
            gain,
            skew: -skew,
            offset,
            scale: value,
            quantisation: s.quantisation_v * steps,
            compensation: if offset > 0.0 { s.compensation.level_v } else { s.compensation.swing_v },
            response: s.response.rms * steps,
            ..Parts::default()
        };
        Ok(Found { value, parts, leak: leak * self.input.leak.rms_v, size: levels.amplitude() })
    }

    /// A figure in volts that is read from the shape.
    fn extreme(&self, read: impl Fn(&Shape) -> Reading, peaks: f64, offset: f64) -> Found {
        let s = &self.sources;
        let Read { value, u } = read(&self.shape).unwrap_or(Read { value: 0.0, u: 0.0 });
        let parts = Parts {
            noise: u,
            gain: half_change(self.by_gain.as_ref(), &read) / s.step(0).max(f64::MIN_POSITIVE),
            skew: -half_change(self.by_skew.as_ref(), &read) / s.step(1).max(f64::MIN_POSITIVE),
            offset,
            scale: value,
            quantisation: s.quantisation_v * peaks.sqrt(),
            compensation: if offset > 0.0 { s.compensation.level_v } else { s.compensation.swing_v },
            response: s.response.peak / 3.0f64.sqrt() * peaks.sqrt(),
            ..Parts::default()
        };
        Found { value, parts, leak: peaks * self.input.leak.peak_v, size: value }
    }

    /// A figure without scale and offset. `moves` says how far a disturbance, given in parts of the amplitude, can move
    /// it.
    pub(super) fn ratio(
        &self,
        read: impl Fn(&Shape) -> Reading,
        moves: impl Fn(f64, f64) -> f64,
    ) -> Result<Found, String> {
        let Read { value, u } = read(&self.shape)?;
        let (low, high) = self.layout.between();
        let amplitude = high - low;
        let parts = Parts {
            noise: u,
            gain: half_change(self.by_gain.as_ref(), &read) / self.sources.step(0).max(f64::MIN_POSITIVE),
            skew: -half_change(self.by_skew.as_ref(), &read) / self.sources.step(1).max(f64::MIN_POSITIVE),
            quantisation: moves(self.sources.quantisation_v / amplitude, value),
            response: moves(self.sources.response.peak / 3.0f64.sqrt() / amplitude, value),
            ..Parts::default()
        };
        Ok(Found { value, parts, leak: moves(self.input.leak.peak_v / amplitude, value), size: value })
    }

    /// As [`Bench::ratio`], from samples to seconds.
    fn time(&self, read: impl Fn(&Shape) -> Reading, moves: impl Fn(f64, f64) -> f64) -> Result<Found, String> {
        Ok(self.ratio(read, moves)?.times(self.input.corrected.interval_s))
    }

    fn period(&self) -> Result<Found, String> {
        // Both ends of the span can move; they are many periods apart.
        let per_part = 2.0 * self.shape.slowest / self.shape.periods.max(1.0);
        self.time(|s| s.period.clone(), move |part, _| per_part * middle_per_part(part))
    }
}

/// The shape with the signal moved along a derivative by a step up and down; `between` gives the levels then.
fn moved<S: Signal + ?Sized, D: Signal + ?Sized>(
    layout: &Layout,
    shape: &Shape,
    signal: &S,
    along: &D,
    noise_v: f64,
    step: f64,
    between: impl Fn(f64) -> (f64, f64),
) -> [Shape; 2] {
    [step, -step].map(|step| layout.read_beside(Some(shape), &Moved { signal, along, step }, noise_v, between(step)))
}

/// Half of what a figure changes between two shapes, 0 when it is missing in one.
fn half_change(shapes: Option<&[Shape; 2]>, read: impl Fn(&Shape) -> Reading) -> f64 {
    let Some([up, down]) = shapes else { return 0.0 };
    match (read(up), read(down)) {
        (Ok(up), Ok(down)) => 0.5 * (up.value - down.value),
        _ => 0.0,
    }
}
