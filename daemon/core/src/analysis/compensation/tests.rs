//! Legs whose compensation differs: what the levels show, what it leaves in a capture.
#![allow(clippy::unwrap_used)]

use super::*;
use crate::analysis::response::tests::world::{Leg, Square};
use crate::analysis::skew::signals::Dice;
use crate::analysis::skew::{Reference, Shape, estimate_records};
use crate::analysis::{Samples, deskew};

const INTERVAL_S: f64 = 1e-9;
/// ±24 V about 0 V, 100 kHz.
const NODE: Square = Square { amplitude: 24.0, period_s: 10e-6, edge_s: 2.5e-6, sigma_s: 25e-9 / 2.563_103_131 };
const PLAIN: Leg = Leg { gain: 1.0, delay_s: 0.0, bandwidth_hz: 350e6, trim: None };

fn record(values: &[f64], level_v: f64, noise_v: f64, dice: &mut Dice) -> Record {
    Record {
        samples: Samples::Numbers(values.iter().map(|v| (v + level_v + noise_v * dice.normal()) as f32).collect()),
        volts_per_code: 1.0,
        zero_v: 0.0,
        interval_s: INTERVAL_S,
        start_s: 0.0,
        end_codes: (-1e9, 1e9),
        step_v: 0.01,
        averages: 1,
    }
}

/// Four acquisitions of two periods about 24 V; the slow gain takes the mean through.
fn acquire(time_constant_s: f64, relative: f64, noise_v: f64, seed: u64) -> (Vec<Record>, Vec<Record>) {
    let negative = Leg { gain: 0.98, delay_s: 2e-9, bandwidth_hz: 330e6, trim: Some((time_constant_s, relative)) };
    let (p, n) = (PLAIN.record(&NODE, 20_000, INTERVAL_S), negative.record(&NODE, 20_000, INTERVAL_S));
    let mut dice = Dice::new(seed);
    (0..4).map(|_| (record(&p, 24.0, noise_v, &mut dice), record(&n, 0.98 * 24.0, noise_v, &mut dice))).unzip()
}

fn deskewed(p: &[Record], n: &[Record]) -> Correction {
    let reference = Reference { shape: Shape::Unknown, period_s: Some(NODE.period_s) };
    let all: Vec<_> = p.iter().zip(n).map(|(p, n)| estimate_records(p, n, &reference).unwrap()).collect();
    deskew::combine(&all).unwrap().correction()
}

fn found(time_constant_s: f64, relative: f64, noise_v: f64, seed: u64) -> Compensation {
    let (p, n) = acquire(time_constant_s, relative, noise_v, seed);
    estimate(&p, &n, &deskewed(&p, &n), Some(NODE.period_s), 95e-6).unwrap().unwrap()
}

/// Catches: a wrong sign, a slope taken for the whole, an uncertainty that noise does not explain.
#[test]
fn the_droop_of_levels_shows_it_within_its_uncertainty() {
    let mut scores = Vec::new();
    for seed in 0..40 {
        for relative in [0.0, 1.5e-4, -2e-3] {
            let one = found(95e-6, relative, 0.034, seed);
            // By hand 4.7e-4: 24 mV of D over 20,000 samples against a triangle of 24 V·2.5 µs/95 µs/√3 = 0.36 V rms; and
            // 11.5 % for T.
            assert!(one.relative.u < 6e-4 + 0.2 * relative.abs(), "{one:?}");
            scores.push((one.relative.value - relative) / one.relative.u);
        }
    }
    let inside = scores.iter().filter(|score| score.abs() <= 2.0).count();
    // 120 at 95.45 %: 108 or more with probability 0.997 (binomial).
    assert!(inside >= 108, "{inside} of 120: {scores:.1?}");
    let rms = (scores.iter().map(|s| s * s).sum::<f64>() / scores.len() as f64).sqrt();
    assert!((0.7..1.2).contains(&rms), "{rms}");
}

#[test]
fn a_shorter_time_constant_is_found() {
    for seed in 0..4 {
        let one = found(1e-6, 0.03, 0.034, seed);
        assert!((0.5e-6..2e-6).contains(&one.time_constant_s), "{one:?}");
        assert!((one.relative.value - 0.03).abs() < 2.0 * one.relative.u, "{one:?}");
    }
}

/// Catches: an offset that claims to hold at every common mode. The truth is by hand: fast gain less slow gain, times the
/// distance from the reference's mean.
#[test]
fn an_offset_holds_at_its_references_mean_only() {
    let known = found(95e-6, 2e-3, 0.034, 7);
    assert!((known.level_v - 24.0).abs() < 0.2, "{known:?}");
    let quiet = vec![60.0f32; 20_000];
    let left = known.left(&quiet, INTERVAL_S, false);
    let truth = 2e-3 * (60.0 - 24.0);
    assert!(left.mean_v > 0.5 * truth && (left.level_v - left.mean_v).abs() < 1e-3 && left.swing_v < 1e-6, "{left:?}");
    assert!(known.left(&quiet, INTERVAL_S, true).mean_v < left.mean_v);
    let same = known.left(&vec![known.level_v as f32; 20_000], INTERVAL_S, false);
    assert!(same.level_v < 1e-6, "{same:?}");
    // Above 1/(2πT) it falls with frequency.
    let corner = 1.0 / (std::f64::consts::TAU * 95e-6);
    let ratio = known.residual(1e-3 * corner, false) / known.residual(corner, false);
    assert!((ratio - 2.0f64.sqrt()).abs() < 1e-5, "{ratio}");
}

#[test]
fn a_sine_cannot_show_it() {
    let mut dice = Dice::new(3);
    let sine = |i: u32, late: f64| 24.0 * (std::f64::consts::TAU * (f64::from(i) - late) / 1_000.0).sin();
    let p: Vec<f64> = (0..20_000).map(|i| sine(i, 0.0)).collect();
    let n: Vec<f64> = (0..20_000).map(|i| 0.98 * sine(i, 2.0)).collect();
    let (p, n) = (record(&p, 0.0, 0.03, &mut dice), record(&n, 0.0, 0.03, &mut dice));
    let correction = Correction {
        skew_s: Estimate { value: 2e-9, u: 1e-11 },
        gain: Estimate { value: 0.98, u: 1e-5 },
        ..Correction::none()
    };
    assert_eq!(estimate(&[p], &[n], &correction, Some(1e-6), 95e-6).unwrap(), None);
}
