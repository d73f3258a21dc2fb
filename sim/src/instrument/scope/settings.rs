//! What the scope has been told, its limits, and what it rounds to.

use crate::message::Limits;
use crate::world::{ChannelSettings, Coupling, ScopeSettings, Trigger, TriggerSource};

/// Channels of the scope.
pub(crate) const CHANNELS: usize = 4;

/// Full span of ten divisions at the input: 1 mV to 10 V per division.
pub(crate) const SPAN: Limits = Limits { min: 10e-3, max: 100.0, default: 10.0 };
/// Voltage at the centre of the span.
pub(crate) const OFFSET: Limits = Limits { min: -50.0, max: 50.0, default: 0.0 };
/// The scope's own skew setting.
pub(crate) const DELAY: Limits = Limits { min: -100e-9, max: 100e-9, default: 0.0 };
/// Sample interval: 10 GSa/s to 100 Sa/s.
pub(crate) const INTERVAL: Limits = Limits { min: 100e-12, max: 10e-3, default: 1e-9 };
/// Record length.
pub(crate) const POINTS: Limits = Limits { min: 10.0, max: 1e6, default: 1e4 };
/// Where in the record the trigger lies.
pub(crate) const POSITION: Limits = Limits { min: 0.0, max: 1.0, default: 0.5 };
/// Sweeps that are averaged.
pub(crate) const AVERAGES: Limits = Limits { min: 1.0, max: 1024.0, default: 16.0 };
/// Trigger level at the input.
pub(crate) const LEVEL: Limits = Limits { min: -50.0, max: 50.0, default: 0.0 };

/// Step of the skew setting, in seconds.
const DELAY_STEP_S: f64 = 50e-12;

/// How samples are sent.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Encoding {
    /// Two-byte codes.
    Integer16,
    /// One-byte codes.
    Integer8,
    /// Volts as four-byte IEEE 754 numbers.
    Real32,
    /// Volts as text.
    Text,
}

/// All settings; `Default` is `*RST`.
#[derive(Debug, Clone)]
pub(crate) struct Settings {
    /// The channels.
    pub(crate) channels: Vec<ChannelSettings>,
    /// Sample interval.
    pub(crate) interval_s: f64,
    /// Record length, a whole number.
    pub(crate) points: f64,
    /// Where in the record the trigger lies, 0 to 1.
    pub(crate) position: f64,
    /// Whether sweeps are averaged.
    pub(crate) averaging: bool,
    /// How many, a whole number.
    pub(crate) averages: f64,
    /// What triggers.
    pub(crate) source: TriggerSource,
    /// Trigger level at the input.
    pub(crate) level_v: f64,
    /// Trigger on the rising edge.
    pub(crate) rising: bool,
    /// How samples are sent.
    pub(crate) encoding: Encoding,
    /// Little endian instead of big endian.
    pub(crate) swapped: bool,
    /// Whether acquisitions follow one another unasked, so that every reading is of a new one.
    pub(crate) free: bool,
}

impl Default for Settings {
    fn default() -> Self {
        let channel = || ChannelSettings {
            span_v: SPAN.default,
            offset_v: OFFSET.default,
            coupling: Coupling::Dc,
            delay_s: DELAY.default,
        };
        Self {
            channels: std::iter::repeat_with(channel).take(CHANNELS).collect(),
            interval_s: INTERVAL.default,
            points: POINTS.default,
            position: POSITION.default,
            averaging: false,
            averages: AVERAGES.default,
            source: TriggerSource::Channel(0),
            level_v: LEVEL.default,
            rising: true,
            // SCPI-99 vol. 2, 9: FORMat[:DATA] is ASCii and BORDer NORMal after *RST (from memory).
            encoding: Encoding::Text,
            swapped: false,
            free: false,
        }
    }
}

impl Settings {
    /// The settings in the form the world takes.
    #[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "whole numbers within their limits")]
    pub(crate) fn for_world(&self) -> ScopeSettings {
        ScopeSettings {
            channels: self.channels.clone(),
            interval_s: self.interval_s,
            points: self.points as usize,
            trigger_position: self.position,
            trigger: Trigger { source: self.source, level_v: self.level_v, rising: self.rising },
            averages: if self.averaging { self.averages as u32 } else { 1 },
        }
    }
}

/// The next span in steps of 1, 2, 5 that is not smaller.
pub(crate) fn span_step(span_v: f64) -> f64 {
    // A span that is a step but for the last bits of its text is that step.
    steps(&[1.0, 2.0, 5.0]).find(|step| *step >= span_v * (1.0 - 1e-9)).unwrap_or(SPAN.max)
}

/// The nearest sample interval, by ratio, in steps of 1, 2, 4.
pub(crate) fn interval_step(interval_s: f64) -> f64 {
    let distance = |step: f64| (step / interval_s).ln().abs();
    let steps = steps(&[1.0, 2.0, 4.0]).filter(|step| (0.99 * INTERVAL.min..=1.01 * INTERVAL.max).contains(step));
    steps.min_by(|left, right| distance(*left).total_cmp(&distance(*right))).unwrap_or(INTERVAL.default)
}

/// The nearest skew setting.
pub(crate) fn delay_step(delay_s: f64) -> f64 {
    // Division by the whole number 2e10 gives the double nearest to the step, which a product with 50e-12 may miss.
    (delay_s / DELAY_STEP_S).round() / DELAY_STEP_S.recip().round()
}

/// Values of these mantissas from 100e-12 up to 500, each the double nearest to its decimal text.
fn steps(mantissas: &'static [f64]) -> impl Iterator<Item = f64> {
    (-10..=2).flat_map(move |exponent| {
        mantissas.iter().map(move |mantissa| {
            if exponent < 0 { mantissa / 10f64.powi(-exponent) } else { mantissa * 10f64.powi(exponent) }
        })
    })
}

#[cfg(test)]
mod tests;
