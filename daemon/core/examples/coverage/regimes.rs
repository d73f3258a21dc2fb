//! The regimes in which coverage is measured, and one simulated case of a regime.
//!
//! A case is a whole measurement: a reference capture, the correction estimated from it, a drift of both legs, a
//! capture of the device, the noise measured, the figures computed. Nothing is told that the tool would not know.

use std::f64::consts::TAU;

use evenpair_core::analysis::figures::{Allowance, Asked, Drift, Figure, FigureInput, FigureKind, compute};
use evenpair_core::analysis::leak::LeakBound;
use evenpair_core::analysis::skew::{Reference, Shape, estimate_records};
use evenpair_core::analysis::{Record, Samples, apply, noise};
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rand_distr::StandardNormal;
use statrs::function::erf::erf;

/// Samples of a record.
const POINTS: usize = 10_000;

/// Seconds between two samples.
const INTERVAL_S: f64 = 1e-9;

/// Full span of the converter in volts at the tip.
const SPAN_V: f64 = 300.0;

/// The common mode: a square wave of ±100 V with edges of 5 ns (10 % to 90 %), ten periods in a record.
const COMMON_V: f64 = 100.0;
const PERIOD: f64 = 1000.0;
const EDGE: f64 = 5.0;

/// Whole and a fraction of cycles of the difference's sine in a record.
const CYCLES: f64 = 37.3;

/// What a regime promises.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Mark {
    /// 94 to 96 %: a budget of first order.
    Sharp,
    /// At least 95 %, and told that the common mode limits the figure.
    CommonMode,
    /// At least 95 %, with a term for quantisation.
    Quantisation,
}

/// A regime.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Regime {
    pub(crate) name: &'static str,
    pub(crate) words: &'static str,
    /// Amplitude of the difference's sine in volts.
    sine_v: f64,
    /// What of the difference moves in step with the common mode, in volts.
    step_v: f64,
    bits: u32,
    /// Noise before the converter, volts rms.
    noise_v: f64,
    /// Half-width of the scale's specification, and standard uncertainty of a calibrated one.
    scale: (f64, f64),
    drift: Drift,
    pub(crate) mark: Mark,
}

const SMALL: Drift = Drift { gain: 1e-4, skew_s: 10e-12, offset_v: 5e-3 };
const GAIN: Drift = Drift { gain: 2e-3, ..SMALL };
const SKEW: Drift = Drift { skew_s: 300e-12, ..SMALL };

/// A 12-bit regime of 10 V with a calibrated scale, from which the others differ.
const BASE: Regime = Regime {
    name: "S2",
    words: "10 V, 12 bit, scale calibrated to 0.05 %",
    sine_v: 10.0,
    step_v: 0.0,
    bits: 12,
    noise_v: 0.15,
    scale: (0.0, 5e-4),
    drift: SMALL,
    mark: Mark::Sharp,
};

const LOW: Regime = Regime { sine_v: 0.5, drift: GAIN, mark: Mark::CommonMode, ..BASE };

/// All regimes.
pub(crate) const REGIMES: [Regime; 10] = [
    Regime { name: "S1", words: "10 V, 12 bit, scale within ±1 %", scale: (0.01, 0.0), ..BASE },
    BASE,
    Regime { name: "S3", words: "10 V, 8 bit, noise 0.68 LSB", bits: 8, noise_v: 0.8, ..BASE },
    Regime { name: "S4", words: "0.5 V, gain drifts ±0.2 %", ..LOW },
    Regime { name: "S5", words: "0.5 V, skew drifts ±300 ps", drift: SKEW, ..LOW },
    Regime {
        name: "S6",
        words: "10 V, 8 bit, noise 0.1 LSB",
        bits: 8,
        noise_v: 0.1 * SPAN_V / 256.0,
        mark: Mark::Quantisation,
        ..BASE
    },
    Regime { name: "S7a", words: "S4 and 0.05 V in step with the common mode", step_v: 0.05, ..LOW },
    Regime { name: "S7b", words: "S4 and 0.15 V in step", step_v: 0.15, ..LOW },
    Regime { name: "S7c", words: "S4 and 0.30 V in step", step_v: 0.30, ..LOW },
    Regime { name: "S8", words: "S4 and 1 V in step", step_v: 1.0, mark: Mark::Sharp, ..LOW },
];

/// What came of one case.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Outcome {
    /// Whether the intervals of rms, mean and maximum held the truth.
    pub(crate) rms: bool,
    pub(crate) mean: bool,
    /// `None` where the difference is more than its sine, so that its maximum is not the sine's amplitude.
    pub(crate) maximum: Option<bool>,
    /// Whether value ± 2u of the rms would have held it.
    pub(crate) plain: bool,
    /// Whether the rms said what limits it: the common mode, or quantisation.
    pub(crate) flagged: bool,
    /// Half-width of the rms's interval in volts.
    pub(crate) half_v: f64,
}

/// One device and two legs, as they are at one time.
struct Bench {
    gain: f64,
    skew_s: f64,
    offset_v: f64,
    scale: f64,
}

