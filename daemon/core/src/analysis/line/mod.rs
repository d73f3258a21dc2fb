//! Straight lines: ordinary least squares, and York's regression for errors in both variables.
//!
//! `y = intercept + slope·x`. Sums are taken about the centroid with Neumaier's compensation, so that data far from
//! the origin or of many points lose no digits. Cost: O(n), for York's regression times the few iterations it needs.
//!
//! York, Evensen, López Martínez and De Basabe Delgado, "Unified equations for the slope, intercept, and standard
//! errors of the best straight line", American Journal of Physics 72 (2004) 367; with equal uncertainties for all
//! points it is Deming's regression.

use super::Estimate;

mod york;
pub use york::{Errors, deming, york};

/// A fitted straight line.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Line {
    /// Unit of y per unit of x, with its standard uncertainty.
    pub slope: Estimate,
    /// y at x = 0, with its standard uncertainty.
    pub intercept: Estimate,
    /// Covariance of slope and intercept.
    pub covariance: f64,
    /// For [`ordinary`] the residual standard deviation in the unit of y; for [`york()`] and [`deming`] the root of
    /// `S/(n − 2)`, about 1 where the stated uncertainties describe the scatter.
    pub residual: f64,
}

/// Why a line could not be fitted.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum LineError {
    /// x, y or their uncertainties differ in number.
    #[error("a line needs as many x as y: {x} and {y} were given")]
    Lengths {
        /// Number of x.
        x: usize,
        /// Number of y, or of uncertainties.
        y: usize,
    },
    /// Fewer than three points.
    #[error("{points} points do not show a line's scatter; give at least 3")]
    TooFew {
        /// Number of points.
        points: usize,
    },
    /// All x are the same.
    #[error("all x are equal, so a line has no slope; vary x")]
    NoSpread,
    /// A value that is not finite, or an uncertainty that is not positive.
    #[error("point {index} is not finite or has no positive uncertainty; remove it")]
    Unusable {
        /// Index of the first such point.
        index: usize,
    },
    /// The iteration did not settle.
    #[error("the slope did not settle in {iterations} steps; the points lie on no line, or on a vertical one")]
    NotSettled {
        /// Steps taken.
        iterations: usize,
    },
}

/// Ordinary least squares of y on x: all error is in y, the same for every point. The standard uncertainties come from
/// the scatter about the line.
///
/// # Errors
/// Unequal lengths, fewer than three points, all x equal, a value that is not finite.
pub fn ordinary(x: &[f64], y: &[f64]) -> Result<Line, LineError> {
    check(x, y)?;
    let n = x.len() as f64;
    let (mean_x, mean_y) = (mean(x), mean(y));
    let sxx = sum(x.iter().map(|x| (x - mean_x).powi(2)));
    if sxx <= 0.0 {
        return Err(LineError::NoSpread);
    }
    let sxy = sum(x.iter().zip(y).map(|(x, y)| (x - mean_x) * (y - mean_y)));
    let slope = sxy / sxx;
    let squares = sum(x.iter().zip(y).map(|(x, y)| (y - mean_y - slope * (x - mean_x)).powi(2)));
    let variance = squares / (n - 2.0);
    Ok(Line {
        slope: Estimate { value: slope, u: (variance / sxx).sqrt() },
        intercept: Estimate {
            value: mean_y - slope * mean_x,
            u: (variance * (1.0 / n + mean_x * mean_x / sxx)).sqrt(),
        },
        covariance: -mean_x * variance / sxx,
        residual: variance.sqrt(),
    })
}

fn check(x: &[f64], y: &[f64]) -> Result<(), LineError> {
    if x.len() != y.len() {
        return Err(LineError::Lengths { x: x.len(), y: y.len() });
    }
    if x.len() < 3 {
        return Err(LineError::TooFew { points: x.len() });
    }
    x.iter()
        .zip(y)
        .position(|(x, y)| !(x.is_finite() && y.is_finite()))
        .map_or(Ok(()), |index| Err(LineError::Unusable { index }))
}

/// Neumaier's compensated sum: the error does not grow with the number of terms.
pub(crate) fn sum(values: impl IntoIterator<Item = f64>) -> f64 {
    let (mut total, mut lost) = (0.0f64, 0.0);
    for value in values {
        let next = total + value;
        lost += if total.abs() >= value.abs() { (total - next) + value } else { (value - next) + total };
        total = next;
    }
    total + lost
}

/// The mean, with a compensated sum; NaN for no values.
pub(crate) fn mean(values: &[f64]) -> f64 {
    sum(values.iter().copied()) / values.len() as f64
}

#[cfg(test)]
mod tests;
