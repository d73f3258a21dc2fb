//! How near levels and transition durations come to their bounds: `cargo run --release -p evenpair-core --example
//! figures_marks [TRIALS]`.
//!
//! Levels: a pulse of four periods in 10,000 samples, edges of 20 samples, against the mean of perfect states; the mark is
//! a standard deviation of at most 1.1 of that bound and a bias below 0.2 % at 40 dB. Durations: one edge of Gaussian
//! shape, against the Cramér–Rao bound of a fit that knows the shape and the levels (place and duration unknown); the
//! mark is at most 1.4 of it and a bias below 0.5 % from 30 to 60 dB. Seeded; 400 trials unless told otherwise, so that a
//! ratio is known to 3.5 %. A mark counts as missed beyond two of these.

use evenpair_core::analysis::{levels, transition};
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, StandardNormal};
use statrs::function::erf::erf;

const PER_SIGMA: f64 = 2.563_103_131;

fn main() -> Result<(), Box<dyn std::error::Error>> {
    let trials: u64 = std::env::args().nth(1).map_or(Ok(400), |text| text.parse())?;
    println!("{trials} trials a case\n\nlevels: amplitude of a pulse from 0 to 1");
    println!("{:>8} {:>10} {:>10} {:>8}  mark 1.10, 0.2 % at 40 dB", "SNR dB", "bias %", "sd %", "sd/bound");
    for snr_db in [20.0, 30.0, 40.0, 50.0, 60.0] {
        levels_case(snr_db, trials);
    }
    println!("\ntransition duration: edge of Gaussian shape");
    println!(
        "{:>8} {:>8} {:>10} {:>10} {:>8} {:>8}  mark 1.40, 0.5 %",
        "duration", "SNR dB", "bias %", "sd %", "sd/bound", "u/sd"
    );
    for duration in [3.0, 10.0, 50.0, 200.0] {
        for snr_db in [30.0, 40.0, 50.0, 60.0] {
            duration_case(duration, snr_db, trials);
        }
    }
    Ok(())
}

/// Noise for an amplitude of one: the alternating part of a square wave has an rms of one half.
fn noise(snr_db: f64) -> f64 {
    0.5 * 10.0f64.powf(-snr_db / 20.0)
}

fn step(x: f64, duration: f64) -> f64 {
    0.5 * (1.0 + erf(x / (duration / PER_SIGMA) / std::f64::consts::SQRT_2))
}

/// Mean and standard deviation.
fn spread(values: &[f64]) -> (f64, f64) {
    let n = values.len() as f64;
    let mean = values.iter().sum::<f64>() / n;
    (mean, (values.iter().map(|v| (v - mean).powi(2)).sum::<f64>() / (n - 1.0)).sqrt())
}

/// `missed` beyond the mark by more than two standard errors of a ratio from so many trials.
fn verdict(ratio: f64, most: f64, bias: f64, most_bias: f64, bias_error: f64, trials: u64) -> &'static str {
    let slack = 2.0 / (2.0 * trials as f64).sqrt();
    if ratio <= most * (1.0 + slack) && bias.abs() <= most_bias + 2.0 * bias_error { "met" } else { "missed" }
}

fn levels_case(snr_db: f64, trials: u64) {
    const POINTS: usize = 10_000;
    let sd = noise(snr_db);
    let found: Vec<f64> = (0..trials)
        .filter_map(|seed| {
            let mut rng = ChaCha8Rng::seed_from_u64(seed);
            let period = POINTS as f64 / 4.0;
            let signal: Vec<f64> = (0..POINTS)
                .map(|i| {
                    let t = (i as f64 + 0.1 * period + seed as f64 / trials as f64).rem_euclid(period);
                    let clean = step(t - 0.3 * period, 20.0) - step(t - 0.8 * period, 20.0);
                    let random: f64 = StandardNormal.sample(&mut rng);
                    clean + sd * random
                })
                .collect();
            levels::find(&signal, sd).ok().map(|levels| levels.amplitude())
        })
        .collect();
    let (mean, scatter) = spread(&found);
    let bound = sd * (2.0 / (POINTS as f64 / 2.0)).sqrt();
    let bias = 100.0 * (mean - 1.0);
    let most_bias = if snr_db >= 40.0 { 0.2 } else { f64::INFINITY };
    let met = verdict(scatter / bound, 1.1, bias, most_bias, 100.0 * scatter / (trials as f64).sqrt(), trials);
    println!("{snr_db:8} {bias:10.4} {:10.4} {:8.3}  {met}", 100.0 * scatter, scatter / bound);
}

fn duration_case(duration: f64, snr_db: f64, trials: u64) {
    let sd = noise(snr_db);
    let points = (20.0 * duration) as usize + 200;
    let mut own = 0.0;
    let found: Vec<f64> = (0..trials)
        .filter_map(|seed| {
            let mut rng = ChaCha8Rng::seed_from_u64(seed);
            let middle = 0.5 * points as f64 + seed as f64 / trials as f64;
            let signal: Vec<f64> = (0..points)
                .map(|i| {
                    let random: f64 = StandardNormal.sample(&mut rng);
                    step(i as f64 - middle, duration) + sd * random
                })
                .collect();
            let edge = *transition::edges(&signal, 0.0, 1.0).first()?;
            let found = transition::measure(&signal, edge, 0..points, (0.0, 1.0), sd)?;
            own += found.duration_u / trials as f64;
            Some(found.duration)
        })
        .collect();
    let (mean, scatter) = spread(&found);
    let bound = bound(duration, sd, points);
    let bias = 100.0 * (mean / duration - 1.0);
    let bias_error = 100.0 * scatter / duration / (trials as f64).sqrt();
    let met = verdict(scatter / bound, 1.4, bias, 0.5, bias_error, trials);
    println!(
        "{duration:8} {snr_db:8} {bias:10.3} {:10.4} {:8.3} {:8.3}  {met}",
        100.0 * scatter / duration,
        scatter / bound,
        own / scatter
    );
}

/// The least standard deviation of the duration, from the Fisher information of place and duration.
fn bound(duration: f64, sd: f64, points: usize) -> f64 {
    let middle = 0.5 * points as f64;
    let (mut aa, mut ab, mut bb) = (0.0, 0.0, 0.0);
    for i in 0..points {
        let x = i as f64 - middle;
        let h = 1e-4 * duration;
        let by_place = (step(x + h, duration) - step(x - h, duration)) / (2.0 * h);
        let by_duration = (step(x, duration + h) - step(x, duration - h)) / (2.0 * h);
        aa += by_place * by_place;
        ab += by_place * by_duration;
        bb += by_duration * by_duration;
    }
    sd / (bb - ab * ab / aa).sqrt()
}
