//! The neighbourhood of one transition: brought to a handy number of samples, smoothed, and searched for crossings.

use std::ops::Range;
use std::sync::LazyLock;

use super::super::interpolate::Interpolator;
use super::super::signal::Signal;
use super::super::wide::widest;
use super::Edge;

/// Long transitions are averaged in blocks so that 30 % to 70 % takes about this many.
const SPAN: usize = 32;

/// Points per sample when a fast edge is interpolated, and the taps for it.
const UPSAMPLING: usize = 8;
const TAPS: usize = 24;

/// How far round its middle a fast edge is interpolated, in stretches from 30 % to 70 %, beside the taps: a Gaussian edge
/// reaches its 10 % and 90 % after 1.2 of them, an exponential one after 1.9.
const AROUND: f64 = 4.0;

/// Smoothing wider than this leaves nothing between the samples that straight lines miss.
const SMOOTH_ENOUGH: f64 = 2.0;

/// Ratio of the 10–90 % duration to the standard deviation of a Gaussian edge: 2·1.2816.
const DURATION_PER_SIGMA: f64 = 2.5631;

/// A transition as a rise from 0 to 1.
pub(super) struct Local {
    values: Vec<f64>,
    /// Position of the first value in samples of the record.
    origin: f64,
    /// Samples of the record per value.
    pub(super) pitch: f64,
    /// 30 % to 70 %, in values.
    pub(super) span: f64,
    /// Rms of the noise per value, in parts of the amplitude.
    noise: f64,
    /// The values that belong to this transition and no other.
    room: Range<f64>,
    centre: f64,
    /// Variance that the block averages added to the width, in values squared.
    block_variance: f64,
}

/// What a search found; positions and widths in values of [`Local`].
#[derive(Debug, Clone, Copy)]
pub(super) struct Crossings {
    /// 10 % to 90 % as found.
    pub(super) raw: f64,
    /// The same with the smoothing's width taken out.
    pub(super) duration: f64,
    pub(super) middle: f64,
    pub(super) end: f64,
    /// Rms of the noise after smoothing, in parts of the amplitude.
    pub(super) noise: f64,
}

impl Local {
    pub(super) fn around<S: Signal + ?Sized>(
        signal: &S,
        edge: Edge,
        room: &Range<usize>,
        span: usize,
        noise: f64,
        (low, amplitude): (f64, f64),
    ) -> Option<Self> {
        let block = (span / SPAN).max(1);
        // Eight times 30–70 % is four times 10–90 %; the rest is for the filters.
        let reach = 8 * span + 32 * block;
        let from = edge.from.saturating_sub(reach);
        let to = (edge.to + reach).min(signal.points());
        if from >= to {
            return None;
        }
        let scale = if edge.rising { 1.0 / amplitude } else { -1.0 / amplitude };
        let zero = if edge.rising { low } else { low + amplitude };
        let mut samples = vec![0.0f32; to - from];
        signal.load(from, &mut samples);
        let values: Vec<f64> = samples
            .chunks_exact(block)
            .map(|c| (c.iter().map(|x| f64::from(*x)).sum::<f64>() / block as f64 - zero) * scale)
            .collect();
        let size = block as f64;
        let origin = from as f64 + 0.5 * (size - 1.0);
        let place = |i: usize| (i as f64 - origin) / size;
        Some(Self {
            values,
            origin,
            pitch: size,
            span: span as f64 / size,
            noise: noise / amplitude / size.sqrt(),
            room: place(room.start)..place(room.end),
            centre: 0.5 * (place(edge.from) + place(edge.to)),
            block_variance: (size * size - 1.0) / (12.0 * size * size),
        })
    }

    pub(super) fn position(&self, place: f64) -> f64 {
        place.mul_add(self.pitch, self.origin)
    }

    /// Noise in parts of the amplitude after smoothing with a Gaussian of `width` values.
    pub(super) fn noise_after(&self, width: f64) -> f64 {
        self.noise * kernel(width).iter().map(|h| h * h).sum::<f64>().sqrt()
    }

