#![allow(clippy::unwrap_used, clippy::float_cmp)]
use super::*;
use crate::analysis::budget::Basis;
use crate::analysis::{Correction, Estimate, Record, Samples, apply, leak};
use crate::units::Unit;
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, Normal};
use statrs::function::erf::erf;

/// A gate drive of 12 V (10 ns edges) on a node that swings 48 V; 1 ns per sample, 5 µs period.
pub(super) struct Scene {
    pub(super) gain: f64,
    pub(super) skew_s: f64,
    pub(super) offset_v: f64,
    pub(super) noise_v: f64,
    pub(super) points: i32,
}

fn step(t: f64, at: f64, sigma: f64) -> f64 {
    0.5 * (1.0 + erf((t - at) / sigma / std::f64::consts::SQRT_2))
}

pub(super) const PERIOD_S: f64 = 5e-6;
pub(super) const EDGE_S: f64 = 20e-9;

/// The gate-source voltage: −0.5 V to 12 V with 8 % of overshoot, 40 % duty.
pub(super) fn gate(t: f64) -> f64 {
    let x = t.rem_euclid(PERIOD_S);
    let sigma = EDGE_S / 2.5631;
    let bump = (-0.5 * ((x - 1.06e-6) / 15e-9f64).powi(2)).exp();
    -0.5 + 12.5 * (step(x, 1e-6, sigma) - step(x, 3e-6, sigma)) + bump
}

pub(super) fn node(t: f64) -> f64 {
    let x = (t - 60e-9).rem_euclid(PERIOD_S);
    48.0 * (step(x, 1e-6, 8e-9) - step(x, 3e-6, 8e-9))
}

impl Scene {
    pub(super) fn acquire(&self, seed: u64, difference: fn(f64) -> f64) -> (Record, Record) {
        let mut rng = ChaCha8Rng::seed_from_u64(seed);
        let normal = Normal::new(0.0, self.noise_v).unwrap();
        let mut leg = |f: &dyn Fn(f64) -> f64| Record {
            samples: Samples::Numbers(
                (0..self.points).map(|i| (f(1e-9 * f64::from(i)) + normal.sample(&mut rng)) as f32).collect(),
            ),
            volts_per_code: 1.0,
            zero_v: 0.0,
            interval_s: 1e-9,
            start_s: 0.0,
            end_codes: (-1e9, 1e9),
            step_v: 0.0,
            averages: 1,
        };
        let p = leg(&|t| node(t) + difference(t));
        let n = leg(&|t| self.gain * node(t - self.skew_s) + self.offset_v);
        (p, n)
    }

    pub(super) fn correction(&self, u_skew_s: f64, u_gain: f64, u_offset_v: f64) -> Correction {
        Correction {
            skew_s: Estimate { value: self.skew_s, u: u_skew_s },
            gain: Estimate { value: self.gain, u: u_gain },
            offset_v: Estimate { value: self.offset_v, u: u_offset_v },
            gain_offset: 0.0,
        }
    }

    pub(super) fn figures(&self, (p, n): &(Record, Record), correction: &Correction, scale_spec: f64) -> Vec<Figure> {
        let corrected = apply::correct(p, n, correction).unwrap();
        let bound = leak::bound(&corrected.common(), corrected.interval_s, correction, &[]);
        compute(&FigureInput {
            corrected: &corrected,
            plain_v: Some(&apply::plain(p, n).unwrap()),
            correction,
            leak: &bound,
            noise_p_v: self.noise_v,
            noise_n_v: self.noise_v,
            step_p_v: 0.0,
            step_n_v: 0.0,
            scale_spec,
            clipped_p: 0,
            clipped_n: 0,
            averages: 1,
            allowance: Allowance::default(),
            asked: Asked::default(),
        })
    }
}

pub(super) fn of(figures: &[Figure], kind: FigureKind) -> &Figure {
    figures.iter().find(|f| f.kind == kind).unwrap()
}

fn scene() -> Scene {
    Scene { gain: 0.97, skew_s: 1.6e-9, offset_v: 0.3, noise_v: 0.05, points: 20_000 }
}

#[test]
fn names_are_unique_and_read_back() {
    let all: Vec<FigureKind> = FigureKind::all().collect();
    assert_eq!(all.len(), 27);
    for kind in all {
        assert_eq!(FigureKind::parse(kind.name()), Some(kind));
    }
    assert_eq!(FigureKind::parse("rise_time").map(FigureKind::unit), Some(Unit::Second));
    assert_eq!(FigureKind::parse("rise time"), None);
}

