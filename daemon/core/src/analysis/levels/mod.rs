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

use super::transition::{self, Edge};

mod histogram;

use histogram::Histogram;

/// The fewest samples for which levels mean anything.
const LEAST_POINTS: usize = 32;

/// The states must be this many robust standard deviations of the samples round them apart. Noise halved in the middle
/// reaches 2, a sine or a triangle 3 to 4: half of their samples lie far from the would-be levels.
const LEAST_SEPARATION: f64 = 6.0;

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

    /// The mean of another signal over the samples that made the low level.
    #[must_use]
    pub fn mean_at_low(&self, signal: &[f64], other: &[f64]) -> f64 {
        mean_of(signal, other, &self.low_stays, &self.low)
    }

    /// The mean of another signal over the samples that made the high level.
    #[must_use]
    pub fn mean_at_high(&self, signal: &[f64], other: &[f64]) -> f64 {
        mean_of(signal, other, &self.high_stays, &self.high)
    }
}

/// Finds the levels of a signal whose white noise is `noise` rms (0 when not known).
///
/// # Errors
/// When the waveform has no two levels.
pub fn find(signal: &[f64], noise: f64) -> Result<Levels, NoLevels> {
    let histogram = (signal.len() >= LEAST_POINTS).then(|| Histogram::of(signal)).flatten().ok_or(NoLevels::Flat)?;
    let threshold = histogram.threshold();
    let least = noise.max(histogram.bin());
    let rough = |above: bool| {
        let group: Vec<f64> = signal.iter().copied().filter(|&x| (x > threshold) == above).collect();
        settle(&group, histogram.mode(threshold, above), least)
    };
    let (low, high) = (rough(false), rough(true));
    let apart = high.value - low.value;
    let spread = low.spread.max(high.spread);
    if apart.is_nan() || apart < LEAST_SEPARATION * spread {
        return Err(NoLevels::NotApart { apart, spread });
    }
    let edges = transition::edges(signal, low.value, high.value);
    if edges.is_empty() {
        return Err(NoLevels::NoTransition);
    }
    let (low_stays, high_stays) = stays(&edges, signal.len());
    let refine = |stays: &[Range<usize>], rough: Level| {
        let group: Vec<f64> = stays.iter().flat_map(|r| &signal[r.clone()]).copied().collect();
        if group.is_empty() { rough } else { settle(&group, rough.value, least) }
    };
    Ok(Levels { low: refine(&low_stays, low), high: refine(&high_stays, high), edges, low_stays, high_stays })
}

/// The mean within three robust standard deviations of a centre, three passes.
fn settle(group: &[f64], centre: f64, least: f64) -> Level {
    let mut level = Level { value: centre, spread: least, count: 0, reach: 3.0 * least, centre };
    let mut distances: Vec<f64> = Vec::with_capacity(group.len());
    for _ in 0..3 {
        level.centre = level.value;
        distances.clear();
        distances.extend(group.iter().map(|x| (x - level.centre).abs()));
        let middle = distances.len() / 2;
        if distances.is_empty() {
            break;
        }
        let (_, median, _) = distances.select_nth_unstable_by(middle, f64::total_cmp);
        level.spread = (1.4826 * *median).max(least);
        level.reach = 3.0 * level.spread;
        let (sum, count) = group
            .iter()
            .filter(|&x| (x - level.centre).abs() <= level.reach)
            .fold((0.0, 0usize), |(s, n), x| (s + (x - level.centre), n + 1));
        level.count = count;
        level.value = level.centre + sum / count.max(1) as f64;
    }
    level
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

fn mean_of(signal: &[f64], other: &[f64], stays: &[Range<usize>], level: &Level) -> f64 {
    let inside = stays.iter().flat_map(Range::clone).filter(|&i| (signal[i] - level.centre).abs() <= level.reach);
    let (sum, count) = inside.fold((0.0, 0usize), |(sum, count), i| (sum + other[i], count + 1));
    sum / count.max(1) as f64
}

#[cfg(test)]
mod tests;
