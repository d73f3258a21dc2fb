#![allow(clippy::unwrap_used, clippy::float_cmp)]
use super::*;
use crate::analysis::interpolate::TAPS;
use crate::analysis::{Estimate, Samples};

fn record(values: impl Iterator<Item = f64>, start_s: f64) -> Record {
    Record {
        samples: Samples::Numbers(values.map(|v| v as f32).collect()),
        volts_per_code: 1.0,
        zero_v: 0.0,
        interval_s: 1e-9,
        start_s,
        end_codes: (-1e9, 1e9),
        step_v: 0.0,
        averages: 1,
    }
}

fn correction(skew_s: f64, gain: f64, offset_v: f64) -> Correction {
    let exact = |value| Estimate { value, u: 0.0 };
    Correction { skew_s: exact(skew_s), gain: exact(gain), offset_v: exact(offset_v), gain_offset: 0.0 }
}

/// Band-limited common signal plus a difference that only the positive leg sees.
fn common(t: f64) -> f64 {
    20.0 * (0.21e9 * t).sin() + 7.0 * (0.9e9 * t).cos()
}

#[test]
fn the_difference_comes_out_as_it_went_in() {
    let (skew, gain, offset) = (2.3e-9, 0.97, 0.4);
    for (start_p, start_n) in [(0.0, 0.0), (-1e-7, -1e-7), (-1e-7, -1e-7 + 1.7e-9), (0.0, -4.2e-9)] {
        let p = record((0..500).map(|i| common(start_p + 1e-9 * f64::from(i)) + 0.5), start_p);
        let n = record((0..500).map(|i| gain * common(start_n + 1e-9 * f64::from(i) - skew) + offset), start_n);
        let corrected = correct(&p, &n, &correction(skew, gain, offset)).unwrap();
        // 20 V and 7 V at −120 dB, and the f32 samples' own 24 bits.
        for (k, d) in corrected.difference_v.iter().enumerate() {
            assert!((f64::from(*d) - 0.5).abs() < 4e-5, "{d}");
            let t = start_p + 1e-9 * (corrected.first + k) as f64;
            assert!((f64::from(corrected.negative_v[k]) - common(t)).abs() < 4e-5);
            assert!((corrected.common().at(k) - common(t) - 0.25).abs() < 4e-5);
        }
        assert!((corrected.start_s - start_p - 1e-9 * corrected.first as f64).abs() < 1e-18);
        assert!(corrected.noise_gain > 0.8 && corrected.noise_gain <= 1.0);
        assert!(corrected.difference_v.len() >= 500 - 60);
    }
}

#[test]
fn the_slope_is_what_the_difference_changes_per_second_of_skew() {
    let p = record((0..400).map(|i| common(1e-9 * f64::from(i))), 0.0);
    let middle = correct(&p, &p, &correction(0.0, 1.0, 0.0)).unwrap();
    let a = correct(&p, &p, &correction(-1e-11, 1.0, 0.0)).unwrap();
    let b = correct(&p, &p, &correction(1e-11, 1.0, 0.0)).unwrap();
    for k in 2..300 {
        // Whole and fractional part of the shift may begin at different samples.
        let at = |c: &Corrected| f64::from(c.difference_v[k + middle.first - c.first]);
        let slope = middle.slope().at(k);
        let change = (at(&b) - at(&a)) / 2e-11;
        // The five-point formula is good to ω⁴/30 = 2.2 % of the 0.9 rad part: 7 V · 0.9e9 · 0.022.
        assert!((change + slope).abs() < 0.022 * 7.0 * 0.9e9 + 1e-3 * 2e10, "{change} {slope}");
    }
}

#[test]
fn plain_subtraction_takes_the_nearest_sample() {
    let p = record((0..100).map(f64::from), 0.0);
    let same = record((0..100).map(|i| f64::from(i) - 2.0), 0.0);
    let all = |plain: Plain<'_>| -> Vec<f64> { (0..plain.points()).map(|i| plain.at(i)).collect() };
    assert_eq!(all(plain(&p, &same).unwrap()), vec![2.0; 100]);
    let later = record((0..100).map(|i| f64::from(i) + 3.0), 3.2e-9);
    assert_eq!(all(plain(&p, &later).unwrap()), vec![0.0; 97]);
    let earlier = record((0..100).map(|i| f64::from(i) - 3.0), -2.9e-9);
    assert_eq!(all(plain(&p, &earlier).unwrap()), vec![0.0; 97]);
}

