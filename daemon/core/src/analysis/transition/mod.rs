//! Transitions between two levels: where they are, and how long they last (IEEE Std 181: transition duration, reference
//! level instants; 10 %, 50 % and 90 % of the waveform amplitude).
//!
//! The duration is measured on a slightly smoothed edge: a Gaussian of 0.12 times the duration, whose width is taken out
//! again in quadrature. The first guess comes from the narrowest of a ladder of widths that keeps the noise below 3 % of
//! the amplitude. Crossings are those nearest to the 50 % point, so that noise and ringing on the states do no harm.

mod local;

use local::Local;

/// A state counts as reached when so many samples in a row say so: a single wild sample is no transition.
const DWELL: usize = 3;

/// Slope at the 10 % and 90 % points of an edge of Gaussian shape, relative to its mean slope between them:
/// φ(1.2816)/(0.8/2.5631).
const END_SLOPE: f64 = 0.562;

/// The same at the 50 % point: φ(0)/(0.8/2.5631).
const MIDDLE_SLOPE: f64 = 1.278;

/// The first guess is made where the smoothed noise is below this part of the amplitude.
const GUESS_NOISE: f64 = 0.03;

/// Smoothing width as a part of the duration.
const SMOOTHING: f64 = 0.12;

/// Where a waveform goes from one state to the other.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Edge {
    /// From low to high.
    pub rising: bool,
    /// The last sample on the near side: below 30 % of the way.
    pub from: usize,
    /// The first sample on the far side: above 70 % of the way.
    pub to: usize,
}

impl Edge {
    /// The sample in the middle.
    #[must_use]
    pub fn middle(&self) -> usize {
        self.from.midpoint(self.to)
    }
}

/// One transition, measured.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Transition {
    /// From low to high.
    pub rising: bool,
    /// Time from 10 % to 90 % of the amplitude (or back), in samples.
    pub duration: f64,
    /// Its standard uncertainty from the noise, in samples.
    pub duration_u: f64,
    /// Position of the 50 % point in samples from the record's first.
    pub middle: f64,
    /// Its standard uncertainty from the noise, in samples.
    pub middle_u: f64,
    /// Position of the last of the two ends, where the new state begins.
    pub end: f64,
}

/// All transitions of a signal between two levels, with a hysteresis from 30 % to 70 %.
#[must_use]
pub fn edges(signal: &[f64], low: f64, high: f64) -> Vec<Edge> {
    let (lower, upper) = (0.3f64.mul_add(high - low, low), 0.7f64.mul_add(high - low, low));
    let mut found = Vec::new();
    let mut state: Option<bool> = None;
    let mut last = [None::<usize>; 2];
    let mut run = (false, 0);
    for (i, &x) in signal.iter().enumerate() {
        let side = if x <= lower {
            false
        } else if x >= upper {
            true
        } else {
            run.1 = 0;
            continue;
        };
        run = if run.0 == side { (side, run.1 + 1) } else { (side, 1) };
        if run.1 >= DWELL {
            if state == Some(!side)
                && let Some(from) = last[usize::from(!side)]
            {
                found.push(Edge { rising: side, from, to: i + 1 - DWELL });
            }
            state = Some(side);
        }
        // A lone wild sample on the old side after the edge must not become its beginning.
        if state == Some(side) {
            last[usize::from(side)] = Some(i);
        }
    }
    found
}

/// Measures one transition between `low` and `high`. `room` is the stretch of samples that belongs to it: from the
/// transition before to the one after. `None` when it does not cross its levels within that room.
#[must_use]
pub fn measure(
    signal: &[f64],
    edge: Edge,
    room: std::ops::Range<usize>,
    (low, high): (f64, f64),
    noise: f64,
) -> Option<Transition> {
    let amplitude = high - low;
    if amplitude.is_nan() || amplitude <= 0.0 || room.end > signal.len() {
        return None;
    }
    let span = (edge.to - edge.from).max(1);
    let local = Local::around(signal, edge, &room, span, noise, (low, amplitude))?;
    let mut width = 0.0;
    let mut ladder = 1.0;
    while local.noise_after(width) > GUESS_NOISE && ladder <= 0.6 * local.span {
        width = ladder;
        ladder *= 2.0;
    }
    let guess = local.crossings(width)?;
    let fine = local.crossings(SMOOTHING * guess.duration).unwrap_or(guess);
    // Taking the width out stretches the uncertainty by the same ratio.
    let stretch = fine.raw / fine.duration;
    let mean_slope = 0.8 / fine.raw;
    let end_u = fine.noise / (END_SLOPE * mean_slope);
    Some(Transition {
        rising: edge.rising,
        duration: fine.duration * local.pitch,
        duration_u: std::f64::consts::SQRT_2 * end_u * stretch * local.pitch,
        middle: local.position(fine.middle),
        middle_u: fine.noise / (MIDDLE_SLOPE * mean_slope) * local.pitch,
        end: local.position(fine.end),
    })
}

/// How far `leak`, in parts of the amplitude, can move a duration: both ends by its worst, relative to the duration.
#[must_use]
pub fn duration_per_part(leak: f64) -> f64 {
    2.0 * leak / (END_SLOPE * 0.8)
}

/// How far `leak`, in parts of the amplitude, can move a 50 % point, relative to the duration.
#[must_use]
pub fn middle_per_part(leak: f64) -> f64 {
    leak / (MIDDLE_SLOPE * 0.8)
}

#[cfg(test)]
mod tests;
