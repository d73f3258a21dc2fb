//! What the shape of one waveform says: levels, transitions, aberrations, period and extremes, each with the
//! uncertainty that its noise leaves. Times are in samples here.
//!
//! Finding the shape and reading it are two steps, so that the same transitions can be read again on a waveform that is
//! changed a little: that is how the figures' sensitivities are found.

use std::ops::Range;

use super::super::levels::{self, Levels, NoLevels};
use super::super::peaks::{self, Extreme};
use super::super::signal::Signal;
use super::super::transition::{self, Edge, Transition};

/// At most about this many transitions are measured, spread over the record.
const MOST_EDGES: usize = 256;

/// So many transitions tell how a small change moves them all.
const ENOUGH_EDGES: usize = 24;

/// At most this many cycles are searched for their extremes, spread over the record.
const MOST_CYCLES: usize = 128;

/// From this many repeats on, their scatter is trusted to show what the noise alone does not: jitter.
const ENOUGH_REPEATS: usize = 5;

/// A flat stretch has its extreme where noise made it: what is left of that lift after the fit, in parts of a single
/// fit's uncertainty. It is the same in every cycle (measured: 0.63).
pub(super) const CHOICE: f64 = 0.63;

/// Cycles that differ by more than this part of the period are none.
const MOST_IRREGULARITY: f64 = 0.1;

/// A value and its standard uncertainty from noise, or the reason why there is none.
pub(super) type Reading = Result<Read, String>;

#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Read {
    pub(super) value: f64,
    pub(super) u: f64,
}

/// Where the features of a waveform are.
pub(super) struct Layout {
    pub(super) levels: Result<Levels, NoLevels>,
    low: f64,
    high: f64,
    /// Every transition, and which of them are measured.
    pub(super) edges: Vec<Edge>,
    chosen: Vec<usize>,
    pub(super) cycles: Vec<Range<usize>>,
}

/// What a waveform reads.
pub(super) struct Shape {
    pub(super) rise: Reading,
    pub(super) fall: Reading,
    pub(super) overshoot: Reading,
    pub(super) undershoot: Reading,
    pub(super) period: Reading,
    pub(super) duty: Reading,
    pub(super) maximum: Read,
    pub(super) minimum: Read,
    /// Where each cycle has its lowest and its highest value.
    extremes: Vec<(Extreme, Extreme)>,
    /// The transitions that were measured, each with its place among the layout's.
    pub(super) measured: Vec<(usize, Transition)>,
    /// High level less low level.
    pub(super) amplitude: f64,
    /// Longest mean duration of a transition, in samples; 0 without any.
    pub(super) slowest: f64,
    /// How many periods lie between the first and the last 50 % point that the period was taken from.
    pub(super) periods: f64,
}

impl Layout {
    /// Of a signal with white noise of `noise` rms.
    pub(super) fn of<S: Signal + ?Sized>(signal: &S, noise: f64) -> Self {
        let levels = levels::find(signal, noise);
        // A waveform without states (a sine) still has a middle that it crosses.
        let (low, high) = levels.as_ref().map_or_else(|_| levels::outer(signal), |l| (l.low.value, l.high.value));
        let edges = match &levels {
            Ok(levels) => levels.edges.clone(),
            Err(_) if high - low > 6.0 * noise && high > low => transition::edges(signal, low, high),
            Err(_) => Vec::new(),
        };
        let group = (3 * edges.len()).div_ceil(2 * MOST_EDGES).max(1);
        // Three in a row make a whole period.
        let chosen = (0..edges.len()).filter(|i| i % (2 * group) < 3).collect();
        let starts: Vec<usize> = edges.iter().filter(|e| e.rising).map(Edge::middle).collect();
        let step = starts.len().div_ceil(MOST_CYCLES).max(1);
        let mut cycles: Vec<Range<usize>> = starts.windows(2).step_by(step).map(|w| w[0]..w[1]).collect();
        if cycles.len() < 2 {
            cycles.clear();
            cycles.push(0..signal.points());
        }
        Self { levels, low, high, edges, chosen, cycles }
    }

