//! The steepest slope of a noisy waveform.
//!
//! The largest difference of two neighbouring samples of a million is several standard deviations of noise too large. Here
//! the steepest place is looked for on the slope of adjacent means, as short as the noise allows, and a cubic is then
//! fitted by least squares round it, in a window that grows for as long as the cubic fits within the noise: the slope is
//! the cubic's largest. Edges of fewer than five samples are not resolved and read low (five: by 1.6 %). Only the stretches that move furthest are looked into, so that a record is passed over once.

use std::ops::Range;

use super::signal::{BLOCK, Signal, blocks, range_of};

/// Stretches of [`BLOCK`] samples of a range that are looked into: those in which the waveform moves furthest.
const CANDIDATES: usize = 8;

/// The slope of adjacent means must exceed its own noise by this factor for its place to be believed: of a million
/// places, noise lifts the highest by five.
const CLEAR: f64 = 12.0;

/// Half-widths of the window in samples begin here: five samples for a cubic's four numbers.
const LEAST_HALF: usize = 2;

/// The window grows no wider.
const MOST_HALF: usize = 512;

/// How many windows before the first that did not fit the result is taken from, beside the last that did.
const STEPS_BACK: usize = 2;

/// Misfits below this part of the range of the samples do not stop the window from growing when there is no noise.
const RELATIVE_FLOOR: f64 = 1e-5;

/// A steepest place.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Steepest {
    /// The slope there, per sample, with its sign.
    pub slope: f64,
    /// Its standard uncertainty from the noise.
    pub u: f64,
    /// The middle of the fit, in samples.
    pub middle: usize,
    /// Where the slope was read, in samples from the middle.
    pub at: f64,
    /// Half-width of the window it was fitted in, in samples.
    pub half: usize,
}

/// The steepest slope of a signal with white noise of `noise` rms within a range; `None` for fewer than five samples.
#[must_use]
pub fn steepest<S: Signal + ?Sized>(signal: &S, range: Range<usize>, noise: f64) -> Option<Steepest> {
    let range = range.start..range.end.min(signal.points());
    if range.len() < 2 * LEAST_HALF + 1 {
        return None;
    }
    let (stretches, spread) = moving(signal, &range);
    let place = place(signal, &range, &stretches, noise)?;
    let tolerance = noise.max(RELATIVE_FLOOR * spread);
    let mut middle = place;
    let mut accepted: Vec<Steepest> = Vec::new();
    let mut half = LEAST_HALF;
    let mut misfit = false;
    while half <= MOST_HALF && 2 * half < range.len() {
        middle = middle.clamp(range.start + half, range.end - 1 - half);
        let fit = Cubic::of(signal, middle, half);
        let found = fit.steepest(middle, noise);
        // A slope that falls back by more than noise explains shows a window that is too wide.
        let steady = accepted.last().is_none_or(|last| {
            (found.slope - last.slope).abs() <= 4.0 * last.u.max(tolerance * fit.weight(found.at).sqrt())
        });
        let freedom = (2 * half - 3) as f64;
        let most = tolerance * tolerance * (1.0 + 3.0 * (2.0 / freedom).sqrt());
        misfit = !accepted.is_empty() && (fit.residual_variance > most || !steady);
        if misfit {
            break;
        }
        middle = middle.saturating_add_signed(found.at.round() as isize);
        accepted.push(found);
        half = (half + half / 2).max(half + 1);
    }
    if misfit && accepted.len() > STEPS_BACK {
        accepted.truncate(accepted.len() - STEPS_BACK);
    }
    accepted.pop()
}

impl Steepest {
    /// The slope per sample that the same fit, at the same place, gives for another signal.
    #[must_use]
    pub fn again<S: Signal + ?Sized>(&self, signal: &S) -> f64 {
        Cubic::of(signal, self.middle, self.half).slope(self.at)
    }
}

/// The stretches that move furthest, each widened by half a block, and how far the whole range moves.
fn moving<S: Signal + ?Sized>(signal: &S, range: &Range<usize>) -> (Vec<Range<usize>>, f64) {
    let (mut low, mut high) = (f32::INFINITY, f32::NEG_INFINITY);
    let mut found: Vec<(f32, usize)> = Vec::with_capacity(range.len() / BLOCK + 1);
    blocks(signal, range.clone(), |from, part| {
        let (least, most) = range_of(part);
        (low, high) = (low.min(least), high.max(most));
        found.push((most - least, from));
    });
    let kept = found.len().min(CANDIDATES);
    if kept < found.len() {
        found.select_nth_unstable_by(kept, |a, b| b.0.total_cmp(&a.0));
        found.truncate(kept);
    }
    let widened = found
        .into_iter()
        .map(|(_, from)| from.saturating_sub(BLOCK / 2).max(range.start)..(from + BLOCK + BLOCK / 2).min(range.end));
    (widened.collect(), f64::from(high - low).max(0.0))
}

