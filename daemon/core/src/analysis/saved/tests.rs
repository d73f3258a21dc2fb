//! Saved records from a model that is written out here: a reference on both legs, a device with two inverted legs.

use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, Normal};

use super::super::figures::FigureKind;
use super::super::signal::Signal;
use super::super::skew::Shape;
use super::*;

const INTERVAL_S: f64 = 2e-9;
const SKEW_S: f64 = 3.7e-9;
const GAIN: f64 = 0.982;
const OFFSET_V: f64 = 0.02;
const NOISE_V: f64 = 0.01;

/// A square wave of ±1 with smooth edges (10–90 % in about 1.8 `edge_s`).
fn square(t: f64, period_s: f64, edge_s: f64) -> f64 {
    ((std::f64::consts::TAU * t / period_s).sin() * period_s / (std::f64::consts::TAU * edge_s)).tanh()
}

fn record(signal: impl Fn(f64) -> f64, points: usize, interval_s: f64, start_s: f64, seed: u64) -> Record {
    let mut noise = ChaCha8Rng::seed_from_u64(seed);
    let normal = Normal::new(0.0, NOISE_V).unwrap();
    let at = |i: usize| (i as f64).mul_add(interval_s, start_s);
    let samples = (0..points).map(|i| (signal(at(i)) + normal.sample(&mut noise)) as f32).collect();
    Record {
        samples: Samples::Numbers(samples),
        volts_per_code: 1.0,
        zero_v: 0.0,
        interval_s,
        start_s,
        end_codes: (f64::NEG_INFINITY, f64::INFINITY),
        step_v: 0.0,
        averages: 1,
    }
}

/// Both legs of what the positive and the negative tip see.
fn legs(
    p: impl Fn(f64) -> f64,
    n: impl Fn(f64) -> f64,
    points: usize,
    interval_s: f64,
    start_s: f64,
    seed: u64,
) -> Legs {
    Legs {
        positive: record(p, points, interval_s, start_s, seed),
        negative: record(|t| GAIN * n(t - SKEW_S) + OFFSET_V, points, interval_s, start_s, seed + 1),
    }
}

fn reference(seed: u64) -> Legs {
    let signal = |t: f64| 2.0 * square(t, 1e-5, 20e-9);
    legs(signal, signal, 40_000, INTERVAL_S, -4e-5, seed)
}

fn given(device: Option<Legs>) -> Given {
    let known = Reference { shape: Shape::Unknown, period_s: None };
    Given { reference: reference(1), verification: None, device, known, scale_spec: None, response: false }
}

#[test]
fn the_correction_is_found_and_verified_on_the_other_half() {
    let found = analyse(&given(None)).unwrap();
    let off = |estimate: Estimate, truth: f64| ((estimate.value - truth) / estimate.u).abs();
    // Four standard uncertainties: once in 16,000.
    assert!(off(found.correction.skew_s, SKEW_S) < 4.0, "{:?}", found.correction);
    assert!(off(found.correction.gain, GAIN) < 4.0, "{:?}", found.correction);
    assert!(off(found.correction.offset_v, OFFSET_V) < 4.0, "{:?}", found.correction);
    assert_eq!(found.verified, Verified::OtherHalf);
    assert!(!found.verified.independent());
    let first = &found.rejection[0];
    assert!((first.frequency_hz - 1e5).abs() < 1e4, "{first:?}");
    // Closed form of the model's gain and skew: ½·|1 + H|/|1 − H| at 100 kHz.
    let closed = super::super::rejection::cmrr_db(GAIN, SKEW_S, 1e5);
    assert!((first.before_db - closed).abs() < 0.5, "{first:?}, closed form {closed}");
    assert!(first.after_db > first.before_db + 25.0, "{first:?}");
}

#[test]
fn a_fresh_acquisition_is_used_where_there_is_one() {
    let mut given = given(None);
    given.verification = Some(reference(77));
    let found = analyse(&given).unwrap();
    assert!(found.verified.independent());
    assert!(found.rejection[0].after_db > found.rejection[0].before_db + 25.0);
}

/// Catches: parts of a record that are not compared at the same place of a period, a response that is not applied, one
/// that is claimed to be verified on a record of its own.
///
/// The negative leg sees the mean of the signal 4 ns early and 4 ns late: a response of `cos(2πf·4 ns)`, whose rejection is
/// 36 dB at 7 MHz by hand.
#[test]
fn a_response_is_fitted_to_two_parts_of_one_record() {
    let signal = |t: f64| 2.0 * square(t, 1e-5, 20e-9);
    let blurred = |t: f64| 0.5 * (signal(t - 4e-9) + signal(t + 4e-9));
    let mut given = given(Some(legs(signal, blurred, 40_000, INTERVAL_S, -4e-5, 12)));
    given.reference = legs(signal, blurred, 40_000, INTERVAL_S, -4e-5, 11);
    given.known = Reference { shape: Shape::Edges, period_s: Some(1e-5) };
    given.response = true;
    let found = analyse(&given).unwrap();
    let response = found.beyond.response.as_ref().unwrap();
    assert!(response.taps.len() > 1 && response.pole_zero.is_none(), "{response:?}");
    assert!(response.improved.iter().any(|band| band.after_db > band.before_db + 6.0), "{response:?}");
    assert_eq!(found.verified, Verified::Itself);
    let rms = found.device.as_ref().unwrap().figures.iter().find(|f| f.kind == FigureKind::Rms).unwrap();
    assert!(rms.budget.iter().any(|term| term.name == "response"), "{rms:?}");

    given.known.period_s = None;
    let without = analyse(&given).unwrap();
    assert!(without.beyond.response.is_none());
    assert!(without.warnings.iter().any(|warning| warning.contains("period")), "{:?}", without.warnings);
}

