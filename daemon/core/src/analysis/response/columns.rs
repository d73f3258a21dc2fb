//! The columns of the fit as spectra on the chosen bins, and the inner products that the normal equations are made of.
//!
//! Columns 0 to 16: the corrected negative leg, shifted by −8 to 8 samples. [`SLOW`]: its low-pass. [`HISTORY`]: what
//! the low-pass's unknown past adds. [`POSITIVE`]: the positive leg, which the others are to equal.

use nalgebra::DMatrix;
use realfft::num_complex::Complex;
use std::ops::Range;

use super::super::spectrum::Fourier;
use super::ResponseError;
use super::align::{HALF, Mean};
use super::bins::{Band, Bins};
use super::carry::LowPass;

/// How many shifted columns there are.
pub(super) const TAPS: usize = 2 * HALF + 1;
/// The low-pass.
pub(super) const SLOW: usize = TAPS;
/// Its history.
pub(super) const HISTORY: usize = TAPS + 1;
/// The positive leg.
pub(super) const POSITIVE: usize = TAPS + 2;

/// The spectrum of a record, bin 0 first.
type Spectrum = Vec<Complex<f64>>;

/// One column: its spectrum, and how the negative leg's noise comes through (nothing where it does not).
#[derive(Debug, Clone)]
pub(super) struct Column {
    pub(super) signal: Vec<Complex<f64>>,
    pub(super) through: Option<Vec<Complex<f64>>>,
}

/// The spectra of a mean of acquisitions on the chosen bins.
#[derive(Debug, Clone)]
pub(super) struct Spectra {
    shifted: Vec<Vec<Complex<f64>>>,
    positive: Vec<Complex<f64>>,
    /// `e^{jω}` of each bin.
    turn: Vec<Complex<f64>>,
    /// Noise power of the positive leg per bin.
    pub(super) noise_p: f64,
    /// Noise power of the corrected negative leg per bin.
    pub(super) noise_x: f64,
    acquisitions: f64,
}

/// The spectra of P and of the unshifted negative leg, from which bins are chosen.
pub(super) fn overview(mean: &Mean, fourier: &Fourier) -> Result<(Spectrum, Spectrum), ResponseError> {
    Ok((fourier.forward(&mut mean.p.clone())?, shifted(mean, fourier, HALF)?))
}

fn shifted(mean: &Mean, fourier: &Fourier, by: usize) -> Result<Vec<Complex<f64>>, ResponseError> {
    Ok(fourier.forward(&mut mean.x[by..by + mean.p.len()].to_vec())?)
}

impl Spectra {
    /// Of a mean of acquisitions, whose legs have this noise power per bin.
    pub(super) fn of(
        mean: &Mean,
        fourier: &Fourier,
        bins: &Bins,
        (noise_p, noise_x): (f64, f64),
    ) -> Result<Self, ResponseError> {
        let pick = |spectrum: &[Complex<f64>]| bins.kept.iter().map(|&k| spectrum[k]).collect::<Vec<_>>();
        let (p, x) = overview(mean, fourier)?;
        let length = mean.p.len() as f64;
        let mut columns = Vec::with_capacity(TAPS);
        for by in 0..TAPS {
            columns.push(if by == HALF { pick(&x) } else { pick(&shifted(mean, fourier, by)?) });
        }
        let step = std::f64::consts::TAU / length;
        let turn = bins.kept.iter().map(|&k| Complex::cis(step * k as f64)).collect();
        Ok(Self { shifted: columns, positive: pick(&p), turn, noise_p, noise_x, acquisitions: mean.acquisitions })
    }

    /// The mean of both, each by its number of acquisitions.
    pub(super) fn with(&self, other: &Self) -> Self {
        let all = self.acquisitions + other.acquisitions;
        let (a, b) = (self.acquisitions / all, other.acquisitions / all);
        let mix = |x: &[Complex<f64>], y: &[Complex<f64>]| x.iter().zip(y).map(|(x, y)| x * a + y * b).collect();
        Self {
            shifted: self.shifted.iter().zip(&other.shifted).map(|(x, y)| mix(x, y)).collect(),
            positive: mix(&self.positive, &other.positive),
            turn: self.turn.clone(),
            noise_p: a * a * self.noise_p + b * b * other.noise_p,
            noise_x: a * a * self.noise_x + b * b * other.noise_x,
            acquisitions: all,
        }
    }

