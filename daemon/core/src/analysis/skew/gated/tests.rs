//! Long records with few edges: against the bound, against the estimate from all samples, and what is declined.

#![allow(clippy::unwrap_used)]

use super::super::fine;
use super::super::signals::{Dice, Signal, Truth, quantise};
use super::*;

const EDGES: Reference = Reference { shape: Shape::Edges, period_s: None };

fn quick(p: &[f64], n: &[f64], reference: &Reference) -> Option<SkewEstimate> {
    estimate(&Leg::Volts(p), &Leg::Volts(n), 1.0, reference)
}

#[test]
fn the_bound_is_reached_and_known() {
    let samples = 40_000;
    let mut dice = Dice::new(401);
    for noise in [0.1, 0.003] {
        let trials = 100;
        let [mut sum, mut squares, mut within, mut ratio] = [[0.0; 3]; 4];
        for _ in 0..trials {
            let signal = Signal::Square { period: 9000.7, rise: 10.0, phase: dice.uniform(400.0, 3500.0) };
            let truth = Truth { tau: dice.uniform(-30.0, 30.0), ..Truth::with_noise(noise) };
            let (p, n) = dice.records(&signal, &truth, samples);
            let bound = truth.bound(&signal, samples);
            let found = quick(&p, &n, &EDGES).unwrap();
            let got = [found.skew_s, found.gain, found.offset_v];
            let want = [truth.tau, truth.gain, truth.offset];
            for i in 0..3 {
                let error = got[i].value - want[i];
                sum[i] += error / bound[i] / f64::from(trials);
                squares[i] += (error / bound[i]).powi(2) / f64::from(trials);
                within[i] += f64::from(u8::from(error.abs() <= 2.0 * got[i].u)) / f64::from(trials);
                ratio[i] += found.bound[i] / bound[i] / f64::from(trials);
            }
            assert!(found.warnings.is_empty(), "{:?}", found.warnings);
        }
        for i in 0..3 {
            // Standard errors with 100 trials: 0.1 of the mean, 0.07 of the spread, 0.02 of the share.
            assert!(sum[i].abs() < 0.35, "{noise} {i}: bias {sum:?}");
            assert!((0.80..1.25).contains(&squares[i].sqrt()), "{noise} {i}: rms {squares:?}");
            assert!(within[i] > 0.89, "{noise} {i}: {within:?}");
            assert!((ratio[i] - 1.0).abs() < 0.08, "{noise} {i}: {ratio:?}");
        }
    }
}

#[test]
fn both_ways_agree() {
    let signal = Signal::Square { period: 21_000.3, rise: 30.0, phase: 5000.0 };
    let truth = Truth { tau: -1234.4, ..Truth::with_noise(0.01) };
    let (p, n) = Dice::new(402).records(&signal, &truth, 80_000);
    let quick = quick(&p, &n, &EDGES).unwrap();
    let whole = fine::estimate(&p, &n, 1.0, &EDGES).unwrap();
    assert!((quick.skew_s.value - truth.tau).abs() < 4.0 * quick.skew_s.u, "{quick:?}");
    assert!((quick.skew_s.value - whole.skew_s.value).abs() < 2.0 * whole.skew_s.u, "{quick:?} {whole:?}");
    assert!((quick.gain.value - whole.gain.value).abs() < 2.0 * whole.gain.u, "{quick:?} {whole:?}");
    assert!((quick.signal_rms_v / whole.signal_rms_v - 1.0).abs() < 0.01, "{quick:?} {whole:?}");
    // The negative leg loses an edge beyond the record's end by its lag, the positive one none.
    assert!((quick.skew_s.u / whole.skew_s.u - 1.0).abs() < 0.15, "{quick:?} {whole:?}");
}

