//! Least squares on the columns: one model for a given time constant, and the search for the time constant.

use nalgebra::{DMatrix, DVector};

use super::align::HALF;
use super::bins::Band;
use super::columns::{Column, HISTORY, POSITIVE, SLOW, Spectra, TAPS};

/// The shortest time constant that is told from what a filter does, in samples.
const SHORTEST: f64 = 50.0;

/// Points of the first search for the time constant.
const GRID: usize = 32;

/// What a tap is expected to differ from its ideal by: legs that differ more are not the same kind of leg. Where the
/// reference says nothing (beyond its band) this keeps the taps small.
const EXPECTED_TAP: f64 = 0.1;

/// The least weight of that expectation, relative to the signal: it costs a tap of 0.1 no more than −120 dB.
const LEAST_RIDGE: f64 = 1e-10;

/// Which terms a model has.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Terms {
    pub(super) pole_zero: bool,
    /// Odd; one tap stands for gain and delay.
    pub(super) taps: usize,
}

/// A model: the coefficient of every column but the positive leg's.
#[derive(Debug, Clone)]
pub(super) struct Model {
    pub(super) coefficients: DVector<f64>,
    /// Standard uncertainties, where the model was fitted.
    pub(super) u: DVector<f64>,
    /// Standard uncertainty of the taps' sum.
    pub(super) u_sum: f64,
}

impl Model {
    /// The corrected negative leg read `delay` samples earlier: a correction whose skew is smaller by that.
    pub(super) fn moved(delay: f64) -> Self {
        let mut coefficients = DVector::zeros(POSITIVE);
        for (m, weight) in shift(-delay).into_iter().enumerate() {
            coefficients[m] = weight;
        }
        Self { coefficients, u: DVector::zeros(POSITIVE), u_sum: 0.0 }
    }

    /// `P − y` as weights of all columns.
    fn residual(&self) -> DVector<f64> {
        let mut weights = (-&self.coefficients).insert_row(POSITIVE, 0.0);
        weights[POSITIVE] = 1.0;
        weights
    }

    /// Residual power over the bins of `products`, without noise.
    pub(super) fn cost(&self, products: &DMatrix<f64>) -> f64 {
        let weights = self.residual();
        weights.dot(&(products * &weights))
    }

    /// The factor on high frequencies.
    pub(super) fn sum(&self) -> f64 {
        self.coefficients.rows(0, TAPS).sum()
    }
}

/// A linear system: products of all columns, band by band, at one time constant.
#[derive(Debug)]
pub(super) struct System {
    pub(super) bands: Vec<DMatrix<f64>>,
    total: DMatrix<f64>,
    /// Noise power per bin of the residual, and of the negative leg alone.
    pub(super) noise: (f64, f64),
}

impl System {
    pub(super) fn new(spectra: &Spectra, bands: &[Band], samples: f64) -> Self {
        let products = spectra.products(&spectra.all(samples), bands);
        let size = POSITIVE + 1;
        let total = products.iter().fold(DMatrix::zeros(size, size), |sum, one| sum + one);
        Self { bands: products, total, noise: (spectra.residual_noise(), spectra.noise_x) }
    }

    /// Fits a model; `None` if its columns cannot be told apart.
    pub(super) fn fit(&self, terms: Terms) -> Option<Model> {
        let basis = basis(terms);
        let mut start = DVector::zeros(POSITIVE + 1);
        start[POSITIVE] = 1.0;
        start[HALF] = -1.0;
        let mut normal = basis.transpose() * &self.total * &basis;
        if terms.taps > 1 {
            let ridge = (0.5 * self.noise.0 / EXPECTED_TAP.powi(2)).max(LEAST_RIDGE * self.total[(HALF, HALF)]);
            (0..terms.taps).for_each(|i| normal[(i, i)] += ridge);
        }
        let right = basis.transpose() * (&self.total * start);
        let (solution, inverse) = solve(&normal, &right)?;
        let mut coefficients = (&basis * solution).remove_row(POSITIVE);
        coefficients[HALF] += 1.0;
        // Noise of power w per bin has w/2 in each of its two parts.
        let covariance = &basis * inverse * basis.transpose() * (0.5 * self.noise.0);
        let u = DVector::from_fn(POSITIVE, |i, _| covariance[(i, i)].max(0.0).sqrt());
        let u_sum = covariance.view((0, 0), (TAPS, TAPS)).sum().max(0.0).sqrt();
        Some(Model { coefficients, u, u_sum })
    }

