//! The samples that are timed: a reference pair (both tips on one square wave) and a device pair (a gate drive on a
//! swinging node), as 12-bit codes, from a small seeded generator so that every run has the same ones.

use evenpair_core::analysis::{Record, Samples};

/// Seconds between two samples.
pub(crate) const INTERVAL_S: f64 = 1e-9;
/// Skew of the negative leg in seconds.
pub(crate) const SKEW_S: f64 = 3.3e-9;
/// Gain of the negative leg.
pub(crate) const GAIN: f64 = 0.97;
/// Offset of the negative leg in volts.
pub(crate) const OFFSET_V: f64 = 0.3;
/// Rms noise of each leg in volts.
pub(crate) const NOISE_V: f64 = 0.06;
/// Volts per code: 12 bits over 160 V.
pub(crate) const STEP_V: f64 = 160.0 / 4096.0;
/// Period of reference and device in samples; ten periods make half a million samples.
const PERIOD: f64 = 50_000.0;

/// Both pairs.
pub(crate) struct Scene {
    /// Both tips on the reference: positive and negative leg.
    pub(crate) reference: (Record, Record),
    /// The device.
    pub(crate) device: (Record, Record),
}

impl Scene {
    /// With so many samples in each record.
    pub(crate) fn new(points: usize) -> Self {
        let mut dice = Dice(0x9E37_79B9_7F4A_7C15);
        let reference = |t: f64| 30.0 * pulse(t, 0.25, 0.75, 10.0);
        let node = |t: f64| 48.0 * pulse(t + 60.0, 0.2, 0.6, 20.0);
        let gate = |t: f64| 12.5 * pulse(t, 0.2, 0.6, 20.0) - 0.5;
        let skew = SKEW_S / INTERVAL_S;
        Self {
            reference: (
                record(points, &mut dice, reference),
                record(points, &mut dice, |t| GAIN * reference(t - skew) + OFFSET_V),
            ),
            device: (
                record(points, &mut dice, |t| node(t) + gate(t)),
                record(points, &mut dice, |t| GAIN * node(t - skew) + OFFSET_V),
            ),
        }
    }
}

/// A pulse train from 0 to 1 whose edges last `duration` samples from 10 % to 90 % (a logistic step: 4.394 widths).
fn pulse(t: f64, from: f64, to: f64, duration: f64) -> f64 {
    let phase = t.rem_euclid(PERIOD);
    let width = duration / 4.394;
    let step = |at: f64| {
        let x = (phase - at * PERIOD) / width;
        if x > 40.0 {
            1.0
        } else if x < -40.0 {
            0.0
        } else {
            1.0 / (1.0 + (-x).exp())
        }
    };
    step(from) - step(to)
}

fn record(points: usize, dice: &mut Dice, signal: impl Fn(f64) -> f64) -> Record {
    let code = |volts: f64| (volts / STEP_V).round().clamp(-2047.0, 2046.0) as i16;
    Record {
        samples: Samples::Codes((0..points).map(|i| code(signal(i as f64) + NOISE_V * dice.normal())).collect()),
        volts_per_code: STEP_V,
        zero_v: 0.0,
        interval_s: INTERVAL_S,
        start_s: 0.0,
        end_codes: (-2048.0, 2047.0),
        step_v: STEP_V,
        averages: 1,
    }
}

/// SplitMix64 (Steele, Lea and Flood 2014; constants from memory); normal numbers as a sum of twelve uniform ones.
struct Dice(u64);

impl Dice {
    fn next(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        z ^ (z >> 31)
    }

    fn normal(&mut self) -> f64 {
        let unit = 1.0 / f64::from(1u32 << 16);
        let four = |bits: u64| (0..4).map(|k| ((bits >> (16 * k)) & 0xFFFF) as f64 * unit).sum::<f64>();
        (0..3).map(|_| four(self.next())).sum::<f64>() - 6.0
    }
}
