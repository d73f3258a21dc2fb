//! Monte Carlo: do the intervals of value ± 2u hold the truth as often as they promise (JCGM 101 in spirit)?
#![allow(clippy::unwrap_used)]

use super::FigureKind;
use super::tests::{EDGE_S, PERIOD_S, Scene, gate, of};
use crate::analysis::{Estimate, apply};
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rand_distr::StandardNormal;

/// 300 captures, each corrected with estimates that are wrong by their own standard uncertainties. 95.45 % is nominal;
/// with 300 trials its standard error is 1.2 %, so that 91.9 % is three of them below. No upper end is asserted:
/// terms of second order make the rms safe rather than sharp.
#[test]
fn two_standard_uncertainties_hold_the_truth() {
    let scene = Scene { gain: 0.97, skew_s: 1.6e-9, offset_v: 0.3, noise_v: 0.08, points: 10_000 };
    let mut expected = vec![
        (FigureKind::HighLevel, 12.0),
        (FigureKind::LowLevel, -0.5),
        (FigureKind::Amplitude, 12.5),
        (FigureKind::RiseTime, EDGE_S),
        (FigureKind::FallTime, EDGE_S),
        (FigureKind::Period, PERIOD_S),
        (FigureKind::Duty, 0.4),
        (FigureKind::Overshoot, 0.08),
        (FigureKind::Maximum, 13.0),
        (FigureKind::RiseSlew, 0.8 * 12.5 / EDGE_S),
        (FigureKind::FallSlew, 0.8 * 12.5 / EDGE_S),
        (FigureKind::CommonSlew, 48.0 / (8e-9 * 2.506_628_27)),
    ];
    let mut inside = [0u32; 14];
    let mut rng = ChaCha8Rng::seed_from_u64(2026);
    for seed in 0..300 {
        let records = scene.acquire(seed, gate);
        let mut correction = scene.correction(20e-12, 2e-4, 3e-3);
        let mut wrong = |e: &mut Estimate| e.value += e.u * rng.sample::<f64, _>(StandardNormal);
        wrong(&mut correction.skew_s);
        wrong(&mut correction.gain);
        wrong(&mut correction.offset_v);
        if seed == 0 {
            let corrected = apply::correct(&records.0, &records.1, &correction).unwrap();
            let points = corrected.first..corrected.first + corrected.difference_v.len();
            let valid: Vec<f64> = points.map(|i| gate(1e-9 * i as f64)).collect();
            let n = valid.len() as f64;
            expected.push((FigureKind::Mean, valid.iter().sum::<f64>() / n));
            expected.push((FigureKind::Rms, (valid.iter().map(|v| v * v).sum::<f64>() / n).sqrt()));
        }
        let figures = scene.figures(&records, &correction, 0.0);
        for ((kind, truth), inside) in expected.iter().zip(&mut inside) {
            let f = of(&figures, *kind);
            *inside += u32::from(f.valid && (f.value - truth).abs() <= 2.0 * f.u);
        }
    }
    for ((kind, _), inside) in expected.iter().zip(inside) {
        let share = f64::from(inside) / 300.0;
        assert!(share >= 0.919, "{}: {share}", kind.name());
    }
}