    /// The delay of a model of gain and delay, in samples: what the skew has to grow by.
    pub(super) fn delay(model: &Model) -> f64 {
        let moment: f64 = (0..TAPS).map(|m| model.coefficients[m] * (m as f64 - HALF as f64)).sum();
        moment / model.sum()
    }
}

/// The free parameters of a model, in terms of the columns.
fn basis(terms: Terms) -> DMatrix<f64> {
    let mut columns: Vec<DVector<f64>> = Vec::new();
    let unit = |i: usize| DVector::from_fn(POSITIVE + 1, |row, _| if row == i { 1.0 } else { 0.0 });
    if terms.taps > 1 {
        let half = terms.taps / 2;
        columns.extend((HALF - half..=HALF + half).map(unit));
    } else {
        columns.push(unit(HALF));
        let slope = slope();
        columns.push(DVector::from_fn(POSITIVE + 1, |row, _| slope.get(row).copied().unwrap_or(0.0)));
    }
    if terms.pole_zero {
        columns.push(unit(SLOW));
        columns.push(unit(HISTORY));
    }
    DMatrix::from_columns(&columns)
}

/// Solves a symmetric positive system after scaling its diagonal to one; the solution and the inverse.
fn solve(matrix: &DMatrix<f64>, right: &DVector<f64>) -> Option<(DVector<f64>, DMatrix<f64>)> {
    let scale = DVector::from_fn(matrix.nrows(), |i, _| 1.0 / matrix[(i, i)].max(f64::MIN_POSITIVE).sqrt());
    let scaled = DMatrix::from_fn(matrix.nrows(), matrix.ncols(), |i, j| matrix[(i, j)] * scale[i] * scale[j]);
    let factors = scaled.cholesky()?;
    let solution = factors.solve(&right.component_mul(&scale)).component_mul(&scale);
    let inverse = factors.inverse();
    let inverse = DMatrix::from_fn(matrix.nrows(), matrix.ncols(), |i, j| inverse[(i, j)] * scale[i] * scale[j]);
    solution.iter().all(|value| value.is_finite()).then_some((solution, inverse))
}

/// Weights of the seventeen-point central difference: the slope per sample (Fornberg, Math. Comp. 51, 1988, in closed
/// form).
pub(super) fn slope() -> [f64; TAPS] {
    let mut weights = [0.0; TAPS];
    let mut ratio = 1.0;
    for m in 1..=HALF {
        // (h!)²/((h − m)!·(h + m)!), step by step.
        ratio *= (HALF + 1 - m) as f64 / (HALF + m) as f64;
        let weight = if m % 2 == 1 { ratio } else { -ratio } / m as f64;
        weights[HALF + m] = weight;
        weights[HALF - m] = -weight;
    }
    weights
}

/// Weights of the seventeen-point Lagrange interpolation at `by` samples from the middle.
fn shift(by: f64) -> [f64; TAPS] {
    let node = |m: usize| m as f64 - HALF as f64;
    std::array::from_fn(|m| (0..TAPS).filter(|&k| k != m).map(|k| (by - node(k)) / (node(m) - node(k))).product())
}

/// The low-pass's time constant, T' in samples, at which a model fits best.
#[derive(Debug, Clone, Copy)]
pub(super) struct TimeConstant {
    pub(super) samples: f64,
    /// Standard uncertainty of its logarithm.
    pub(super) u_relative: f64,
}

/// Half-width of a probe's time constant as its data sheet gives it, relative (common practice, no source).
const KNOWN_TO: f64 = 0.2;

/// A time constant that was found counts up to this uncertainty of its logarithm.
const SHOWN: f64 = 0.2;

impl TimeConstant {
    /// One that is known beforehand.
    pub(super) fn known(samples: f64) -> Self {
        Self { samples, u_relative: KNOWN_TO / 3.0f64.sqrt() }
    }

