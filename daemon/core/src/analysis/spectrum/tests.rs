//! Against numpy, and white noise.

#![allow(clippy::unwrap_used)]

use super::*;
use crate::analysis::skew::signals::Dice;

#[test]
fn the_spectrum_is_numpys_and_comes_back() {
    let file: serde_json::Value =
        serde_json::from_str(include_str!("../../../../../tests/reference/vectors/rfft.json")).unwrap();
    let values = |key: &str| file[key].as_array().unwrap().iter().map(|x| x.as_f64().unwrap()).collect::<Vec<f64>>();
    let signal = values("signal");
    let fourier = Fourier::new(signal.len());
    let mut spectrum = fourier.forward(&mut signal.clone()).unwrap();
    assert_eq!(spectrum.len(), values("real").len());
    for ((bin, re), im) in spectrum.iter().zip(values("real")).zip(values("imaginary")) {
        assert!((bin.re - re).abs() < 1e-12 && (bin.im - im).abs() < 1e-12, "{bin} {re} {im}");
    }
    let back = fourier.inverse(&mut spectrum).unwrap();
    assert!(back.iter().zip(&signal).all(|(a, b)| (a - b).abs() < 1e-14));
}

#[test]
fn another_length_is_an_error_not_a_panic() {
    let fourier = Fourier::new(16);
    assert_eq!(fourier.forward(&mut [0.0; 15]).unwrap_err().length, 16);
    assert!(fourier.inverse(&mut [Complex::new(0.0, 0.0); 3]).is_err());
}

#[test]
fn fast_lengths_have_small_factors_only() {
    for (asked, given) in [(0, 2), (2, 2), (7, 8), (241, 250), (1_000_000, 1_000_000), (1_015_625, 1_024_000)] {
        assert_eq!(fast_length(asked), given, "{asked}");
    }
}

#[test]
fn white_noise_has_its_variance_in_every_part_of_the_spectrum() {
    let mut dice = Dice::new(21);
    let noise: Vec<f64> = (0..10_007).map(|_| 5.0 + 0.3 * dice.normal()).collect();
    let (spectrum, length) = hann(&noise).unwrap();
    assert!(length >= noise.len());
    for part in spectrum[10..5000].chunks_exact(1247) {
        let power = part.iter().map(|bin| bin.norm_sqr()).sum::<f64>() / part.len() as f64;
        // Neighbouring bins share noise under the window: about 640 independent values, 4 % each.
        assert!((power / 0.09 - 1.0).abs() < 0.16, "{power}");
    }
}

#[test]
fn cosines_by_rotation_are_cosines() {
    for (k, value) in cosines(0.3, 0.0123).take(1000).enumerate() {
        assert!((value - (0.3 + 0.0123 * k as f64).cos()).abs() < 2e-14, "{k}");
    }
}
