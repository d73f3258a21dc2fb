//! The two state levels of a pulse waveform (IEEE Std 181: low and high state, waveform amplitude).
//!
//! Definition used: the record's values are parted in two groups; each group's level begins at the mode of its smoothed
//! histogram and is then the mean of the samples within three robust standard deviations, three times over. Samples
//! near a transition do not take part (one and a half transition durations, but at most a quarter of the stay in
//! the state): the tails of the edges would draw both levels inwards. A drooping state gives its mean, not the value
//! it has most often.
//!
//! A waveform that has no two levels (DC, noise, sine, triangle) is refused with the reason.

use std::ops::Range;

use super::signal::{BLOCK, Outline, Signal, blocks};
use super::transition::{self, Edge};
use super::wide::widest;

mod histogram;

use histogram::{BINS, Histogram};

/// The fewest samples for which levels mean anything.
const LEAST_POINTS: usize = 32;

/// The states must be this many robust standard deviations of the samples round them apart. Noise halved in the middle
/// reaches 2, a sine or a triangle 3 to 4: half of their samples lie far from the would-be levels.
const LEAST_SEPARATION: f64 = 6.0;

/// Width of the fine histogram's bins in parts of the spread; it reaches 64 spreads to each side.
const FINENESS: f64 = 128.0 / BINS as f64;

/// So many samples of a state are enough to tell how errors of the correction move its level.
const ENOUGH: usize = 65_536;

/// One state's level.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Level {
    /// The level, in the signal's unit.
    pub value: f64,
    /// Robust standard deviation of the samples round it.
    pub spread: f64,
    /// How many samples were averaged.
    pub count: usize,
    /// Samples within this distance of `centre` were averaged.
    reach: f64,
    centre: f64,
}

/// Both levels of a waveform, and its transitions between them.
#[derive(Debug, Clone, PartialEq)]
pub struct Levels {
    /// The low state.
    pub low: Level,
    /// The high state.
    pub high: Level,
    /// The transitions in the order of time.
    pub edges: Vec<Edge>,
    /// Stretches of the low state, away from the transitions.
    low_stays: Vec<Range<usize>>,
    /// Stretches of the high state, away from the transitions.
    high_stays: Vec<Range<usize>>,
}

/// Why a waveform has no two levels.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum NoLevels {
    /// There is no transition.
    #[error("the waveform has no transition between two states")]
    NoTransition,
    /// The two groups are not far enough apart for their spread: DC, noise, a sine, a triangle.
    #[error("the waveform has no two states: its levels would be {apart} apart, in a spread of {spread}")]
    NotApart {
        /// Distance of the would-be levels.
        apart: f64,
        /// Robust standard deviation round them.
        spread: f64,
    },
    /// There are too few samples, or they are all equal.
    #[error("the waveform has no two states: it is flat or too short")]
    Flat,
}

impl Levels {
    /// The waveform amplitude: high level less low level.
    #[must_use]
    pub fn amplitude(&self) -> f64 {
        self.high.value - self.low.value
    }

    /// The mean of another signal over samples that made the low level; in a long record not all of them are read.
    #[must_use]
    pub fn mean_at_low<S: Signal + ?Sized, T: Signal + ?Sized>(&self, signal: &S, other: &T) -> f64 {
        mean_of(signal, other, &self.low_stays, &self.low)
    }

    /// The mean of another signal over samples that made the high level; in a long record not all of them are read.
    #[must_use]
    pub fn mean_at_high<S: Signal + ?Sized, T: Signal + ?Sized>(&self, signal: &S, other: &T) -> f64 {
        mean_of(signal, other, &self.high_stays, &self.high)
    }
}

/// Finds the levels of a signal whose white noise is `noise` rms (0 when not known). Cost: five passes over the signal,
/// no sorting.
///
/// # Errors
/// When the waveform has no two levels.
pub fn find<S: Signal + ?Sized>(signal: &S, noise: f64) -> Result<Levels, NoLevels> {
    let outline = Outline::of(signal);
    let enough = signal.points() >= LEAST_POINTS;
    let histogram = enough.then(|| Histogram::of(signal, &outline)).flatten().ok_or(NoLevels::Flat)?;
    let threshold = histogram.threshold();
    let least = noise.max(histogram.bin());
    let rough = |above: bool| {
        let settled = histogram.settle(Some((threshold, above)), histogram.mode(threshold, above), least);
        Level {
            value: settled.mean,
            spread: settled.spread,
            count: settled.count as usize,
            reach: 3.0 * settled.spread,
            centre: settled.centre,
        }
    };
    let (low, high) = (rough(false), rough(true));
    let apart = high.value - low.value;
    let spread = low.spread.max(high.spread);
    if apart.is_nan() || apart < LEAST_SEPARATION * spread {
        return Err(NoLevels::NotApart { apart, spread });
    }
    let edges = transition::outlined_edges(signal, &outline, low.value, high.value);
    if edges.is_empty() {
        return Err(NoLevels::NoTransition);
    }
    let (low_stays, high_stays) = stays(&edges, signal.points());
    Ok(Levels {
        low: refine(signal, &low_stays, low, least),
        high: refine(signal, &high_stays, high, least),
        edges,
        low_stays,
        high_stays,
    })
}

