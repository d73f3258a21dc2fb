use super::*;

#[test]
fn forward_and_inverse_undo_each_other() {
    for points in [7, 64, 101, 1000] {
        let signal: Vec<f64> = (0..points).map(|i| (0.3 * i as f64).sin() + 0.1 * i as f64).collect();
        let back = inverse(forward(signal.clone()), points);
        assert!(signal.iter().zip(&back).all(|(a, b)| (a - b).abs() < 1e-12 * points as f64));
    }
}

#[test]
fn the_window_leaks_less_than_92_db_and_has_its_noise_bandwidth() {
    let w = window(512);
    let bandwidth = 512.0 * w.iter().map(|w| w * w).sum::<f64>() / w.iter().sum::<f64>().powi(2);
    assert!((bandwidth - NOISE_BANDWIDTH).abs() < 0.01, "{bandwidth}");
    // A sine half-way between two bins: everything outside the main lobe is below −92 dB of its top.
    let sine: Vec<f64> = (0..512).map(|i| (std::f64::consts::TAU * 100.5 * f64::from(i) / 512.0).sin()).collect();
    let mut transform = Transform::new(512);
    transform.both(&sine, &sine, 0);
    let power: Vec<f64> = transform.first.iter().map(|x| f64::from(x.norm())).collect();
    assert_eq!(transform.first, transform.second);
    let top = power.iter().copied().fold(0.0, f64::max);
    for (k, x) in power.iter().enumerate() {
        if (k as f64 - 100.5).abs() > LOBE as f64 + 0.5 {
            assert!(20.0 * (x / top).log10() < -91.0, "bin {k}");
        }
    }
}

#[test]
fn fast_lengths_have_small_factors_and_are_near() {
    assert_eq!((fast_up_to(1000), fast_from(1000)), (1000, 1000));
    assert_eq!((fast_up_to(999_957), fast_from(999_957)), (995_328, 1_000_000));
    assert_eq!((fast_up_to(7), fast_from(7)), (6, 8));
}