#[test]
fn halves_that_disagree_widen_the_uncertainty() {
    let mut given = given(None);
    // The negative leg moves by 2 ns in the middle of the record, as if a connector had been touched.
    let late = reference(5);
    let later =
        legs(|t| 2.0 * square(t, 1e-5, 20e-9), |t| 2.0 * square(t - 2e-9, 1e-5, 20e-9), 40_000, INTERVAL_S, -4e-5, 6);
    let (Samples::Numbers(before), Samples::Numbers(after)) = (&late.negative.samples, &later.negative.samples) else {
        panic!("the model makes numbers");
    };
    let joined = before[..20_000].iter().chain(&after[20_000..]).copied().collect();
    given.reference = Legs { negative: Record { samples: Samples::Numbers(joined), ..late.negative }, ..late };
    let found = analyse(&given).unwrap();
    assert!(found.correction.skew_s.u > 0.9e-9, "{:?}", found.correction);
    assert!(found.warnings.iter().any(|warning| warning.contains("halves differ in skew")), "{:?}", found.warnings);
}

/// The amplitude of a sine of this frequency in the first 40,000 samples of 3 ns: 120 µs hold 51 periods of 425 kHz and
/// 12 of 100 kHz, so the square wave adds nothing.
fn amplitude(signal: &impl Signal, interval_s: f64, frequency_hz: f64) -> f64 {
    let (mut re, mut im) = (0.0, 0.0);
    for i in 0..40_000 {
        let x = signal.at(i);
        let angle = std::f64::consts::TAU * frequency_hz * i as f64 * interval_s;
        re += x * angle.cos();
        im += x * angle.sin();
    }
    2.0 * f64::hypot(re, im) / 40_000.0
}

#[test]
fn a_sine_on_both_inverted_legs_is_gone_and_the_levels_are_right() {
    // Another sample rate, another length and another trigger position than the reference: 3 ns, 50,000, −20 µs.
    // The sine lies at 425 kHz, where the 100 kHz square wave has no harmonic; 1 V of it on 2.5 V of difference.
    let sine = |t: f64| (std::f64::consts::TAU * 425e3 * t).sin();
    let half = |t: f64| 1.25 * square(t, 1e-5, 30e-9);
    let device = legs(|t| half(t) + sine(t), |t| -half(t) + sine(t), 50_000, 3e-9, -2e-5, 40);
    let found = analyse(&given(Some(device.clone()))).unwrap();
    let measured = found.device.unwrap();
    let plain = super::super::apply::plain(&device.positive, &device.negative).unwrap();
    let (before, after) = (amplitude(&plain, 3e-9, 425e3), amplitude(&measured.difference_v, 3e-9, 425e3));
    let before_db = -20.0 * before.log10();
    let closed = super::super::rejection::cmrr_db(GAIN, SKEW_S, 425e3);
    assert!((before_db - closed).abs() < 0.5, "plain subtraction rejects {before_db} dB, closed form {closed} dB");
    // What noise alone leaves at one frequency: an amplitude of σ·√(2/n) in each of two phases, here σ = 14 mV: 90 µV,
    // three times of it are 71 dB below 1 V. The correction must reach its measured rejection or that.
    let near = found.rejection.iter().min_by(|a, b| {
        let far = |band: &RejectionBand| (band.frequency_hz / 425e3).ln().abs();
        far(a).total_cmp(&far(b))
    });
    let promised = near.unwrap().after_db.min(71.0);
    let after_db = -20.0 * after.log10();
    assert!(after_db > promised - 1.0, "{after_db} dB after the correction, {promised} dB were measured");
    for (kind, level) in [(FigureKind::HighLevel, 2.5), (FigureKind::LowLevel, -2.5), (FigureKind::Amplitude, 5.0)] {
        let figure = measured.figures.iter().find(|figure| figure.kind == kind).unwrap();
        assert!(figure.valid, "{figure:?}");
        assert!((figure.value - level).abs() < 4.0 * figure.u, "{}: {} ± {}", kind.name(), figure.value, figure.u);
        assert!(figure.u < 0.005, "{figure:?}");
    }
}

#[test]
fn a_flat_reference_is_refused() {
    let mut given = given(None);
    given.reference = legs(|_| 0.0, |_| 0.0, 1000, 1e-9, 0.0, 9);
    assert!(matches!(analyse(&given), Err(SavedError::Reference(_))));
}
