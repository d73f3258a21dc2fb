//! A sine with its harmonics, fitted by least squares: exact for records that do not hold whole periods.
//!
//! `x[i] = c₀ + Σ_k a_k·cos(kωt) + b_k·sin(kωt)`, k = 1..=K, t from the record's middle, where cosines and sines are
//! orthogonal for any length. The normal equations have the closed form `Σ cos(mωt) = sin(mωn/2)/sin(mω/2)`, so that one
//! pass over the samples suffices: K complex sums each. The frequency comes from the phases of the fundamental in the
//! record's halves, twice over (as the four-parameter fit of IEEE Std 1057, but in one pass a step).

use nalgebra::{DMatrix, DVector};
use realfft::num_complex::Complex;

use super::signal::{BLOCK, Signal, blocks};

/// The highest harmonic that is fitted.
pub const HIGHEST: usize = 10;

/// Below so many periods the harmonics cannot be told from each other and the mean.
pub const LEAST_PERIODS: f64 = 2.0;

/// Passes over the samples to find the frequency.
const PASSES: usize = 4;

/// A phase between the halves that is known better than this, in radians, needs no further pass.
const PHASE: f64 = 1e-5;

/// A fundamental with its harmonics.
#[derive(Debug, Clone, PartialEq)]
pub struct Harmonics {
    /// Cycles per sample of the fundamental.
    pub frequency: f64,
    /// `a_k − j·b_k`, the fundamental first: the phasors at the record's middle.
    pub phasors: Vec<Complex<f64>>,
    /// c₀.
    pub level: f64,
    /// Variance of the phasors' real and imaginary parts per variance of a sample, one for each harmonic (the mean of both).
    pub weights: Vec<f64>,
    /// Mean square of what the fit explains about the mean.
    pub explained: f64,
    points: usize,
}

/// Why there is no fit.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum NoHarmonics {
    /// Too few periods.
    #[error("the record holds {periods:.1} periods; harmonics need at least {LEAST_PERIODS:.0}")]
    FewPeriods {
        /// How many periods it holds.
        periods: f64,
    },
    /// The second harmonic is beyond the band.
    #[error("the second harmonic lies above four tenths of the sample rate; sample faster")]
    Slow,
    /// The equations cannot be solved.
    #[error("the harmonics cannot be told apart in this record")]
    Singular,
}

/// Fits a signal whose fundamental is near `frequency` cycles per sample.
///
/// # Errors
/// When the record holds too few periods or too few samples a period.
pub fn fit<S: Signal + ?Sized>(signal: &S, frequency: f64) -> Result<Harmonics, NoHarmonics> {
    let points = signal.points();
    let middle = points / 2;
    let mut frequency = frequency;
    for _ in 0..PASSES {
        let count = count(points, frequency)?;
        let omega = std::f64::consts::TAU * frequency;
        let [first, second] = [0..middle, middle..points]
            .map(|range| solve(&sums(signal, range.clone(), omega, count), omega, range.len()));
        let (first, second) = (first?, second?);
        // The middles of the halves are half the record apart.
        let apart = 0.5 * points as f64;
        let turn = Complex::from_polar(1.0, -omega * apart);
        // A phasor a − jb is A·e^{jφ} of A·cos(ωt + φ).
        let phase = (second.phasors[0] * first.phasors[0].conj() * turn).arg();
        frequency += phase / apart / std::f64::consts::TAU;
        if phase.abs() < PHASE {
            break;
        }
    }
    at(signal, frequency)
}

/// The fit at a frequency that is known, such as that of another signal of the same capture.
///
/// # Errors
/// As [`fit`].
pub fn at<S: Signal + ?Sized>(signal: &S, frequency: f64) -> Result<Harmonics, NoHarmonics> {
    let points = signal.points();
    let count = count(points, frequency)?;
    let omega = std::f64::consts::TAU * frequency;
    solve(&sums(signal, 0..points, omega, count), omega, points)
}

impl Harmonics {
    /// Rms of the harmonics relative to the fundamental's, the power taken off that white noise of `noise` rms leaves in
    /// them, and the standard uncertainty that it leaves.
    #[must_use]
    pub fn distortion(&self, noise: f64) -> (f64, f64) {
        let fundamental = self.phasors[0].norm_sqr();
        if fundamental <= 0.0 {
            return (0.0, 0.0);
        }
        let (mut power, mut variance) = (0.0, 0.0);
        for (phasor, weight) in self.phasors.iter().zip(&self.weights).skip(1) {
            let v = weight * noise * noise;
            let own = phasor.norm_sqr() - 2.0 * v;
            power += own;
            // Variance of a² + b² with variance v in each: 4·A²·v + 4·v².
            variance += 4.0 * v * (own.max(0.0) + v);
        }
        let value = (power.max(0.0) / fundamental).sqrt();
        // The root is bent near zero; what noise could fake keeps the slope finite there.
        let size = value.max((variance.sqrt() / fundamental).sqrt()).max(f64::MIN_POSITIVE.sqrt());
        (value, 0.5 * variance.sqrt() / fundamental / size)
    }

