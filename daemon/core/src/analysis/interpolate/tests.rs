use super::*;

/// Largest `|H(f) − exp(j2πf·advance)|` over the band and over fractions, in dB.
fn worst_error_db(taps: usize) -> f64 {
    let mut worst = 0.0f64;
    for step in 0..=20 {
        let advance = f64::from(step) / 20.0 - 3.0;
        let interpolator = Interpolator::with_taps(advance, taps);
        for bin in 0..=400 {
            let omega = 2.0 * std::f64::consts::PI * BAND * f64::from(bin) / 400.0;
            let (mut re, mut im) = (0.0, 0.0);
            for (k, h) in interpolator.taps.iter().enumerate() {
                let angle = omega * (interpolator.first as f64 + k as f64);
                re += h * angle.cos();
                im += h * angle.sin();
            }
            let angle = omega * advance;
            worst = worst.max((re - angle.cos()).hypot(im - angle.sin()));
        }
    }
    20.0 * worst.log10()
}

#[test]
fn error_stays_below_120_db_in_the_band() {
    let error = worst_error_db(TAPS);
    assert!(error <= -120.0, "{error} dB");
    // A shorter kernel must be worse, or the measure is blind.
    assert!(worst_error_db(28) > -100.0);
}

#[test]
fn bessel_function_has_its_tabulated_values() {
    // Abramowitz and Stegun, table 9.8: e^-x·I0(x) at x = 1 and x = 10, from memory.
    assert!((bessel_i0(1.0) * (-1.0f64).exp() - 0.465_759_607_6).abs() < 1e-9);
    assert!((bessel_i0(10.0) * (-10.0f64).exp() - 0.127_833_337_2).abs() < 1e-9);
}

#[test]
fn a_delayed_sine_is_brought_back() {
    let advance = 2.37;
    let signal: Vec<f64> = (0..400).map(|i| (0.9 * (f64::from(i) - advance)).sin()).collect();
    let interpolator = Interpolator::new(advance);
    let range = interpolator.support(signal.len());
    let output = interpolator.apply(&signal);
    assert_eq!(range.len(), output.len());
    for (i, y) in range.zip(output) {
        assert!((y - (0.9 * i as f64).sin()).abs() < 2e-6, "sample {i}");
    }
}

#[test]
fn a_short_record_has_no_support() {
    assert!(Interpolator::new(0.5).apply(&[1.0; 10]).is_empty());
    assert!(Interpolator::new(-300.5).apply(&[1.0; 100]).is_empty());
    assert!(Interpolator::new(300.5).apply(&[1.0; 100]).is_empty());
}

#[test]
fn between_samples_the_value_is_scipys() {
    // tests/reference/make_vectors.py, interpolation(): scipy.signal.resample, exact for whole periods.
    let file: serde_json::Value =
        serde_json::from_str(include_str!("../../../../../tests/reference/vectors/interpolation.json"))
            .unwrap_or_default();
    let values = |key: &str| -> Vec<f64> {
        file[key].as_array().map(|list| list.iter().filter_map(serde_json::Value::as_f64).collect()).unwrap_or_default()
    };
    let (signal, shifted) = (values("signal"), values("shifted"));
    assert_eq!((signal.len(), shifted.len()), (240, 240));
    let interpolator = Interpolator::new(file["advance"].as_f64().unwrap_or_default());
    let range = interpolator.support(signal.len());
    for (y, expected) in interpolator.apply(&signal).iter().zip(&shifted[range]) {
        // 89 tones of up to 1 V, each −120 dB or better: 89e-6 at the very worst.
        assert!((y - expected).abs() < 2e-5, "{y} {expected}");
    }
}

#[test]
fn the_taps_are_numpys_sinc_times_scipys_window() {
    // tests/reference/make_vectors.py, kernel(): numpy.sinc and scipy.special.i0; on the grid scipy's own Kaiser window.
    let file: serde_json::Value =
        serde_json::from_str(include_str!("../../../../../tests/reference/vectors/kernel.json")).unwrap_or_default();
    let cases = file["cases"].as_array().cloned().unwrap_or_default();
    assert_eq!(cases.len(), 7);
    for case in &cases {
        let expected: Vec<f64> = case["taps"].as_array().into_iter().flatten().filter_map(|tap| tap.as_f64()).collect();
        let interpolator = Interpolator::with_taps(case["advance"].as_f64().unwrap_or(f64::NAN), expected.len());
        let (taps, first) = interpolator.kernel();
        assert_eq!((taps.len(), Some(first as i64)), (expected.len(), case["first"].as_i64()));
        for (tap, expected) in taps.iter().zip(&expected) {
            // Sines of up to 22π, a Bessel function and a division: a few of the last digits of 1.
            assert!((tap - expected).abs() < 2e-15, "{}: {tap} {expected}", case["advance"]);
        }
    }
}