#[test]
fn the_gate_s_figures_come_out_on_a_swinging_node() {
    let scene = scene();
    let figures = scene.figures(&scene.acquire(1, gate), &scene.correction(5e-12, 5e-5, 2e-3), 0.0);
    assert_eq!(figures.len(), 25);
    let near = |kind: FigureKind, expected: f64, within: f64| {
        let f = of(&figures, kind);
        assert!(f.valid, "{f:?}");
        assert!((f.value - expected).abs() <= within, "{} = {} ± {}", kind.name(), f.value, f.u);
        // The uncertainty is of use: not much wider than what is asked for here.
        assert!(f.u > 0.0 && f.u < 2.0 * within, "{} ± {}", kind.name(), f.u);
    };
    near(FigureKind::HighLevel, 12.0, 0.01);
    near(FigureKind::LowLevel, -0.5, 0.01);
    near(FigureKind::Amplitude, 12.5, 0.01);
    near(FigureKind::RiseTime, EDGE_S, 0.6e-9);
    near(FigureKind::FallTime, EDGE_S, 0.6e-9);
    near(FigureKind::Period, PERIOD_S, 0.3e-9);
    near(FigureKind::Frequency, 2e5, 12.0);
    near(FigureKind::Duty, 0.4, 1e-4);
    near(FigureKind::Overshoot, 0.08, 0.006);
    near(FigureKind::Maximum, 13.0, 0.06);
    near(FigureKind::Minimum, -0.5, 0.06);
    near(FigureKind::PeakToPeak, 13.5, 0.08);
    assert!(of(&figures, FigureKind::Undershoot).value < 0.005);
    near(FigureKind::RiseSlew, 0.8 * 12.5 / EDGE_S, 1.5e7);
    near(FigureKind::FallSlew, 0.8 * 12.5 / EDGE_S, 1.5e7);
    // A Gaussian edge of 48 V: steepest at 48 V/(σ·√(2π)).
    near(FigureKind::CommonSlew, 48.0 / (8e-9 * 2.506_628), 6e7);
    // Rising: until the bump of 1 V, 60 ns after the middle, is down to 2 % of 12.5 V. Falling: Φ(−2.0537) is 2 %.
    let settled = 0.5 * (60e-9 + 15e-9 * (2.0 * 4f64.ln()).sqrt() + 2.053_7 * EDGE_S / 2.5631);
    near(FigureKind::SettlingTime, settled, 1.5e-9);
    let before = of(&figures, FigureKind::PreAberration);
    assert!(before.valid && before.value < 0.005 && before.coverage.is_some_and(|c| c.low >= 0.0), "{before:?}");
    for (kind, why) in [(FigureKind::Jitter, "3 whole periods"), (FigureKind::Thd, "two states")] {
        let f = of(&figures, kind);
        assert!(!f.valid && f.why.as_deref().unwrap().contains(why), "{f:?}");
    }
    // Nobody asked for a threshold.
    assert!(figures.iter().all(|f| !matches!(f.kind, FigureKind::TimeAbove | FigureKind::TimeBelow)));
    let rms = (0..5000).map(|i| gate(1e-9 * f64::from(i)).powi(2)).sum::<f64>() / 5000.0;
    // The 45 samples lost at the ends are 0.2 % of the record.
    near(FigureKind::Rms, rms.sqrt(), 0.012);
    let common = |i: i32| node(1e-10 * f64::from(i)) + 0.5 * gate(1e-10 * f64::from(i));
    let (low, high) = (0..50_000).map(common).fold((f64::MAX, f64::MIN), |(l, h), c| (f64::min(l, c), f64::max(h, c)));
    near(FigureKind::CommonSwing, high - low, 0.1);
    for f in &figures {
        let combined = crate::analysis::budget::combined(&f.budget);
        assert!((combined - f.u).abs() <= 1e-12 * f.u, "{f:?}");
    }
}

#[test]
fn plain_subtraction_is_shown_beside_and_is_worse() {
    let scene = scene();
    let figures = scene.figures(&scene.acquire(2, gate), &scene.correction(5e-12, 5e-5, 2e-3), 0.0);
    // 3 % of 48 V less the offset of 0.3 V: plain subtraction reads 1.14 V too high on the high level.
    let high = of(&figures, FigureKind::HighLevel);
    assert!((high.plain.unwrap() - 12.0 - 1.14).abs() < 0.05, "{high:?}");
    assert!((high.value - 12.0).abs() < 0.01);
    assert_eq!(of(&figures, FigureKind::CommonRms).plain, None);
}

#[test]
fn grades_follow_the_leak_bound() {
    let scene = scene();
    let records = scene.acquire(3, gate);
    let good = scene.figures(&records, &scene.correction(1e-13, 1e-7, 1e-5), 0.02);
    assert_eq!(of(&good, FigureKind::HighLevel).grade, Grade::Clean);
    let poor = scene.figures(&records, &scene.correction(1e-11, 1e-3, 1e-2), 0.0);
    assert_eq!(of(&poor, FigureKind::HighLevel).grade, Grade::Shaded);
    let quiet = scene.acquire(4, |_| 0.01);
    let hopeless = scene.figures(&quiet, &scene.correction(1e-10, 5e-3, 1e-2), 0.0);
    assert_eq!(of(&hopeless, FigureKind::Rms).grade, Grade::Swamped);
}