/// The sample round which adjacent means differ most, over a width at which their noise is well below that.
fn place<S: Signal + ?Sized>(
    signal: &S,
    range: &Range<usize>,
    stretches: &[Range<usize>],
    noise: f64,
) -> Option<usize> {
    let mut width = 1;
    let mut best = None;
    while width <= MOST_HALF && 2 * width <= range.len() {
        let mut top = (0.0, None);
        for stretch in stretches {
            let from = stretch.start.saturating_sub(width).max(range.start);
            let to = (stretch.end + width).min(range.end);
            let mut samples = vec![0.0f32; to - from];
            signal.load(from, &mut samples);
            let mut sum = 0.0;
            let sums: Vec<f64> = std::iter::once(0.0)
                .chain(samples.iter().map(|x| {
                    sum += f64::from(*x);
                    sum
                }))
                .collect();
            for (i, w) in sums.windows(2 * width + 1).enumerate() {
                let step = (w[2 * width] - 2.0 * w[width] + w[0]).abs();
                if step > top.0 {
                    top = (step, Some(from + i + width));
                }
            }
        }
        best = top.1.or(best);
        // The sums of 2w samples have √(2w) times their noise.
        if top.0 > CLEAR * noise * (2.0 * width as f64).sqrt() {
            break;
        }
        width *= 2;
    }
    best.or(Some(range.start))
}

/// A cubic through `2·half + 1` samples in orthogonal polynomials 1, x, x² − Σx²/n, x³ − x·Σx⁴/Σx².
struct Cubic {
    half: f64,
    /// Coefficients of x, x² and x³.
    rise: [f64; 3],
    /// Σ of the squared polynomials, and Σx⁴/Σx².
    norms: [f64; 3],
    ratio: f64,
    residual_variance: f64,
}

impl Cubic {
    fn of<S: Signal + ?Sized>(signal: &S, middle: usize, half: usize) -> Self {
        let mut window = vec![0.0f32; 2 * half + 1];
        signal.load(middle - half, &mut window);
        let count = window.len() as f64;
        let h = half as f64;
        let (mut s2, mut s4, mut s6) = (0.0, 0.0, 0.0);
        for k in 1..=half {
            let square = (k * k) as f64;
            s2 += 2.0 * square;
            s4 += 2.0 * square * square;
            s6 += 2.0 * square * square * square;
        }
        let ratio = s4 / s2;
        let norms = [s2, s4 - s2 * s2 / count, s6 - ratio * s4];
        let mean = window.iter().map(|y| f64::from(*y)).sum::<f64>() / count;
        let (mut sums, mut total) = ([0.0; 3], 0.0);
        for (i, y) in window.iter().enumerate() {
            let (x, y) = (i as f64 - h, f64::from(*y) - mean);
            sums[0] += x * y;
            sums[1] += (x * x - s2 / count) * y;
            sums[2] += (x * x - ratio) * x * y;
            total += y * y;
        }
        let rise = [0, 1, 2].map(|i| sums[i] / norms[i]);
        let explained: f64 = (0..3).map(|i| rise[i] * sums[i]).sum();
        Self { half: h, rise, norms, ratio, residual_variance: (total - explained).max(0.0) / (count - 4.0) }
    }

    fn slope(&self, x: f64) -> f64 {
        let [a, b, c] = self.rise;
        a + 2.0 * b * x + c * (3.0 * x * x - self.ratio)
    }

    /// Variance of the slope at `x` per variance of a sample.
    fn weight(&self, x: f64) -> f64 {
        1.0 / self.norms[0] + (2.0 * x).powi(2) / self.norms[1] + (3.0 * x * x - self.ratio).powi(2) / self.norms[2]
    }

    /// The largest slope in the window's inner half.
    fn steepest(&self, middle: usize, noise: f64) -> Steepest {
        let limit = 0.5 * self.half;
        let [_, b, c] = self.rise;
        let turn = if c.abs() > 0.0 { (-b / (3.0 * c)).clamp(-limit, limit) } else { 0.0 };
        // Towards an end only where the slope still rises there; a turn that is a least slope is no steepest one.
        let here = self.slope(turn);
        let at = if here * c <= 0.0 { turn } else { 0.0 };
        Steepest { slope: self.slope(at), u: noise * self.weight(at).sqrt(), middle, at, half: self.half as usize }
    }
}

#[cfg(test)]
mod tests;
