//! Means by hand, and repeats of simulated acquisitions.

#![allow(clippy::unwrap_used, clippy::float_cmp)]

use super::*;
use crate::analysis::skew::signals::{Dice, Signal, Truth};
use crate::analysis::skew::{Reference, Shape, estimate};

fn one(value: f64, u: f64) -> Estimate {
    Estimate { value, u }
}

#[test]
fn equal_repeats_that_scatter_little_keep_what_they_promise() {
    let mean = weighted(&[one(10.0, 2.0), one(10.5, 2.0), one(9.5, 2.0), one(10.0, 2.0)], true);
    assert!((mean.estimate.value - 10.0).abs() < 1e-12);
    assert!((mean.estimate.u - 1.0).abs() < 1e-12 && (mean.coverage_factor - 2.0).abs() < 1e-12);
    // sd 0.408 of four values, over √4.
    assert!((mean.scatter.unwrap() - 0.204_124_145_231_931_5).abs() < 1e-12);
}

#[test]
fn scatter_beyond_the_promise_counts_with_students_factor() {
    let mean = weighted(&[one(9.0, 0.1), one(11.0, 0.1), one(10.0, 0.1)], true);
    assert!((mean.estimate.u - 1.0 / 3f64.sqrt()).abs() < 1e-12, "{mean:?}");
    // JCGM 100, table G.2: t(95.45 %) is 4.53 for 2 degrees of freedom.
    assert!((mean.coverage_factor - 4.53).abs() < 0.005, "{mean:?}");
}

#[test]
fn unequal_repeats_are_weighted() {
    let mean = weighted(&[one(1.0, 1.0), one(3.0, 2.0)], true);
    assert!((mean.estimate.value - 1.4).abs() < 1e-12);
    assert!((mean.promised - 0.8f64.sqrt()).abs() < 1e-12);
}

#[test]
fn repeats_of_noise_free_data_do_not_divide_by_zero() {
    let mean = weighted(&[one(1.0, 0.0), one(2.0, 0.0)], true);
    assert!((mean.estimate.value - 1.5).abs() < 1e-12 && mean.estimate.u.is_finite());
}

fn repeats(count: usize, seed: u64, noise: f64) -> Vec<SkewEstimate> {
    let signal = Signal::Square { period: 400.0, rise: 10.0, phase: 130.0 };
    let mut dice = Dice::new(seed);
    (0..count)
        .map(|_| {
            let (p, n) = dice.records(&signal, &Truth::with_noise(noise), 2000);
            estimate(&p, &n, 1e-9, &Reference { shape: Shape::Edges, period_s: None }).unwrap()
        })
        .collect()
}

#[test]
fn sixteen_repeats_are_four_times_surer_than_one() {
    let all = repeats(16, 41, 0.03);
    let combined = combine(&all).unwrap();
    let single = all[0].skew_s.u;
    // Scatter's own uncertainty with 16 repeats is 18 %.
    let gained = single / combined.skew_s.estimate.u;
    assert!((2.5..4.5).contains(&gained), "{gained}");
    assert!((combined.skew_s.estimate.value - 3.3e-9).abs() < 4.0 * combined.skew_s.estimate.u);
    assert!((combined.correction().gain.value - 0.97).abs() < 4.0 * combined.gain.estimate.u);
    assert!(enough(&combined, single / 2.0) && !enough(&combined, single / 10.0));
}

#[test]
fn one_repeat_is_never_enough() {
    let combined = combine(&repeats(1, 42, 0.03)).unwrap();
    assert!(!enough(&combined, 1.0) && combined.skew_s.scatter.is_none());
    assert!(combine(&[]).is_none());
}

#[test]
fn without_dither_repeats_do_not_average_down() {
    let plain = repeats(9, 43, 0.002);
    let free = combine(&plain).unwrap();
    let locked: Vec<SkewEstimate> = plain.into_iter().map(|one| one.with_converter(0.01, 0.01, 1)).collect();
    let locked = combine(&locked).unwrap();
    assert!(locked.warnings.iter().any(|w| matches!(w, Warning::LittleDither { .. })));
    assert_eq!(locked.warnings.len(), 1, "each kind once");
    assert!(locked.skew_s.estimate.u > 2.9 * free.skew_s.promised, "{locked:?} {free:?}");
}

#[test]
fn a_coarse_skew_picks_the_period_or_does_not() {
    let period = 20e-9;
    assert_eq!(whole_periods(-7.7e-9, one(12.4e-9, 50e-12), period), Some(1.0));
    assert_eq!(whole_periods(2.3e-9, one(2.4e-9, 50e-12), period), Some(0.0));
    assert_eq!(whole_periods(2.3e-9, one(-37.6e-9, 50e-12), period), Some(-2.0));
    // Half a period off, or too uncertain: nothing is told.
    assert_eq!(whole_periods(2.3e-9, one(12.0e-9, 50e-12), period), None);
    assert_eq!(whole_periods(2.3e-9, one(2.3e-9, 2e-9), period), None);
    assert_eq!(whole_periods(f64::NAN, one(0.0, 0.0), period), None);
}
