#![allow(clippy::unwrap_used, clippy::float_cmp)]
use super::carry::LowPass;
use super::*;
use crate::analysis::apply::ApplyError;
use crate::analysis::rejection;
use crate::analysis::skew::signals::Dice;
use crate::analysis::skew::{Shape, estimate_records};
use crate::analysis::{Samples, deskew};

#[path = "../../../examples/response_marks/world.rs"]
pub(in crate::analysis) mod world;
use world::{Done, Leg, Square, bend, rejection_db};

const INTERVAL_S: f64 = 0.8e-9;
const NODE: Square = Square { amplitude: 100.0, period_s: 20e-6, edge_s: 5e-6, sigma_s: 1.5e-9 / 2.563_103_131 };
const POSITIVE: Leg = Leg { gain: 1.0, delay_s: 0.0, bandwidth_hz: 350e6, trim: None };
pub(in crate::analysis) const NEGATIVE: Leg =
    Leg { gain: 0.985, delay_s: 137e-12, bandwidth_hz: 280e6, trim: Some((0.6e-6, 0.03)) };

fn record(values: Vec<f64>) -> Record {
    Record {
        samples: Samples::Numbers(values.into_iter().map(|v| v as f32).collect()),
        volts_per_code: 1.0,
        zero_v: 0.0,
        interval_s: INTERVAL_S,
        start_s: 0.0,
        end_codes: (-1e9, 1e9),
        step_v: 0.01,
        averages: 1,
    }
}

pub(in crate::analysis) fn acquire(
    negative: &Leg,
    points: usize,
    noise: f64,
    seed: u64,
    count: usize,
) -> (Vec<Record>, Vec<Record>) {
    acquire_on(&NODE, negative, points, noise, seed, count)
}

fn acquire_on(
    node: &Square,
    negative: &Leg,
    points: usize,
    noise: f64,
    seed: u64,
    count: usize,
) -> (Vec<Record>, Vec<Record>) {
    let mut dice = Dice::new(seed);
    let clean = [POSITIVE.record(node, points, INTERVAL_S), negative.record(node, points, INTERVAL_S)];
    let mut leg = |values: &[f64]| record(values.iter().map(|v| v + noise * dice.normal()).collect());
    (0..count).map(|_| (leg(&clean[0]), leg(&clean[1]))).unzip()
}

pub(in crate::analysis) fn reference() -> Reference {
    Reference { shape: Shape::Edges, period_s: Some(NODE.period_s) }
}

pub(in crate::analysis) fn deskewed(p: &[Record], n: &[Record]) -> Correction {
    let all: Vec<_> = p.iter().zip(n).map(|(p, n)| estimate_records(p, n, &reference()).unwrap()).collect();
    deskew::combine(&all).unwrap().correction()
}

fn reached(negative: &Leg, correction: &Correction, response: Option<&Response>, frequency_hz: f64) -> f64 {
    let done = Done {
        skew_s: correction.skew_s.value + response.map_or(0.0, |r| r.skew_s),
        gain: correction.gain.value,
        interval_s: INTERVAL_S,
        taps: response.map_or_else(|| vec![1.0], |r| r.taps.clone()),
        pole_zero: response.and_then(|r| r.pole_zero).map(|t| (t.time_constant_s.value, t.relative.value)),
    };
    rejection_db(&POSITIVE, negative, &done, frequency_hz)
}

