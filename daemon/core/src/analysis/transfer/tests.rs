//! The lines' closed form against its definition, differences, GTC and Monte Carlo; whole transfers on simulated legs.

#![allow(clippy::unwrap_used)]

use proptest::prelude::*;

use super::*;
use crate::analysis::Samples;
use crate::analysis::skew::Shape;
use crate::analysis::skew::signals::{Dice, Signal};

fn estimate(value: f64, u: f64) -> Estimate {
    Estimate { value, u }
}

fn line(gain: (f64, f64), offset_v: (f64, f64), gain_offset: f64) -> RangeLine {
    RangeLine { gain: estimate(gain.0, gain.1), offset_v: estimate(offset_v.0, offset_v.1), gain_offset }
}

fn correction(gain: (f64, f64), offset_v: (f64, f64), gain_offset: f64) -> Correction {
    Correction {
        skew_s: estimate(0.0, 0.0),
        gain: estimate(gain.0, gain.1),
        offset_v: estimate(offset_v.0, offset_v.1),
        gain_offset,
    }
}

/// GTC (PyPI, the GUM Tree Calculator) by automatic differentiation; `tests/reference/uncertainty.py` makes the file.
#[test]
fn the_propagation_is_gtcs() {
    let text = include_str!("../../../../../tests/reference/vectors/transfer.json");
    let file: serde_json::Value = serde_json::from_str(text).unwrap();
    let pair = |value: &serde_json::Value| (value[0].as_f64().unwrap(), value[1].as_f64().unwrap());
    let number = |value: &serde_json::Value| value.as_f64().unwrap();
    let leg = |value: &serde_json::Value| line(pair(&value[0]), pair(&value[1]), number(&value[2]));
    let cases = file["cases"].as_array().unwrap();
    assert_eq!(cases.len(), 3);
    for case in cases {
        let from = correction(pair(&case["gain"]), pair(&case["offset"]), number(&case["correlation"]));
        let found = levels(&from, &leg(&case["positive"]), &leg(&case["negative"]));
        let near = |found: f64, expected: f64| {
            assert!((found - expected).abs() <= 1e-11 * (1.0 + expected.abs()), "{found} {expected} in {case}");
        };
        let ((gain, u_gain), (offset, u_offset)) = (pair(&case["new_gain"]), pair(&case["new_offset"]));
        near(found.gain.value, gain);
        near(found.gain.u / u_gain, 1.0);
        near(found.offset_v.value, offset);
        near(found.offset_v.u / u_offset, 1.0);
        near(found.gain_offset, number(&case["new_correlation"]));
    }
}

proptest! {
    /// By the definition: a leg on a range reads `a·v + b`; what correction holds on either range follows, and so do
    /// the lines from range to range.
    #[test]
    fn what_the_ranges_are_is_found(a in prop::array::uniform4(0.9f64..1.1), b in prop::array::uniform4(-2f64..2.0)) {
        let [p_old, n_old, p_new, n_new] = a;
        let on = |a: [f64; 2], b: [f64; 2]| (a[1] / a[0], b[1] - a[1] / a[0] * b[0]);
        let (gain, offset) = on([p_old, n_old], [b[0], b[1]]);
        let between = |old: usize, new: usize| line((a[new] / a[old], 0.0), (b[new] - a[new] / a[old] * b[old], 0.0), 0.0);
        let found = levels(&correction((gain, 0.0), (offset, 0.0), 0.0), &between(0, 2), &between(1, 3));
        let (gain, offset) = on([p_new, n_new], [b[2], b[3]]);
        prop_assert!((found.gain.value - gain).abs() < 1e-13 && (found.offset_v.value - offset).abs() < 1e-12);
        prop_assert!(found.gain.u.abs() < 1e-300 && found.gain_offset.abs() < 1e-300);
    }

    /// Lines that change nothing leave the correction as it is, its correlation too.
    #[test]
    fn the_same_range_changes_nothing(g in 0.9f64..1.1, o in -2f64..2.0, r in -0.99f64..0.99) {
        let same = line((1.0, 0.0), (0.0, 0.0), 0.0);
        let found = levels(&correction((g, 1e-4), (o, 2e-3), r), &same, &same);
        prop_assert!((found.gain.value - g).abs() < 1e-15 && (found.offset_v.value - o).abs() < 1e-15);
        prop_assert!((found.gain.u / 1e-4 - 1.0).abs() < 1e-12 && (found.offset_v.u / 2e-3 - 1.0).abs() < 1e-12);
        prop_assert!((found.gain_offset - r).abs() < 1e-12);
    }

    /// There and back by inverse lines gives the same correction, and never a smaller uncertainty of the gain.
    #[test]
    fn there_and_back(g in 0.9f64..1.1, o in -2f64..2.0, k in prop::array::uniform2(0.98f64..1.02),
                      c in prop::array::uniform2(-1f64..1.0), u in 1e-6f64..1e-3) {
        let there = [0, 1].map(|i| line((k[i], u), (c[i], 10.0 * u), -0.5));
        let back = [0, 1].map(|i| line((1.0 / k[i], u), (-c[i] / k[i], 10.0 * u), -0.5));
        let from = correction((g, 1e-5), (o, 1e-4), -0.3);
        let new = levels(&from, &there[0], &there[1]);
        let middle = Correction { gain: new.gain, offset_v: new.offset_v, gain_offset: new.gain_offset, ..from };
        let again = levels(&middle, &back[0], &back[1]);
        prop_assert!((again.gain.value - g).abs() < 1e-13 && (again.offset_v.value - o).abs() < 1e-12);
        prop_assert!(again.gain.u >= 1e-5 && again.gain_offset.abs() <= 1.0);
    }
}

