#![allow(clippy::unwrap_used)]
use super::*;
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, Normal};

fn noisy(seed: u64, sd: f64, signal: impl Iterator<Item = f64>) -> Vec<f64> {
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    let normal = Normal::new(0.0, sd).unwrap();
    signal.map(|x| x + normal.sample(&mut rng)).collect()
}

fn cosine(period: f64, points: i32) -> impl Iterator<Item = f64> {
    (0..points).map(move |i| (std::f64::consts::TAU * (f64::from(i) - 313.3) / period).cos())
}

#[test]
fn the_top_of_a_sine_without_noise() {
    let signal: Vec<f64> = cosine(500.0, 700).collect();
    let (low, high) = extremes(&signal, 0.0);
    assert!((high.value - 1.0).abs() < 1e-4 && (low.value + 1.0).abs() < 1e-4, "{low:?} {high:?}");
    assert!((high.position - 313.3).abs() < 2.0);
}

/// 200 seeds at 26 dB: the highest sample would be 2.5 sd too high; the fit is within a few of its own u.
#[test]
fn noise_does_not_lift_the_top() {
    let mut bias = 0.0;
    let mut inside = 0;
    for seed in 0..200 {
        let signal = noisy(seed, 0.05, cosine(500.0, 620));
        let high = highest(&signal, 0..620, 0.05);
        bias += (high.value - 1.0) / 200.0;
        inside += usize::from((high.value - 1.0).abs() <= 2.0 * high.u);
    }
    // The raw maximum of so many samples would be off by 0.1.
    assert!(bias.abs() < 0.012, "{bias}");
    assert!(inside >= 170, "{inside}");
}

#[test]
fn a_flat_stretch_reads_its_level() {
    let signal = noisy(5, 0.05, (0..2000).map(|_| 3.0));
    let (low, high) = extremes(&signal, 0.05);
    assert!((high.value - 3.0).abs() < 0.03 && (low.value - 3.0).abs() < 0.03, "{low:?} {high:?}");
}

#[test]
fn a_sharp_top_is_not_flattened() {
    let signal: Vec<f64> = (0..400).map(|i| (-((f64::from(i) - 200.4) / 3.0).powi(2)).exp()).collect();
    let high = highest(&signal, 0..400, 1e-3);
    assert!((high.value - 1.0).abs() < 0.02, "{high:?}");
}

#[test]
fn noise_is_found_under_a_waveform() {
    let signal = noisy(9, 0.02, cosine(60.0, 20_000));
    assert!((noise_of(&signal) / 0.02 - 1.0).abs() < 0.05);
    assert!(noise_of(&[1.0, 2.0]).abs() < 1e-300);
}

#[test]
fn short_and_empty_ranges() {
    assert!(highest::<[f64]>(&[], 0..0, 1.0).value.abs() < 1e-300);
    assert!((highest(&[1.0, 4.0, 2.0], 0..3, 0.1).value - 4.0).abs() < 1e-12);
    assert!((lowest(&[1.0, 4.0, 2.0], 1..3, 0.1).value - 2.0).abs() < 1e-12);
}