    /// The fit of this signal with `step` times another one added: least squares is linear. The same frequency and length
    /// is the caller's business.
    #[must_use]
    pub fn moved(&self, along: &[Complex<f64>], step: f64) -> Self {
        let phasors = self.phasors.iter().zip(along).map(|(own, other)| own + other * step).collect();
        Self { phasors, ..self.clone() }
    }

    /// The phasors of the signal's derivative, per unit of time for samples `interval_s` apart.
    #[must_use]
    pub fn slope(&self, interval_s: f64) -> Vec<Complex<f64>> {
        let omega = std::f64::consts::TAU * self.frequency / interval_s;
        (1u32..).zip(&self.phasors).map(|(k, phasor)| phasor * Complex::new(0.0, omega * f64::from(k))).collect()
    }

    /// How many periods the record holds.
    #[must_use]
    pub fn periods(&self) -> f64 {
        self.points as f64 * self.frequency
    }
}

/// How many harmonics lie in the band in which samples are right.
fn count(points: usize, frequency: f64) -> Result<usize, NoHarmonics> {
    let periods = points as f64 * frequency;
    if periods.is_nan() || periods < LEAST_PERIODS {
        return Err(NoHarmonics::FewPeriods { periods });
    }
    let count = ((super::interpolate::BAND / frequency) as usize).min(HIGHEST);
    if count < 2 { Err(NoHarmonics::Slow) } else { Ok(count) }
}

/// `Σ x[i]·e^{−jkωt}` for k = 0..=K, t from the range's middle, and nothing else of the samples.
fn sums<S: Signal + ?Sized>(signal: &S, range: std::ops::Range<usize>, omega: f64, count: usize) -> Vec<Complex<f64>> {
    /// Products that are added side by side.
    const LANES: usize = 4;
    let table: Vec<(Vec<f64>, Vec<f64>)> = (0..=count)
        .map(|k| (0..BLOCK).map(|i| ((k * i) as f64 * omega).sin_cos()).map(|(sin, cos)| (cos, -sin)).unzip())
        .collect();
    let centre = 0.5 * (range.len() as f64 - 1.0) + range.start as f64;
    let mut found = vec![Complex::new(0.0, 0.0); count + 1];
    let mut values = [0.0f64; BLOCK];
    blocks(signal, range, |from, part| {
        let values = &mut values[..part.len()];
        values.iter_mut().zip(part).for_each(|(value, x)| *value = f64::from(*x));
        for (k, (found, (cos, sin))) in found.iter_mut().zip(&table).enumerate() {
            let dot = |table: &[f64]| {
                let mut lanes = [0.0; LANES];
                let (chunks, rest) = values.as_chunks::<LANES>();
                let (weights, others) = table[..values.len()].as_chunks::<LANES>();
                for (x, w) in chunks.iter().zip(weights) {
                    for l in 0..LANES {
                        lanes[l] += x[l] * w[l];
                    }
                }
                lanes.iter().sum::<f64>() + rest.iter().zip(others).map(|(x, w)| x * w).sum::<f64>()
            };
            let start = Complex::from_polar(1.0, -(k as f64) * omega * (from as f64 - centre));
            *found += start * Complex::new(dot(cos), dot(sin));
        }
    });
    found
}

/// The least-squares solution from the sums of `points` samples.
fn solve(sums: &[Complex<f64>], omega: f64, points: usize) -> Result<Harmonics, NoHarmonics> {
    let count = sums.len() - 1;
    let n = points as f64;
    let kernel = |m: usize| {
        let half = 0.5 * m as f64 * omega;
        if half.sin().abs() < 1e-12 { n } else { (n * half).sin() / half.sin() }
    };
    let cosines = DMatrix::from_fn(count + 1, count + 1, |k, l| 0.5 * (kernel(k.abs_diff(l)) + kernel(k + l)));
    let sines = DMatrix::from_fn(count, count, |k, l| 0.5 * (kernel(k.abs_diff(l)) - kernel(k + l + 2)));
    let right_cosines = DVector::from_iterator(count + 1, sums.iter().map(|s| s.re));
    let right_sines = DVector::from_iterator(count, sums[1..].iter().map(|s| -s.im));
    let cosines = cosines.cholesky().ok_or(NoHarmonics::Singular)?;
    let sines = sines.cholesky().ok_or(NoHarmonics::Singular)?;
    let (a, b) = (cosines.solve(&right_cosines), sines.solve(&right_sines));
    let (of_a, of_b) = (cosines.inverse(), sines.inverse());
    let total = a.dot(&right_cosines) + b.dot(&right_sines);
    let mean = sums[0].re / n;
    Ok(Harmonics {
        frequency: omega / std::f64::consts::TAU,
        phasors: (0..count).map(|k| Complex::new(a[k + 1], -b[k])).collect(),
        level: a[0],
        weights: (0..count).map(|k| 0.5 * (of_a[(k + 1, k + 1)] + of_b[(k, k)])).collect(),
        explained: (total / n - mean * mean).max(0.0),
        points,
    })
}

#[cfg(test)]
mod tests;
