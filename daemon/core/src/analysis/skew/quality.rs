//! The estimator against the Cramér–Rao bound of the true signal, by seeded Monte Carlo.

#![allow(clippy::unwrap_used)]

use super::signals::{Dice, Signal, Truth, quantise};
use super::{Reference, Shape, estimate};
use std::f64::consts::TAU;

fn reference(shape: Shape) -> Reference {
    Reference { shape, period_s: None }
}

fn square(period: f64, rise: f64, phase: f64) -> Signal {
    Signal::Square { period, rise, phase }
}

/// Bias and standard deviation of skew, gain and offset in units of the true bound, and the share of trials in which
/// each lies within twice its own standard uncertainty.
#[derive(Debug)]
struct Quality {
    bias: [f64; 3],
    sd: [f64; 3],
    within: [f64; 3],
}

struct Case {
    name: &'static str,
    shape: Shape,
    snr_db: f64,
    samples: usize,
    /// Converter step as a fraction of full scale (−1.25 to 1.25 V), if quantised.
    bits: Option<i32>,
    truth: Truth,
    make: fn(f64) -> Signal,
}

impl Case {
    fn new(name: &'static str, shape: Shape, snr_db: f64, make: fn(f64) -> Signal) -> Self {
        Self { name, shape, snr_db, samples: 4000, bits: None, truth: Truth::with_noise(0.0), make }
    }

    fn run(&self, trials: usize, seed: u64) -> Quality {
        let mut dice = Dice::new(seed);
        let mut errors: Vec<[f64; 3]> = Vec::new();
        let mut within = [0.0; 3];
        for _ in 0..trials {
            // A new phase and skew each time: every fraction of a sample, and record ends that cut anything.
            let signal = (self.make)(dice.uniform(0.0, 1.0));
            let noise = signal.rms(self.samples) * 10f64.powf(-self.snr_db / 20.0);
            let tau = self.truth.tau + dice.uniform(-8.0, 8.0);
            let ratio = if self.truth.noise_p > 0.0 { self.truth.noise_n / self.truth.noise_p } else { 1.0 };
            let truth = Truth { tau, noise_p: noise, noise_n: noise * ratio, ..self.truth };
            let (mut p, mut n) = dice.records(&signal, &truth, self.samples);
            let mut felt = truth;
            if let Some(bits) = self.bits {
                let step = 2.5 / 2f64.powi(bits);
                quantise(&mut p, step);
                quantise(&mut n, step);
                felt.noise_p = noise.hypot(step / 12f64.sqrt());
                felt.noise_n = (noise * ratio).hypot(step / 12f64.sqrt());
            }
            let bound = felt.bound(&signal, self.samples);
            let found = estimate(&p, &n, 1.0, &reference(self.shape)).unwrap();
            let got = [found.skew_s, found.gain, found.offset_v];
            let error = [got[0].value - truth.tau, got[1].value - truth.gain, got[2].value - truth.offset];
            for i in 0..3 {
                within[i] += f64::from(u8::from(error[i].abs() <= 2.0 * got[i].u)) / trials as f64;
            }
            errors.push([error[0] / bound[0], error[1] / bound[1], error[2] / bound[2]]);
        }
        let count = trials as f64;
        let bias = [0, 1, 2].map(|i| errors.iter().map(|e| e[i]).sum::<f64>() / count);
        let sd =
            [0, 1, 2].map(|i| (errors.iter().map(|e| (e[i] - bias[i]).powi(2)).sum::<f64>() / (count - 1.0)).sqrt());
        Quality { bias, sd, within }
    }

