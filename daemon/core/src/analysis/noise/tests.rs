//! Noise of known size under signals of every kind.

#![allow(clippy::unwrap_used)]

use super::*;
use crate::analysis::skew::signals::{Dice, Signal, Truth};

#[test]
fn repeats_show_the_noise_and_not_the_signal() {
    let signal = Signal::Square { period: 300.0, rise: 5.0, phase: 20.0 };
    let truth = Truth { tau: 0.0, gain: 1.0, offset: 0.4, noise_p: 0.05, noise_n: 0.05 };
    let (first, second) = Dice::new(25).records(&signal, &truth, 20_000);
    // Relative standard error 1/√(2·20000) = 0.5 %.
    assert!((from_repeats(&first, &second).unwrap() / 0.05 - 1.0).abs() < 0.02);
    assert!(from_repeats(&first, &second[1..]).is_none());
    assert!(from_repeats(&[1.0], &[1.0]).is_none());
}

#[test]
fn each_legs_noise_is_found_below_edges_and_tones() {
    let signals = [
        Signal::Square { period: 800.0, rise: 3.0, phase: 20.0 },
        Signal::Pulse { start: 3000.0, width: 500.0, rise: 3.0 },
        Signal::sine(79.4, 0.2),
        Signal::twenty(1.0),
    ];
    for (i, signal) in signals.iter().enumerate() {
        for (noise_p, noise_n) in [(0.1, 0.02), (0.001, 0.003)] {
            let truth = Truth { tau: 0.0, gain: 0.8, offset: 2.0, noise_p, noise_n };
            let (p, n) = Dice::new(30 + i as u64).records(signal, &truth, 8000);
            let found = out_of_band(&p, &n, 0.8).unwrap().unwrap();
            // About 1500 independent bins: 1.3 % of each value, and as much from the common part.
            assert!((found.p_v / noise_p - 1.0).abs() < 0.08, "{i} {found:?}");
            assert!((found.n_v / noise_n - 1.0).abs() < 0.08, "{i} {found:?}");
        }
    }
}

#[test]
fn a_band_full_of_signal_or_a_short_record_says_nothing() {
    let mut dice = Dice::new(26);
    let short: Vec<f64> = (0..100).map(|_| dice.normal()).collect();
    assert_eq!(out_of_band(&short, &short, 1.0).unwrap(), None);
}
