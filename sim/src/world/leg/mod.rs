//! A leg at work: from the voltage at its tip to the voltage that its converter is shown.

#[cfg(test)]
mod tests;

use std::f64::consts::TAU;

use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

use super::acquisition::{ChannelSettings, Coupling};
use super::wave::{Sampler, Wave};
use crate::scenario::{LegSpec, RangeSpec};

/// Spans nearer than this (relative) are the same range.
const SAME_SPAN: f64 = 1e-6;

/// The signal at a converter: `gain·wave(t − delay) + offset`, and white noise on it.
#[derive(Debug, Clone)]
pub(crate) struct Signal {
    /// The tip's voltage behind the leg's poles.
    pub(crate) wave: Sampler,
    /// True when the wave never changes.
    pub(crate) constant: bool,
    /// Volts at the input per volt at the tip.
    pub(crate) gain: f64,
    /// Volts at the input.
    pub(crate) offset_v: f64,
    /// From tip to converter.
    pub(crate) delay_s: f64,
    /// Rms at the input.
    pub(crate) noise_v: f64,
}

impl Signal {
    /// An input with nothing on it, and quiet.
    pub(crate) fn nothing() -> Self {
        let wave = Sampler::new(&Wave::constant(0.0, 1.0));
        Self { wave, constant: true, gain: 1.0, offset_v: 0.0, delay_s: 0.0, noise_v: 0.0 }
    }

    /// What `leg` makes of the voltage at its tip, `hours` of virtual time after the start.
    pub(crate) fn new(leg: &LegSpec, seed: u64, hours: f64, channel: &ChannelSettings, tip: &Wave) -> Self {
        let range = range(leg, seed, channel.span_v);
        let wave = tip.clone().low_pass(1.0 / (TAU * leg.bandwidth_hz));
        let wave = wave.pole_zero(leg.compensation_time_s, leg.compensation_error);
        let gain = gain(leg, &range, hours) / leg.attenuation;
        let noise_v = (leg.noise_of_span * channel.span_v).hypot(leg.noise_v);
        let (gain, offset_v) = match channel.coupling {
            Coupling::Ac => (gain, range.offset_v - gain * wave.mean()),
            Coupling::Dc => (gain, range.offset_v),
            Coupling::Ground => (0.0, range.offset_v),
        };
        let delay_s = delay_s(leg, &range, hours);
        Self { constant: wave.is_constant(), wave: Sampler::new(&wave), gain, offset_v, delay_s, noise_v }
    }

    /// Volts at the input at one instant, without noise.
    pub(crate) fn at(&self, time_s: f64) -> f64 {
        self.gain * self.wave.at(time_s - self.delay_s) + self.offset_v
    }
}

/// The leg's true gain over its nominal one.
pub(crate) fn gain(leg: &LegSpec, range: &RangeSpec, hours: f64) -> f64 {
    leg.gain * range.gain * (1.0 + leg.gain_drift_per_h * hours)
}

/// The leg's delay without that of its poles, in seconds.
pub(crate) fn delay_s(leg: &LegSpec, range: &RangeSpec, hours: f64) -> f64 {
    leg.delay_s + range.delay_s + leg.delay_drift_s_per_h * hours
}

/// The errors of a vertical range: those listed or, for others, some that go with the seed, the leg and the span and
/// are the same whenever the range is used.
pub(crate) fn range(leg: &LegSpec, seed: u64, span_v: f64) -> RangeSpec {
    let listed = leg.ranges.iter().find(|range| (range.span_v - span_v).abs() <= SAME_SPAN * span_v);
    if let Some(range) = listed {
        return range.clone();
    }
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    // Apart from the streams of the acquisitions, which count up from nought.
    let span = (span_v.max(f64::MIN_POSITIVE).log10() * 1e3).round() as i64;
    rng.set_stream(1 << 63 | (leg.channel as u64) << 32 | u64::from(span as u32));
    let mut within = |limit: f64| limit * (2.0 * rng.random::<f64>() - 1.0);
    RangeSpec {
        span_v,
        gain: 1.0 + within(leg.unlisted.gain),
        offset_v: within(leg.unlisted.offset_of_span) * span_v,
        delay_s: within(leg.unlisted.delay_s),
    }
}