/// Runs one case; `None` when the estimator or the correction refuses its record, which counts as a miss.
pub(crate) fn case(regime: &Regime, seed: u64) -> Option<Outcome> {
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    let (half, u) = regime.scale;
    let z: f64 = rng.sample(StandardNormal);
    let scale = 1.0 + half * rng.random_range(-1.0..=1.0) + u * z;
    let mut bench = Bench { gain: 0.985, skew_s: (1.37 + rng.random_range(-0.5..=0.5)) * 1e-9, offset_v: 0.2, scale };
    let nothing = |_: f64| 0.0;
    let (p, n) = acquire(&bench, regime, &nothing, rng.random_range(0.0..PERIOD), &mut rng);
    let known = Reference { shape: Shape::Edges, period_s: Some(PERIOD * INTERVAL_S) };
    let correction = estimate_records(&p, &n, &known).ok()?.correction();

    bench.gain *= 1.0 + regime.drift.gain * rng.random_range(-1.0..=1.0);
    bench.skew_s += regime.drift.skew_s * rng.random_range(-1.0..=1.0);
    bench.offset_v += regime.drift.offset_v * rng.random_range(-1.0..=1.0);
    let (phase, angle) = (rng.random_range(0.0..PERIOD), rng.random_range(0.0..TAU));
    let sine = |t: f64| regime.sine_v * (TAU * CYCLES * t / POINTS as f64 + angle).sin();
    let difference = |t: f64| sine(t) + regime.step_v / COMMON_V * common(t - phase);
    let (p, n) = acquire(&bench, regime, &difference, phase, &mut rng);
    let corrected = apply::correct(&p, &n, &correction).ok()?;
    let noise = noise::out_of_band(&p.volts(), &n.volts(), correction.gain.value).ok()??;
    let leak = LeakBound { rms_v: 0.0, peak_v: 0.0, mean_v: 0.0, common_rms_v: 0.0, common_swing_v: 0.0 };
    let figures = compute(&FigureInput {
        corrected: &corrected,
        plain_v: None,
        correction: &correction,
        leak: &leak,
        noise_p_v: noise.p_v,
        noise_n_v: noise.n_v,
        step_p_v: p.step_v,
        step_n_v: n.step_v,
        scale_spec: half,
        clipped_p: p.clipped(),
        clipped_n: n.clipped(),
        averages: 1,
        allowance: Allowance { scale_u: u, noise_bins: noise.bins, drift: regime.drift, ..Allowance::default() },
        asked: Asked::default(),
    });
    let truth: Vec<f64> =
        (corrected.first..corrected.first + corrected.difference_v.len()).map(|i| difference(i as f64)).collect();
    let count = truth.len() as f64;
    let rms = (truth.iter().map(|d| d * d).sum::<f64>() / count).sqrt();
    let figure = |kind| figures.iter().find(|f| f.kind == kind);
    let holds =
        |kind, truth: f64| figure(kind).and_then(|f| f.coverage).is_some_and(|c| c.low <= truth && truth <= c.high);
    let found: &Figure = figure(FigureKind::Rms)?;
    let named = |name| found.budget.iter().any(|t| t.name == name && t.u > 0.1 * found.u);
    Some(Outcome {
        rms: holds(FigureKind::Rms, rms),
        mean: holds(FigureKind::Mean, truth.iter().sum::<f64>() / count),
        maximum: (regime.step_v <= 0.0).then(|| holds(FigureKind::Maximum, regime.sine_v)),
        plain: (found.value - rms).abs() <= 2.0 * found.u,
        flagged: match regime.mark {
            Mark::Quantisation => named("quantisation"),
            _ => found.coverage.is_some_and(|c| c.basis.name() == "common mode"),
        },
        half_v: found.coverage.map_or(f64::NAN, |c| c.half_width()),
    })
}

/// The common mode at `t` samples: ±[`COMMON_V`], rising at 0.
fn common(t: f64) -> f64 {
    let sigma = EDGE / 2.563_103_131 * 2.0f64.sqrt();
    let x = (t + 0.25 * PERIOD).rem_euclid(PERIOD);
    COMMON_V * (erf((x - 0.25 * PERIOD) / sigma) - erf((x - 0.75 * PERIOD) / sigma) - 1.0)
}

/// Both legs of one acquisition, through noise and converter.
fn acquire(
    bench: &Bench,
    regime: &Regime,
    difference: &dyn Fn(f64) -> f64,
    phase: f64,
    rng: &mut ChaCha8Rng,
) -> (Record, Record) {
    let late = bench.skew_s / INTERVAL_S;
    let p = digitise(regime, rng, &|t| bench.scale * (common(t - phase) + difference(t)));
    let n = digitise(regime, rng, &|t| bench.scale * (bench.gain * common(t - late - phase)) + bench.offset_v);
    (p, n)
}

fn digitise(regime: &Regime, rng: &mut ChaCha8Rng, leg: &dyn Fn(f64) -> f64) -> Record {
    let step_v = SPAN_V / 2.0f64.powi(regime.bits as i32);
    let end = 2.0f64.powi(regime.bits as i32 - 1);
    let codes = (0..POINTS).map(|i| {
        let noise: f64 = rng.sample(StandardNormal);
        let volts = regime.noise_v.mul_add(noise, leg(i as f64));
        (volts / step_v).round().clamp(-end, end - 1.0) as i16
    });
    Record {
        samples: Samples::Codes(codes.collect()),
        volts_per_code: step_v,
        zero_v: 0.0,
        interval_s: INTERVAL_S,
        start_s: 0.0,
        end_codes: (-end, end - 1.0),
        step_v,
        averages: 1,
    }
}

/// The standard error of a share of `trials`.
pub(crate) fn standard_error(share: f64, trials: usize) -> f64 {
    (share * (1.0 - share) / trials as f64).sqrt()
}

/// How far a share over `trials` lies from where its standard error at 95 % allows it, as a test's slack.
#[cfg(test)]
pub(crate) fn slack(trials: usize) -> f64 {
    // Three standard errors.
    3.0 * standard_error(0.95, trials)
}