/// The levels that a waveform without states has: the values below and above which 5 % of its samples lie.
pub(super) fn outer<S: Signal + ?Sized>(signal: &S) -> (f64, f64) {
    let outline = Outline::of(signal);
    match Histogram::of(signal, &outline) {
        Some(histogram) => (histogram.quantile(0.05), histogram.quantile(0.95)),
        None if outline.range().0.is_finite() => (outline.range().0, outline.range().0),
        None => (0.0, 0.0),
    }
}

/// A level from the samples of its stays alone, beginning with a rough one. Where to cut is found on a histogram that is
/// fine against the spread; the mean within is that of the samples themselves.
fn refine<S: Signal + ?Sized>(signal: &S, stays: &[Range<usize>], rough: Level, least: f64) -> Level {
    let half = 0.5 * FINENESS * BINS as f64 * rough.spread;
    let (low, high) = (rough.value - half, rough.value + half);
    let fine = (!stays.is_empty()).then(|| Histogram::within(signal, stays, low, high)).flatten();
    let Some(settled) = fine.map(|histogram| histogram.settle(None, rough.value, least)) else { return rough };
    let (centre, reach) = (settled.centre, 3.0 * settled.spread);
    let (mut sum, mut count) = (0.0, 0.0);
    for stretch in stays {
        blocks(signal, stretch.clone(), |_, part| {
            let (distance, inside) = inside(part, part, centre, reach);
            sum += distance;
            count += inside;
        });
    }
    let value = centre + if count > 0.0 { sum / count } else { 0.0 };
    Level { value, spread: settled.spread, count: count as usize, reach, centre }
}

widest! {
    /// The sum of `other` over the samples of `part` within `reach` of `centre`, and their number; for `other` the same
    /// as `part` relative to the centre.
    fn inside(part: &[f32], other: &[f32], centre: f64, reach: f64) -> (f64, f64) {
        // As many as keep the loop over them a loop, see `range_of`.
        const LANES: usize = 32;
        let (middle, reach) = (centre as f32, reach as f32);
        let zero = if std::ptr::eq(part, other) { middle } else { 0.0 };
        let (mut sums, mut counts) = ([0.0f32; LANES], [0.0f32; LANES]);
        let ((x, last_x), (y, last_y)) = (part.as_chunks::<LANES>(), other.as_chunks::<LANES>());
        for (x, y) in x.iter().zip(y) {
            for k in 0..LANES {
                let inside = (x[k] - middle).abs() <= reach;
                sums[k] += if inside { y[k] - zero } else { 0.0 };
                counts[k] += if inside { 1.0 } else { 0.0 };
            }
        }
        for (k, (x, y)) in last_x.iter().zip(last_y).enumerate() {
            let inside = (x - middle).abs() <= reach;
            sums[k] += if inside { y - zero } else { 0.0 };
            counts[k] += if inside { 1.0 } else { 0.0 };
        }
        let (mut sum, mut count) = ([0.0f64; 8], [0.0f64; 8]);
        for (sums, counts) in sums.as_chunks::<8>().0.iter().zip(counts.as_chunks::<8>().0) {
            for k in 0..8 {
                sum[k] += f64::from(sums[k]);
                count[k] += f64::from(counts[k]);
            }
        }
        let count: f64 = count.iter().sum();
        // What the centre lost in single precision is given back.
        let lost = if zero.abs() > 0.0 { (f64::from(middle) - centre) * count } else { 0.0 };
        (sum.iter().sum::<f64>() + lost, count)
    }
}

/// The stretches between the transitions, low and high, without their neighbourhoods.
fn stays(edges: &[Edge], points: usize) -> (Vec<Range<usize>>, Vec<Range<usize>>) {
    let (mut low, mut high) = (Vec::new(), Vec::new());
    for i in 0..=edges.len() {
        let before = i.checked_sub(1).map(|i| &edges[i]);
        let after = edges.get(i);
        let from = before.map_or(0, |e| e.to);
        let to = after.map_or(points, |e| e.from + 1);
        let room = to.saturating_sub(from) / 4;
        // From 30 % to 70 % is half of what 10 % to 90 % is, for an edge of Gaussian shape.
        let guard = |edge: &Edge| (3 * (edge.to - edge.from) + 2).min(room);
        let range = from + before.map_or(0, guard)..to.saturating_sub(after.map_or(0, guard));
        let is_high = before.map_or_else(|| after.is_some_and(|e| !e.rising), |e| e.rising);
        if !range.is_empty() {
            if is_high { high.push(range) } else { low.push(range) }
        }
    }
    (low, high)
}

fn mean_of<S: Signal + ?Sized, T: Signal + ?Sized>(
    signal: &S,
    other: &T,
    stays: &[Range<usize>],
    level: &Level,
) -> f64 {
    let (mut sum, mut count) = (0.0, 0.0);
    let mut buffer = [0.0f32; BLOCK];
    // In long stays every so many-th block tells.
    let every = (stays.iter().map(Range::len).sum::<usize>() / ENOUGH).max(1) * BLOCK;
    for part in stays.iter().flat_map(|stay| stay.clone().step_by(every).map(|i| i..(i + BLOCK).min(stay.end))) {
        blocks(signal, part, |from, part| {
            let others = match other.samples() {
                Some(samples) => &samples[from..from + part.len()],
                None => {
                    other.load(from, &mut buffer[..part.len()]);
                    &buffer[..part.len()]
                }
            };
            let (total, inside) = inside(part, others, level.centre, level.reach);
            sum += total;
            count += inside;
        });
    }
    sum / f64::max(count, 1.0)
}

#[cfg(test)]
mod tests;