#[test]
fn pole_zero_and_filter_are_found_together() {
    // One period and a little, and 2.3 periods: of these two are used.
    for (points, seed) in [(25_100, 1), (57_500, 2)] {
        let (p, n) = acquire(&NEGATIVE, points, 0.05, seed, 4);
        let correction = deskewed(&p, &n);
        let found = fit(&p, &n, &correction, &reference()).unwrap();
        let term = found.pole_zero.unwrap();
        let off = (term.time_constant_s.value - 0.6e-6) / term.time_constant_s.u;
        assert!(off.abs() < 4.0 && term.time_constant_s.u < 6e-9, "{term:?}");
        // The filter's discrete low-pass differs from the analog one by less than 1e-5 of it.
        let off = (term.relative.value - 0.03) / term.relative.u.hypot(1e-5);
        assert!(off.abs() < 4.0 && term.relative.u < 1e-4, "{term:?}");
        assert!(found.taps.len() > 1, "{found:?}");
        assert!(found.words[0].contains("3.0") && found.words[0].contains("over-compensated"), "{:?}", found.words);
        for (frequency, least) in [(5e4, 80.0), (1e6, 80.0), (1e7, 75.0), (5e7, 65.0), (1e8, 58.0)] {
            let (before, after) = (
                reached(&NEGATIVE, &correction, None, frequency),
                reached(&NEGATIVE, &correction, Some(&found), frequency),
            );
            assert!(before < 46.0 && after > least, "{points} {frequency}: {before} {after}");
        }
        for band in &found.improved {
            assert!(band.after_db > band.before_db + 6.0 || band.floor_db < band.before_db + 6.0, "{band:?}");
        }
    }
}

#[test]
fn records_that_cut_a_period_anywhere_give_the_same() {
    // No period is told: all bins count, and the record ends in the middle of a level that still droops.
    let (p, n) = acquire(&NEGATIVE, 33_000, 0.05, 3, 4);
    let correction = deskewed(&p, &n);
    let unknown = Reference { shape: Shape::Unknown, period_s: None };
    let found = fit(&p, &n, &correction, &unknown).unwrap();
    let term = found.pole_zero.unwrap();
    assert!((term.time_constant_s.value - 0.6e-6).abs() < 4.0 * term.time_constant_s.u, "{term:?}");
    assert!((term.relative.value - 0.03).abs() < 4.0 * term.relative.u.hypot(1e-5), "{term:?}");
    for (frequency, least) in [(1e6, 80.0), (1e7, 75.0), (5e7, 65.0), (1e8, 58.0)] {
        let after = reached(&NEGATIVE, &correction, Some(&found), frequency);
        assert!(after > least, "{frequency}: {after}");
    }
}

#[test]
fn legs_that_differ_in_gain_and_delay_only_get_nothing_more() {
    let same = Leg { bandwidth_hz: 350e6, trim: None, ..NEGATIVE };
    for seed in 1..=4 {
        let (p, n) = acquire(&same, 25_100, 0.3, seed, 4);
        let found = fit(&p, &n, &deskewed(&p, &n), &reference()).unwrap();
        assert!(found.pole_zero.is_none() && found.taps.len() == 1, "{found:?}");
    }
}

#[test]
fn carried_out_it_is_what_the_rejection_shows() {
    let (p, n) = acquire(&NEGATIVE, 57_500, 0.05, 5, 4);
    let correction = deskewed(&p, &n);
    let found = fit(&p, &n, &correction, &reference()).unwrap();
    let (p, n) = acquire(&NEGATIVE, 57_500, 0.05, 6, 4);
    let bands = [1e6, 1e7, 5e7];
    let alone = rejection::measure(&p, &n, &correction, &bands).unwrap();
    let with = rejection::measure_with(&p, &n, &correction, Some(&found), &bands).unwrap();
    assert_eq!(with.len(), bands.len());
    for (alone, with) in alone.iter().zip(&with) {
        let truth = reached(&NEGATIVE, &correction, None, alone.frequency_hz);
        assert!((alone.after_db - truth).abs() < 2.5, "{alone:?} {truth}");
        assert!(with.after_db > alone.after_db + 15.0 || with.at_least, "{alone:?} {with:?}");
    }
    // The level agrees as well: no difference at the mean.
    let corrected = correct(&p[0], &n[0], &correction, Some(&found)).unwrap();
    let whole = &corrected.difference_v[..25_000];
    let mean = whole.iter().map(|d| f64::from(*d)).sum::<f64>() / 25_000.0;
    assert!(mean.abs() < 4.0 * 0.05 * (2.0f64 / 25_000.0).sqrt() + 1e-3, "{mean}");
    assert!(corrected.first > 57_500 / 100 && corrected.noise_gain > 0.5, "{}", corrected.first);
    assert_eq!(corrected.first + corrected.difference_v.len(), 57_500 - 22 - found.taps.len() / 2);
}

