//! What an estimate says of its data, and what it refuses.

#![allow(clippy::unwrap_used, clippy::float_cmp)]

use super::signals::{Dice, Signal, Truth, quantise};
use super::*;
use crate::analysis::record::Samples;

const INTERVAL_S: f64 = 8e-10;

fn reference(shape: Shape) -> Reference {
    Reference { shape, period_s: None }
}

fn square(period: f64, rise: f64, phase: f64) -> Signal {
    Signal::Square { period, rise, phase }
}

fn vector(name: &serde_json::Value, key: &str) -> Vec<f64> {
    name[key].as_array().unwrap().iter().map(|x| x.as_f64().unwrap()).collect()
}

#[test]
fn a_noise_free_pair_made_by_scipy_gives_its_truth() {
    // tests/reference/make_vectors.py, edge(): scipy.special.erfc at each leg's own instants.
    let file = include_str!("../../../../../tests/reference/vectors/edge.json");
    let truth: serde_json::Value = serde_json::from_str(file).unwrap();
    let found = estimate(&vector(&truth, "p"), &vector(&truth, "n"), 1.0, &reference(Shape::Edges)).unwrap();
    // The interpolator errs by −120 dB at most in its band: 1e-6 of the amplitude.
    assert!((found.skew_s.value - truth["lag"].as_f64().unwrap()).abs() < 1e-6, "{found:?}");
    assert!((found.gain.value - truth["gain"].as_f64().unwrap()).abs() < 1e-6, "{found:?}");
    assert!((found.offset_v.value - truth["offset"].as_f64().unwrap()).abs() < 1e-6, "{found:?}");
}

#[test]
fn noise_signal_and_bound_are_reported_in_their_units() {
    let signal = square(400.0, 10.0, 130.0);
    let truth = Truth { tau: -2.6, gain: 1.05, offset: -0.3, noise_p: 0.01, noise_n: 0.02 };
    let (p, n) = Dice::new(7).records(&signal, &truth, 8000);
    let found = estimate(&p, &n, INTERVAL_S, &reference(Shape::Edges)).unwrap();
    let bound = truth.bound(&signal, 8000);
    let scales = [INTERVAL_S, 1.0, 1.0];
    for i in 0..3 {
        // The record's ends cost one part in a hundred, the measured noise has an uncertainty of two.
        assert!((found.bound[i] / (bound[i] * scales[i]) - 1.0).abs() < 0.06, "{i}: {found:?} {bound:?}");
        assert!((found.covariance[i][i].sqrt() / (bound[i] * scales[i]) - 1.0).abs() < 0.08, "{i}: {found:?}");
    }
    assert!((found.noise_p_v / 0.01 - 1.0).abs() < 0.06 && (found.noise_n_v / 0.02 - 1.0).abs() < 0.06, "{found:?}");
    assert!((found.signal_rms_v - signal.rms(8000)).abs() < 0.01);
    assert!((found.skew_s.value - truth.tau * INTERVAL_S).abs() < 4.0 * found.skew_s.u);
    assert!(found.warnings.is_empty(), "{:?}", found.warnings);
}

#[test]
fn the_offset_is_that_at_zero_volts_and_surest_at_the_signals_mean() {
    // A pulse between 10 V and 11 V: its mean is far from zero, so offset and gain hang together.
    let signal = square(400.0, 10.0, 130.0);
    let truth = Truth { tau: 1.5, gain: 0.98, offset: 0.1, noise_p: 0.01, noise_n: 0.01 };
    let (p, n) = Dice::new(8).records(&signal, &truth, 8000);
    let lift = 10.0;
    let p: Vec<f64> = p.iter().map(|x| x + lift).collect();
    let n: Vec<f64> = n.iter().map(|x| x + truth.gain * lift).collect();
    let found = estimate(&p, &n, 1.0, &reference(Shape::Edges)).unwrap();
    assert!((found.offset_v.value - 0.1).abs() < 3.0 * found.offset_v.u, "{found:?}");
    let middle = found.offset_at(found.level_v);
    let expected = 0.1 + (0.98 - 1.0) * found.level_v;
    assert!((middle.value - expected).abs() < 4.0 * middle.u, "{middle:?} {expected}");
    assert!(middle.u < found.offset_v.u / 5.0, "{middle:?} {:?}", found.offset_v);
    assert!(found.covariance[1][2] < 0.0 && found.covariance[1][2] == found.covariance[2][1]);
}

