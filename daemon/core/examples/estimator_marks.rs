//! The skew estimator against its marks: spread, bias and coverage in units of the Cramér–Rao bound.
//!
//! `cargo run --release -p evenpair-core --example estimator_marks [TRIALS [CASE]]` (1000 trials; all cases) simulates
//! pairs of records from analytic signals, each with its own skew (−8 to 8 samples) and sub-sample phase, so that
//! record ends cut anything, and lets the tool estimate them. The noise is *measured* by the tool, not told. The bound
//! is that of the true signal for two channels and an unknown waveform, from every sample of the record:
//! `cov(τ, g, o) = (σ_N² + g²σ_P²)·(GᵀG)⁻¹`, `G = [−g·s′, s, 1]`, with step²/12 added to each variance where the
//! record is quantised. Signal to noise: rms of the signal about its mean over the noise of each leg.
//!
//! Beside it stands the spread of an estimator that is told signal and noise, over the same trials: it reaches the bound
//! exactly, so what it is above or below 1 is the luck of these trials, and the tool's spread shares it.
//!
//! Printed for skew, gain and offset: standard deviation over bound (SE), bias over bound (SE), and the share of trials
//! in which the error is within twice the stated standard uncertainty. Then a verdict for each mark:
//! spread ≤ 1.05 (plus two SE), |bias| ≤ 0.1 (plus two SE), share 94 to 96.5 % (with two SE).
//! `estimator_marks time` prints instead how long an estimate takes (medians of 15) from records of converter codes.
//! Seeds: 70 000 + case number; ChaCha8, one stream a thread and case. About ten minutes
//! of two quiet cores, half of them for the records of a million samples.

#![allow(dead_code, clippy::unwrap_used, unreachable_pub)]

#[path = "../src/analysis/skew/signals.rs"]
mod signals;

use evenpair_core::analysis::skew::{Reference, Shape, SkewEstimate, estimate, estimate_records};
use evenpair_core::analysis::{Record, Samples};
use signals::{Dice, Signal, Truth, quantise};

/// Streams of random numbers a case is split into; the result does not depend on the machine.
const STREAMS: u64 = 2;

struct Case {
    name: &'static str,
    shape: Shape,
    samples: usize,
    snr_db: f64,
    /// Converter bits over −1.25 to 1.25 V; none for unquantised records.
    bits: Option<i32>,
    make: fn(f64) -> Signal,
}

const SHORT: usize = 20_000;
const LONG: usize = 1_000_000;

