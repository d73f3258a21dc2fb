//! Highest and lowest values of a noisy waveform.
//!
//! The highest sample of a million is several standard deviations of noise too high. Here a parabola is fitted by least
//! squares round the highest place, in a window that grows for as long as the parabola fits within the noise and its
//! top does not move further than its uncertainty explains: a broad top is averaged over many samples, a sharp one
//! over few, and the top of a flat stretch is its level.

use std::ops::Range;

/// Half-widths of the window in samples begin here.
const LEAST_HALF: usize = 2;

/// How many windows before the first that did not fit the result is taken from, beside the last that did.
const STEPS_BACK: usize = 2;

/// Misfits below this part of the record's range do not stop the window from growing when there is no noise.
const RELATIVE_FLOOR: f64 = 1e-5;

/// A local extreme.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Extreme {
    /// The value at the top or bottom of the fit, in the signal's unit.
    pub value: f64,
    /// Its standard uncertainty from the noise.
    pub u: f64,
    /// Where it is, in samples.
    pub position: f64,
}

/// The lowest and the highest value of a signal with white noise of `noise` rms.
#[must_use]
pub fn extremes(signal: &[f64], noise: f64) -> (Extreme, Extreme) {
    (lowest(signal, 0..signal.len(), noise), highest(signal, 0..signal.len(), noise))
}

/// The highest value within a range of samples; zero for an empty range.
#[must_use]
pub fn highest(signal: &[f64], range: Range<usize>, noise: f64) -> Extreme {
    extreme(signal, range, noise, 1.0)
}

/// The lowest value within a range of samples; zero for an empty range.
#[must_use]
pub fn lowest(signal: &[f64], range: Range<usize>, noise: f64) -> Extreme {
    let e = extreme(signal, range, noise, -1.0);
    Extreme { value: -e.value, ..e }
}

/// The rms of a signal's white noise, from the median magnitude of its fourth differences: slow shapes vanish in them
/// and edges are too few to move a median. Waveforms whose every sample lies on an edge read too high.
#[must_use]
pub fn noise_of(signal: &[f64]) -> f64 {
    let mut fourth: Vec<f64> =
        signal.windows(5).map(|w| (w[0] + w[4] - 4.0 * (w[1] + w[3]) + 6.0 * w[2]).abs()).collect();
    if fourth.is_empty() {
        return 0.0;
    }
    let middle = fourth.len() / 2;
    let (_, median, _) = fourth.select_nth_unstable_by(middle, f64::total_cmp);
    // 1.4826 turns the median magnitude of a normal distribution into its sd; 70 = 1 + 16 + 36 + 16 + 1.
    1.4826 * *median / 70.0f64.sqrt()
}

/// The highest value of `sign` times the signal.
fn extreme(signal: &[f64], range: Range<usize>, noise: f64, sign: f64) -> Extreme {
    let range = range.start..range.end.min(signal.len());
    let Some((top, spread)) = start(signal, range.clone(), sign) else {
        return Extreme { value: 0.0, u: 0.0, position: 0.0 };
    };
    let tolerance = noise.max(RELATIVE_FLOOR * spread);
    let mut accepted = vec![Extreme { value: sign * signal[top], u: noise, position: top as f64 }];
    let mut half = LEAST_HALF;
    let mut misfit = false;
    while let Some(last) = accepted.last()
        && let Some(fit) = Fit::of(signal, &range, last.position, half, sign)
    {
        // The place was chosen for being high: of the m windows that could have been chosen, noise lifts the highest by
        // √(2·ln m) standard deviations. Falling back by that much is no misfit, nor is one sample that stands out so.
        let choice = 2.0 * (range.len() as f64 / (fit.freedom + 3.0)).ln().max(0.0);
        let limit = tolerance * tolerance * (1.0 + 3.0 * (2.0 / fit.freedom).sqrt() + choice / fit.freedom);
        let moved = (fit.value - last.value).abs();
        let u = last.u.max(tolerance * fit.weight.sqrt());
        let steady = half == LEAST_HALF || moved <= (1.0 + choice.sqrt()) * u;
        misfit = fit.residual_variance > limit || !steady;
        if misfit {
            break;
        }
        accepted.push(Extreme { value: fit.value, u: noise * fit.weight.sqrt(), position: fit.position });
        half = (half + half / 2).max(half + 1);
    }
    // A misfit shows only when it is as large as the noise in the result. It falls with the fourth power of the width,
    // so that a few windows further back it is far below.
    if misfit && accepted.len() > STEPS_BACK + 1 {
        accepted.truncate(accepted.len() - STEPS_BACK);
    }
    accepted.pop().unwrap_or(Extreme { value: 0.0, u: 0.0, position: 0.0 })
}

