//! Against GTC (PyPI, the GUM Tree Calculator): the same budget of a mean and an rms, by automatic differentiation
//! through every sample. `tests/reference/uncertainty.py` makes the file.
#![allow(clippy::unwrap_used)]

use super::tests::of;
use super::*;
use crate::analysis::leak::LeakBound;
use crate::analysis::signal::Signal;
use crate::analysis::{Correction, Estimate, budget};

#[test]
fn every_term_of_mean_and_rms_is_gtcs() {
    let text = include_str!("../../../../../tests/reference/vectors/budget.json");
    let file: serde_json::Value = serde_json::from_str(text).unwrap();
    let number = |key: &str| file[key].as_f64().unwrap();
    let list = |key: &str| file[key].as_array().unwrap().iter().map(|x| x.as_f64().unwrap()).collect::<Vec<f64>>();
    let single = |key: &str| list(key).iter().map(|x| *x as f32).collect::<Vec<f32>>();
    let corrected = Corrected::of(single("difference"), single("negative"), number("interval_s"), 0.0, 1.0);
    let correction = Correction {
        skew_s: Estimate { value: 0.0, u: number("u_skew_s") },
        gain: Estimate { value: number("gain"), u: number("u_gain") },
        offset_v: Estimate { value: number("offset_v"), u: number("u_offset_v") },
        gain_offset: number("gain_offset"),
    };
    let figures = compute(&FigureInput {
        corrected: &corrected,
        plain_v: None,
        correction: &correction,
        leak: &LeakBound { rms_v: 0.0, peak_v: 0.0, mean_v: 0.0, common_rms_v: 0.0, common_swing_v: 0.0 },
        noise_p_v: number("noise_p_v"),
        noise_n_v: number("noise_n_v"),
        step_p_v: 0.0,
        step_n_v: 0.0,
        scale_spec: number("scale_spec"),
        clipped_p: 0,
        clipped_n: 0,
        averages: 1,
        allowance: Allowance::default(),
        asked: Asked::default(),
    });
    for (kind, name) in [(FigureKind::Mean, "mean"), (FigureKind::Rms, "rms")] {
        let expected = &file[name];
        let figure = of(&figures, kind);
        // The noise power that is taken off the rms is 6·10⁻⁹ of its square; GTC leaves it in.
        let near = |found: f64, key: &str, relative: f64| {
            let expected = expected[key].as_f64().unwrap();
            assert!((found - expected).abs() <= relative * expected, "{name}: {key} {found} {expected}");
        };
        near(figure.value, "value", 1e-8);
        for term in ["noise", "gain", "skew", "offset", "scale"] {
            let found = figure.budget.iter().find(|t| t.name == term).unwrap();
            // Difference times slope has either sign on a swinging node: what single-precision sums round off counts
            // against the sum of magnitudes (see `apply::sums`).
            let cancels = if (name, term) == ("rms", "skew") { cancellation(&corrected) } else { 0.0 };
            near(found.u, term, 2e-8 + 4.0 * 2f64.powi(-24) * cancels);
        }
        // GTC's sum knows no second order.
        let first: Vec<_> = figure.budget.iter().filter(|t| t.name != "common mode").copied().collect();
        near(budget::combined(&first), "u", 2e-8);
        let shares: f64 = budget::shares(&figure.budget).iter().sum();
        assert!((shares - 1.0).abs() < 1e-12, "{shares}");
        // The correlation is what makes this budget smaller than its gain term alone.
        let gain = figure.budget.iter().find(|t| t.name == "gain").unwrap();
        assert!(figure.u < gain.u && gain.correlated.is_some_and(|c| c.with == "offset" && c.coefficient < 0.0));
    }
}

/// `Σ|D·N'| / |Σ D·N'|`.
fn cancellation(corrected: &Corrected) -> f64 {
    let slope = corrected.slope();
    let products = corrected.difference_v.iter().enumerate().map(|(i, d)| f64::from(*d) * slope.at(i));
    let (sum, magnitudes) = products.fold((0.0, 0.0), |(sum, all), x| (sum + x, all + f64::abs(x)));
    magnitudes / f64::abs(sum)
}

#[test]
fn sensitivities_are_per_unit_of_their_source() {
    // D is 2 V, the negative leg 10 V: by hand ∂D̄/∂g = N_c/g, ∂D̄/∂o = 1/g.
    let corrected = Corrected::of(vec![2.0; 64], vec![10.0; 64], 1e-9, 0.0, 1.0);
    let none = LeakBound { rms_v: 0.0, peak_v: 0.0, mean_v: 0.0, common_rms_v: 0.0, common_swing_v: 0.0 };
    let exact = |value, u| Estimate { value, u };
    let correction =
        Correction { skew_s: exact(0.0, 0.0), gain: exact(0.5, 1e-3), offset_v: exact(0.0, 2e-3), gain_offset: 0.0 };
    let drift = Drift { gain: 3e-3, ..Drift::default() };
    let input = FigureInput {
        corrected: &corrected,
        plain_v: None,
        correction: &correction,
        leak: &none,
        noise_p_v: 0.0,
        noise_n_v: 0.0,
        step_p_v: 0.0,
        step_n_v: 0.0,
        scale_spec: 0.03,
        clipped_p: 0,
        clipped_n: 0,
        averages: 1,
        allowance: Allowance { drift, scale_u: 1e-3, ..Allowance::default() },
        asked: Asked::default(),
    };
    let figures = compute(&input);
    let mean = of(&figures, FigureKind::Mean);
    let expected = [
        ("gain", 20.0, 0.02),
        ("offset", 2.0, 0.004),
        ("scale", 2.0, 0.06 / 3f64.sqrt()),
        ("calibration", 2.0, 0.002),
        ("gain drift", 20.0, 0.03 / 3f64.sqrt()),
    ];
    assert_eq!(mean.budget.len(), expected.len());
    for (name, sensitivity, u) in expected {
        let term = mean.budget.iter().find(|t| t.name == name).unwrap();
        assert!((term.sensitivity.unwrap() - sensitivity).abs() < 1e-9 && (term.u - u).abs() < 1e-12, "{term:?}");
    }
    // The largest rectangular term, convolved with the others.
    let rest = (mean.u * mean.u - 0.06 * 0.06 / 3.0).sqrt();
    let half = mean.coverage.unwrap().half_width();
    assert!((half - budget::half_width(rest, 0.06)).abs() < 1e-12);
}