/// Catches: a filter taken from edges that do not reach so far, a low-frequency term that is lost on the way, a bound for
/// bands that neither reference showed.
#[test]
fn the_filter_comes_from_fast_edges_and_the_rest_in_situ() {
    let fast_node = Square { amplitude: 10.0, period_s: 1e-6, edge_s: 0.25e-6, ..NODE };
    let node = Square { sigma_s: 25e-9 / 2.563_103_131, ..NODE };
    let negative = Leg { trim: Some((95e-6, 0.02)), ..NEGATIVE };
    let (fast_p, fast_n) = acquire_on(&fast_node, &negative, 12_600, 0.005, 21, 4);
    let (p, n) = acquire_on(&node, &negative, 50_100, 0.05, 22, 4);
    let fast_reference = Reference { shape: Shape::Edges, period_s: Some(fast_node.period_s) };
    let (fast_correction, correction) = (deskewed(&fast_p, &fast_n), deskewed(&p, &n));
    let fast = Acquired { p: &fast_p, n: &fast_n, correction: &fast_correction, reference: &fast_reference };
    let reference = reference();
    let slow = Acquired { p: &p, n: &n, correction: &correction, reference: &reference };
    let alone = combined(&slow, None, Some(95e-6)).unwrap();
    let both = combined(&slow, Some(&fast), Some(95e-6)).unwrap();
    let term = both.pole_zero.unwrap();
    // Too long a time constant for 20 µs: it is the one that was told.
    assert!((term.time_constant_s.value - 95e-6).abs() < 4e-6, "{term:?}");
    assert!((term.relative.value - 0.02).abs() < 2.0 * term.relative.u && term.relative.u < 4e-3, "{term:?}");
    assert!(both.taps.len() > 1, "{both:?}");
    let highest = |response: &Response| response.improved.last().unwrap().to_hz;
    assert!(highest(&both) > 9e7 && both.improved.windows(2).all(|w| w[1].from_hz >= 0.999 * w[0].to_hz), "{both:?}");
    for (frequency, least) in [(1e6, 70.0), (1e7, 65.0), (5e7, 55.0), (1e8, 48.0)] {
        let before = reached(&negative, &correction, None, frequency);
        let after = reached(&negative, &correction, Some(&both), frequency);
        assert!(after > least && after > before + 10.0, "{frequency}: {before} {after}");
    }
    let (with, without) =
        (reached(&negative, &correction, Some(&both), 1e8), reached(&negative, &correction, Some(&alone), 1e8));
    assert!(with > without + 6.0, "{with} {without}");
}

#[test]
fn it_is_kept_as_text() {
    let (p, n) = acquire(&NEGATIVE, 25_100, 0.05, 7, 2);
    let found = fit(&p, &n, &deskewed(&p, &n), &reference()).unwrap();
    let text = serde_json::to_string(&found).unwrap();
    assert_eq!(serde_json::from_str::<Response>(&text).unwrap(), found);
}

#[test]
fn what_does_not_fit_is_refused() {
    let (mut p, mut n) = acquire(&NEGATIVE, 25_100, 0.05, 8, 2);
    let correction = deskewed(&p, &n);
    let found = fit(&p, &n, &correction, &reference()).unwrap();
    let few = fit(&p[..1], &n[..1], &correction, &reference()).unwrap_err();
    assert_eq!(few, ResponseError::Acquisitions { acquisitions: 1 });
    p[0].interval_s *= 2.0;
    n[0].interval_s *= 2.0;
    let other = correct(&p[0], &n[0], &correction, Some(&found)).unwrap_err();
    assert!(matches!(other, ApplyError::Response(ResponseError::Interval { .. })), "{other}");
    let mut dice = Dice::new(10);
    let mut noise = || record((0..4_000).map(|_| dice.normal()).collect());
    let (p, n): (Vec<_>, Vec<_>) = (0..2).map(|_| (noise(), noise())).unzip();
    let nothing = fit(&p, &n, &Correction::none(), &Reference { shape: Shape::Unknown, period_s: None }).unwrap_err();
    assert!(matches!(nothing, ResponseError::NoSignal { .. }), "{nothing}");
}