/// Catches: a wrong sensitivity or a lost correlation. Against Monte Carlo (JCGM 101): the errors of all six are drawn,
/// and k = 2 must cover 95.45 %.
#[test]
fn intervals_cover_under_monte_carlo() {
    let truth = correction((0.955, 3e-4), (-0.4, 8e-3), -0.8);
    let p = line((1.008, 4e-4), (0.3, 5e-3), -0.7);
    let n = line((0.993, 5e-4), (-0.25, 6e-3), 0.6);
    let exact = levels(&truth, &p, &n);
    let mut dice = Dice::new(41);
    let mut drawn = |first: Estimate, second: Estimate, r: f64| {
        let (a, b) = (dice.normal(), dice.normal());
        let b = r * a + (1.0 - r * r).sqrt() * b;
        (estimate(first.value + a * first.u, first.u), estimate(second.value + b * second.u, second.u))
    };
    let (mut gain, mut offset, mut products, trials) = (0, 0, 0.0, 4_000);
    for _ in 0..trials {
        let (g, o) = drawn(truth.gain, truth.offset_v, truth.gain_offset);
        let mut leg = |line: &RangeLine| {
            let (gain, offset_v) = drawn(line.gain, line.offset_v, line.gain_offset);
            RangeLine { gain, offset_v, gain_offset: line.gain_offset }
        };
        let (p, n) = (leg(&p), leg(&n));
        let found = levels(&Correction { gain: g, offset_v: o, ..truth }, &p, &n);
        let scores = [
            (found.gain.value - exact.gain.value) / found.gain.u,
            (found.offset_v.value - exact.offset_v.value) / found.offset_v.u,
        ];
        gain += usize::from(scores[0].abs() <= 2.0);
        offset += usize::from(scores[1].abs() <= 2.0);
        products += scores[0] * scores[1] / f64::from(trials);
    }
    // Three standard deviations of the binomial count: 0.99 %.
    for (covered, what) in [(gain, "gain"), (offset, "offset")] {
        let share = covered as f64 / f64::from(trials);
        assert!((share - 0.9545).abs() < 0.0099, "{what}: {share}");
    }
    assert!((products - exact.gain_offset).abs() < 0.05, "{products} {}", exact.gain_offset);
}

/// Gain, offset and delay (samples) of one leg on one range.
#[derive(Clone, Copy)]
struct Path(f64, f64, f64);

/// Two legs on two ranges, and what they show.
struct Lab {
    old: [Path; 2],
    new: [Path; 2],
    /// Noise of the old and the new range.
    noise: [f64; 2],
    dice: Dice,
}

const INTERVAL_S: f64 = 1e-9;
const SAMPLES: usize = 2_000;
const KNOWN: Reference = Reference { shape: Shape::Edges, period_s: Some(1000.0 * INTERVAL_S) };

impl Lab {
    fn new(seed: u64) -> Self {
        let mut dice = Dice::new(seed);
        let mut path = || Path(1.0 + dice.uniform(-0.01, 0.01), dice.uniform(-0.5, 0.5), dice.uniform(-0.05, 0.05));
        let (old, new) = ([path(), path()], [path(), path()]);
        Self { old, new, noise: [0.09, 0.03], dice }
    }

