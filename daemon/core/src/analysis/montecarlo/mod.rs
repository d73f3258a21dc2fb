//! The rms of a difference whose common-mode residual is a matter of second order: propagated by Monte Carlo (JCGM 101).
//!
//! An error of the correction leaves a part of the common mode in the difference. Where the difference itself is small,
//! the residual's *power* counts, which can only make the measured rms too large, while a first-order budget knows only
//! errors of either sign. With `δ = (δg/g, δτ, δo/g)`, B the corrected negative leg and B' its slope, the true
//! difference is `D + δ₁·B − δ₂·B' + δ₃`, and its mean square
//!
//! ```text
//! R²(δ) = m_DD + 2·(δ₁·m_DB − δ₂·m_DB' + δ₃·m_D) + δᵀ·A·δ,   A = [[m_BB, −m_BB', m_B], [−m_BB', m_B'B', −m_B'], [m_B, −m_B', 1]]
//! ```
//!
//! is exact in δ. Its upper limit is the 97.5 % quantile of the propagated distribution. The lower one needs more: the
//! error that was really made has left its mark in the record (m_DB is then −δ·m_BB), so that for a difference that has
//! nothing in common with the common mode the truth lies at the parabola's *vertex*, its very lowest point, which a
//! symmetric interval cuts off (62–72 % coverage). The lower limit is therefore extended to the lowest point that δ can
//! reach within three standard uncertainties, less what noise and scale leave open there. Subtracting the expected
//! residual instead fails where the difference moves with the common mode.
//!
//! Draws are seeded: the same capture gives the same interval.

use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rand_distr::StandardNormal;

use super::budget;

/// How many draws are made. The 97.5 % quantile is then good to 0.16 % in probability (one standard deviation), a tenth
/// of what a coverage test of 2,000 cases can see. Cost: about a millisecond.
pub const DRAWS: usize = 10_000;

/// The seed of every propagation.
const SEED: u64 = 0x5EED_0101;

/// How many standard uncertainties the correction's errors are followed downwards.
const REACH: f64 = 3.0;

/// Sweeps of the descent to the lowest point; each is three to six short sums.
const SWEEPS: usize = 200;

/// The mean square of a difference as a function of the correction's errors (gain over g, skew, offset over g).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Power {
    /// Mean square as measured, noise power removed, in V²; may be negative by chance.
    pub measured: f64,
    /// Mean square of the noise per sample, in V².
    pub noise: f64,
    /// How many samples the mean is over.
    pub points: usize,
    /// Relative standard uncertainty of `noise` itself.
    pub u_noise: f64,
    /// `m_DB, −m_DB', m_D`.
    pub linear: [f64; 3],
    /// A.
    pub quadratic: [[f64; 3]; 3],
}

/// The correction's errors (gain over g, skew, offset over g).
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Errors {
    /// Standard uncertainties, normal.
    pub u: [f64; 3],
    /// Half-widths of rectangular drift.
    pub drift: [f64; 3],
    /// Correlation coefficient of gain and offset (of the normal parts).
    pub gain_offset: f64,
}

/// What else moves the rms.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Others {
    /// Relative standard uncertainty of the scale, normal.
    pub scale_u: f64,
    /// Relative half-width of the scale, rectangular.
    pub scale_half: f64,
    /// Standard uncertainty that adds to the rms itself, in volts: quantisation.
    pub added_v: f64,
}

impl Power {
    /// R²(δ) in V².
    #[must_use]
    pub fn at(&self, delta: [f64; 3]) -> f64 {
        let mut sum = self.measured;
        for ((d, linear), row) in delta.iter().zip(&self.linear).zip(&self.quadratic) {
            let bent: f64 = row.iter().zip(&delta).map(|(a, e)| a * e).sum();
            sum += d * 2.0f64.mul_add(*linear, bent);
        }
        sum
    }

    /// What errors of this size add to the mean square on average, whatever their sign, in V².
    #[must_use]
    pub fn second_order(&self, errors: &Errors) -> f64 {
        let [g, _, o] = errors.u;
        let squares: f64 = (0..3)
            .map(|i| errors.drift[i].mul_add(errors.drift[i] / 3.0, errors.u[i] * errors.u[i]) * self.quadratic[i][i])
            .sum();
        2.0f64.mul_add(errors.gain_offset * g * o * self.quadratic[0][2], squares).max(0.0)
    }

    /// Standard deviation of the mean square that noise leaves where the true mean square is `power`:
    /// `√(4·R²·s²/n + 2·s⁴/n)`, and s² itself is known to `u_noise` only.
    fn u_noise_at(&self, power: f64) -> f64 {
        let n = self.points.max(1) as f64;
        let own = (4.0 * power.max(0.0) + 2.0 * self.noise) * self.noise / n;
        (self.u_noise * self.noise).mul_add(self.u_noise * self.noise, own).sqrt()
    }

