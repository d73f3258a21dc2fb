#![allow(clippy::unwrap_used)]
use super::*;

/// 10,000 samples of a sine of 0.5 V on a square common mode of ±100 V, that hold `step` volts of the common mode.
fn power(step: f64, noise_v: f64) -> Power {
    let (square, sine) = (1e4, 0.125);
    Power {
        measured: sine + step * step,
        noise: noise_v * noise_v,
        points: 10_000,
        u_noise: 0.0,
        linear: [step * 100.0, 0.0, 0.0],
        quadratic: [[square, 0.0, 0.0], [0.0, 0.0, 0.0], [0.0, 0.0, 1.0]],
    }
}

#[test]
fn the_parabola_is_the_mean_square_itself() {
    let d: Vec<f64> = (0..50).map(|i| (f64::from(i) * 0.7).sin() + 0.2).collect();
    let b: Vec<f64> = (0..50).map(|i| 3.0 * (f64::from(i) * 0.31).cos() - 1.0).collect();
    let s: Vec<f64> = (0..50).map(|i| 0.1 * f64::from(i % 7)).collect();
    let mean = |f: &dyn Fn(usize) -> f64| (0..50).map(f).sum::<f64>() / 50.0;
    let (bs, mb, ms) = (-mean(&|i| b[i] * s[i]), mean(&|i| b[i]), -mean(&|i| s[i]));
    let power = Power {
        measured: mean(&|i| d[i] * d[i]),
        noise: 0.0,
        points: 50,
        u_noise: 0.0,
        linear: [mean(&|i| d[i] * b[i]), -mean(&|i| d[i] * s[i]), mean(&|i| d[i])],
        quadratic: [[mean(&|i| b[i] * b[i]), bs, mb], [bs, mean(&|i| s[i] * s[i]), ms], [mb, ms, 1.0]],
    };
    let delta = [0.03, -0.2, 0.4];
    let moved = mean(&|i| (d[i] + delta[0] * b[i] - delta[1] * s[i] + delta[2]).powi(2));
    assert!((power.at(delta) - moved).abs() < 1e-13, "{} {moved}", power.at(delta));
    // Unbounded, the lowest point is what remains after projection on b, s and 1: least squares.
    let wide = Errors { u: [10.0, 10.0, 10.0], drift: [0.0; 3], gain_offset: 0.3 };
    let a = nalgebra::Matrix3::from_fn(|i, j| power.quadratic[i][j]);
    let y = nalgebra::Vector3::from(power.linear);
    let rest = power.measured - y.dot(&a.lu().solve(&y).unwrap());
    assert!((power.lowest(&wide) - rest).abs() < 1e-9 * power.measured, "{} {rest}", power.lowest(&wide));
}

/// Without any second order the interval is the first-order one: noise alone, 1.96·u to the draws' own scatter.
#[test]
fn with_noise_alone_the_interval_is_the_first_order_one() {
    let power = power(0.0, 0.2);
    let (low, high) = interval(&power, &Errors::default(), &Others::default());
    let r = 0.125f64.sqrt();
    let u = power.u_noise_at(0.125) / (2.0 * r);
    // The 2.5 % quantile of 10,000 draws has a standard deviation of 0.027·u; here four of them.
    assert!((high - r - 1.96 * u).abs() < 0.11 * u, "{high} {}", r + 1.96 * u);
    // The lower end is the quantile or the vertex's bound, whichever is lower; both are 1.96·u.
    assert!((r - low - 1.96 * u).abs() < 0.13 * u, "{low} {}", r - 1.96 * u);
}

/// A drift that stays within ±0.2 V of ±100 V: worked by hand, the true square is 0.125 + (step + 100·δ)².
#[test]
fn a_drifting_gain_reaches_from_the_vertex_to_its_end() {
    let errors = Errors { drift: [2e-3, 0.0, 0.0], ..Errors::default() };
    let (low, high) = interval(&power(0.0, 0.0), &errors, &Others::default());
    assert!((low - 0.125f64.sqrt()).abs() < 1e-9, "{low}");
    // |δ| is uniform to 2·10⁻³, so that its 97.5 % point leaves 0.195 V.
    assert!((high - 0.195f64.mul_add(0.195, 0.125).sqrt()).abs() < 5e-4, "{high}");
    // 1 V in step: the vertex is out of reach; the interval ends where the drift does.
    let (low, high) = interval(&power(1.0, 0.0), &errors, &Others::default());
    assert!((low - 0.8f64.mul_add(0.8, 0.125).sqrt()).abs() < 1e-9, "{low}");
    assert!((high - 1.19f64.mul_add(1.19, 0.125).sqrt()).abs() < 2e-3, "{high}");
}

#[test]
fn the_same_input_gives_the_same_interval() {
    let errors = Errors { u: [1e-3, 0.0, 1e-2], drift: [0.0; 3], gain_offset: -0.5 };
    let others = Others { scale_u: 1e-3, scale_half: 0.01, added_v: 1e-3 };
    let power = power(0.1, 0.2);
    assert_eq!(interval(&power, &errors, &others), interval(&power, &errors, &others));
    let expected = 1e-6 * 1e4 + 1e-4;
    assert!((power.second_order(&errors) - expected).abs() < 1e-12);
}

/// A square that noise made negative has a lower end of zero and an upper end that noise explains.
#[test]
fn nothing_but_noise_reaches_down_to_zero() {
    let mut power = power(0.0, 1.0);
    power.measured = -0.005;
    let (low, high) = interval(&power, &Errors::default(), &Others::default());
    let expected = (1.96 * 2e-4f64.sqrt() - 0.005).sqrt();
    assert!(low.abs() < 1e-300 && (high - expected).abs() < 0.02 * expected, "{low} {high} {expected}");
}