    fn record(&mut self, signal: &Signal, path: Path, noise: f64, trigger: f64) -> Record {
        let Path(gain, offset, delay) = path;
        let sample = |i: usize| {
            let value = gain * 5.0 * signal.at(i as f64 - delay - trigger).0 + offset;
            (value + noise * self.dice.normal()) as f32
        };
        let samples = Samples::Numbers((0..SAMPLES).map(sample).collect());
        let (interval_s, end_codes) = (INTERVAL_S, (f64::NEG_INFINITY, f64::INFINITY));
        let (volts_per_code, step_v) = (1.0, 0.1 * noise);
        Record { samples, volts_per_code, zero_v: 0.0, interval_s, start_s: 0.0, end_codes, step_v, averages: 1 }
    }

    /// One acquisition on each range; the old range's trigger comes `early` samples sooner.
    fn repeat(&mut self, signals: &[Signal; 2], early: f64) -> Repeat {
        let (old, new, [old_noise, new_noise]) = (self.old, self.new, self.noise);
        let old = [0, 1].map(|leg| self.record(&signals[leg], old[leg], old_noise, 0.0));
        let new = [0, 1].map(|leg| self.record(&signals[leg], new[leg], new_noise, early));
        compare(&old, &new, &KNOWN).unwrap()
    }

    fn truth([p, n]: [Path; 2]) -> [f64; 3] {
        let gain = n.0 / p.0;
        [(n.2 - p.2) * INTERVAL_S, gain, n.1 - gain * p.1]
    }

    /// A correction on the old range as a deskew would have made it, off by chance.
    fn correction(&mut self) -> Correction {
        let [skew, gain, offset] = Self::truth(self.old);
        let mut off = |value: f64, u: f64| estimate(value + u * self.dice.normal(), u);
        Correction { skew_s: off(skew, 2e-12), gain: off(gain, 5e-5), offset_v: off(offset, 3e-4), gain_offset: 0.0 }
    }
}

fn square(phase: f64) -> Signal {
    Signal::Square { period: 1000.0, rise: 5.0, phase }
}

/// Catches: a bias, a wrong sign, an uncertainty that is too small, in either way. The trigger comes at another time on
/// the new range.
#[test]
fn transfers_cover_the_truth_either_way() {
    let trials = 100;
    for choice in [Choice::Legs, Choice::Common, Choice::Best] {
        let mut covered = [0; 3];
        for seed in 0..trials {
            let mut lab = Lab::new(1_000 + seed);
            let signal = square(77.3);
            let signals = [signal.clone(), signal];
            let repeats: Vec<Repeat> = (0..4).map(|_| lab.repeat(&signals, 0.37)).collect();
            let from = lab.correction();
            let found = transfer(&from, &repeats, None, 0.0, choice).unwrap();
            let truth = Lab::truth(lab.new);
            let all = [found.correction.skew_s, found.correction.gain, found.correction.offset_v];
            for ((count, found), truth) in covered.iter_mut().zip(all).zip(truth) {
                *count += usize::from((found.value - truth).abs() <= 2.0 * found.u);
            }
        }
        // 95.45 % of 100 are 95.5, three standard deviations 6.3. The larger of bound and scatter is stated, so that
        // more may be covered.
        assert!(covered.iter().all(|count| *count >= 89), "{choice:?}: {covered:?} of {trials}");
    }
}

/// The tips on different nodes: only each leg knows itself.
#[test]
fn tips_on_different_nodes_are_compared_leg_by_leg() {
    let mut lab = Lab::new(7);
    let slow = Signal::sine(500.0, 0.4);
    let repeats: Vec<Repeat> = (0..4).map(|_| lab.repeat(&[square(77.3), slow.clone()], 0.2)).collect();
    let from = lab.correction();
    let found = transfer(&from, &repeats, None, 0.0, Choice::Best).unwrap();
    assert_eq!((found.skew_way, found.level_way), (Way::Legs, Way::Legs));
    let truth = Lab::truth(lab.new);
    for (found, truth) in [found.correction.skew_s, found.correction.gain, found.correction.offset_v].iter().zip(truth)
    {
        assert!((found.value - truth).abs() <= 3.0 * found.u, "{found:?} {truth}");
    }
}