    /// Noise power per bin of the residual.
    pub(super) fn residual_noise(&self) -> f64 {
        self.noise_p + self.noise_x
    }

    pub(super) fn bins(&self) -> usize {
        self.turn.len()
    }

    /// The negative leg, `Σ weights[m]·x[i + m − 8]`.
    pub(super) fn weighted(&self, weights: &[f64; TAPS]) -> Column {
        let mut signal = vec![Complex::default(); self.bins()];
        let mut through = vec![Complex::default(); self.bins()];
        for (m, &weight) in weights.iter().enumerate().filter(|(_, weight)| **weight != 0.0) {
            signal.iter_mut().zip(&self.shifted[m]).for_each(|(sum, x)| *sum += x * weight);
            through.iter_mut().zip(&self.through(m)).for_each(|(sum, h)| *sum += h * weight);
        }
        Column { signal, through: Some(through) }
    }

    pub(super) fn tap(&self, m: usize) -> Column {
        Column { signal: self.shifted[m].clone(), through: Some(self.through(m)) }
    }

    fn through(&self, m: usize) -> Vec<Complex<f64>> {
        let power = m as i32 - HALF as i32;
        self.turn.iter().map(|turn| turn.powi(power)).collect()
    }

    pub(super) fn positive(&self) -> Column {
        Column { signal: self.positive.clone(), through: None }
    }

    /// The low-pass with a time constant of `samples`, and its history.
    ///
    /// Over a record, `(1 − ρz⁻¹)·U = (c1 + c0·z⁻¹)·X + K` with a constant K from what lies before the record and at its
    /// end, so that the two columns hold the low-pass exactly, whatever its past was.
    pub(super) fn slow(&self, samples: f64) -> [Column; 2] {
        let filter = LowPass::new(samples);
        let tail: Vec<Complex<f64>> = self.turn.iter().map(|turn| (1.0 - turn.conj() * filter.rho).inv()).collect();
        let through: Vec<Complex<f64>> =
            self.turn.iter().zip(&tail).map(|(turn, tail)| (turn.conj() * filter.c0 + filter.c1) * tail).collect();
        let signal = through.iter().zip(&self.shifted[HALF]).map(|(h, x)| h * x).collect();
        [Column { signal, through: Some(through) }, Column { signal: tail, through: None }]
    }

    /// All columns, in order.
    pub(super) fn all(&self, samples: f64) -> Vec<Column> {
        let mut columns: Vec<Column> = (0..TAPS).map(|m| self.tap(m)).collect();
        columns.extend(self.slow(samples));
        columns.push(self.positive());
        columns
    }

    /// The inner product of two columns over `range`, less what the negative leg's noise puts there.
    pub(super) fn clean(&self, a: &Column, b: &Column, range: Range<usize>) -> f64 {
        let found = inner(&a.signal[range.clone()], &b.signal[range.clone()]);
        match (&a.through, &b.through) {
            (Some(a), Some(b)) => found - self.noise_x * inner(&a[range.clone()], &b[range]),
            _ => found,
        }
    }

    /// The matrix of clean inner products in each band; the last column is taken to be the positive leg.
    pub(super) fn products(&self, columns: &[Column], bands: &[Band]) -> Vec<DMatrix<f64>> {
        let size = columns.len();
        let of_band = |band: &Band| {
            let mut matrix = DMatrix::zeros(size, size);
            for i in 0..size {
                for j in 0..=i {
                    let mut value = self.clean(&columns[i], &columns[j], band.range.clone());
                    if i == size - 1 && j == i {
                        value -= self.noise_p * band.range.len() as f64;
                    }
                    matrix[(i, j)] = value;
                    matrix[(j, i)] = value;
                }
            }
            matrix
        };
        bands.iter().map(of_band).collect()
    }
}

/// `Σ Re(a*·b)`.
fn inner(a: &[Complex<f64>], b: &[Complex<f64>]) -> f64 {
    // Partial sums keep the digits of long sums.
    let chunks = a.chunks(1024).zip(b.chunks(1024));
    chunks.map(|(a, b)| a.iter().zip(b).map(|(a, b)| a.re * b.re + a.im * b.im).sum::<f64>()).sum()
}