    /// The levels between which transitions are measured.
    pub(super) fn between(&self) -> (f64, f64) {
        (self.low, self.high)
    }

    /// Reads a signal that has its features at the same places, between the levels given.
    pub(super) fn read<S: Signal + ?Sized>(&self, signal: &S, noise: f64, between: (f64, f64)) -> Shape {
        self.read_beside(None, signal, noise, between)
    }

    /// As [`Layout::read`], of a signal that differs little from one that was read: its extremes are at the same
    /// places, and fewer transitions suffice, since the noise is the same in both.
    pub(super) fn read_beside<S: Signal + ?Sized>(
        &self,
        known: Option<&Shape>,
        signal: &S,
        noise: f64,
        (low, high): (f64, f64),
    ) -> Shape {
        let points = signal.points();
        let middle = |i: usize| self.edges.get(i).map(Edge::middle);
        let measured: Vec<(usize, Transition)> = self
            .chosen
            .iter()
            .take(if known.is_some() { ENOUGH_EDGES } else { usize::MAX })
            .filter_map(|&i| {
                let from = i.checked_sub(1).and_then(middle).unwrap_or(0);
                let to = middle(i + 1).unwrap_or(points);
                let found = transition::measure(signal, self.edges[i], from..to, (low, high), noise)?;
                Some((i, found))
            })
            .collect();
        let states = self.levels.as_ref().map(|_| ()).map_err(ToString::to_string);
        let duration = |rising: bool| {
            let all = measured.iter().filter(|(_, t)| t.rising == rising);
            mean(all.map(|(_, t)| Read { value: t.duration, u: t.duration_u })).ok_or_else(|| {
                format!("the record holds no whole {} transition", if rising { "rising" } else { "falling" })
            })
        };
        let (rise, fall) = (duration(true), duration(false));
        let aberration = |rising: bool| {
            let found = measured.iter().filter(|(_, t)| t.rising == rising).take(MOST_CYCLES).filter_map(|(i, t)| {
                let next = middle(i + 1).unwrap_or(points) as f64;
                // The post-transition region: ten durations, but no further than half-way to the next transition.
                let to = (t.end + (10.0 * t.duration).max(16.0)).min(0.5 * (t.end + next));
                let range = t.end.ceil() as usize..(to.ceil() as usize).min(points);
                let top = if rising { peaks::highest } else { peaks::lowest };
                (range.len() >= 3).then(|| {
                    let top = top(signal, range, noise);
                    let beyond = if rising { top.value - high } else { low - top.value };
                    Read { value: beyond / (high - low), u: top.u / (high - low) }
                })
            });
            let found = mean(found).ok_or_else(|| "the record holds no transition with room after it".to_owned())?;
            Ok(Read { value: found.value.max(0.0), ..found })
        };
        let (period, periods) = period(&measured);
        let duty = states.clone().and_then(|()| duty(&measured, period.clone()?));
        let found: Vec<(Extreme, Extreme)> = match known {
            None => self.cycles.iter().map(|r| peaks::extremes_within(signal, r.clone(), noise)).collect(),
            Some(known) => {
                let again = |(low, high): &(Extreme, Extreme)| {
                    let value = |e: &Extreme, highest| Extreme { value: e.again(signal, highest), ..*e };
                    (value(low, false), value(high, true))
                };
                known.extremes.iter().map(again).collect()
            }
        };
        let extreme = |of: fn(&(Extreme, Extreme)) -> Extreme| {
            let all = found.iter().map(of);
            let mean = mean(all.clone().map(|e| Read { value: e.value, u: e.u }));
            let mean = mean.unwrap_or(Read { value: 0.0, u: 0.0 });
            let each = all.map(|e| e.u).sum::<f64>() / self.cycles.len() as f64;
            Read { value: mean.value, u: mean.u.hypot(CHOICE * each) }
        };
        let duration_of = |r: &Reading| r.as_ref().map_or(0.0, |r| r.value);
        Shape {
            slowest: duration_of(&rise).max(duration_of(&fall)),
            overshoot: states.clone().and_then(|()| aberration(true)),
            undershoot: states.clone().and_then(|()| aberration(false)),
            rise: states.clone().and(rise),
            fall: states.and(fall),
            period,
            duty,
            maximum: extreme(|both| both.1),
            minimum: extreme(|both| both.0),
            extremes: found,
            measured,
            amplitude: high - low,
            periods,
        }
    }
}

