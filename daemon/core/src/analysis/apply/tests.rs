#![allow(clippy::unwrap_used, clippy::float_cmp)]
use super::*;
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
            assert!((d - 0.5).abs() < 4e-5, "{d}");
            let t = start_p + 1e-9 * (corrected.first + k) as f64;
            assert!((corrected.negative_v[k] - common(t)).abs() < 4e-5);
            assert!((corrected.common_v[k] - common(t) - 0.25).abs() < 4e-5);
        }
        assert!((corrected.start_s - start_p - 1e-9 * corrected.first as f64).abs() < 1e-18);
        assert!(corrected.noise_gain > 0.8 && corrected.noise_gain <= 1.0);
        assert!(corrected.difference_v.len() >= 500 - 60);
    }
}

#[test]
fn the_slope_is_what_the_difference_changes_per_second_of_skew() {
    let p = record((0..400).map(|i| common(1e-9 * f64::from(i))), 0.0);
    let a = correct(&p, &p, &correction(0.0, 1.0, 0.0)).unwrap();
    let b = correct(&p, &p, &correction(1e-12, 1.0, 0.0)).unwrap();
    let slope = a.negative_slope();
    for (k, slope) in slope.iter().enumerate().take(300).skip(2) {
        let change = (b.difference_v[k] - a.difference_v[k]) / 1e-12;
        // The five-point formula is good to ω⁴/30 = 2.2 % of the 0.9 rad part: 7 V · 0.9e9 · 0.022.
        assert!((change + slope).abs() < 0.022 * 7.0 * 0.9e9 + 1e-3 * 2e10, "{change} {slope}");
    }
}

#[test]
fn plain_subtraction_takes_the_nearest_sample() {
    let p = record((0..100).map(f64::from), 0.0);
    let same = record((0..100).map(|i| f64::from(i) - 2.0), 0.0);
    assert_eq!(plain(&p, &same).unwrap(), vec![2.0; 100]);
    let later = record((0..100).map(|i| f64::from(i) + 3.0), 3.2e-9);
    assert_eq!(plain(&p, &later).unwrap(), vec![0.0; 97]);
    let earlier = record((0..100).map(|i| f64::from(i) - 3.0), -2.9e-9);
    assert_eq!(plain(&p, &earlier).unwrap(), vec![0.0; 97]);
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
