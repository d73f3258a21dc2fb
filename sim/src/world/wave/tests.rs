//! Waves against closed forms and against a Fourier series summed term by term.

use std::f64::consts::{LN_10, PI, TAU};

use super::*;

/// A trapezoid 0…1 of period 1: rises from 0 to 0.05, falls from 0.4 to 0.45.
fn trapezoid() -> Wave {
    Wave::polyline(1.0, &[(0.0, 0.0), (0.05, 1.0), (0.4, 1.0), (0.45, 0.0)])
}

/// A step from 0 to 1 at the time 0 and back half a period later, with edges too short to see.
fn step(period_s: f64) -> Wave {
    let edge_s = 1e-9 * period_s;
    let half_s = period_s / 2.0;
    Wave::polyline(period_s, &[(0.0, 0.0), (edge_s, 1.0), (half_s, 1.0), (half_s + edge_s, 0.0)])
}

/// The trapezoid behind `transfer`, as the sum of its harmonics. Coefficients of a train of ramps by integration by
/// parts twice: `c_n = −Σ Δslope·e^(−jω_n t)/ω_n²`.
fn by_harmonics(time_s: f64, transfer: impl Fn(f64) -> Complex) -> f64 {
    let mut sum = 0.05 * 0.5 + 0.35 + 0.05 * 0.5;
    for n in 1..=20_000 {
        let omega = TAU * f64::from(n);
        let corner = |at: f64, change: f64| Complex::new(0.0, -omega * at).exp() * (-change / (omega * omega));
        let c = corner(0.0, 20.0) + corner(0.05, -20.0) + corner(0.4, -20.0) + corner(0.45, 20.0);
        sum += 2.0 * (c * transfer(omega) * Complex::new(0.0, omega * time_s).exp()).re;
    }
    sum
}

#[test]
fn one_poles_fast_and_slow_agree_with_the_fourier_series() {
    for time_constant_s in [0.003, 0.2, 30.0] {
        let sampler = Sampler::new(&trapezoid().low_pass(time_constant_s));
        for i in 0..25 {
            let time_s = 0.013 + 0.04 * f64::from(i);
            let pole = |omega: f64| Complex::real(1.0) / Complex::new(1.0, omega * time_constant_s);
            let expected = by_harmonics(time_s, pole);
            // The series' rest after 20,000 terms is below 40/(2π²·20,000) without the pole; measured 1.2e-7.
            assert!((sampler.at(time_s) - expected).abs() < 1e-6, "T = {time_constant_s}, t = {time_s}");
        }
    }
}

#[test]
fn a_chain_with_compensation_agrees_with_the_fourier_series() {
    let (fast, slow, error) = (0.004, 3.0, 0.03);
    let sampler = Sampler::new(&trapezoid().low_pass(fast).pole_zero(slow, error).low_pass(0.001));
    let transfer = |omega: f64| {
        let one = |t: f64| Complex::new(1.0, omega * t);
        one(slow * (1.0 + error)) / (one(slow) * one(fast) * one(0.001))
    };
    for i in 0..25 {
        let time_s = 0.007 + 0.04 * f64::from(i);
        assert!((sampler.at(time_s) - by_harmonics(time_s, transfer)).abs() < 1e-6, "t = {time_s}");
    }
}

#[test]
fn a_step_behind_one_pole_rises_in_ln_9_time_constants() {
    let sampler = Sampler::new(&step(100.0).low_pass(1.0));
    for time_s in [0.1_f64, 1.0, 3.0, 7.0] {
        assert!((sampler.at(time_s) - (1.0 - (-time_s).exp())).abs() < 1e-6, "t = {time_s}");
    }
    // 10 % at ln(10/9), 90 % at ln(10): the rise takes ln(9) = 2.197 time constants.
    let tenth_s = LN_10 - 9_f64.ln();
    assert!((sampler.at(tenth_s) - 0.1).abs() < 1e-6);
    assert!((sampler.at(tenth_s + 9_f64.ln()) - 0.9).abs() < 1e-6);
}

#[test]
fn a_step_behind_two_equal_poles() {
    // Closed form of 1/(1+s)²: 1 − (1 + t)·e^(−t).
    let sampler = Sampler::new(&step(100.0).low_pass(1.0).low_pass(1.0));
    for time_s in [0.1_f64, 1.0, 3.0, 7.0] {
        let expected = 1.0 - (1.0 + time_s) * (-time_s).exp();
        assert!((sampler.at(time_s) - expected).abs() < 5e-6, "t = {time_s}: {}", sampler.at(time_s) - expected);
    }
}

