#![allow(clippy::unwrap_used)]
use super::*;
use crate::analysis::Estimate;
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, Normal};

fn correction(u_gain: f64, u_skew_s: f64, u_offset_v: f64) -> Correction {
    Correction {
        skew_s: Estimate { value: 0.0, u: u_skew_s },
        gain: Estimate { value: 1.0, u: u_gain },
        offset_v: Estimate { value: 0.0, u: u_offset_v },
        gain_offset: 0.0,
    }
}

fn band(frequency_hz: f64, after_db: f64) -> RejectionBand {
    RejectionBand { frequency_hz, before_db: 30.0, after_db, floor_db: 90.0, at_least: false, bins: 3 }
}

/// 10 V of cosine, 64 whole periods of 50 samples of 1 ns: 20 MHz; its mirror image continues it smoothly.
fn cosine(offset: f64) -> Vec<f64> {
    (0..3200).map(|i| offset + 10.0 * (std::f64::consts::TAU * (f64::from(i) + 0.5) / 50.0).cos()).collect()
}

#[test]
fn a_sine_leaks_its_amplitude_times_the_residual() {
    // Gain alone: 2·u_g; skew alone: 2·2πf·u_τ.
    let found = bound(&cosine(0.0), 1e-9, &correction(1e-3, 0.0, 0.0), &[]);
    assert!((found.peak_v - 10.0 * 2e-3).abs() < 1e-6, "{found:?}");
    assert!((found.rms_v - 10.0 * 2e-3 / 2.0f64.sqrt()).abs() < 1e-6, "{found:?}");
    // The samples pass in single precision, 2⁻²⁴ of 10 V each.
    assert!((found.common_rms_v - 10.0 / 2.0f64.sqrt()).abs() < 1e-6);
    assert!((found.common_swing_v - 20.0).abs() < 0.01, "{found:?}");
    assert!(found.mean_v < 1e-9);
    let found = bound(&cosine(0.0), 1e-9, &correction(0.0, 1e-12, 0.0), &[]);
    let expected = 10.0 * 2.0 * std::f64::consts::TAU * 20e6 * 1e-12;
    assert!((found.peak_v - expected).abs() < 1e-6 * expected + 1e-9, "{found:?} {expected}");
}

#[test]
fn the_larger_of_verification_and_uncertainty_counts() {
    let uncertainty = correction(1e-3, 0.0, 0.0);
    let found = bound(&cosine(0.0), 1e-9, &uncertainty, &[band(1e6, 80.0), band(1e8, 40.0)]);
    // At 20 MHz: 80 − 40·log10(20)/2 = 53.98 dB; 2·10⁻³ is 53.98 dB too, to three digits.
    let expected = 10.0f64.powf(-(80.0 - 20.0 * 20.0f64.log10()) / 20.0).max(2e-3);
    assert!((found.peak_v - 10.0 * expected).abs() < 1e-4 * found.peak_v, "{found:?} {expected}");
    let worse = bound(&cosine(0.0), 1e-9, &uncertainty, &[band(1e6, 40.0)]);
    // One band: flat below, proportional to f above.
    assert!((worse.peak_v - 10.0 * 0.01 * 20.0).abs() < 1e-4, "{worse:?}");
    let flat = bound(&cosine(0.0), 1e-9, &uncertainty, &[band(5e7, 40.0)]);
    assert!((flat.peak_v - 0.1).abs() < 1e-5, "{flat:?}");
}

#[test]
fn the_part_at_zero_frequency_adds_up() {
    let found = bound(&cosine(30.0), 1e-9, &correction(1e-3, 0.0, 0.05), &[]);
    // Independent errors of gain and offset: 2·√((30 V·10⁻³)² + (50 mV)²).
    assert!((found.mean_v - f64::hypot(30.0 * 2e-3, 0.1)).abs() < 1e-8, "{found:?}");
    assert!((found.peak_v - (found.mean_v + 0.02)).abs() < 1e-5);
    assert!((found.rms_v - found.mean_v.hypot(0.02 / 2.0f64.sqrt())).abs() < 1e-6);
}

/// The bound must hold for real residuals: a gain error and a skew error inside their k = 2, on steep edges, with a
/// record whose ends differ.
#[test]
fn real_residuals_stay_below_the_bound() {
    let edge = |x: f64| 30.0 * (0.5 + 0.5 * (x / 3.0).tanh());
    let node = |t: f64| edge(t - 300.0) - edge(t - 900.0) + edge(t - 1500.0);
    let common: Vec<f64> = (0..2000).map(|i| node(f64::from(i))).collect();
    let uncertainty = correction(2e-3, 20e-12, 0.0);
    let found = bound(&common, 1e-9, &uncertainty, &[]);
    for (gain, skew_ns) in [(4e-3, 0.0), (0.0, 0.04), (-3e-3, 0.025), (3e-3, 0.025)] {
        let leak: Vec<f64> =
            (0..2000).map(|i| node(f64::from(i)) - (1.0 + gain) * node(f64::from(i) - skew_ns)).collect();
        let rms = (leak.iter().map(|x| x * x).sum::<f64>() / 2000.0).sqrt();
        let peak = leak.iter().fold(0.0f64, |m, x| m.max(x.abs()));
        assert!(rms <= found.rms_v * 1.001 && peak <= found.peak_v, "{gain} {skew_ns}: {rms} {peak} {found:?}");
        // And it is a bound of use: not more than five times what the worst of these does.
        assert!(found.peak_v < 5.0 * 0.12 + 5.0 * peak.max(0.12), "{found:?} {peak}");
    }
    assert!(found.rms_v < 0.2 && found.peak_v < 0.8, "{found:?}");
}