    /// The marks: sd at most `worst` times the bound, bias below a tenth of it, k = 2 holding in its 95.45 % of cases;
    /// each with three standard errors for the number of trials.
    fn check(&self, trials: usize, seed: u64, worst: f64) {
        let quality = self.run(trials, seed);
        let count = trials as f64;
        println!("{:24} {:3} dB {quality:.3?}", self.name, self.snr_db);
        for i in 0..3 {
            let se_sd = worst / (2.0 * count).sqrt();
            assert!(quality.sd[i] <= worst + 3.0 * se_sd, "{} quantity {i}: sd {quality:?}", self.name);
            // An estimator that beats the bound would show that the bound is wrong.
            assert!(quality.sd[i] >= 0.93 - 3.0 * se_sd, "{} quantity {i}: sd {quality:?}", self.name);
            assert!(quality.bias[i].abs() <= 0.1 + 3.0 / count.sqrt(), "{} quantity {i}: bias {quality:?}", self.name);
            let se_within = (0.9545 * 0.0455 / count).sqrt();
            assert!(quality.within[i] >= 0.94 - 3.0 * se_within, "{} quantity {i}: k=2 {quality:?}", self.name);
        }
    }
}

fn cases() -> Vec<(Case, f64)> {
    let square10: fn(f64) -> Signal = |u| square(392.5, 10.0, 392.5 * u);
    let sine: fn(f64) -> Signal = |u| Signal::sine(79.4, TAU * u);
    let pulse: fn(f64) -> Signal = |u| Signal::Pulse { start: 1800.0 + u, width: 300.0, rise: 5.0 };
    let tones: fn(f64) -> Signal = |u| Signal::twenty(TAU * u);
    let base = |case: Case, change: fn(&mut Case)| {
        let mut case = case;
        change(&mut case);
        case
    };
    vec![
        (Case::new("square rise 10", Shape::Edges, 20.0, square10), 1.05),
        (Case::new("square rise 10", Shape::Edges, 40.0, square10), 1.05),
        (Case::new("square rise 10", Shape::Edges, 60.0, square10), 1.05),
        // A numerical prototype reached 1.14 with so few samples on an edge at 20 dB; up to 1.15 is taken here.
        (Case::new("square rise 3", Shape::Edges, 20.0, |u| square(392.5, 3.0, 392.5 * u)), 1.15),
        (Case::new("square rise 3", Shape::Edges, 50.0, |u| square(392.5, 3.0, 392.5 * u)), 1.05),
        (Case::new("square rise 50", Shape::Edges, 30.0, |u| square(800.0, 50.0, 800.0 * u)), 1.05),
        (Case::new("pulse rise 5", Shape::Edges, 40.0, pulse), 1.05),
        (Case::new("sine", Shape::Sine, 20.0, sine), 1.05),
        (Case::new("sine", Shape::Sine, 60.0, sine), 1.05),
        (Case::new("twenty tones", Shape::Multitone, 20.0, tones), 1.05),
        (Case::new("twenty tones", Shape::Multitone, 50.0, tones), 1.05),
        (Case::new("square, not told", Shape::Unknown, 40.0, square10), 1.05),
        (Case::new("tones, not told", Shape::Unknown, 40.0, tones), 1.05),
        (base(Case::new("8 bit", Shape::Edges, 30.0, square10), |case| case.bits = Some(8)), 1.05),
        (base(Case::new("12 bit", Shape::Edges, 50.0, square10), |case| case.bits = Some(12)), 1.05),
        (base(Case::new("gain 0.5", Shape::Edges, 40.0, square10), |case| case.truth.gain = 0.5), 1.05),
        (base(Case::new("gain 2", Shape::Sine, 40.0, sine), |case| case.truth.gain = 2.0), 1.05),
        (
            base(Case::new("noise 1:3, offset", Shape::Edges, 30.0, square10), |case| {
                (case.truth.noise_p, case.truth.noise_n, case.truth.offset) = (1.0, 3.0, 5.0);
            }),
            1.05,
        ),
        (
            base(Case::new("noise 3:1", Shape::Edges, 20.0, square10), |case| {
                (case.truth.noise_p, case.truth.noise_n) = (3.0, 1.0);
            }),
            1.05,
        ),
    ]
}

#[test]
fn estimates_reach_the_bound_without_bias_and_know_their_uncertainty() {
    for (i, (case, worst)) in cases().iter().enumerate() {
        case.check(60, 1000 + i as u64, *worst);
    }
}