#[test]
fn a_record_of_codes_is_read_like_its_volts() {
    let signal = Signal::Square { period: 16_000.0, rise: 8.0, phase: 3000.0 };
    let (mut p, mut n) = Dice::new(403).records(&signal, &Truth::with_noise(0.02), 50_000);
    let step = 0.01;
    quantise(&mut p, step);
    quantise(&mut n, step);
    let codes = |volts: &[f64]| -> Vec<i16> { volts.iter().map(|v| (v / step).round() as i16).collect() };
    let (codes_p, codes_n) = (codes(&p), codes(&n));
    let leg = |codes| Leg::Codes { codes, scale: step, zero: 0.0 };
    let of_codes = estimate(&leg(&codes_p), &leg(&codes_n), 1.0, &EDGES).unwrap();
    let of_volts = quick(&p, &n, &EDGES).unwrap();
    assert!((of_codes.skew_s.value - of_volts.skew_s.value).abs() < 1e-9, "{of_codes:?} {of_volts:?}");
    assert!((of_codes.gain.value - of_volts.gain.value).abs() < 1e-12);
    assert!(leg(&codes_p).reaches((-128.0, 100.0)) && !leg(&codes_p).reaches((-128.0, 127.0)));
}

#[test]
fn what_it_is_not_made_for_is_declined() {
    let mut dice = Dice::new(404);
    let truth = Truth::with_noise(0.01);
    let mut refused = |signal: &Signal, truth: &Truth, shape: Shape, why: &str| {
        let (p, n) = dice.records(signal, truth, 40_000);
        let found = quick(&p, &n, &Reference { shape, period_s: None });
        assert!(found.is_none(), "{why}: {found:?}");
    };
    let square = |period: f64, rise: f64| Signal::Square { period, rise, phase: 2000.0 };
    refused(&square(700.0, 10.0), &truth, Shape::Edges, "many edges");
    refused(&square(9000.0, 600.0), &truth, Shape::Edges, "slow edges");
    refused(&square(9000.0, 10.0), &truth, Shape::Multitone, "told to be tones");
    refused(&square(9000.0, 10.0), &Truth { noise_p: 3.0, noise_n: 3.0, ..truth }, Shape::Edges, "no clear edge");
    refused(&Signal::sine(400.0, 0.1), &truth, Shape::Unknown, "a sine");
    let upside_down = Truth { gain: -1.0, ..truth };
    refused(&square(90_000.0, 10.0), &upside_down, Shape::Edges, "a mirrored leg");
}

#[test]
fn of_an_unknown_signal_only_one_quiet_between_its_edges_is_taken() {
    let signal = Signal::Square { period: 9000.0, rise: 10.0, phase: 2000.0 };
    let truth = Truth::with_noise(0.01);
    let unknown = Reference { shape: Shape::Unknown, period_s: None };
    let mut dice = Dice::new(405);
    let (mut p, mut n) = dice.records(&signal, &truth, 40_000);
    let found = quick(&p, &n, &unknown).unwrap();
    assert!((found.skew_s.value - truth.tau).abs() < 4.0 * found.skew_s.u);
    // Tones that block means do not show, but that tell of the skew all along the record.
    let tones = Signal::Tones(vec![(0.05, 0.125, 0.4)]);
    for (i, (p, n)) in p.iter_mut().zip(&mut n).enumerate() {
        *p += tones.at(i as f64).0;
        *n += truth.gain * tones.at(i as f64 - truth.tau).0;
    }
    assert!(quick(&p, &n, &unknown).is_none());
}

/// Catches: points of the gain's regression that hold both levels and so tell nothing of it, which many edges in a long
/// record make of most; and the samples round the edges left out of the gain.
#[test]
fn many_edges_in_a_long_record_cost_the_gain_nothing() {
    let samples = 600_000;
    let mut dice = Dice::new(406);
    let signal = Signal::Square { period: 4400.3, rise: 10.0, phase: 900.0 };
    let truth = Truth::with_noise(0.1);
    let (p, n) = dice.records(&signal, &truth, samples);
    let bound = truth.bound(&signal, samples);
    let found = quick(&p, &n, &EDGES).unwrap();
    for (i, (got, want)) in [(found.gain, truth.gain), (found.offset_v, truth.offset)].into_iter().enumerate() {
        // Of the 2200 samples between two edges about 70 lie neither in a window nor in a whole block apart from the
        // edges: 2 % of the deviation. The stated uncertainty comes from the scatter of 2,000 points: another 2 %.
        assert!((0.95..1.08).contains(&(got.u / bound[i + 1])), "{i}: {got:?} {bound:?}");
        assert!((found.bound[i + 1] / bound[i + 1] - 1.0).abs() < 0.08, "{i}: {found:?} {bound:?}");
        assert!((got.value - want).abs() < 4.0 * got.u, "{i}: {got:?}");
    }
}
