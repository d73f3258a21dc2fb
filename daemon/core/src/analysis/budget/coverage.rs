//! From a budget to an interval of 95 %: the half-width of a normal distribution convolved with one rectangular one.
//!
//! A scope's gain specification is a rectangular term that often outweighs all others. Twice the standard uncertainty
//! then covers everything (2·a/√3 > a), and a normal distribution of the same variance is the wrong shape. The sum
//! S of X ~ N(0, u) and Y ~ R(−a, a) has a closed form: `P(S ≤ x) = [ψ(x + a) − ψ(x − a)]/(2a)`,
//! `ψ(z) = z·Φ(z/u) + u·φ(z/u)`, the integral of the normal distribution's Φ (JCGM 101, 6.4.2 and 6.4.7 for the two
//! distributions; the convolution is elementary).

use statrs::function::erf::erfc;

use super::student::student;
use super::{Distribution, Term, variance};

/// The coverage probability of every interval (JCGM 100, 6.2.2).
pub const PROBABILITY: f64 = 0.95;

/// The factor of a normal distribution for [`PROBABILITY`].
const NORMAL: f64 = 1.959_963_984_540_054;

/// Where an interval comes from.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Basis {
    /// Common-mode limited: the residual of the correction adds to the figure in second order, as much as its first-order
    /// terms are sure to a tenth. The interval is propagated (JCGM 101) and reaches down to where the common mode is
    /// taken off as far as the correction's uncertainty allows.
    CommonMode,
    /// All terms as normal ones: half-width 1.96·u.
    Normal,
    /// Propagated (JCGM 101), because the figure is too close to zero for a first-order budget.
    Propagated,
    /// The largest rectangular term convolved with the rest.
    Rectangular,
}

impl Basis {
    /// `common mode`, `normal`, `propagated` or `rectangular`.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::CommonMode => "common mode",
            Self::Normal => "normal",
            Self::Propagated => "propagated",
            Self::Rectangular => "rectangular",
        }
    }
}

/// An interval that holds the true value with a probability of [`PROBABILITY`].
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Coverage {
    /// Lower end, in the figure's unit.
    pub low: f64,
    /// Upper end.
    pub high: f64,
    /// Where it comes from.
    pub basis: Basis,
}

impl Coverage {
    /// The symmetric interval of a first-order budget round `value`.
    #[must_use]
    pub fn of(value: f64, terms: &[Term]) -> Self {
        let (half, basis) = expanded(terms);
        Self { low: value - half, high: value + half, basis }
    }

    /// Half of its width: U95 where it is symmetric.
    #[must_use]
    pub fn half_width(&self) -> f64 {
        0.5 * (self.high - self.low)
    }
}

/// The effective degrees of freedom of terms by the Welch–Satterthwaite formula, `u⁴/Σ(u_i⁴/ν_i)` with u² the sum of their
/// variances (JCGM 100, equation G.2b); `None` where every term is well known. Never below the fewest of any term,
/// which the formula keeps to by itself only where terms are not correlated.
#[must_use]
pub fn effective_freedom(terms: &[Term], variance: f64) -> Option<f64> {
    let few = || terms.iter().filter_map(|t| t.freedom.filter(|v| *v > 0.0).map(|v| (t.u, v)));
    let sum: f64 = few().map(|(u, v)| u.powi(4) / v).sum();
    let fewest = few().filter(|(u, _)| *u > 0.0).map(|(_, v)| v).reduce(f64::min)?;
    (sum > 0.0).then(|| (variance * variance / sum).max(fewest))
}

/// How much wider than a normal distribution Student's is at 95 %, for so many degrees of freedom.
#[must_use]
pub fn widening(freedom: Option<f64>) -> f64 {
    freedom.map_or(1.0, |freedom| (student(PROBABILITY, freedom) / NORMAL).max(1.0))
}

/// The expanded uncertainty U95 of a budget: its largest rectangular term convolved with a normal distribution that has
/// the variance of all others. Where some of these come from few repeats the normal distribution is as wide as Student's
/// is at 95 % with the effective degrees of freedom (JCGM 100, G.4.1).
#[must_use]
pub fn expanded(terms: &[Term]) -> (f64, Basis) {
    let rectangular = terms.iter().filter(|t| t.distribution == Distribution::Rectangular);
    let largest = rectangular.map(|t| t.u).fold(0.0, f64::max);
    let rest = (variance(terms) - largest * largest).max(0.0).sqrt();
    // Below a fifth of the rest its shape moves the half-width by less than a part in 5000.
    let basis = if largest > 0.2 * rest { Basis::Rectangular } else { Basis::Normal };
    let rest = rest * widening(effective_freedom(terms, rest * rest));
    (half_width(rest, 3.0f64.sqrt() * largest), basis)
}

/// The half-width that holds 95 % of N(0, `u`) convolved with a rectangular distribution of half-width `a`; 0.95·a
/// without the former, 1.96·u without the latter. Both must not be negative.
#[must_use]
pub fn half_width(u: f64, a: f64) -> f64 {
    // Where one of the two is that small, the closed form only loses digits.
    if a <= 1e-3 * u {
        return NORMAL * u.hypot(a / 3.0f64.sqrt());
    }
    if u <= 1e-9 * a {
        return PROBABILITY * a;
    }
    let (mut low, mut high) = (0.0, NORMAL.mul_add(u, a));
    // 60 halvings reach the double's precision; P grows with x.
    for _ in 0..60 {
        let x = 0.5 * (low + high);
        if within(x, u, a) < PROBABILITY { low = x } else { high = x }
    }
    0.5 * (low + high)
}

/// P(|S| ≤ x) = [ψ(x + a) − ψ(x − a)]/a − 1. With ψ(z) = ψ(−z) + z, no difference of large numbers is left where the
/// tail is thin.
fn within(x: f64, u: f64, a: f64) -> f64 {
    // ψ(−z): the part of the normal distribution's tail beyond z, small for z ≫ u.
    let tail = |z: f64| {
        let t = z / u;
        let density = (-0.5 * t * t).exp() / (2.0 * std::f64::consts::PI).sqrt();
        u.mul_add(density, -z * 0.5 * erfc(t / std::f64::consts::SQRT_2))
    };
    1.0 - (tail(x - a) - tail(x + a)) / a
}
