//! The score's linear equations at a trial point: the next step, its covariance, and the bound.
//!
//! `δ = (ZᵀG)⁻¹Zᵀe`, `cov = σ_e²·(ZᵀG)⁻¹ZᵀZ(ZᵀG)⁻ᵀ`, with σ_e² from the residual itself, freed of what the interpolator
//! does to the noise; the bound is `σ_e²·(GᵀG)⁻¹`. White noise is assumed.

use super::fine::{Noise, Point, View};
use super::template::Template;
use nalgebra::{Matrix3, Vector3};

/// One solution of the score's linear equations, in samples and volts.
pub(super) struct Solved {
    pub(super) step: [f64; 3],
    pub(super) covariance: Matrix3<f64>,
    pub(super) bound: Matrix3<f64>,
    /// Mean square of the residual, and its ratio to what the noise explains.
    pub(super) residual2: f64,
    pub(super) ratio: f64,
}

impl Solved {
    pub(super) fn new(view: &View<'_>, at: &Point, noise: &Noise, template: &Template) -> Self {
        let n = view.n.len() as f64;
        let g = at.gain;
        // Unknowns (τ, g, offset at the signal's mean level): nearly orthogonal.
        // Plain sums, one pass: Z = [−g·gated, signal, 1], G = [−g·slope, signal, 1].
        let (mut gated2, mut gated_signal, mut gated1) = (0.0, 0.0, 0.0);
        let (mut slope_signal, mut slope1, mut signal2, mut signal1) = (0.0, 0.0, 0.0, 0.0);
        let (mut gated_e, mut signal_e, mut e1, mut squares) = (0.0, 0.0, 0.0, 0.0);
        let regressors = template.gated.iter().zip(&template.slope).zip(&template.signal);
        for (e, ((gated, slope), signal)) in view.residual(at).zip(regressors) {
            gated2 += gated * gated;
            gated_signal += gated * signal;
            gated1 += gated;
            slope_signal += slope * signal;
            slope1 += slope;
            signal2 += signal * signal;
            signal1 += signal;
            gated_e += gated * e;
            signal_e += signal * e;
            e1 += e;
            squares += e * e;
        }
        let score = Vector3::new(-g * gated_e, signal_e, e1);
        let own = Matrix3::new(
            g * g * gated2,
            -g * gated_signal,
            -g * gated1,
            -g * gated_signal,
            signal2,
            signal1,
            -g * gated1,
            signal1,
            n,
        );
        let mut cross = own;
        (cross[(1, 0)], cross[(2, 0)]) = (-g * slope_signal, -g * slope1);
        let useful = template.useful();
        cross[(0, 0)] = g * g * useful;
        cross[(1, 1)] = (cross[(1, 1)] - n * template.signal_noise).max(0.01 * cross[(1, 1)]);
        let residual2 = squares / (n - 3.0);
        let ratio = residual2 / (noise.n2 + g * g * noise.p2 * view.noise_gain);
        // The interpolator takes noise only near the end of the band, where the template has nothing.
        let in_band = ratio * (noise.n2 + g * g * noise.p2);
        let mut information = cross;
        information[(0, 0)] = (g * g * template.slope_energy).max(cross[(0, 0)]);
        for (i, j) in [(0, 1), (0, 2), (1, 2)] {
            information[(j, i)] = information[(i, j)];
        }
        let nan = || Matrix3::from_element(f64::NAN);
        let inverse = scaled_inverse(&cross).unwrap_or_else(nan);
        let delta = inverse * score;
        // Back to the offset at zero volts: o = o' − g·level.
        let back = Matrix3::new(1.0, 0.0, 0.0, 0.0, 1.0, 0.0, 0.0, -template.level, 1.0);
        let covariance = back * (inverse * own * inverse.transpose()) * back.transpose() * in_band;
        let bound = back * scaled_inverse(&information).unwrap_or_else(nan) * back.transpose() * in_band;
        let step = back * delta;
        Self { step: [step[0], step[1], step[2]], covariance, bound, residual2, ratio }
    }

    pub(super) fn u(&self) -> [f64; 3] {
        [0, 1, 2].map(|i| self.covariance[(i, i)].sqrt())
    }
}

/// The inverse of a matrix whose rows and columns have very different units.
fn scaled_inverse(matrix: &Matrix3<f64>) -> Option<Matrix3<f64>> {
    let scale = Matrix3::from_diagonal(&Vector3::from_fn(|i, _| 1.0 / matrix[(i, i)].abs().sqrt()));
    (scale * matrix * scale).try_inverse().map(|inverse| scale * inverse * scale)
}