/// Mean of repeats; its uncertainty is the larger of what noise and what scatter say.
pub(super) fn mean(reads: impl Iterator<Item = Read>) -> Option<Read> {
    let reads: Vec<Read> = reads.collect();
    if reads.is_empty() {
        return None;
    }
    let n = reads.len() as f64;
    let value = reads.iter().map(|r| r.value).sum::<f64>() / n;
    let noise = reads.iter().map(|r| r.u * r.u).sum::<f64>().sqrt() / n;
    let scatter = if reads.len() >= ENOUGH_REPEATS {
        (reads.iter().map(|r| (r.value - value).powi(2)).sum::<f64>() / (n - 1.0) / n).sqrt()
    } else {
        0.0
    };
    Some(Read { value, u: noise.max(scatter) })
}

/// The slope of a straight line through the 50 % points of one direction, and how many periods they span.
fn period(measured: &[(usize, Transition)]) -> (Reading, f64) {
    let of = |rising: bool| measured.iter().filter(move |(_, t)| t.rising == rising);
    let rising = of(true).count() >= of(false).count();
    // Transitions alternate, so every second one begins a cycle.
    let points: Vec<(f64, f64, f64)> = of(rising).map(|(i, t)| ((i / 2) as f64, t.middle, t.middle_u)).collect();
    let (Some(first), Some(last)) = (points.first(), points.last()) else {
        return (Err("the record holds no transition".to_owned()), 0.0);
    };
    let spanned = last.0 - first.0;
    if spanned < 1.0 {
        return (Err("the record holds less than one period".to_owned()), 0.0);
    }
    let n = points.len() as f64;
    let (cx, cy) = (points.iter().map(|p| p.0).sum::<f64>() / n, points.iter().map(|p| p.1).sum::<f64>() / n);
    let sxx: f64 = points.iter().map(|p| (p.0 - cx).powi(2)).sum();
    let value = points.iter().map(|p| (p.0 - cx) * (p.1 - cy)).sum::<f64>() / sxx;
    let residual: f64 = points.iter().map(|p| (p.1 - cy - value * (p.0 - cx)).powi(2)).sum();
    let scatter = if points.len() > 2 { residual / (n - 2.0) } else { 0.0 };
    if scatter.sqrt() > MOST_IRREGULARITY * value {
        return (Err("the waveform does not repeat: its transitions have no constant distance".to_owned()), 0.0);
    }
    let noise = points.iter().map(|p| p.2 * p.2).sum::<f64>() / n;
    let variance = if points.len() >= ENOUGH_REPEATS { noise.max(scatter) } else { noise };
    (Ok(Read { value, u: (variance / sxx).sqrt() }), spanned)
}

/// Mean time from a rising to the falling 50 % point after it, per period.
fn duty(measured: &[(usize, Transition)], period: Read) -> Reading {
    let highs = measured.windows(2).filter(|w| w[0].0 + 1 == w[1].0 && w[0].1.rising).map(|w| Read {
        value: (w[1].1.middle - w[0].1.middle) / period.value,
        u: w[0].1.middle_u.hypot(w[1].1.middle_u) / period.value,
    });
    let found = mean(highs).ok_or_else(|| "the record holds no whole stay in the high state".to_owned())?;
    Ok(Read { u: found.u.hypot(found.value * period.u / period.value), ..found })
}
