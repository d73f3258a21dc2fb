//! The converter: noise, steps, clipping, and the average of many sweeps.

#[cfg(test)]
mod tests;

use rand::RngExt;
use rand_chacha::ChaCha8Rng;
use rand_distr::StandardNormal;

use super::acquisition::{ChannelData, ChannelSettings};
use super::leg::Signal;

/// An average is given on a grid this many times finer than the converter's.
const FINER: i32 = 256;

/// One channel's converter.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Converter {
    /// Converter steps in the span; half of them are below its middle.
    steps: i32,
    span_v: f64,
    middle_v: f64,
    delay_s: f64,
}

impl Converter {
    /// A converter of `bits` for a channel as it is set.
    pub(crate) fn new(bits: u32, channel: &ChannelSettings) -> Self {
        let (span_v, middle_v, delay_s) = (channel.span_v, channel.offset_v, channel.delay_s);
        Self { steps: 1 << bits, span_v, middle_v, delay_s }
    }

    /// Converts one sweep per instant of `starts_s` (the instants of sample 0) and averages them.
    pub(crate) fn record(
        &self,
        signal: &Signal,
        starts_s: &[f64],
        interval_s: f64,
        points: usize,
        rng: &mut ChaCha8Rng,
    ) -> ChannelData {
        let step_v = self.span_v / f64::from(self.steps);
        let (low, high) = (-self.steps / 2, self.steps / 2 - 1);
        // In converter steps from here on.
        let gain = signal.gain / step_v;
        let offset = (signal.offset_v - self.middle_v) / step_v;
        let noise = signal.noise_v / step_v;
        let still = signal.constant && noise == 0.0;
        let mut sweep = vec![0.0; points];
        let mut sums = vec![0_i32; points];
        for &start_s in starts_s.iter().take(if still { 1 } else { starts_s.len() }) {
            signal.wave.read(start_s + self.delay_s - signal.delay_s, interval_s, &mut sweep);
            for (sum, &volts) in sums.iter_mut().zip(&sweep) {
                let mut level = gain * volts + offset;
                if noise > 0.0 {
                    level += noise * rng.sample::<f64, _>(StandardNormal);
                }
                *sum += code(level, low, high);
            }
        }
        let sweeps = if still { 1 } else { starts_s.len() as i64 };
        let finer = if starts_s.len() > 1 { FINER } else { 1 };
        // The quotient lies between the end codes, which fit: see `ScopeSpec::converter_bits`.
        let average = |&sum: &i32| rounded(i64::from(sum) * i64::from(finer), sweeps) as i16;
        ChannelData {
            codes: sums.iter().map(average).collect(),
            volts_per_code: step_v / f64::from(finer),
            zero_v: self.middle_v,
            low_code: low * finer,
            high_code: high * finer,
            step_v,
        }
    }
}

/// The nearest code to a level in steps.
fn code(level: f64, low: i32, high: i32) -> i32 {
    let inside = level.clamp(f64::from(low), f64::from(high));
    // Cutting off rounds towards nought: made positive first, it rounds down. `floor` would be a call on plain x86-64.
    (inside + 0.5 - f64::from(low)) as i32 + low
}

/// The quotient to the nearest whole number.
fn rounded(dividend: i64, divisor: i64) -> i64 {
    (2 * dividend + divisor).div_euclid(2 * divisor)
}