#[test]
fn a_large_skew_is_found_either_way() {
    for tau in [-731.25, 604.5] {
        let signal = Signal::Pulse { start: 1900.0, width: 200.0, rise: 8.0 };
        let truth = Truth { tau, ..Truth::with_noise(0.005) };
        let (p, n) = Dice::new(9).records(&signal, &truth, 4000);
        let found = estimate(&p, &n, 1.0, &reference(Shape::Edges)).unwrap();
        assert!((found.skew_s.value - tau).abs() < 4.0 * found.skew_s.u, "{found:?}");
    }
}

#[test]
fn a_sine_is_taken_for_the_nearer_of_two_skews_and_says_so() {
    let truth = Truth { tau: 220.0, ..Truth::with_noise(0.01) };
    let (p, n) = Dice::new(10).records(&Signal::sine(400.0, 0.3), &truth, 8000);
    let found = estimate(&p, &n, 1.0, &reference(Shape::Sine));
    // A sine 180 samples early of 400 is nearer to its own mirror image 20 samples late: it is refused, not guessed.
    assert!(matches!(found, Err(SkewError::Inverted { .. })), "{found:?}");
    let truth = Truth { tau: 120.0, ..truth };
    let (p, n) = Dice::new(11).records(&Signal::sine(400.0, 0.3), &truth, 8000);
    let found = estimate(&p, &n, 1.0, &reference(Shape::Sine)).unwrap();
    assert!((found.skew_s.value - 120.0).abs() < 4.0 * found.skew_s.u, "{found:?}");
    let [Warning::Ambiguous { alternative_s }] = found.warnings[..] else { panic!("{:?}", found.warnings) };
    assert!((alternative_s + 280.0).abs() < 10.0, "{alternative_s}");
}

#[test]
fn correlated_noise_does_not_pull_the_skew_to_zero() {
    // A numerical prototype showed this trap for correlation peaks: −55 bounds at 20 dB, rho = 0.5 at lag zero.
    let signal = square(392.5, 10.0, 100.0);
    let truth = Truth::with_noise(0.1);
    let bound = truth.bound(&signal, 4000)[0];
    let mut dice = Dice::new(12);
    let mut mean = 0.0;
    for _ in 0..40 {
        let (mut p, mut n) = dice.records(&signal, &Truth { noise_p: 0.0707, noise_n: 0.0707, ..truth }, 4000);
        for (p, n) in p.iter_mut().zip(&mut n) {
            let shared = 0.0707 * dice.normal();
            *p += shared;
            *n += shared;
        }
        mean += (estimate(&p, &n, 1.0, &reference(Shape::Edges)).unwrap().skew_s.value - truth.tau) / bound / 40.0;
    }
    // Standard error 0.16; the prototype saw −0.23.
    assert!(mean.abs() < 0.7, "{mean}");
}

