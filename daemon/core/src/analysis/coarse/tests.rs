//! Against scipy and the plain sum.

#![allow(clippy::unwrap_used, clippy::float_cmp)]

use super::*;
use crate::analysis::skew::signals::{Dice, Signal, Truth};

#[test]
fn lag_and_coefficient_are_scipys_and_numpys() {
    let file: serde_json::Value =
        serde_json::from_str(include_str!("../../../../../tests/reference/vectors/correlation.json")).unwrap();
    let values = |key: &str| file[key].as_array().unwrap().iter().map(|x| x.as_f64().unwrap()).collect::<Vec<f64>>();
    let found = find(&values("p"), &values("n"), 200).unwrap();
    assert_eq!(found.alike.lag as i64, file["lag"].as_i64().unwrap());
    assert!((found.alike.correlation - file["coefficient"].as_f64().unwrap()).abs() < 1e-12, "{found:?}");
}

#[test]
fn every_lag_equals_the_plain_sum() {
    let mut dice = Dice::new(22);
    let p: Vec<f64> = (0..61).map(|_| 3.0 + dice.normal()).collect();
    let n: Vec<f64> = (0..61).map(|_| dice.normal() - 1.0).collect();
    let curve = correlation(&p, &n, 30).unwrap();
    for (i, r) in curve.iter().enumerate() {
        let lag = i as isize - 30;
        let pairs: Vec<(f64, f64)> = (0..61isize)
            .filter(|k| (0..61).contains(&(k + lag)))
            .map(|k| (p[k as usize], n[(k + lag) as usize]))
            .collect();
        let count = pairs.len() as f64;
        let mean = (pairs.iter().map(|q| q.0).sum::<f64>() / count, pairs.iter().map(|q| q.1).sum::<f64>() / count);
        let moment = |f: fn(f64, f64) -> f64| pairs.iter().map(|q| f(q.0 - mean.0, q.1 - mean.1)).sum::<f64>();
        let plain = moment(|a, b| a * b) / (moment(|a, _| a * a) * moment(|_, b| b * b)).sqrt();
        assert!((r - plain).abs() < 1e-12, "lag {lag}: {r} {plain}");
    }
}

#[test]
fn record_ends_do_not_pull_the_lag_to_zero() {
    // 3.3 cycles of a sine, 30 samples late: a zero-padded correlation, tried in numpy, was 29 samples off here.
    let truth = Truth { tau: 30.0, ..Truth::with_noise(0.001) };
    let (p, n) = Dice::new(23).records(&Signal::sine(303.0, 1.0), &truth, 1000);
    let found = find(&p, &n, 500).unwrap();
    assert!((found.alike.lag - 30).abs() <= 2, "{found:?}");
    assert!(found.alike.alternative.is_some());
}

#[test]
fn a_reference_upside_down_shows_as_opposite() {
    let truth = Truth { tau: 5.0, gain: -1.0, ..Truth::with_noise(0.01) };
    let signal = Signal::Pulse { start: 400.0, width: 200.0, rise: 5.0 };
    let (p, n) = Dice::new(24).records(&signal, &truth, 1000);
    let found = find(&p, &n, 500).unwrap();
    assert_eq!(found.opposite.lag, 5);
    assert!(found.opposite.correlation < -0.99 && found.alike.correlation < 0.9, "{found:?}");
}

#[test]
fn a_flat_leg_correlates_with_nothing() {
    let found = find(&[1.0; 300], &[2.0; 300], 150).unwrap();
    assert_eq!(found.alike.correlation, 0.0);
}