/// Where the difference is next to nothing the rms's interval is propagated: it contains the truth, does not go below
/// zero, and says whether the common mode or the noise is what limits it.
#[test]
fn a_small_rms_has_an_interval_that_is_not_symmetric() {
    let scene = scene();
    let quiet = scene.acquire(4, |_| 0.05);
    let figures = scene.figures(&quiet, &scene.correction(1e-12, 5e-3, 1e-2), 0.0);
    let rms = of(&figures, FigureKind::Rms);
    let limited = rms.coverage.unwrap();
    assert_eq!(limited.basis, Basis::CommonMode);
    assert!(limited.low >= 0.0 && limited.low <= 0.05 && limited.high >= 0.05, "{limited:?}");
    assert!(limited.high - rms.value > 2.0 * (rms.value - limited.low), "{limited:?}");
    // 0.5 % of the node's 48 V for two fifths of the time, 30 V rms: the upper end knows it.
    assert!(limited.high > 0.15 && limited.high < 0.5, "{limited:?}");
    let nothing = scene.acquire(5, |_| 0.0);
    let noisy = scene.figures(&nothing, &scene.correction(0.0, 0.0, 0.0), 0.0);
    let noise = of(&noisy, FigureKind::Rms).coverage.unwrap();
    assert_eq!(noise.basis, Basis::Propagated);
    assert!(noise.low.abs() < 1e-12 && noise.high < 0.02, "{noise:?}");
    let sure = of(&scene.figures(&scene.acquire(3, gate), &scene.correction(1e-12, 1e-5, 1e-4), 0.02), FigureKind::Rms)
        .coverage
        .unwrap();
    assert_eq!(sure.basis, Basis::Rectangular);
}

#[test]
fn a_sine_has_a_frequency_but_no_levels() {
    let scene = scene();
    let figures = scene.figures(
        &scene.acquire(5, |t| 3.0 * (std::f64::consts::TAU * 1e6 * t).sin()),
        &scene.correction(1e-12, 1e-5, 1e-3),
        0.0,
    );
    let frequency = of(&figures, FigureKind::Frequency);
    assert!(frequency.valid && (frequency.value - 1e6).abs() < 3.0 * frequency.u.max(20.0), "{frequency:?}");
    assert!((of(&figures, FigureKind::Rms).value - 3.0 / 2.0f64.sqrt()).abs() < 0.01);
    assert!((of(&figures, FigureKind::Maximum).value - 3.0).abs() < 0.05);
    for kind in [FigureKind::HighLevel, FigureKind::RiseTime, FigureKind::Overshoot, FigureKind::Duty] {
        let f = of(&figures, kind);
        assert!(!f.valid && f.why.as_deref().unwrap().contains("no two states"), "{f:?}");
    }
}

#[test]
fn a_constant_has_a_mean_and_an_rms_only() {
    let scene = scene();
    let figures = scene.figures(&scene.acquire(6, |_| 2.5), &scene.correction(0.0, 0.0, 0.0), 0.0);
    assert!((of(&figures, FigureKind::Mean).value - 2.5).abs() < 4.0 * of(&figures, FigureKind::Mean).u);
    assert!((of(&figures, FigureKind::Rms).value - 2.5).abs() < 4.0 * of(&figures, FigureKind::Rms).u);
    assert!((of(&figures, FigureKind::Maximum).value - 2.5).abs() < 0.05);
    for kind in [FigureKind::Amplitude, FigureKind::Period, FigureKind::Frequency, FigureKind::FallTime] {
        assert!(!of(&figures, kind).valid);
    }
}

#[test]
fn clipping_makes_every_figure_invalid_and_says_how_much() {
    let scene = scene();
    let records = scene.acquire(7, gate);
    let correction = scene.correction(0.0, 0.0, 0.0);
    let corrected = apply::correct(&records.0, &records.1, &correction).unwrap();
    let bound = leak::bound(&corrected.common(), 1e-9, &correction, &[]);
    let input = FigureInput {
        corrected: &corrected,
        plain_v: None,
        correction: &correction,
        leak: &bound,
        noise_p_v: 0.05,
        noise_n_v: 0.05,
        step_p_v: 0.4,
        step_n_v: 0.4,
        scale_spec: 0.01,
        clipped_p: 3,
        clipped_n: 0,
        averages: 1,
        allowance: Allowance::default(),
        asked: Asked::default(),
    };
    for f in compute(&input) {
        assert!(!f.valid && f.why.is_some() && f.plain.is_none() && f.coverage.is_none());
    }
    // Noise of an eighth of a step leaves a quantisation that no averaging takes away.
    let figures = compute(&FigureInput { clipped_p: 0, ..input });
    let mean = of(&figures, FigureKind::Mean);
    let term = mean.budget.iter().find(|t| t.name == "quantisation").unwrap();
    assert!(term.u > 0.09 && term.u < 0.13, "{mean:?}");
    assert!(mean.coverage.unwrap().half_width() > 1.9 * mean.u);
    let scale = mean.budget.iter().find(|t| t.name == "scale").unwrap();
    assert!((scale.u - 0.01 / 3.0f64.sqrt() * mean.value).abs() < 1e-9);
}