#[test]
fn little_dither_is_told_and_widens_the_uncertainty() {
    let signal = square(400.0, 10.0, 130.0);
    let step = 2.5 / 256.0;
    let truth = Truth::with_noise(0.1 * step);
    let (mut p, mut n) = Dice::new(13).records(&signal, &truth, 4000);
    quantise(&mut p, step);
    quantise(&mut n, step);
    let plain = estimate(&p, &n, 1.0, &reference(Shape::Edges)).unwrap();
    let found = plain.clone().with_converter(step, step, 1);
    assert!(found.warnings.iter().any(|w| matches!(w, Warning::LittleDither { steps } if *steps < 0.5)), "{found:?}");
    assert!(found.skew_s.u >= plain.skew_s.u && found.gain.u > plain.gain.u && found.offset_v.u > plain.offset_v.u);
    assert!((found.gain.value - truth.gain).abs() < 2.0 * found.gain.u, "{found:?}");
    assert!((found.offset_v.value - truth.offset).abs() < 2.0 * found.offset_v.u, "{found:?}");
    // With 0.8 steps of noise nothing changes but the figure itself.
    let (mut p, mut n) = Dice::new(14).records(&signal, &Truth::with_noise(0.8 * step), 4000);
    quantise(&mut p, step);
    quantise(&mut n, step);
    let plain = estimate(&p, &n, 1.0, &reference(Shape::Edges)).unwrap();
    let found = plain.clone().with_converter(step, step, 1);
    assert!(found.dither_steps.unwrap() > 0.7, "{found:?}");
    assert_eq!(SkewEstimate { dither_steps: None, ..found }, plain);
}

/// Catches: an average that the instrument rounded to whole converter steps once more, taken for one with its digits.
#[test]
fn an_average_on_the_converters_own_grid_is_not_dithered_by_single_sweeps() {
    let signal = square(400.0, 10.0, 130.0);
    let step = 2.5 / 256.0;
    // 0.7 steps in each of 64 sweeps.
    let truth = Truth::with_noise(0.7 * step / 8.0);
    let (p, n) = Dice::new(19).records(&signal, &truth, 4000);
    let on_grid = |volts: &[f64], grid: f64| Record {
        samples: Samples::Codes(volts.iter().map(|v| (v / grid).round() as i16).collect()),
        volts_per_code: grid,
        zero_v: 0.0,
        interval_s: 1.0,
        start_s: 0.0,
        end_codes: (f64::from(i16::MIN), f64::from(i16::MAX)),
        step_v: step,
        averages: 64,
    };
    let told = |grid: f64| estimate_records(&on_grid(&p, grid), &on_grid(&n, grid), &reference(Shape::Edges)).unwrap();
    let found = told(step);
    assert!(found.warnings.iter().any(|w| matches!(w, Warning::LittleDither { .. })), "{found:?}");
    assert!((found.gain.value - truth.gain).abs() < 2.0 * found.gain.u, "{found:?}");
    assert!((found.offset_v.value - truth.offset).abs() < 2.0 * found.offset_v.u, "{found:?}");
    let fine = told(step / 64.0);
    assert!(fine.warnings.is_empty() && fine.gain.u < 0.2 * found.gain.u, "{fine:?}");
}

#[test]
fn dither_is_measured_without_bias() {
    let step = 2.5 / 256.0;
    let mut dice = Dice::new(27);
    let mut mean = 0.0;
    for _ in 0..40 {
        let signal = square(392.5, 10.0, dice.uniform(0.0, 392.5));
        let (mut p, mut n) = dice.records(&signal, &Truth::with_noise(0.8 * step), 4000);
        quantise(&mut p, step);
        quantise(&mut n, step);
        let found = estimate(&p, &n, 1.0, &reference(Shape::Edges)).unwrap();
        let steps = |noise: f64| (noise * noise - step * step / 12.0).sqrt() / step;
        mean += (steps(found.noise_p_v) + steps(found.noise_n_v)) / 80.0;
    }
    // Measured with a standard error of 0.004.
    assert!((mean - 0.8).abs() < 0.015, "{mean}");
}

#[test]
fn legs_of_different_bandwidth_are_told() {
    let truth = Truth { noise_p: 0.001, noise_n: 0.001, ..Truth::with_noise(0.0) };
    let mut dice = Dice::new(15);
    let (p, _) = dice.records(&square(400.0, 10.0, 130.0), &truth, 4000);
    let (_, n) = dice.records(&square(400.0, 14.0, 130.0), &truth, 4000);
    let found = estimate(&p, &n, 1.0, &reference(Shape::Edges)).unwrap();
    assert!(found.warnings.iter().any(|w| matches!(w, Warning::ResponsesDiffer { .. })), "{found:?}");
    assert!((found.skew_s.value - truth.tau).abs() < 0.05);
}

