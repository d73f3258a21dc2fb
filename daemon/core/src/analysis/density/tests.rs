#![allow(clippy::unwrap_used)]
use super::*;
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rand_distr::StandardNormal;

/// 3 V of amplitude in the middle of a bin: 3/√2 V rms there, half of it in each neighbour (Hann's main lobe).
#[test]
fn a_sine_shows_its_rms() {
    let (segment, bin) = (1024, 100.0);
    let angle = std::f64::consts::TAU * bin / f64::from(segment);
    let wave: Vec<f64> = (0..10 * segment).map(|i| 1.0 + 3.0 * (angle * f64::from(i) + 0.4).sin()).collect();
    let found = density(&wave, 1e-9, 1024).unwrap().unwrap();
    assert!((found.bin_hz - 1e9 / 1024.0).abs() < 1e-3);
    assert_eq!((found.segment, found.segments), (1024, 19));
    let rms = 3.0 / 2.0f64.sqrt();
    assert!((found.rms[100] - rms).abs() < 1e-6, "{}", found.rms[100]);
    assert!((found.rms[99] - rms / 2.0).abs() < 1e-6 && (found.rms[101] - rms / 2.0).abs() < 1e-6);
    // Half-way between two bins: the window's scallop, 4/(3π) twice over.
    let between: Vec<f64> = (0..10 * segment).map(|i| (angle * 100.5 / 100.0 * f64::from(i)).sin()).collect();
    let found = density(&between, 1e-9, 1024).unwrap().unwrap();
    assert!((found.rms[100] * 2.0f64.sqrt() - 8.0 / (3.0 * std::f64::consts::PI)).abs() < 1e-3, "{}", found.rms[100]);
}

/// White noise of 50 mV rms at 1 GSa/s: 50 mV/√(500 MHz) = 2.236 µV/√Hz, to the 0.4 % that 61 segments' 510 bins leave.
#[test]
fn white_noise_shows_its_density() {
    let mut rng = ChaCha8Rng::seed_from_u64(7);
    let wave: Vec<f64> = (0..31 * 1024).map(|_| 0.05 * rng.sample::<f64, _>(StandardNormal)).collect();
    let found = density(&wave, 1e-9, 1024).unwrap().unwrap();
    let inner = &found.density[2..511];
    let mean = (inner.iter().map(|d| d * d).sum::<f64>() / inner.len() as f64).sqrt();
    let expected = 0.05 / 5e8f64.sqrt();
    assert!((mean / expected - 1.0).abs() < 0.012, "{mean} {expected}");
    // The scales differ by the root of 1.5 bins.
    for (rms, density) in found.rms.iter().zip(&found.density) {
        assert!((rms - density * (NOISE_BANDWIDTH * found.bin_hz).sqrt()).abs() < 1e-12);
    }
}

#[test]
fn segments_fit_the_record() {
    let wave = vec![0.5; 1500];
    let found = density(&wave, 1e-6, 4096).unwrap().unwrap();
    assert_eq!((found.segment, found.segments), (1024, 1));
    assert!(found.rms.iter().all(|x| *x < 1e-9));
    assert_eq!(density(&wave[..15], 1e-6, 4096).unwrap(), None);
    assert_eq!(density(&wave, 1e-6, 1).unwrap().unwrap().segment, SHORTEST);
}

/// tests/reference/figure_vectors.py, spectrum(): scipy.signal.welch of the same samples, both scalings.
#[test]
fn it_is_what_scipy_makes() {
    let text = include_str!("../../../../../tests/reference/vectors/welch.json");
    let vector: serde_json::Value = serde_json::from_str(text).unwrap();
    let list = |key: &str| -> Vec<f64> { serde_json::from_value(vector[key].clone()).unwrap() };
    let interval_s = vector["interval_s"].as_f64().unwrap();
    let found = density(&list("signal"), interval_s, 256).unwrap().unwrap();
    for (ours, theirs) in [(&found.rms, list("rms")), (&found.density, list("density"))] {
        let scale = theirs.iter().copied().fold(0.0, f64::max);
        assert_eq!(ours.len(), theirs.len());
        for (k, (a, b)) in ours.iter().zip(&theirs).enumerate() {
            // The samples pass in single precision.
            assert!((a - b).abs() < 1e-6 * scale, "bin {k}: {a} {b}");
        }
    }
}
