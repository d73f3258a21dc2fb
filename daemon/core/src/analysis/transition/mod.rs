//! Transitions between two levels: where they are, and how long they last (IEEE Std 181: transition duration, reference
//! level instants; 10 %, 50 % and 90 % of the waveform amplitude).
//!
//! The duration is measured on a slightly smoothed edge: a Gaussian of 0.12 times the duration, whose width is taken out
//! again in quadrature. The first guess comes from the narrowest of a ladder of widths that keeps the noise below 3 % of
//! the amplitude. Crossings are those nearest to the 50 % point, so that noise and ringing on the states do no harm.

mod local;

use super::signal::{BLOCK, Outline, Signal};
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
pub fn edges<S: Signal + ?Sized>(signal: &S, low: f64, high: f64) -> Vec<Edge> {
    outlined_edges(signal, &Outline::of(signal), low, high)
}

/// As [`edges`], with the signal's outline: blocks that stay in one state are not looked into.
pub(super) fn outlined_edges<S: Signal + ?Sized>(signal: &S, outline: &Outline, low: f64, high: f64) -> Vec<Edge> {
    let (lower, upper) = (0.3f64.mul_add(high - low, low), 0.7f64.mul_add(high - low, low));
    let mut walk = Walk::default();
    let points = signal.points();
    let mut buffer = [0.0; BLOCK];
    for (block, &(least, most)) in outline.blocks.iter().enumerate() {
        let from = block * BLOCK;
        let count = BLOCK.min(points - from);
        let side = if f64::from(most) <= lower {
            Some(false)
        } else if f64::from(least) >= upper {
            Some(true)
        } else {
            None
        };
        match side {
            // The first few samples may complete a transition; the rest only says where the state was seen last.
            Some(side) if count > DWELL => {
                (from..from + DWELL).for_each(|i| walk.step(i, Some(side)));
                walk.stay(from + count - 1, side);
            }
            _ => {
                let part = &mut buffer[..count];
                signal.load(from, part);
                for (i, &x) in part.iter().enumerate() {
                    let x = f64::from(x);
                    let side = (x <= lower || x >= upper).then_some(x >= upper);
                    walk.step(from + i, side);
                }
            }
        }
    }
    walk.found
}

/// Walks along a signal's states, low (false) and high (true).
#[derive(Default)]
struct Walk {
    found: Vec<Edge>,
    state: Option<bool>,
    /// Where each state was seen last.
    last: [Option<usize>; 2],
    /// How many samples in a row were on which side.
    run: (bool, usize),
}

impl Walk {
    fn step(&mut self, i: usize, side: Option<bool>) {
        let Some(side) = side else {
            self.run.1 = 0;
            return;
        };
        self.run = if self.run.0 == side { (side, self.run.1 + 1) } else { (side, 1) };
        if self.run.1 >= DWELL {
            if self.state == Some(!side)
                && let Some(from) = self.last[usize::from(!side)]
            {
                self.found.push(Edge { rising: side, from, to: i + 1 - DWELL });
            }
            self.state = Some(side);
        }
        // A lone wild sample on the old side after the edge must not become its beginning.
        if self.state == Some(side) {
            self.last[usize::from(side)] = Some(i);
        }
    }

    /// The state, which holds already, goes on to sample `i`.
    fn stay(&mut self, i: usize, side: bool) {
        self.run = (side, DWELL);
        self.last[usize::from(side)] = Some(i);
    }
}

/// Measures one transition between `low` and `high`. `room` is the stretch of samples that belongs to it: from the
/// transition before to the one after. `None` when it does not cross its levels within that room.
#[must_use]
pub fn measure<S: Signal + ?Sized>(
    signal: &S,
    edge: Edge,
    room: std::ops::Range<usize>,
    (low, high): (f64, f64),
    noise: f64,
) -> Option<Transition> {
    let amplitude = high - low;
    if amplitude.is_nan() || amplitude <= 0.0 || room.end > signal.points() {
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