/// Where the mean of five neighbours is highest, and the range's spread.
fn start(signal: &[f64], range: Range<usize>, sign: f64) -> Option<(usize, f64)> {
    let part = signal.get(range.clone())?;
    let first = *part.first()?;
    let (low, high) = part.iter().fold((first, first), |(l, h), &x| (l.min(x), h.max(x)));
    let better = |a: (usize, f64), b: (usize, f64)| if b.1 > a.1 { b } else { a };
    let smoothed = part.windows(5).enumerate().map(|(i, w)| (i + 2, sign * w.iter().sum::<f64>() / 5.0));
    let place = smoothed
        .reduce(better)
        .or_else(|| part.iter().map(|x| sign * x).enumerate().reduce(better))
        .map_or(0, |(i, _)| i);
    Some((range.start + place, high - low))
}

/// A parabola through `2·half + 1` samples.
struct Fit {
    value: f64,
    position: f64,
    /// Variance of `value` per variance of a sample.
    weight: f64,
    residual_variance: f64,
    freedom: f64,
}

impl Fit {
    fn of(signal: &[f64], range: &Range<usize>, centre: f64, half: usize, sign: f64) -> Option<Self> {
        let points = 2 * half + 1;
        if range.len() < points {
            return None;
        }
        let middle = (centre.round().max(0.0) as usize).clamp(range.start + half, range.end - 1 - half);
        let window = &signal[middle - half..=middle + half];
        let h = half as f64;
        let count = points as f64;
        // Σx² and Σx⁴ over −h..h.
        let s2 = h * (h + 1.0) * (2.0 * h + 1.0) / 3.0;
        let s4 = s2 * (3.0 * h * h + 3.0 * h - 1.0) / 5.0;
        let xs = (0..points).map(|i| i as f64 - h);
        let mean = window.iter().sum::<f64>() / count;
        let (mut t1, mut t2, mut total) = (0.0, 0.0, 0.0);
        for (x, y) in xs.zip(window) {
            let y = y - mean;
            t1 += x * y;
            t2 += (x * x - s2 / count) * y;
            total += y * y;
        }
        // Orthogonal polynomials 1, x, x² − Σx²/n.
        let n2 = s4 - s2 * s2 / count;
        let (a1, a2) = (sign * t1 / s2, sign * t2 / n2);
        let freedom = count - 3.0;
        let residual_variance = (total - t1 * t1 / s2 - t2 * t2 / n2).max(0.0) / freedom;
        let vertex = if a2 < 0.0 { (-0.5 * a1 / a2).clamp(-h, h) } else { 0.5 * h * a1.signum() };
        // A top outside the inner half is the next window's business, which is centred there.
        let x = vertex.clamp(-0.5 * h, 0.5 * h);
        let value = sign * mean + a1 * x + a2 * (x * x - s2 / count);
        let weight = 1.0 / count + x * x / s2 + (x * x - s2 / count).powi(2) / n2;
        Some(Self { value, position: middle as f64 + x, weight, residual_variance, freedom })
    }
}

#[cfg(test)]
mod tests;