#[test]
fn records_that_do_not_belong_together_are_refused() {
    let p = record((0..200).map(f64::from), 0.0);
    let none = Correction::none();
    let mut n = p.clone();
    n.interval_s = 1.001e-9;
    assert!(matches!(correct(&p, &n, &none), Err(ApplyError::Intervals { .. })));
    let n = record((0..199).map(f64::from), 0.0);
    assert!(matches!(correct(&p, &n, &none), Err(ApplyError::Lengths { positive: 200, negative: 199 })));
    let n = record((0..200).map(|i| if i == 7 { f64::NAN } else { 0.0 }), 0.0);
    let error = correct(&p, &n, &none).unwrap_err();
    assert_eq!(error, ApplyError::NotFinite { leg: "negative", what: "sample 7".to_owned() });
    assert!(matches!(correct(&p, &p, &correction(190e-9, 1.0, 0.0)), Err(ApplyError::TooShort { .. })));
    assert!(matches!(correct(&p, &p, &correction(1.0, 1.0, 0.0)), Err(ApplyError::TooShort { .. })));
    assert!(matches!(correct(&p, &p, &correction(f64::NAN, 1.0, 0.0)), Err(ApplyError::TooShort { .. })));
    assert!(matches!(correct(&p, &p, &correction(0.0, 0.0, 0.0)), Err(ApplyError::Gain { .. })));
    let short = record((0..10).map(f64::from), 0.0);
    assert!(matches!(plain(&short, &short), Err(ApplyError::TooShort { valid: 10, .. })));
    let mut odd = p.clone();
    odd.interval_s = 0.0;
    assert!(matches!(plain(&odd, &p), Err(ApplyError::NotFinite { leg: "positive", .. })));
}

/// The pass in single precision against the same sums in double precision, on codes and on numbers with a large constant.
#[test]
fn the_fused_pass_agrees_with_double_precision() {
    let volts = |i: i32| 20.0 * (0.21 * f64::from(i)).sin() + 7.0 * (0.9 * f64::from(i)).cos();
    let codes = |phase: f64| Samples::Codes((0..5003).map(|i| (volts(i) * 900.0 + phase) as i16).collect());
    let mut p = record((0..5003).map(|i| 350.0 + volts(i)), 0.0);
    let mut n = record((0..5003).map(|i| 350.0 + 0.9 * volts(i)), 0.0);
    for coded in [false, true] {
        if coded {
            (p.samples, n.samples) = (codes(0.0), codes(5.0));
            (p.volts_per_code, n.volts_per_code, n.zero_v) = (1.0 / 900.0, 1.1 / 900.0, -3.0);
        }
        let by = correction(1.37e-9, 0.97, 0.4);
        let found = correct(&p, &n, &by).unwrap();
        let interpolator = Interpolator::new(1.37);
        let slow: Vec<f64> = interpolator.apply(&n.volts()).iter().map(|v| (v - 0.4) / 0.97).collect();
        assert_eq!((slow.len(), found.difference_v.len()), (5003 - TAPS + 1, 5003 - TAPS + 1));
        let positive = &p.volts()[found.first..];
        let difference: Vec<f64> = positive.iter().zip(&slow).map(|(p, n)| p - n).collect();
        // Single precision at 350 V is 3e-5 V. In codes the largest is 30 V: measured 1.2e-5 V, −128 dB of it.
        let within = if coded { 2e-5 } else { 6e-5 };
        for (k, d) in difference.iter().enumerate() {
            assert!((f64::from(found.difference_v[k]) - d).abs() < within, "{k}: {} {d}", found.difference_v[k]);
        }
        let mean = |of: &dyn Fn(usize) -> f64| (0..slow.len()).map(of).sum::<f64>() / slow.len() as f64;
        let slope = |i: usize| {
            let i = i.clamp(2, slow.len() - 3);
            (8.0 * (slow[i + 1] - slow[i - 1]) - (slow[i + 2] - slow[i - 2])) / 12e-9
        };
        let m = found.moments();
        let close = |found: f64, expected: f64, size: f64| {
            assert!((found - expected).abs() <= 3e-6 * size, "{found} {expected}");
        };
        close(m.d, mean(&|i| difference[i]), 50.0);
        close(m.n, mean(&|i| slow[i]), 350.0);
        close(m.s, mean(&slope), 1e10);
        close(m.dd, mean(&|i| difference[i].powi(2)), 350.0);
        close(m.nn, mean(&|i| slow[i].powi(2)), 350.0 * 350.0);
        close(m.ss, mean(&|i| slope(i).powi(2)), 1e20);
        close(m.dn, mean(&|i| difference[i] * slow[i]), 350.0 * 50.0);
        close(m.ds, mean(&|i| difference[i] * slope(i)), 50.0 * 1e10);
        close(m.ns, mean(&|i| slow[i] * slope(i)), 350.0 * 1e10);
        close(m.common_square(), mean(&|i| (slow[i] + 0.5 * difference[i]).powi(2)), 350.0 * 350.0);
        close(m.common(), mean(&|i| slow[i] + 0.5 * difference[i]), 350.0);
        let again = Corrected::of(found.difference_v.to_vec(), found.negative_v.to_vec(), 1e-9, 0.0, 1.0).moments();
        close(again.ds, m.ds, 50.0 * 1e10);
        close(again.nn, m.nn, 350.0 * 350.0);
    }
}

