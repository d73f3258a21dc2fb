//! Highest and lowest values of a noisy waveform.
//!
//! The highest sample of a million is several standard deviations of noise too high. Here a parabola is fitted by least
//! squares round the highest place, in a window that grows for as long as the parabola fits within the noise and its
//! top does not move further than its uncertainty explains: a broad top is averaged over many samples, a sharp one
//! over few, and the top of a flat stretch is its level.

use std::ops::Range;

use super::signal::{BLOCK, Signal, blocks, range_within};
use super::wide::widest;

/// Half-widths of the window in samples begin here.
const LEAST_HALF: usize = 2;

/// How many windows before the first that did not fit the result is taken from, beside the last that did.
const STEPS_BACK: usize = 2;

/// Misfits below this part of the record's range do not stop the window from growing when there is no noise.
const RELATIVE_FLOOR: f64 = 1e-5;

/// The window grows no wider: with a thousand samples on each side noise is down to a twentieth.
const MOST_HALF: usize = 1024;

/// Stretches of samples, spread over a long record, from which the noise is taken: enough to know it to 1 %.
const NOISE_STRETCHES: usize = 64;

/// A local extreme.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Extreme {
    /// The value at the top or bottom of the fit, in the signal's unit.
    pub value: f64,
    /// Its standard uncertainty from the noise.
    pub u: f64,
    /// Where it is, in samples.
    pub position: f64,
    /// Half-width of the window it was fitted in, in samples; 0 for a single sample.
    pub half: usize,
}

/// The lowest and the highest value of a signal with white noise of `noise` rms.
#[must_use]
pub fn extremes<S: Signal + ?Sized>(signal: &S, noise: f64) -> (Extreme, Extreme) {
    extremes_within(signal, 0..signal.points(), noise)
}

/// The lowest and the highest value within a range of samples; zero for an empty range.
#[must_use]
pub fn extremes_within<S: Signal + ?Sized>(signal: &S, range: Range<usize>, noise: f64) -> (Extreme, Extreme) {
    let range = range.start..range.end.min(signal.points());
    let Some(start) = Start::of(signal, range.clone()) else { return (Extreme::NONE, Extreme::NONE) };
    let low = extreme(signal, &range, (start.lowest, start.spread), noise, -1.0);
    (Extreme { value: -low.value, ..low }, extreme(signal, &range, (start.highest, start.spread), noise, 1.0))
}

/// The highest value within a range of samples; zero for an empty range.
#[must_use]
pub fn highest<S: Signal + ?Sized>(signal: &S, range: Range<usize>, noise: f64) -> Extreme {
    extremes_within(signal, range, noise).1
}

/// The lowest value within a range of samples; zero for an empty range.
#[must_use]
pub fn lowest<S: Signal + ?Sized>(signal: &S, range: Range<usize>, noise: f64) -> Extreme {
    extremes_within(signal, range, noise).0
}

impl Extreme {
    const NONE: Self = Self { value: 0.0, u: 0.0, position: 0.0, half: 0 };

    /// What the same fit, in the same window, gives for another signal: this one changed a little.
    #[must_use]
    pub fn again<S: Signal + ?Sized>(&self, signal: &S, highest: bool) -> f64 {
        let sign = if highest { 1.0 } else { -1.0 };
        let fit = (self.half > 0).then(|| Fit::of(signal, &(0..signal.points()), self.position, self.half, sign));
        let single = || signal.at((self.position.max(0.0) as usize).min(signal.points().saturating_sub(1)));
        fit.flatten().map_or_else(single, |fit| sign * fit.value)
    }
}

/// The rms of a signal's white noise, from the median magnitude of its fourth differences: slow shapes vanish in them
/// and edges are too few to move a median. Waveforms whose every sample lies on an edge read too high.
#[must_use]
pub fn noise_of<S: Signal + ?Sized>(signal: &S) -> f64 {
    let points = signal.points();
    let step = points.div_ceil(NOISE_STRETCHES).max(BLOCK);
    let mut fourth: Vec<f32> = Vec::new();
    for from in (0..points).step_by(step) {
        blocks(signal, from..(from + BLOCK).min(points), |_, part| {
            fourth.extend(part.windows(5).map(|w| (w[0] + w[4] - 4.0 * (w[1] + w[3]) + 6.0 * w[2]).abs()));
        });
    }
    if fourth.is_empty() {
        return 0.0;
    }
    let middle = fourth.len() / 2;
    let (_, median, _) = fourth.select_nth_unstable_by(middle, f32::total_cmp);
    // 1.4826 turns the median magnitude of a normal distribution into its sd; 70 = 1 + 16 + 36 + 16 + 1.
    1.4826 * f64::from(*median) / 70.0f64.sqrt()
}