#[test]
fn a_wrong_compensation_overshoots_and_decays() {
    let error = 0.02;
    let sampler = Sampler::new(&step(100.0).pole_zero(1.0, error));
    for time_s in [0.01_f64, 0.5, 2.0, 10.0] {
        let expected = 1.0 + error * (-time_s).exp();
        assert!((sampler.at(time_s) - expected).abs() < 1e-8, "t = {time_s}");
    }
}

#[test]
fn a_tone_takes_the_transfer_function_of_pole_and_zero() {
    let (time_constant_s, error, frequency_hz) = (95e-6, 0.03, 2e3);
    let tone = Tone { frequency_hz, amplitude: Complex::real(1.0) };
    let wave = Wave::tones(1.0 / frequency_hz, 0.0, vec![tone]).pole_zero(time_constant_s, error);
    let omega = TAU * frequency_hz;
    let expected =
        Complex::new(1.0, omega * time_constant_s * (1.0 + error)) / Complex::new(1.0, omega * time_constant_s);
    let sampler = Sampler::new(&wave);
    assert!((sampler.at(0.0) - expected.re).abs() < 1e-12);
    assert!((sampler.at(-0.25 / frequency_hz) - expected.im).abs() < 1e-12);
}

#[test]
fn a_record_is_what_single_readings_give() {
    let ring = Mode { pole: Complex::new(9.0, -80.0), coefficient: Complex::new(0.0, -0.3) };
    let mut wave = trapezoid();
    wave.push(Event { at_s: 0.05, jump_v: 0.0, slope_v_per_s: 0.0, modes: vec![ring] });
    let tone = Tone { frequency_hz: 3.0, amplitude: Complex::new(0.2, 0.1) };
    let wave = wave.plus(&Wave::tones(1.0, 0.4, vec![tone])).low_pass(0.002).pole_zero(5.0, 0.01);
    let sampler = Sampler::new(&wave);
    for (start_s, interval_s) in [(-7.3, 0.001), (0.0, 0.05), (0.2, 0.37), (3.9, 1.7)] {
        let mut record = vec![f64::NAN; 3000];
        sampler.read(start_s, interval_s, &mut record);
        for (i, &value) in record.iter().enumerate() {
            let single = sampler.at(start_s + i as f64 * interval_s);
            assert!((value - single).abs() < 1e-9, "{start_s} {interval_s} {i}: {value} {single}");
        }
    }
}

#[test]
fn networks_of_unit_gain_leave_the_mean() {
    // Area of the trapezoid: 0.05/2 + 0.35 + 0.05/2.
    assert!((trapezoid().mean() - 0.4).abs() < 1e-12);
    let behind = trapezoid().low_pass(0.03).pole_zero(7.0, 0.1);
    assert!((behind.mean() - 0.4).abs() < 1e-10, "{}", behind.mean());
}

#[test]
fn an_arc_of_a_sine_does_not_outlive_its_group() {
    // Half-wave rectified sine: mean 1/π, value sin on the first half, nought on the second.
    let pole = Complex::new(0.0, -TAU);
    let mut wave = Wave::constant(0.0, 1.0);
    for at_s in [0.0, 0.5] {
        // Begun at 0 and taken away at 0.5: sin(2π(0.5 + t)) = −sin(2πt), so that the same mode is added.
        let mode = Mode { pole, coefficient: Complex::new(0.0, -1.0) };
        wave.push(Event { at_s, jump_v: 0.0, slope_v_per_s: 0.0, modes: vec![mode] });
    }
    let sampler = Sampler::new(&wave);
    assert!((sampler.mean() - 1.0 / PI).abs() < 1e-12);
    assert!((sampler.at(5.25) - 1.0).abs() < 1e-12);
    assert!(sampler.at(-0.25).abs() < 1e-12);
    // Behind a pole: mean kept, and the fundamental 1/2 of the half wave weakened by the slow pole.
    let slow = Sampler::new(&wave.low_pass(3.0));
    assert!((slow.mean() - 1.0 / PI).abs() < 1e-10);
    let first = 0.5 / (TAU * 3.0);
    let swing = (slow.at(0.5) - slow.at(0.0)) / 2.0;
    // The second harmonic drops out of the difference of two instants half a period apart; odd ones are absent.
    assert!((swing - first * (1.0 + (TAU * 3.0).powi(-2)).powi(-1)).abs() < 1e-9, "{swing} {first}");
}
