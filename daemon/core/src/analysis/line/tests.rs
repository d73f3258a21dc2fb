//! Against NIST, York's paper and scipy.

#![allow(clippy::unwrap_used, clippy::float_cmp)]

use super::*;

/// How many digits agree.
fn digits(found: f64, expected: f64) -> f64 {
    -((found - expected) / expected).abs().max(1e-16).log10()
}

/// NIST StRD, linear regression, data set Norris (36 observations, calibration of ozone monitors).
const NORRIS: [(f64, f64); 36] = [
    (0.1, 0.2),
    (338.8, 337.4),
    (118.1, 118.2),
    (888.0, 884.6),
    (9.2, 10.1),
    (228.1, 226.5),
    (668.5, 666.3),
    (998.5, 996.3),
    (449.1, 448.6),
    (778.9, 777.0),
    (559.2, 558.2),
    (0.3, 0.4),
    (0.1, 0.6),
    (778.1, 775.5),
    (668.8, 666.9),
    (339.3, 338.0),
    (448.9, 447.5),
    (10.8, 11.6),
    (557.7, 556.0),
    (228.3, 228.1),
    (998.0, 995.8),
    (888.8, 887.6),
    (119.6, 120.2),
    (0.3, 0.3),
    (0.6, 0.3),
    (557.6, 556.8),
    (339.3, 339.1),
    (888.0, 887.2),
    (998.5, 999.0),
    (778.9, 779.0),
    (10.2, 11.1),
    (117.6, 118.3),
    (228.9, 229.2),
    (668.4, 669.1),
    (449.2, 448.9),
    (0.2, 0.5),
];

#[test]
fn norris_has_its_certified_line() {
    // As in the file, y stands before x.
    let (y, x): (Vec<f64>, Vec<f64>) = NORRIS.iter().copied().unzip();
    let line = ordinary(&x, &y).unwrap();
    assert!(digits(line.slope.value, 1.002_116_818_020_45) > 13.0, "{line:?}");
    assert!(digits(line.intercept.value, -0.262_323_073_774_029) > 11.0, "{line:?}");
    assert!(digits(line.residual, 0.884_796_396_144_373) > 12.0, "{line:?}");
    // Certified standard deviations of the estimates: from memory of the same file.
    assert!(digits(line.slope.u, 0.429_796_848_199_937e-3) > 11.0, "{line:?}");
    assert!(digits(line.intercept.u, 0.232_818_234_301_152) > 11.0, "{line:?}");
}

fn values(file: &serde_json::Value, key: &str) -> Vec<f64> {
    file[key].as_array().unwrap().iter().map(|x| x.as_f64().unwrap()).collect()
}

#[test]
fn pearsons_data_with_yorks_weights() {
    let file: serde_json::Value =
        serde_json::from_str(include_str!("../../../../../tests/reference/vectors/pearson.json")).unwrap();
    let sd = |key| values(&file, key).iter().map(|w| 1.0 / w.sqrt()).collect::<Vec<f64>>();
    let (ux, uy) = (sd("weight_x"), sd("weight_y"));
    let line = york(&values(&file, "x"), &values(&file, "y"), Errors { x: &ux, y: &uy }).unwrap();
    // York et al. 2004: −0.480533407446, 5.479910224033; standard errors 0.05798501, 0.29497074.
    assert!((line.slope.value + 0.480_533_407_446).abs() < 1e-11, "{line:?}");
    assert!((line.intercept.value - 5.479_910_224_033).abs() < 1e-11, "{line:?}");
    assert!((line.slope.u - 0.057_985_01).abs() < 1e-8, "{line:?}");
    assert!((line.intercept.u - 0.294_970_74).abs() < 1e-8, "{line:?}");
    // scipy.odr on the same data, which stops at seven digits.
    assert!((line.slope.value - file["slope"].as_f64().unwrap()).abs() < 1e-7);
    assert!((line.intercept.value - file["intercept"].as_f64().unwrap()).abs() < 1e-6);
    assert!((line.residual.powi(2) - file["residual_variance"].as_f64().unwrap()).abs() < 1e-6);
}