    /// Smooths with a Gaussian of `width` values and looks for the crossings nearest to the 50 % point.
    pub(super) fn crossings(&self, width: f64) -> Option<Crossings> {
        let kernel = kernel(width);
        let half = kernel.len() / 2;
        let last = self.values.len().checked_sub(1)?;
        // Beyond its ends the stretch goes on with its first and its last value.
        let mut padded = vec![self.values[0]; half];
        padded.extend_from_slice(&self.values);
        padded.resize(self.values.len() + 2 * half, self.values[last]);
        let mut smooth = vec![0.0; self.values.len()];
        smoothed(&padded, &kernel, &mut smooth);
        // A fast edge is read between its samples too, where it and its tails can be.
        let (fine, factor, skipped) = if width >= SMOOTH_ENOUGH {
            (smooth, 1, 0)
        } else {
            let near = (AROUND * self.span + TAPS as f64) as usize;
            let centre = self.centre.max(0.0) as usize;
            let from = centre.saturating_sub(near).min(last);
            (upsample(&smooth[from..(centre + near).min(last) + 1]), UPSAMPLING, from)
        };
        let factor = factor as f64;
        let place = |i: f64| i / factor + skipped as f64;
        // The 50 % crossing upwards that is nearest to the middle of the edge.
        let up = |w: &[f64]| w[0] < 0.5 && w[1] >= 0.5;
        let inside = |i: usize| self.room.contains(&place(i as f64));
        let distance = |i: usize| (place(i as f64) - self.centre).abs();
        let middle = (0..fine.len().saturating_sub(1))
            .filter(|&i| up(&fine[i..i + 2]) && inside(i))
            .min_by(|&a, &b| distance(a).total_cmp(&distance(b)))?;
        let between = |i: usize, level: f64| crossing(&fine, i, level);
        let start = (0..=middle).rev().take_while(|&i| inside(i)).find(|&i| fine[i] < 0.1)?;
        let end = (middle + 1..fine.len()).take_while(|&i| inside(i)).find(|&i| fine[i] >= 0.9)? - 1;
        let variance: f64 = kernel.iter().enumerate().map(|(k, h)| h * (k as f64 - half as f64).powi(2)).sum::<f64>()
            + self.block_variance;
        let raw = (between(end, 0.9) - between(start, 0.1)) / factor;
        let duration = (raw * raw - DURATION_PER_SIGMA * DURATION_PER_SIGMA * variance).max(0.25 * raw * raw).sqrt();
        Some(Crossings {
            raw,
            duration,
            middle: place(between(middle, 0.5)),
            end: place(between(end, 0.9)),
            noise: self.noise_after(width),
        })
    }
}

widest! {
    /// `y[i] = Σ h[k]·x[i + k]`, tap by tap over a short stretch: sums side by side do not wait for each other.
    fn smoothed(x: &[f64], h: &[f64], y: &mut [f64]) {
        const WIDE: usize = 16;
        let whole = y.len() / WIDE * WIDE;
        for from in (0..whole).step_by(WIDE) {
            let mut sums = [0.0f64; WIDE];
            for (k, h) in h.iter().enumerate() {
                let Some(x) = x[from + k..].first_chunk::<WIDE>() else { continue };
                for j in 0..WIDE {
                    sums[j] += h * x[j];
                }
            }
            y[from..from + WIDE].copy_from_slice(&sums);
        }
        for (i, y) in y.iter_mut().enumerate().skip(whole) {
            *y = h.iter().zip(&x[i..]).map(|(h, x)| h * x).sum();
        }
    }
}

/// A sampled Gaussian with a sum of one; a single 1 when it would be narrower than that.
fn kernel(width: f64) -> Vec<f64> {
    if width < 0.2 {
        return vec![1.0];
    }
    let half = (4.0 * width).ceil() as i32;
    let weights: Vec<f64> = (-half..=half).map(|k| (-0.5 * (f64::from(k) / width).powi(2)).exp()).collect();
    let sum: f64 = weights.iter().sum();
    weights.into_iter().map(|w| w / sum).collect()
}

/// Where `values` reach `level` between `i` and `i + 1`: on the parabola that has the mean bend of both ends, where
/// that is not more than the step itself.
fn crossing(values: &[f64], i: usize, level: f64) -> f64 {
    let (from, rise) = (values[i], values[i + 1] - values[i]);
    let straight = (level - from) / rise;
    let around = i.checked_sub(1).and_then(|before| values.get(before)).zip(values.get(i + 2));
    let bend = around.map_or(0.0, |(before, after)| 0.5 * (before - from - values[i + 1] + after));
    if bend.abs() > 0.5 * rise.abs() {
        return i as f64 + straight;
    }
    // Value: from + rise·t − bend/2·t·(1 − t). Two steps of Newton's from the straight line are exact to 10⁻⁶.
    let better =
        |t: f64| t - (from + rise * t - 0.5 * bend * t * (1.0 - t) - level) / (rise - 0.5 * bend * (1.0 - 2.0 * t));
    i as f64 + better(better(straight)).clamp(0.0, 1.0)
}

/// Band-limited interpolation to [`UPSAMPLING`] points per sample. Where the taps lack support the nearest sample is
/// repeated; the transition is far from there.
fn upsample(values: &[f64]) -> Vec<f64> {
    /// One interpolator for each place between two samples, designed once.
    static PLACES: LazyLock<Vec<Interpolator>> = LazyLock::new(|| {
        (1..UPSAMPLING).map(|part| Interpolator::with_taps(part as f64 / UPSAMPLING as f64, TAPS)).collect()
    });
    let mut fine: Vec<f64> = values.iter().flat_map(|&v| std::iter::repeat_n(v, UPSAMPLING)).collect();
    for (part, interpolator) in PLACES.iter().enumerate() {
        let support = interpolator.support(values.len());
        for (i, v) in support.zip(interpolator.apply(values)) {
            fine[i * UPSAMPLING + part + 1] = v;
        }
    }
    fine
}