/// The highest value of `sign` times the signal, from where to begin and the range's spread.
fn extreme<S: Signal + ?Sized>(
    signal: &S,
    range: &Range<usize>,
    (top, spread): (usize, f64),
    noise: f64,
    sign: f64,
) -> Extreme {
    let tolerance = noise.max(RELATIVE_FLOOR * spread);
    let single = Extreme { value: sign * signal.at(top), u: noise, position: top as f64, half: 0 };
    let mut accepted = vec![single];
    let mut half = LEAST_HALF;
    let mut misfit = false;
    while let Some(last) = accepted.last()
        && half <= MOST_HALF
        && let Some(fit) = Fit::of(signal, range, last.position, half, sign)
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
        accepted.push(Extreme { value: fit.value, u: noise * fit.weight.sqrt(), position: fit.position, half });
        half = (half + half / 2).max(half + 1);
    }
    // A misfit shows only when it is as large as the noise in the result. It falls with the fourth power of the width,
    // so that a few windows further back it is far below.
    if misfit && accepted.len() > STEPS_BACK + 1 {
        accepted.truncate(accepted.len() - STEPS_BACK);
    }
    accepted.pop().unwrap_or(single)
}

widest! {
    /// The means of five neighbours each, and the lowest and the highest of them.
    fn means_of_five(part: &[f32], means: &mut [f32]) -> (f32, f32) {
        let n = means.len();
        let (a, b, c, d, e) = (&part[..n], &part[1..n + 1], &part[2..n + 2], &part[3..n + 3], &part[4..n + 4]);
        for k in 0..n {
            means[k] = 0.2 * (a[k] + b[k] + c[k] + d[k] + e[k]);
        }
        range_within(means)
    }
}

/// Where to begin: the places at which the mean of five neighbours is lowest and highest, and the range's spread.
struct Start {
    lowest: usize,
    highest: usize,
    spread: f64,
}

impl Start {
    fn of<S: Signal + ?Sized>(signal: &S, range: Range<usize>) -> Option<Self> {
        if range.is_empty() {
            return None;
        }
        let mut found = Self { lowest: range.start, highest: range.start, spread: 0.0 };
        // Neighbouring stretches share four samples, so that every five in a row are seen once.
        let mut best = (f32::INFINITY, f32::NEG_INFINITY);
        let mut buffer = [0.0f32; BLOCK + 4];
        let mut smooth = [0.0f32; BLOCK];
        for from in (range.start..range.end.saturating_sub(4)).step_by(BLOCK) {
            let count = (BLOCK + 4).min(range.end - from);
            let part = match signal.samples() {
                Some(samples) => &samples[from..from + count],
                None => {
                    signal.load(from, &mut buffer[..count]);
                    &buffer[..count]
                }
            };
            let smooth = &mut smooth[..count - 4];
            let (least, most) = means_of_five(part, smooth);
            let place = |x: f32| from + 2 + smooth.iter().position(|y| (y - x).abs() <= 0.0).unwrap_or(0);
            if least < best.0 {
                (best.0, found.lowest) = (least, place(least));
            }
            if most > best.1 {
                (best.1, found.highest) = (most, place(most));
            }
        }
        if range.len() < 5 {
            let by = |a: &usize, b: &usize| signal.at(*a).total_cmp(&signal.at(*b));
            found.lowest = range.clone().min_by(by).unwrap_or(range.start);
            found.highest = range.clone().max_by(by).unwrap_or(range.start);
            best = (signal.at(found.lowest) as f32, signal.at(found.highest) as f32);
        }
        found.spread = f64::from(best.1 - best.0).max(0.0);
        Some(found)
    }
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
    fn of<S: Signal + ?Sized>(signal: &S, range: &Range<usize>, centre: f64, half: usize, sign: f64) -> Option<Self> {
        let points = 2 * half + 1;
        if range.len() < points {
            return None;
        }
        let middle = (centre.round().max(0.0) as usize).clamp(range.start + half, range.end - 1 - half);
        let mut window = vec![0.0f32; points];
        signal.load(middle - half, &mut window);
        let h = half as f64;
        let count = points as f64;
        // Σx² and Σx⁴ over −h..h.
        let s2 = h * (h + 1.0) * (2.0 * h + 1.0) / 3.0;
        let s4 = s2 * (3.0 * h * h + 3.0 * h - 1.0) / 5.0;
        let xs = (0..points).map(|i| i as f64 - h);
        let mean = window.iter().map(|y| f64::from(*y)).sum::<f64>() / count;
        let (mut t1, mut t2, mut total) = (0.0, 0.0, 0.0);
        for (x, y) in xs.zip(&window) {
            let y = f64::from(*y) - mean;
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