#[test]
fn nothing_in_nothing_out() {
    assert_eq!(bound::<[f32]>(&[], 1e-9, &Correction::none(), &[]).rms_v.to_bits(), 0.0f64.to_bits());
    let quiet = bound(&[0.0; 50], 1e-9, &Correction::none(), &[band(1e6, 60.0)]);
    assert!(quiet.rms_v.abs() < 1e-15 && quiet.peak_v.abs() < 1e-15);
}

/// A long record in segments against the same one transformed as a whole: edges of a node, noise, and a slow drift.
#[test]
fn segments_give_what_the_whole_gives() {
    let mut rng = ChaCha8Rng::seed_from_u64(5);
    let normal = Normal::new(0.0, 0.05).unwrap();
    let points = 100_000;
    let step = |x: f64| 0.5 + 0.5 * (x / 4.0).tanh();
    let common: Vec<f64> = (0..points)
        .map(|i| {
            let t = f64::from(i);
            let node = step(t - 20_000.3) - step(t - 45_000.0) + step(t - 61_440.0) - step(t - 99_000.0);
            48.0 * node + 2.0 * (t / 15_000.0).sin() + normal.sample(&mut rng)
        })
        .collect();
    let mean = common.iter().sum::<f64>() / f64::from(points);
    for (correction, bands) in [
        (correction(1e-3, 0.0, 0.0), vec![]),
        (correction(1e-4, 10e-12, 0.0), vec![]),
        (correction(1e-5, 1e-12, 0.0), vec![band(1e4, 80.0), band(1e6, 70.0), band(1e7, 50.0)]),
    ] {
        let points: Vec<(f64, f64)> = bands.iter().map(|b| (b.frequency_hz, b.after_db)).collect();
        let residual = |f: f64| interpolated(&points, f).max(residual_of_uncertainty(&correction, f));
        let wave: Vec<f64> = common.iter().map(|c| c - mean).collect();
        let (a, b, power) = quadrature(wave, 1e-9, &residual);
        let peak = a.iter().zip(&b).map(|(a, b)| a.hypot(*b)).fold(0.0, f64::max);
        let found = long::filtered(&common, 1e-9, mean, 0.05, &residual);
        // Measured: within 0.8 % (rms) and 0.6 % (peak).
        assert!((found.rms / power.sqrt() - 1.0).abs() < 0.02, "{} {}", found.rms, power.sqrt());
        assert!((found.peak / peak - 1.0).abs() < 0.03, "{} {peak}", found.peak);
    }
}

/// JCGM 100, equation 16, worked by hand: 30 V of mean, u(g) = 0.1 %, u(o) = 50 mV and a correlation of −0.8 leave
/// 2·√(0.03² + 0.05² − 2·0.8·0.03·0.05) V; drift of ±0.3 % and ±60 mV adds (0.09² + 0.06²)/3 to the variance.
#[test]
fn correlation_and_drift_count_at_zero_frequency() {
    let together = Correction { gain_offset: -0.8, ..correction(1e-3, 0.0, 0.05) };
    let found = bound(&cosine(30.0), 1e-9, &together, &[]);
    let variance: f64 = 0.0009 + 0.0025 - 2.0 * 0.8 * 0.0015;
    assert!((found.mean_v - 2.0 * variance.sqrt()).abs() < 1e-8, "{found:?}");
    let drift = Drift { gain: 3e-3, skew_s: 0.0, offset_v: 0.06 };
    let found = bound_with(&cosine(30.0), 1e-9, &together, &[], &Beyond::default(), &drift);
    let drifted = variance + (0.0081 + 0.0036) / 3.0;
    assert!((found.mean_v - 2.0 * drifted.sqrt()).abs() < 1e-8, "{found:?}");
    // Where a verification says more about the gain, what is left of the offset is what the gain does not tell of it.
    let verified = bound(&cosine(30.0), 1e-9, &together, &[band(1e6, 40.0)]);
    assert!((verified.mean_v - (0.3 + 2.0 * 0.05 * 0.6)).abs() < 1e-8, "{verified:?}");
}

/// At 20 MHz: 2·√((0.2 %)²/3 + (2πf·30 ps)²/3) of 10 V.
#[test]
fn drift_widens_the_residual() {
    let drift = Drift { gain: 2e-3, skew_s: 30e-12, offset_v: 0.0 };
    let found = bound_with(&cosine(0.0), 1e-9, &correction(0.0, 0.0, 0.0), &[], &Beyond::default(), &drift);
    let expected = 20.0 / 3.0f64.sqrt() * f64::hypot(2e-3, std::f64::consts::TAU * 20e6 * 30e-12);
    assert!((found.peak_v - expected).abs() < 1e-5, "{found:?} {expected}");
}