#[test]
fn legs_that_see_nothing_in_common_cannot_be_deskewed() {
    let mut lab = Lab::new(8);
    let other = Signal::sine(470.0, 0.4);
    let repeats: Vec<Repeat> = (0..2).map(|_| lab.repeat(&[Signal::sine(333.0, 0.0), other.clone()], 0.0)).collect();
    let from = lab.correction();
    assert_eq!(repeats[0].common, None);
    assert_eq!(transfer(&from, &repeats, None, 0.0, Choice::Common), Err(TransferError::NotCommon));
    assert!(transfer(&from, &repeats, None, 0.0, Choice::Best).is_ok());
    assert_eq!(transfer(&from, &[], None, 0.0, Choice::Best), Err(TransferError::NoRepeats));
}

/// Catches: a deskew on the new range that is believed although the same signal says that the correction is wrong.
#[test]
fn a_correction_that_the_signal_contradicts_is_told_and_not_replaced() {
    let mut lab = Lab::new(9);
    let signal = square(77.3);
    let signals = [signal.clone(), signal];
    let repeats: Vec<Repeat> = (0..4).map(|_| lab.repeat(&signals, 0.0)).collect();
    let right = lab.correction();
    let found = transfer(&right, &repeats, None, 0.0, Choice::Best).unwrap();
    assert_eq!((found.skew_way, found.level_way), (Way::Common, Way::Common));
    assert_eq!(found.disagreements, []);
    let drifted = Correction { gain: estimate(right.gain.value + 0.002, right.gain.u), ..right };
    let found = transfer(&drifted, &repeats, None, 0.0, Choice::Best).unwrap();
    assert_eq!((found.skew_way, found.level_way), (Way::Common, Way::Legs));
    let [told] = found.disagreements[..] else { panic!("{found:?}") };
    assert_eq!(told.quantity, Quantity::Gain);
    assert!((told.apart.value + 0.002).abs() < 4.0 * told.apart.u, "{told:?}");
    // Asked for by name it is taken all the same, and the disagreement is told.
    let found = transfer(&drifted, &repeats, None, 0.0, Choice::Common).unwrap();
    assert_eq!((found.level_way, found.disagreements.len()), (Way::Common, 1));
}

#[test]
fn skew_is_carried_where_that_is_surer_than_measuring() {
    let mut lab = Lab::new(10);
    // Edges of 200 samples tell little of a delay.
    let signal = Signal::Square { period: 1000.0, rise: 200.0, phase: 77.3 };
    let signals = [signal.clone(), signal];
    let repeats: Vec<Repeat> = (0..4).map(|_| lab.repeat(&signals, 0.0)).collect();
    let from = lab.correction();
    let found = transfer(&from, &repeats, Some(1e-12), 0.0, Choice::Legs).unwrap();
    assert_eq!(found.skew_way, Way::Carried);
    assert!((found.correction.skew_s.u - from.skew_s.u.hypot(1e-12)).abs() < 1e-18);
    assert!((found.correction.skew_s.value - from.skew_s.value).abs() < 1e-18);
    // The step is a tenth of the old range's noise; the signal moves by ±5 times itself.
    let expected = 2.0 * 5.0 * signals[0].rms(SAMPLES) / 0.009;
    assert!(found.few_steps.is_none() && (repeats[0].steps / expected - 1.0).abs() < 0.02, "{}", repeats[0].steps);
    let coarse = Repeat { steps: 26.0, ..repeats[1].clone() };
    let found = transfer(&from, &[repeats[0].clone(), coarse], Some(0.0), 0.0, Choice::Legs).unwrap();
    assert_eq!((found.few_steps, found.skew_way), (Some(26.0), Way::Legs));
    let found = transfer(&from, &repeats, Some(1e-9), 0.0, Choice::Legs).unwrap();
    assert_eq!(found.skew_way, Way::Legs);
    assert!(!enough(&found, &from, 0.0, 1e-12));
    assert!(enough(&found, &from, 1.0, 1.0));
}

#[test]
fn clipping_and_flat_legs_are_named() {
    let mut lab = Lab::new(11);
    let flat = Signal::Tones(Vec::new());
    let good = |lab: &mut Lab| [0, 1].map(|leg| lab.record(&square(10.0), lab.old[leg], 0.05, 0.0));
    let (old, mut new) = (good(&mut lab), good(&mut lab));
    new[1] = lab.record(&flat, Path(1.0, 0.0, 0.0), 0.05, 0.0);
    let error = compare(&old, &new, &KNOWN).unwrap_err();
    assert!(matches!(error, TransferError::Leg { leg: "negative", .. }), "{error}");
    assert!(error.to_string().contains("negative leg on the old range"), "{error}");
}
