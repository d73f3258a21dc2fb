//! Uncertainty budgets after the GUM (JCGM 100:2008): terms, their combination, and first-order propagation with
//! correlations.

use nalgebra::{DMatrix, DVector};

mod coverage;
mod student;

pub use coverage::{Basis, Coverage, PROBABILITY, effective_freedom, expanded, half_width, widening};
pub use student::student;

/// How a term was evaluated (JCGM 100, 4.2 and 4.3).
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Kind {
    /// From the statistics of the observations at hand.
    A,
    /// From other knowledge: a specification, an earlier deskew.
    B,
}

impl Kind {
    /// `A` or `B`.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::A => "A",
            Self::B => "B",
        }
    }
}

/// The distribution that stands behind a term's standard uncertainty.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Distribution {
    /// Normal.
    Normal,
    /// Rectangular: the half-width is √3 times the standard uncertainty (JCGM 100, 4.3.7).
    Rectangular,
}

impl Distribution {
    /// `normal` or `rectangular`.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::Normal => "normal",
            Self::Rectangular => "rectangular",
        }
    }
}

/// How a term's source is correlated with another term's.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Correlated {
    /// Name of the other term.
    pub with: &'static str,
    /// Correlation coefficient of the two *contributions*, −1 to 1: that of the sources times the signs of both
    /// sensitivities.
    pub coefficient: f64,
}

/// One term of a figure's budget.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Term {
    /// What it comes from: `noise`, `gain`, `skew`, `offset`, `scale`, `quantisation`, `common mode`; with ` drift`
    /// behind it, what the correction's estimate may have moved since it was made.
    pub name: &'static str,
    /// Its contribution to the figure's standard uncertainty, in the figure's unit, not negative.
    pub u: f64,
    /// How it was evaluated.
    pub kind: Kind,
    /// Its distribution.
    pub distribution: Distribution,
    /// What the figure changes per unit of the source (figure's unit per 1, s or V), sign included; `None` where the
    /// source is no single number, as for noise.
    pub sensitivity: Option<f64>,
    /// The other term that it is correlated with. Both of a pair say it.
    pub correlated: Option<Correlated>,
    /// Degrees of freedom of `u` (JCGM 100, 4.2.6 and G.3); `None` where it is taken as well known.
    pub freedom: Option<f64>,
}

impl Term {
    /// What correlation adds to the variance on this term's account: half of `2·r·u_a·u_b` (JCGM 100, equation 16).
    fn covariance(&self, terms: &[Self]) -> f64 {
        self.correlated
            .and_then(|c| terms.iter().find(|t| t.name == c.with).map(|t| c.coefficient * self.u * t.u))
            .unwrap_or(0.0)
    }
}

/// The combined standard uncertainty, correlations counted (JCGM 100, equations 10 and 16).
#[must_use]
pub fn combined(terms: &[Term]) -> f64 {
    variance(terms).sqrt()
}

fn variance(terms: &[Term]) -> f64 {
    terms.iter().map(|t| t.u.mul_add(t.u, t.covariance(terms))).sum::<f64>().max(0.0)
}

/// Each term's share of the combined variance, in the order of the terms. They sum to 1; each of two correlated terms
/// has half of their covariance in its share, which makes it negative where the two cancel.
#[must_use]
pub fn shares(terms: &[Term]) -> Vec<f64> {
    let variance = variance(terms);
    let share = |t: &Term| t.u.mul_add(t.u, t.covariance(terms)) / variance;
    terms.iter().map(|t| if variance > 0.0 { share(t) } else { 0.0 }).collect()
}

/// Why a propagation is impossible.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum PropagateError {
    /// The parts do not fit together.
    #[error(
        "a budget of {inputs} inputs needs {inputs} sensitivities per result and a correlation matrix of that size, \
         but has {sensitivities} and {correlations}"
    )]
    Sizes {
        /// Number of standard uncertainties.
        inputs: usize,
        /// Columns of sensitivities.
        sensitivities: usize,
        /// Rows of correlations.
        correlations: usize,
    },
}

/// Results of a propagation: standard uncertainties, and the correlations between the results.
#[derive(Debug, Clone, PartialEq)]
pub struct Propagated {
    /// Standard uncertainty of each result.
    pub u: Vec<f64>,
    /// Correlation coefficients between the results; 0 where a result has no uncertainty.
    pub correlation: DMatrix<f64>,
}

/// First-order propagation for several results of the same inputs (JCGM 100, equations 13 and H.9; JCGM 102, 6.2.1.3):
/// `U_y = C·U_x·Cᵀ`, one row of `sensitivities` per result.
///
/// # Errors
/// When the sizes do not fit.
pub fn propagate(
    sensitivities: &DMatrix<f64>,
    u: &[f64],
    correlation: &DMatrix<f64>,
) -> Result<Propagated, PropagateError> {
    let inputs = u.len();
    if sensitivities.ncols() != inputs || correlation.nrows() != inputs || correlation.ncols() != inputs {
        return Err(PropagateError::Sizes {
            inputs,
            sensitivities: sensitivities.ncols(),
            correlations: correlation.nrows(),
        });
    }
    let scaled = sensitivities * DMatrix::from_diagonal(&DVector::from_column_slice(u));
    let covariance = &scaled * correlation * scaled.transpose();
    let u: Vec<f64> = covariance.diagonal().iter().map(|v| v.max(0.0).sqrt()).collect();
    let correlation = DMatrix::from_fn(u.len(), u.len(), |i, j| {
        let product = u[i] * u[j];
        if product > 0.0 { covariance[(i, j)] / product } else { 0.0 }
    });
    Ok(Propagated { u, correlation })
}

/// The standard uncertainty that a converter of step `step_v` leaves in an averaged level and that no averaging
/// takes away: `q/(π√2)·exp(−2π²s²/q²)` for noise of `s` rms before the converter; 0.22 q without noise,
/// 0.0016 q at half a step. From the first term of the Fourier series of the quantiser's mean error.
#[must_use]
pub fn quantisation(step_v: f64, noise_v: f64) -> f64 {
    if step_v.is_nan() || step_v <= 0.0 {
        return 0.0;
    }
    let steps = noise_v / step_v;
    let pi = std::f64::consts::PI;
    step_v / (pi * std::f64::consts::SQRT_2) * (-2.0 * pi * pi * steps * steps).exp()
}

#[cfg(test)]
mod tests;