#[test]
fn records_of_codes_give_true_time_and_refuse_clipping() {
    let signal = square(400.0, 10.0, 130.0);
    let (p, n) = Dice::new(16).records(&signal, &Truth::with_noise(0.01), 4000);
    let record = |volts: &[f64], start_s: f64| Record {
        samples: Samples::Codes(volts.iter().map(|v| (v / 0.01).round() as i16).collect()),
        volts_per_code: 0.01,
        zero_v: 0.0,
        interval_s: INTERVAL_S,
        start_s,
        end_codes: (-128.0, 127.0),
        step_v: 0.01,
        averages: 1,
    };
    let found = estimate_records(&record(&p, 0.0), &record(&n, 1e-10), &reference(Shape::Edges)).unwrap();
    assert!((found.skew_s.value - (3.3 * INTERVAL_S + 1e-10)).abs() < 4.0 * found.skew_s.u, "{found:?}");
    assert!(found.dither_steps.is_some());
    let mut clipped = record(&n, 0.0);
    clipped.end_codes = (-128.0, 90.0);
    let error = estimate_records(&record(&p, 0.0), &clipped, &reference(Shape::Edges)).unwrap_err();
    assert!(matches!(error, SkewError::Clipped { p: 0, n } if n > 1000), "{error:?}");
    let mut slower = record(&n, 0.0);
    slower.interval_s = 2.0 * INTERVAL_S;
    let error = estimate_records(&record(&p, 0.0), &slower, &reference(Shape::Edges)).unwrap_err();
    assert!(matches!(error, SkewError::Intervals { .. }));
}

#[test]
fn bad_records_are_refused_with_the_reason() {
    let signal = square(400.0, 10.0, 130.0);
    let mut dice = Dice::new(17);
    let (p, n) = dice.records(&signal, &Truth::with_noise(0.01), 2000);
    let refuse = |p: &[f64], n: &[f64]| estimate(p, n, 1.0, &reference(Shape::Edges)).unwrap_err();
    assert_eq!(refuse(&p, &n[1..]), SkewError::Lengths { p: 2000, n: 1999 });
    assert!(matches!(refuse(&p[..100], &n[..100]), SkewError::TooShort { samples: 100, .. }));
    assert!(matches!(refuse(&p, &[0.3; 2000]), SkewError::Flat { leg: "negative", .. }));
    assert!(matches!(refuse(&[0.1; 2000], &n), SkewError::Flat { leg: "positive", .. }));
    let mut broken = n.clone();
    broken[700] = f64::NAN;
    assert!(matches!(refuse(&p, &broken), SkewError::NotFinite { .. }));
    let only_noise: Vec<f64> = (0..2000).map(|_| dice.normal()).collect();
    let error = refuse(&p, &only_noise);
    assert!(matches!(error, SkewError::OnlyNoise { leg: "negative", rms_v } if (rms_v - 1.0).abs() < 0.1), "{error:?}");
    assert!(matches!(refuse(&only_noise, &n), SkewError::OnlyNoise { leg: "positive", .. }));
    let more_noise: Vec<f64> = (0..2000).map(|_| dice.normal()).collect();
    assert!(matches!(refuse(&more_noise, &only_noise), SkewError::NoCommonSignal { .. }));
    let mirrored: Vec<f64> = n.iter().map(|x| -x).collect();
    assert!(matches!(refuse(&p, &mirrored), SkewError::Inverted { .. }));
    let tiny: Vec<f64> = n.iter().map(|x| x / 100.0).collect();
    assert!(matches!(refuse(&p, &tiny), SkewError::Gain { .. }));
    let error = estimate(&p, &n, f64::NAN, &reference(Shape::Edges)).unwrap_err();
    assert!(matches!(error, SkewError::NotFinite { what: "the sample interval" }));
    let (p, n) = dice.records(&signal, &Truth { tau: 120.0, ..Truth::with_noise(0.01) }, 260);
    let error = estimate(&p, &n, 1.0, &reference(Shape::Edges));
    assert!(error.is_err(), "{error:?}");
}

