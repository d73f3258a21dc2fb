//! Codes, clipping and averaging.

use rand::SeedableRng;

use super::*;
use crate::world::fixture::{scope, spread};
use crate::world::wave::{Sampler, Wave};

fn signal(volts: f64, noise_v: f64) -> Signal {
    let wave = Sampler::new(&Wave::constant(volts, 1.0));
    Signal { wave, constant: true, gain: 1.0, offset_v: 0.0, delay_s: 0.0, noise_v }
}

fn record(signal: &Signal, sweeps: usize, points: usize) -> ChannelData {
    let converter = Converter::new(8, &scope(2.56, 1.0, 1e-9, points).channels[0]);
    converter.record(signal, &vec![0.0; sweeps], 1e-9, points, &mut ChaCha8Rng::seed_from_u64(5))
}

#[test]
fn a_code_is_the_nearest_step_from_the_middle_of_the_span() {
    // 2.56 V on 256 steps: 10 mV each, code 0 at 1 V.
    for (volts, code) in [(1.0, 0), (1.014, 1), (1.016, 2), (0.986, -1), (0.984, -2), (2.27, 127), (-0.28, -128)] {
        let data = record(&signal(volts, 0.0), 1, 3);
        assert_eq!(data.codes, [code; 3], "{volts}");
    }
    let data = record(&signal(1.0, 0.0), 1, 1);
    assert_eq!((data.low_code, data.high_code, data.zero_v), (-128, 127, 1.0));
    assert!((data.step_v - 0.01).abs() < 1e-15 && (data.volts_per_code - 0.01).abs() < 1e-15);
}

#[test]
fn what_is_outside_the_span_sticks_to_its_end() {
    assert_eq!(record(&signal(9.0, 0.0), 1, 1).codes, [127]);
    assert_eq!(record(&signal(-9.0, 0.001), 1, 1).codes, [-128]);
    let averaged = record(&signal(9.0, 0.001), 16, 1);
    assert_eq!((averaged.codes[0], averaged.high_code), (127 * 256, 127 * 256));
    let averaged = record(&signal(-1e30, 0.001), 16, 1);
    assert_eq!((averaged.codes[0], averaged.low_code), (-32768, -32768));
}

#[test]
fn an_average_is_on_a_finer_grid_and_quieter_by_the_root_of_its_sweeps() {
    let noise_v = 0.007;
    let mut last = None;
    for sweeps in [1, 4, 64] {
        let data = record(&signal(1.0037, noise_v), sweeps, 20_000);
        let volts: Vec<f64> = data.codes.iter().map(|&c| data.zero_v + f64::from(c) * data.volts_per_code).collect();
        let (mean, sd) = spread(&volts);
        // Noise and the converter's own, a step over √12 (Sheppard): 7 mV and 2.89 mV.
        let expected = (noise_v.powi(2) + 0.01_f64.powi(2) / 12.0).sqrt() / (sweeps as f64).sqrt();
        // The standard deviation of 20,000 values is known to 0.5 %.
        assert!((sd / expected - 1.0).abs() < 0.025, "{sweeps}: {sd} {expected}");
        // What the dither leaves of a step: 2·(step/2π)·e^(−2π²·0.7²) = 0.2 µV; the rest is noise.
        assert!((mean - 1.0037).abs() < 5.0 * expected / 20_000_f64.sqrt() + 1e-6, "{sweeps}: {mean}");
        last = Some(data);
    }
    let data = last.unwrap();
    assert!((data.volts_per_code - 0.01 / 256.0).abs() < 1e-15 && (data.step_v - 0.01).abs() < 1e-15);
}

#[test]
fn quotients_go_to_the_nearest() {
    for (dividend, divisor, expected) in [(7, 2, 4), (-7, 2, -3), (5, 3, 2), (-5, 3, -2), (-6, 3, -2), (0, 9, 0)] {
        assert_eq!(rounded(dividend, divisor), expected, "{dividend}/{divisor}");
    }
}