/// A ramp `x = t` answered by a first-order low-pass: `t − T·(1 − e^{−t/T})` (closed form).
#[test]
fn the_low_pass_is_exact_for_a_ramp() {
    let samples = 73.0;
    let mut ramp = vec![0.0; 401];
    for (i, x) in ramp.iter_mut().enumerate().skip(200) {
        *x = (i - 200) as f64;
    }
    let mean = ramp.iter().sum::<f64>() / 401.0;
    for (i, y) in LowPass::new(samples).apply(&ramp).into_iter().enumerate().skip(200) {
        let t = (i - 200) as f64;
        let history = mean * (-(i as f64 + 1.0) / samples).exp();
        let drop = mean * LowPass::new(samples).c0 * (-(i as f64) / samples).exp();
        let expected = t + samples * (-t / samples).exp_m1() + history + drop;
        assert!((y - expected).abs() < 1e-9, "{i}: {y} {expected}");
    }
}

#[test]
fn non_linearity_shows_in_a_sine_and_not_in_a_square() {
    let mut dice = Dice::new(12);
    let sine = |i: i32| 100.0 * (std::f64::consts::TAU * f64::from(i) / 1_234.5).sin();
    let mut capture = |size: f64| {
        let p = record((0..60_000).map(|i| sine(i) + 0.3 * dice.normal()).collect());
        let n = record((0..60_000).map(|i| sine(i) + bend(size, sine(i), 1.5, 0.0) + 0.3 * dice.normal()).collect());
        nonlinearity(&[p], &[n], &Correction::none(), None).unwrap().unwrap()
    };
    // Off the best straight line the bend `0.4·sin(2π·1.5·v/256)` departs most near ±25, ±65 and at the ends.
    let levels: Vec<f64> = (-100..=100).map(f64::from).collect();
    let slope =
        levels.iter().map(|v| v * bend(0.4, *v, 1.5, 0.0)).sum::<f64>() / levels.iter().map(|v| v * v).sum::<f64>();
    let truth = levels.iter().map(|v| (bend(0.4, *v, 1.5, 0.0) - slope * v).abs()).fold(0.0, f64::max);
    let found = capture(0.4);
    assert!((found.error_v - truth).abs() < 4.0 * found.u_v + 0.02 * truth && !found.at_least, "{found:?} {truth}");
    assert!((found.cap_db - 20.0 * (found.amplitude_v / found.error_v).log10()).abs() < 1e-9);
    let straight = capture(0.0);
    assert!(straight.cap_db > 70.0, "{straight:?}");
    let (p, n) = acquire(&NEGATIVE, 25_100, 0.05, 13, 1);
    assert_eq!(nonlinearity(&p, &n, &Correction::none(), None).unwrap(), None);
}

#[test]
fn the_low_pass_is_scipys_exact_one() {
    // tests/reference/make_vectors.py, low_pass(): scipy.signal.lsim of 1/(1 + s·T) on a seeded walk with steps.
    let file: serde_json::Value =
        serde_json::from_str(include_str!("../../../../../tests/reference/vectors/low_pass.json")).unwrap();
    let values = |value: &serde_json::Value| -> Vec<f64> {
        value.as_array().unwrap().iter().map(|x| x.as_f64().unwrap()).collect()
    };
    let signal = values(&file["signal"]);
    let cases = file["cases"].as_array().unwrap();
    assert_eq!(cases.len(), 3);
    for case in cases {
        let samples = case["samples"].as_f64().unwrap();
        let (found, expected) = (LowPass::new(samples).apply(&signal), values(&case["output"]));
        assert_eq!(found.len(), expected.len());
        for (i, (y, expected)) in found.iter().zip(&expected).enumerate() {
            // At 400 samples the first coefficient is a difference of nearly equal numbers: 400·2⁻⁵³ a step.
            assert!((y - expected).abs() < 1e-11, "{samples} {i}: {y} {expected}");
        }
    }
}