#[test]
fn a_ten_times_probe_is_recognised() {
    let truth = Truth { gain: 10.0, ..Truth::with_noise(0.01) };
    let (p, n) = Dice::new(18).records(&square(400.0, 10.0, 130.0), &truth, 4000);
    let found = estimate(&p, &n, 1.0, &reference(Shape::Edges)).unwrap();
    assert!(matches!(found.warnings[..], [Warning::Attenuation { .. }]), "{:?}", found.warnings);
    let text = found.warnings[0].to_string();
    assert!(text.contains("negative leg") && text.contains("wrong by 10"), "{text}");
    let (n, p) = (p, n);
    let found = estimate(&p, &n, 1.0, &reference(Shape::Edges)).unwrap();
    assert!(found.warnings[0].to_string().contains("positive leg"), "{:?}", found.warnings);
    let truth = Truth { gain: 1.4, ..Truth::with_noise(0.01) };
    let (p, n) = Dice::new(18).records(&square(400.0, 10.0, 130.0), &truth, 4000);
    let found = estimate(&p, &n, 1.0, &reference(Shape::Edges)).unwrap();
    assert!(matches!(found.warnings[..], [Warning::GainFarFromOne { .. }]), "{:?}", found.warnings);
}

#[test]
fn gain_and_offset_at_a_known_skew_are_unbiased_and_know_their_uncertainty() {
    // 20 dB, where ordinary regression of N on P is biased by −1 % (−9.7 of these bounds in the prototype).
    let signal = square(392.5, 10.0, 100.0);
    let truth = Truth { noise_p: 0.1, noise_n: 0.2, ..Truth::with_noise(0.0) };
    let bound = truth.bound(&signal, 4000);
    let mut dice = Dice::new(19);
    let trials = 200;
    let (mut z, mut z2, mut within) = (0.0, 0.0, 0.0);
    for _ in 0..trials {
        let (p, n) = dice.records(&signal, &truth, 4000);
        let found = gain_and_offset(&p, &n, truth.tau).unwrap();
        let error = (found.gain.value - truth.gain) / bound[1];
        z += error / f64::from(trials);
        z2 += error * error / f64::from(trials);
        within += f64::from(u8::from((found.gain.value - truth.gain).abs() <= 2.0 * found.gain.u)) / f64::from(trials);
        assert!((found.offset_v.value - truth.offset).abs() < 5.0 * found.offset_v.u, "{found:?}");
        assert!((found.offset_v.u / bound[2] - 1.0).abs() < 0.15, "{found:?} {bound:?}");
    }
    let se = 1.0 / f64::from(trials).sqrt();
    assert!(z.abs() < 0.1 + 3.0 * se, "bias {z}");
    // The measured noise ratio adds a little at 20 dB.
    assert!(z2.sqrt() < 1.1 + 3.0 * se * 0.71, "rms {}", z2.sqrt());
    assert!(within > 0.93 - 3.0 * 0.0147, "{within}");
}

#[test]
fn gain_and_offset_refuse_what_is_no_pair() {
    let signal = square(392.5, 10.0, 100.0);
    let mut dice = Dice::new(20);
    let (p, n) = dice.records(&signal, &Truth::with_noise(0.01), 2000);
    assert!(gain_and_offset(&p, &n[1..], 0.0).is_err());
    assert!(gain_and_offset(&p, &n, f64::NAN).is_err());
    assert!(gain_and_offset(&p, &[1.0; 2000], 0.0).is_err());
    assert!(matches!(gain_and_offset(&p, &n, 1900.0), Err(SkewError::TooShort { .. })));
    let noise: Vec<f64> = (0..2000).map(|_| dice.normal()).collect();
    let other: Vec<f64> = (0..2000).map(|_| dice.normal()).collect();
    assert!(gain_and_offset(&noise, &other, 0.0).is_err());
}