    /// Whether the records show it: well enough, and not at the end of what was sought.
    pub(super) fn shown(&self, length: usize) -> bool {
        self.u_relative < SHOWN && self.samples < 0.4 * length as f64
    }
}

/// Seeks the time constant, from the shortest that makes sense up to half of the record.
pub(super) fn time_constant(spectra: &Spectra, terms: Terms, near: Option<f64>, length: usize) -> Option<TimeConstant> {
    let mut fixed: Vec<Column> = match terms.taps {
        1 => vec![spectra.tap(HALF), spectra.weighted(&slope())],
        taps => (HALF - taps / 2..=HALF + taps / 2).map(|m| spectra.tap(m)).collect(),
    };
    fixed.push(spectra.positive());
    let whole = 0..spectra.bins();
    let one = [Band { from_hz: 0.0, to_hz: 0.0, range: whole.clone() }];
    let inside = spectra.products(&fixed, &one).pop()?;
    let target = fixed.len() - 1;
    let cost = |logarithm: f64| -> f64 {
        let border = spectra.slow(logarithm.exp());
        // The low-pass and its history take the places after the fixed columns; the target goes last.
        let size = fixed.len() + 2;
        let place = |i: usize| if i < target { i } else { size - 1 };
        let mut matrix = DMatrix::zeros(size, size);
        for i in 0..fixed.len() {
            for j in 0..fixed.len() {
                matrix[(place(i), place(j))] = inside[(i, j)];
            }
        }
        for (k, column) in border.iter().enumerate() {
            let row = target + k;
            for (i, other) in fixed.iter().enumerate() {
                let value = spectra.clean(column, other, whole.clone());
                matrix[(row, place(i))] = value;
                matrix[(place(i), row)] = value;
            }
            for (l, other) in border.iter().enumerate() {
                matrix[(row, target + l)] = spectra.clean(column, other, whole.clone());
            }
        }
        let free = size - 1;
        let mut normal = matrix.view((0, 0), (free, free)).into_owned();
        let ridge = LEAST_RIDGE * normal[(0, 0)];
        (0..target).for_each(|i| normal[(i, i)] += if terms.taps > 1 { ridge } else { 0.0 });
        let right = matrix.view((0, free), (free, 1)).column(0).into_owned();
        match solve(&normal, &right) {
            Some((solution, _)) => matrix[(free, free)] - solution.dot(&right),
            None => f64::INFINITY,
        }
    };
    let (low, high) = match near {
        Some(samples) => ((samples / 1.2).ln(), (samples * 1.2).ln()),
        None => (SHORTEST.ln(), (length as f64 / 2.0).max(2.0 * SHORTEST).ln()),
    };
    let points = if near.is_some() { 3 } else { GRID };
    let step = (high - low) / (points - 1) as f64;
    let best =
        (0..points).map(|i| (low + i as f64 * step, cost(low + i as f64 * step))).min_by(|a, b| a.1.total_cmp(&b.1))?;
    let at = golden(&cost, best.0 - step, best.0 + step);
    let width = 0.02;
    let curvature = (cost(at + width) - 2.0 * cost(at) + cost(at - width)) / (width * width);
    let u_relative = (spectra.residual_noise() / curvature.max(f64::MIN_POSITIVE)).sqrt();
    Some(TimeConstant { samples: at.exp(), u_relative: u_relative.min(1.0) })
}

/// Golden-section search for the minimum of `cost`.
fn golden(cost: &dyn Fn(f64) -> f64, mut low: f64, mut high: f64) -> f64 {
    let ratio = 0.5 * (5f64.sqrt() - 1.0);
    let mut inner = [high - ratio * (high - low), low + ratio * (high - low)];
    let mut costs = inner.map(cost);
    while high - low > 1e-5 {
        if costs[0] < costs[1] {
            high = inner[1];
            inner = [high - ratio * (high - low), inner[0]];
            costs = [cost(inner[0]), costs[0]];
        } else {
            low = inner[0];
            inner = [inner[1], low + ratio * (high - low)];
            costs = [costs[1], cost(inner[1])];
        }
    }
    0.5 * (low + high)
}