type Named = (&'static str, Shape, fn(f64) -> Signal);

fn references() -> [Named; 7] {
    [
        ("square rise 3", Shape::Edges, |u| Signal::Square { period: 2000.0, rise: 3.0, phase: 500.0 + u }),
        ("square rise 10, 10.19 p.", Shape::Edges, |u| Signal::Square {
            period: 1962.7,
            rise: 10.0,
            phase: 1962.7 * u,
        }),
        ("square rise 50", Shape::Edges, |u| Signal::Square { period: 2000.0, rise: 50.0, phase: 500.0 + u }),
        ("one pulse rise 5", Shape::Edges, |u| Signal::Pulse { start: 9000.0 + u, width: 2000.0, rise: 5.0 }),
        ("sine 50 p.", Shape::Sine, |u| Signal::sine(400.0, std::f64::consts::TAU * u)),
        ("sine 50.37 p.", Shape::Sine, |u| Signal::sine(20_000.0 / 50.37, std::f64::consts::TAU * u)),
        ("twenty tones", Shape::Multitone, |u| Signal::twenty(std::f64::consts::TAU * u)),
    ]
}

fn cases() -> Vec<Case> {
    let levels = [
        (20.0, None),
        (20.0, Some(8)),
        (30.0, Some(8)),
        (40.0, None),
        (40.0, Some(12)),
        (50.0, Some(12)),
        (60.0, Some(12)),
    ];
    let mut cases: Vec<Case> = references()
        .into_iter()
        .flat_map(|(name, shape, make)| {
            levels.map(|(snr_db, bits)| Case { name, shape, samples: SHORT, snr_db, bits, make })
        })
        .collect();
    for snr_db in [20.0, 40.0, 60.0] {
        cases.push(Case {
            name: "1 M, 20 edges rise 10",
            shape: Shape::Edges,
            samples: LONG,
            snr_db,
            bits: None,
            make: |u| Signal::Square { period: 100_000.5, rise: 10.0, phase: 20_000.0 + 20_000.0 * u },
        });
    }
    cases.push(Case {
        name: "1 M, 400 edges rise 10",
        shape: Shape::Edges,
        samples: LONG,
        snr_db: 20.0,
        bits: None,
        make: |u| Signal::Square { period: 5000.3, rise: 10.0, phase: 1000.0 + 1000.0 * u },
    });
    cases
}

/// Error over bound, error over stated uncertainty, and the told estimator's error over bound, of skew, gain and offset.
type Trial = [(f64, f64, f64); 3];

impl Case {
    fn run(&self, trials: usize, seed: u64) -> Vec<Trial> {
        std::thread::scope(|scope| {
            let each = trials.div_ceil(STREAMS as usize);
            let threads: Vec<_> =
                (0..STREAMS).map(|stream| scope.spawn(move || self.stream(each, seed + 1000 * stream))).collect();
            threads.into_iter().flat_map(|thread| thread.join().unwrap()).collect()
        })
    }

    fn stream(&self, trials: usize, seed: u64) -> Vec<Trial> {
        let mut dice = Dice::new(seed);
        let rms = (self.make)(0.37).rms(self.samples);
        (0..trials)
            .map(|_| {
                let signal = (self.make)(dice.uniform(0.0, 1.0));
                let noise = rms * 10f64.powf(-self.snr_db / 20.0);
                let truth = Truth { tau: dice.uniform(-8.0, 8.0), ..Truth::with_noise(noise) };
                let (mut p, mut n) = dice.records(&signal, &truth, self.samples);
                let mut felt = truth;
                if let Some(bits) = self.bits {
                    let step = 2.5 / 2f64.powi(bits);
                    quantise(&mut p, step);
                    quantise(&mut n, step);
                    felt.noise_p = noise.hypot(step / 12f64.sqrt());
                    felt.noise_n = felt.noise_p;
                }
                let bound = felt.bound(&signal, self.samples);
                let found = estimate(&p, &n, 1.0, &Reference { shape: self.shape, period_s: None }).unwrap();
                trial(&found, &truth, bound, felt.efficient(&signal, &p, &n))
            })
            .collect()
    }

    /// Noise in converter steps.
    fn dither(&self) -> Option<f64> {
        let noise = (self.make)(0.37).rms(self.samples) * 10f64.powf(-self.snr_db / 20.0);
        self.bits.map(|bits| noise / (2.5 / 2f64.powi(bits)))
    }
}

fn trial(found: &SkewEstimate, truth: &Truth, bound: [f64; 3], told: [f64; 3]) -> Trial {
    let got = [found.skew_s, found.gain, found.offset_v];
    let want = [truth.tau, truth.gain, truth.offset];
    [0, 1, 2].map(|i| {
        let error = got[i].value - want[i];
        (error / bound[i], error / got[i].u, told[i] / bound[i])
    })
}

/// Milliseconds of an estimate from codes, median of 15.
fn time() {
    for (samples, edges) in [(100_000, 4.0), (1_000_000, 20.0), (10_000_000, 20.0)] {
        let signal = Signal::Square { period: 2.0 * samples as f64 / edges, rise: 10.0, phase: 0.02 * samples as f64 };
        let (p, n) = Dice::new(69_000).records(&signal, &Truth::with_noise(0.01), samples);
        let record = |volts: &[f64]| Record {
            samples: Samples::Codes(volts.iter().map(|v| (v / 0.01).round() as i16).collect()),
            volts_per_code: 0.01,
            zero_v: 0.0,
            interval_s: 1e-9,
            start_s: 0.0,
            end_codes: (-128.0, 127.0),
            step_v: 0.01,
            averages: 1,
        };
        let (p, n) = (record(&p), record(&n));
        let mut all: Vec<f64> = (0..15)
            .map(|_| {
                let begun = std::time::Instant::now();
                let found = estimate_records(&p, &n, &Reference { shape: Shape::Edges, period_s: None }).unwrap();
                let ms = begun.elapsed().as_secs_f64() * 1e3;
                assert!((found.skew_s.value - 3.3e-9).abs() < 0.1e-9, "{found:?}");
                ms
            })
            .collect();
        all.sort_by(f64::total_cmp);
        println!("{samples:>9} samples, {edges} edges: {:.2} ms (least {:.2})", all[all.len() / 2], all[0]);
    }
}

fn main() {
    if std::env::args().nth(1).is_some_and(|text| text == "time") {
        return time();
    }
    let mut arguments = std::env::args().skip(1);
    let trials: usize = arguments.next().and_then(|text| text.parse().ok()).unwrap_or(1000);
    let only = arguments.next();
    println!("{trials} trials a case, seeds 70000 + case, measured noise; values in units of the bound");
    println!(
        "{:25} {:>5} {:>5} {:>5} | {:^38} | {:^38} | {:^38} | {:^17} | marks",
        "reference", "dB", "bits", "LSB", "skew: sd (SE), bias (SE), k=2 %", "gain", "offset", "told: sd of each"
    );
    let mut missed = 0;
    for (number, case) in cases().iter().enumerate() {
        if only.as_ref().is_some_and(|only| !case.name.contains(only.as_str())) {
            continue;
        }
        let all = case.run(trials, 70_000 + number as u64);
        let count = all.len() as f64;
        let (mut columns, mut verdict, mut told) = (Vec::new(), Vec::new(), Vec::new());
        for (i, what) in ["skew", "gain", "offset"].into_iter().enumerate() {
            let bias = all.iter().map(|one| one[i].0).sum::<f64>() / count;
            let sd = (all.iter().map(|one| (one[i].0 - bias).powi(2)).sum::<f64>() / (count - 1.0)).sqrt();
            told.push(format!("{:5.3}", (all.iter().map(|one| one[i].2.powi(2)).sum::<f64>() / count).sqrt()));
            let within = all.iter().filter(|one| one[i].1.abs() <= 2.0).count() as f64 / count;
            let (se_sd, se_bias) = (sd / (2.0 * count).sqrt(), sd / count.sqrt());
            let se_within = (0.9545 * 0.0455 / count).sqrt();
            columns.push(format!(
                "{sd:5.3} ({se_sd:.3}) {bias:+6.3} ({se_bias:.3}) {:5.1} ({:.1})",
                100.0 * within,
                100.0 * se_within
            ));
            if sd > 1.05 + 2.0 * se_sd {
                verdict.push(format!("{what} sd"));
            }
            if bias.abs() > 0.1 + 2.0 * se_bias {
                verdict.push(format!("{what} bias"));
            }
            if within < 0.94 - 2.0 * se_within || within > 0.965 + 2.0 * se_within {
                verdict.push(format!("{what} k=2"));
            }
        }
        let dither = case.dither();
        // Below half a step of noise no mark applies: there the tool warns.
        let marks = match (verdict.is_empty(), dither.is_some_and(|steps| steps < 0.5)) {
            (true, _) => "met".to_owned(),
            (false, true) => format!("(warned: little dither) {}", verdict.join(", ")),
            (false, false) => {
                missed += 1;
                format!("MISSED: {}", verdict.join(", "))
            }
        };
        println!(
            "{:25} {:5.0} {:>5} {:>5} | {} | {} | {} | {} | {marks}",
            case.name,
            case.snr_db,
            case.bits.map_or_else(|| "-".to_owned(), |bits| bits.to_string()),
            dither.map_or_else(|| "-".to_owned(), |steps| format!("{steps:.2}")),
            columns[0],
            columns[1],
            columns[2],
            told.join(" "),
        );
    }
    println!("{missed} cases missed a mark");
}