#[test]
fn demings_line_is_scipys() {
    // tests/reference/make_vectors.py, deming(): scipy.odr, which stops at eight digits of the slope and five of the
    // covariance (its Jacobian is of differences).
    let file: serde_json::Value =
        serde_json::from_str(include_str!("../../../../../tests/reference/vectors/deming.json")).unwrap();
    let number = |key: &str| file[key].as_f64().unwrap();
    let line = deming(&values(&file, "x"), &values(&file, "y"), number("u_x"), number("u_y")).unwrap();
    assert!((line.slope.value - number("slope")).abs() < 2e-9, "{line:?}");
    assert!((line.intercept.value - number("intercept")).abs() < 2e-9, "{line:?}");
    assert!((line.residual.powi(2) - number("residual_variance")).abs() < 1e-10, "{line:?}");
    let covariance = |i: usize, j: usize| file["covariance"][i][j].as_f64().unwrap();
    assert!(digits(line.slope.u.powi(2), covariance(0, 0)) > 5.0, "{line:?}");
    assert!(digits(line.intercept.u.powi(2), covariance(1, 1)) > 5.0, "{line:?}");
    assert!(digits(line.covariance, covariance(0, 1)) > 5.0, "{line:?}");
}

#[test]
fn far_from_the_origin_scipys_line_comes_back() {
    let file: serde_json::Value =
        serde_json::from_str(include_str!("../../../../../tests/reference/vectors/line.json")).unwrap();
    let line = ordinary(&values(&file, "x"), &values(&file, "y")).unwrap();
    assert!(digits(line.slope.value, file["slope"].as_f64().unwrap()) > 10.0);
    assert!(digits(line.slope.u, file["u_slope"].as_f64().unwrap()) > 9.0);
    let at_mean = line.intercept.value + line.slope.value * file["mean_x"].as_f64().unwrap();
    assert!(digits(at_mean, file["at_mean"].as_f64().unwrap()) > 11.0);
}

#[test]
fn deming_is_york_with_equal_errors() {
    let x: Vec<f64> = (0..40).map(|i| 20.0 + f64::from(i) + (f64::from(i) * 2.1).sin()).collect();
    for sign in [1.0, -1.0] {
        let y: Vec<f64> = (0..40).map(|i| sign * (3.0 + 0.7 * f64::from(i)) + (f64::from(i) * 3.7).cos()).collect();
        let (ux, uy) = (vec![0.6; 40], vec![0.9; 40]);
        let closed = deming(&x, &y, 0.6, 0.9).unwrap();
        let steps = york(&x, &y, Errors { x: &ux, y: &uy }).unwrap();
        for (a, b) in [
            (closed.slope.value, steps.slope.value),
            (closed.slope.u, steps.slope.u),
            (closed.intercept.value, steps.intercept.value),
            (closed.intercept.u, steps.intercept.u),
            (closed.covariance, steps.covariance),
            (closed.residual, steps.residual),
        ] {
            assert!((a / b - 1.0).abs() < 1e-9, "{closed:?} {steps:?}");
        }
    }
}

#[test]
fn covariance_gives_the_uncertainty_where_the_line_crosses_any_x() {
    // At the mean of x the fitted value's variance is σ²/n: var(a) + 2·x·cov + x²·var(b).
    let x: Vec<f64> = (0..10).map(f64::from).collect();
    let y: Vec<f64> = (0..10).map(|i| f64::from(i) + if i % 2 == 0 { 0.1 } else { -0.1 }).collect();
    let line = ordinary(&x, &y).unwrap();
    let variance = line.intercept.u.powi(2) + 9.0 * line.covariance + 20.25 * line.slope.u.powi(2);
    assert!((variance - line.residual.powi(2) / 10.0).abs() < 1e-15);
}

#[test]
fn a_compensated_sum_keeps_what_a_plain_one_loses() {
    assert_eq!(sum([1.0, 1e100, 1.0, -1e100]), 2.0);
}

#[test]
fn what_is_no_line_is_refused() {
    assert_eq!(ordinary(&[1.0, 2.0], &[1.0, 2.0]), Err(LineError::TooFew { points: 2 }));
    assert_eq!(ordinary(&[1.0, 2.0, 3.0], &[1.0, 2.0]), Err(LineError::Lengths { x: 3, y: 2 }));
    assert_eq!(ordinary(&[1.0; 3], &[1.0, 2.0, 3.0]), Err(LineError::NoSpread));
    assert_eq!(ordinary(&[1.0, f64::NAN, 3.0], &[1.0, 2.0, 3.0]), Err(LineError::Unusable { index: 1 }));
    let errors = Errors { x: &[0.1, 0.1, 0.1], y: &[0.1, 0.0, 0.1] };
    assert_eq!(york(&[1.0, 2.0, 3.0], &[1.0, 2.0, 3.0], errors), Err(LineError::Unusable { index: 1 }));
}
