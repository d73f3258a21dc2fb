//! Figures against numpy's and scipy's answers on the same samples (tests/reference/figure_vectors.py).
#![allow(clippy::unwrap_used)]

use super::tests::of;
use super::*;
use crate::analysis::{Correction, harmonics, leak};

/// Levels as plain means away from the transitions, times by crossings on a cubic spline, thresholds by counting on a fine
/// grid: pulse().
#[test]
fn a_pulse_train_is_what_scipy_says() {
    let vector: serde_json::Value =
        serde_json::from_str(include_str!("../../../../../tests/reference/vectors/pulse.json")).unwrap();
    let signal: Vec<f64> = serde_json::from_value(vector["signal"].clone()).unwrap();
    let difference: Vec<f32> = signal.iter().map(|x| *x as f32).collect();
    let interval_s = vector["interval_s"].as_f64().unwrap();
    let corrected = Corrected::of(difference.clone(), vec![0.0; difference.len()], interval_s, 0.0, 1.0);
    let correction = Correction::none();
    let bound = leak::bound(&corrected.common(), interval_s, &correction, &[]);
    let figures = compute(&FigureInput {
        corrected: &corrected,
        plain_v: None,
        correction: &correction,
        leak: &bound,
        noise_p_v: 0.0,
        noise_n_v: 0.0,
        step_p_v: 0.0,
        step_n_v: 0.0,
        scale_spec: 0.0,
        clipped_p: 0,
        clipped_n: 0,
        averages: 1,
        allowance: Allowance::default(),
        asked: Asked { thresholds: Thresholds { high_v: Some(8.0), low_v: Some(1.0) }, ..Asked::default() },
    });
    // Relative to the amplitude for levels, to the value for the rest. Durations are read on an edge smoothed by 0.12 of
    // them, the width taken out for a Gaussian edge, which these are.
    for (kind, within) in [
        (FigureKind::HighLevel, 1e-4),
        (FigureKind::LowLevel, 1e-4),
        (FigureKind::Amplitude, 1e-4),
        (FigureKind::RiseTime, 2e-3),
        (FigureKind::FallTime, 2e-3),
        (FigureKind::RiseSlew, 2e-3),
        (FigureKind::FallSlew, 2e-3),
        (FigureKind::Period, 1e-5),
        (FigureKind::Duty, 1e-4),
        (FigureKind::TimeAbove, 1e-4),
        (FigureKind::TimeBelow, 1e-4),
    ] {
        let truth = vector[kind.name()].as_f64().unwrap();
        let scale = if kind.unit() == crate::units::Unit::Volt { 12.5 } else { truth };
        let found = of(&figures, kind).value;
        assert!((found - truth).abs() <= within * scale, "{}: {found}, scipy has {truth}", kind.name());
    }
}

/// numpy.linalg.lstsq with ten harmonics at the known frequency: harmonics.json.
#[test]
fn distortion_is_what_least_squares_says() {
    let vector: serde_json::Value =
        serde_json::from_str(include_str!("../../../../../tests/reference/vectors/harmonics.json")).unwrap();
    let signal: Vec<f64> = serde_json::from_value(vector["signal"].clone()).unwrap();
    let frequency = vector["periods"].as_f64().unwrap() / signal.len() as f64;
    let power: Vec<f64> = serde_json::from_value(vector["power"].clone()).unwrap();
    let found = harmonics::at(&signal, frequency).unwrap();
    for (phasor, power) in found.phasors.iter().zip(power) {
        assert!((phasor.norm_sqr() - power).abs() < 1e-7, "{phasor} {power}");
    }
    let thd = vector["thd"].as_f64().unwrap();
    assert!((found.distortion(0.0).0 - thd).abs() < 1e-6);
    // With the frequency not told it is found, to what the noise of 0.1 mV leaves.
    let fitted = harmonics::fit(&signal, 1.004 * frequency).unwrap();
    assert!((fitted.frequency / frequency - 1.0).abs() < 1e-6, "{fitted:?}");
    assert!((fitted.distortion(1e-4).0 - thd).abs() < 1e-4);
}
