//! York's regression: every point has its own uncertainty in x and in y.

use super::{Line, LineError, check, mean, ordinary, sum};
use crate::analysis::Estimate;

/// Standard uncertainties of the points, uncorrelated between x and y.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Errors<'a> {
    /// Of each x, positive.
    pub x: &'a [f64],
    /// Of each y, positive.
    pub y: &'a [f64],
}

/// Steps after which the iteration is given up; well-posed data need about ten.
const STEPS: usize = 200;

/// York's regression (2004, equations 13a to 13e, with no correlation between the errors of a point's x and y). The
/// standard uncertainties are those of equations 13c and 13d: they come from the stated errors, not from the scatter.
///
/// # Errors
/// As [`ordinary`]; also an uncertainty that is not positive, or no settling.
pub fn york(x: &[f64], y: &[f64], errors: Errors<'_>) -> Result<Line, LineError> {
    check(x, y)?;
    for given in [errors.x, errors.y] {
        if given.len() != x.len() {
            return Err(LineError::Lengths { x: x.len(), y: given.len() });
        }
        if let Some(index) = given.iter().position(|u| !(u.is_finite() && *u > 0.0)) {
            return Err(LineError::Unusable { index });
        }
    }
    let mut slope = ordinary(x, y)?.slope.value;
    for _ in 0..STEPS {
        let at = Step::at(x, y, errors, slope);
        // Sums round in the last digits: a slope that moves only there has settled.
        let settled = (at.slope - slope).abs() <= 1e-13 * at.slope.abs();
        slope = at.slope;
        if !slope.is_finite() {
            break;
        }
        if settled {
            return Ok(Step::at(x, y, errors, slope).line(x, y, errors));
        }
    }
    Err(LineError::NotSettled { iterations: STEPS })
}

/// York's regression where all x share one uncertainty and all y another: Deming's regression, in closed form. Only
/// the ratio of the two matters for the line; the standard uncertainties use their size.
///
/// # Errors
/// As [`york`].
pub fn deming(x: &[f64], y: &[f64], u_x: f64, u_y: f64) -> Result<Line, LineError> {
    check(x, y)?;
    if !(u_x.is_finite() && u_y.is_finite() && u_x > 0.0 && u_y > 0.0) {
        return Err(LineError::Unusable { index: 0 });
    }
    let n = x.len() as f64;
    let (mean_x, mean_y) = (mean(x), mean(y));
    let sxx = sum(x.iter().map(|x| (x - mean_x).powi(2)));
    let syy = sum(y.iter().map(|y| (y - mean_y).powi(2)));
    let sxy = sum(x.iter().zip(y).map(|(x, y)| (x - mean_x) * (y - mean_y)));
    if sxx <= 0.0 || sxy == 0.0 {
        return Err(LineError::NoSpread);
    }
    // The quadratic's root written so that neither branch subtracts nearly equal numbers.
    let ratio = (u_y / u_x).powi(2);
    let half = (syy - ratio * sxx) / 2.0;
    let root = half.hypot(ratio.sqrt() * sxy);
    let slope = if half >= 0.0 { (half + root) / sxy } else { ratio * sxy / (root - half) };
    let variance = u_y * u_y + slope * slope * u_x * u_x;
    // Spread of the true x: what is left of the adjusted points' (York, 13c) is this sum.
    let weight_x = u_y * u_y / variance;
    let adjusted = sum(x.iter().zip(y).map(|(x, y)| {
        let (dx, dy) = (x - mean_x, y - mean_y);
        (weight_x * dx + (1.0 - weight_x) * dy / slope).powi(2)
    }));
    let squares = (syy - 2.0 * slope * sxy + slope * slope * sxx).max(0.0);
    Ok(Line {
        slope: Estimate { value: slope, u: (variance / adjusted).sqrt() },
        intercept: Estimate {
            value: mean_y - slope * mean_x,
            u: (variance * (1.0 / n + mean_x * mean_x / adjusted)).sqrt(),
        },
        covariance: -mean_x * variance / adjusted,
        residual: (squares / variance / (n - 2.0)).sqrt(),
    })
}

/// One pass of York's iteration at a trial slope.
struct Step {
    slope: f64,
    mean_x: f64,
    mean_y: f64,
    /// Sum of the weights W, and W·(adjusted x − their mean)² summed with that mean.
    weights: f64,
    mean_adjusted: f64,
    spread: f64,
}

impl Step {
    fn at(x: &[f64], y: &[f64], errors: Errors<'_>, slope: f64) -> Self {
        let points = || x.iter().zip(y).zip(errors.x.iter().zip(errors.y));
        let weight = |ux: f64, uy: f64| 1.0 / (uy * uy + slope * slope * ux * ux);
        let weights = sum(points().map(|(_, (ux, uy))| weight(*ux, *uy)));
        let mean_x = sum(points().map(|((x, _), (ux, uy))| weight(*ux, *uy) * x)) / weights;
        let mean_y = sum(points().map(|((_, y), (ux, uy))| weight(*ux, *uy) * y)) / weights;
        // β of York's equation 13b, without the term in the correlation of a point's errors.
        let beta = |x: f64, y: f64, ux: f64, uy: f64| {
            weight(ux, uy) * ((x - mean_x) * uy * uy + slope * (y - mean_y) * ux * ux)
        };
        let above = sum(points().map(|((x, y), (ux, uy))| weight(*ux, *uy) * beta(*x, *y, *ux, *uy) * (y - mean_y)));
        let below = sum(points().map(|((x, y), (ux, uy))| weight(*ux, *uy) * beta(*x, *y, *ux, *uy) * (x - mean_x)));
        let betas = sum(points().map(|((x, y), (ux, uy))| weight(*ux, *uy) * beta(*x, *y, *ux, *uy))) / weights;
        let spread =
            sum(points().map(|((x, y), (ux, uy))| weight(*ux, *uy) * (beta(*x, *y, *ux, *uy) - betas).powi(2)));
        Self { slope: above / below, mean_x, mean_y, weights, mean_adjusted: mean_x + betas, spread }
    }

    fn line(&self, x: &[f64], y: &[f64], errors: Errors<'_>) -> Line {
        let squares = sum(x.iter().zip(y).zip(errors.x.iter().zip(errors.y)).map(|((x, y), (ux, uy))| {
            let residual = y - self.mean_y - self.slope * (x - self.mean_x);
            residual * residual / (uy * uy + self.slope * self.slope * ux * ux)
        }));
        let u_slope = (1.0 / self.spread).sqrt();
        let u_intercept = (1.0 / self.weights + (self.mean_adjusted * u_slope).powi(2)).sqrt();
        Line {
            slope: Estimate { value: self.slope, u: u_slope },
            intercept: Estimate { value: self.mean_y - self.slope * self.mean_x, u: u_intercept },
            covariance: -self.mean_adjusted * u_slope * u_slope,
            residual: (squares / (x.len() as f64 - 2.0)).sqrt(),
        }
    }
}