    /// The lowest R² within the reach of the errors, by descent along one source after the other: a convex parabola
    /// under bounds on each source, where that ends at the lowest point.
    fn lowest(&self, errors: &Errors) -> f64 {
        let sources = Source::all(errors);
        let mut place = [0.0; 6];
        for _ in 0..SWEEPS {
            for k in 0..sources.len() {
                let along = sources[k].direction;
                let mut here = [0.0; 3];
                for (source, z) in sources.iter().zip(&place) {
                    for (h, d) in here.iter_mut().zip(&source.direction) {
                        *h += z * d;
                    }
                }
                let pull = |row: &[f64; 3]| row.iter().zip(&here).map(|(a, h)| a * h).sum::<f64>();
                let (mut slope, mut bend) = (0.0, 0.0);
                for (i, row) in self.quadratic.iter().enumerate() {
                    slope += along[i] * (self.linear[i] + pull(row));
                    bend += along[i] * row.iter().zip(&along).map(|(a, d)| a * d).sum::<f64>();
                }
                if bend > 0.0 {
                    place[k] = (place[k] - slope / bend).clamp(-sources[k].reach, sources[k].reach);
                }
            }
        }
        let mut here = [0.0; 3];
        for (source, z) in sources.iter().zip(&place) {
            for (h, d) in here.iter_mut().zip(&source.direction) {
                *h += z * d;
            }
        }
        self.at(here)
    }
}

/// One independent source of error: where it moves δ, per unit, and how far it goes.
struct Source {
    direction: [f64; 3],
    reach: f64,
}

impl Source {
    /// Three normal sources in units of their standard deviations (offset's first part is the gain's, by their
    /// correlation), three rectangular ones in units of their half-widths.
    fn all(errors: &Errors) -> [Self; 6] {
        let [g, t, o] = errors.u;
        let r = errors.gain_offset.clamp(-1.0, 1.0);
        let normal = |direction| Self { direction, reach: REACH };
        let drift = |direction| Self { direction, reach: 1.0 };
        let [dg, dt, d_o] = errors.drift;
        [
            normal([g, 0.0, r * o]),
            normal([0.0, t, 0.0]),
            normal([0.0, 0.0, (1.0 - r * r).sqrt() * o]),
            drift([dg, 0.0, 0.0]),
            drift([0.0, dt, 0.0]),
            drift([0.0, 0.0, d_o]),
        ]
    }
}

/// The 95 % interval of the rms `√R²`, in volts: (low, high).
#[must_use]
pub fn interval(power: &Power, errors: &Errors, others: &Others) -> (f64, f64) {
    let sources = Source::all(errors);
    let mut rng = ChaCha8Rng::seed_from_u64(SEED);
    let mut draws: Vec<f64> = (0..DRAWS)
        .map(|_| {
            let mut delta = [0.0; 3];
            for (k, source) in sources.iter().enumerate() {
                let z = if k < 3 { rng.sample(StandardNormal) } else { rng.random_range(-1.0..=1.0) };
                for (d, along) in delta.iter_mut().zip(&source.direction) {
                    *d = along.mul_add(z, *d);
                }
            }
            let exact = power.at(delta);
            let noisy = power.u_noise_at(exact).mul_add(rng.sample(StandardNormal), exact);
            let normal: f64 = rng.sample(StandardNormal);
            let scale = others.scale_u.mul_add(normal, others.scale_half * rng.random_range(-1.0..=1.0));
            let added: f64 = rng.sample(StandardNormal);
            (1.0 + scale) * noisy.max(0.0).sqrt() + others.added_v * added
        })
        .collect();
    draws.sort_by(f64::total_cmp);
    let tail = 0.5 * (1.0 - budget::PROBABILITY);
    let quantile = |p: f64| draws[((p * DRAWS as f64) as usize).min(DRAWS - 1)];
    let (low, high) = (quantile(tail), quantile(1.0 - tail));
    (low.min(below_vertex(power, errors, others)).max(0.0), high.max(0.0))
}

/// The lowest rms within reach, less what noise, scale and quantisation leave open there.
fn below_vertex(power: &Power, errors: &Errors, others: &Others) -> f64 {
    let square = power.lowest(errors).max(0.0);
    let noise = budget::half_width(power.u_noise_at(square), 0.0);
    let below = (square - noise).max(0.0).sqrt();
    let root = square.sqrt();
    let rest = budget::half_width(others.added_v.hypot(others.scale_u * root), others.scale_half * root);
    root - (root - below).hypot(rest)
}

#[cfg(test)]
mod tests;