/// One thread and two give the same bits; sections, chunks and blocks that are not full are among them.
#[test]
fn two_threads_give_the_same_bits() {
    for points in [150_043, 131_072 + 43, 65_536 + 44, 65_536 + 1024 + 44, 700] {
        let codes = |scale: f64| {
            let code = |i: usize| (scale * (9000.0 * (0.01 * i as f64).sin() + 700.0 * (1.9 * i as f64).cos())) as i16;
            Samples::Codes((0..points).map(code).collect())
        };
        let mut p = record([0.0].into_iter(), 0.0);
        p.volts_per_code = 1e-3;
        let mut n = p.clone();
        (p.samples, n.samples) = (codes(1.0), codes(0.97));
        let interpolator = Interpolator::new(2.3);
        let valid = interpolator.support(points);
        let task = fused::Task {
            p: &p,
            n: &n,
            interpolator: &interpolator,
            gain: 0.97,
            offset_v: 0.1,
            summed: true,
            valid: valid.clone(),
        };
        let (one, two) = (fused::pass_by(&task, 1), fused::pass_by(&task, 2));
        assert_eq!(one.difference_v.len(), valid.len());
        assert!(one.difference_v == two.difference_v && one.negative_v == two.negative_v);
        assert_eq!(one.sums, two.sums);
        assert_eq!(one.outlines, two.outlines);
        // What is made of the finished waveforms agrees: the outlines to the bit, the sums to their rounding.
        let whole = Corrected::of(one.difference_v.to_vec(), one.negative_v.to_vec(), 1e-9, 0.0, 1.0);
        assert_eq!(whole.outlines, one.outlines);
        let (a, b) = (whole.moments(), one.sums.moments(1e-9));
        assert!((a.ns - b.ns).abs() <= 1e-9 * (a.nn * a.ss).sqrt() && (a.s - b.s).abs() <= 1e-9 * a.ss.sqrt());
        assert!((a.dd / b.dd - 1.0).abs() < 1e-9 && (a.nn / b.nn - 1.0).abs() < 1e-9);
    }
}

/// The memory of a waveform is used again, never its samples.
#[test]
fn kept_memory_holds_nothing() {
    let before = Wave::from(vec![7.0; 200_000]);
    drop(before);
    let mut after = Wave::with_capacity(150_000);
    assert!(after.is_empty());
    after.extend(&[1.0, 2.0]);
    assert_eq!(after.clone().into_vec(), vec![1.0, 2.0]);
    assert_eq!(after.points(), 2);
}
