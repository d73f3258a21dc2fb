//! Long records with few edges: skew from the samples round the edges, gain and offset from block means.
//!
//! Between the edges of a square wave or of pulses the signal tells nothing about the skew, and its noise only hides
//! the edges' spectrum. So the edges are looked for in means over blocks, the score is solved on short windows round
//! them (joined to one record: two-level signals go on where the last window ended), and the levels are compared by
//! Deming's regression of the block means that hold no edge. Cost: O(n) additions and O(windows) of the rest: at a
//! million samples several hundred times less than correlating everything, and nearer to the bound.
//!
//! Whatever does not fit this picture (many or slow edges, a lag that no edge confirms, a common signal between the
//! edges that was not announced) is declined and left to the estimate from all samples.

mod edges;
mod levels;

use super::super::interpolate::Interpolator;
use super::fine::{Legs, Point, View, alternative_lag, begin, settle};
use super::leg::{BLOCK, Leg};
use super::report::report;
use super::{Reference, Shape, SkewError, SkewEstimate};
use edges::Edge;

/// Shorter records are estimated from all samples: it takes little time.
const LEAST_SAMPLES: usize = 32_768;
/// Samples on either side of an edge that are used.
const HALF: usize = 128;
/// Samples more on either side, for the interpolator's taps and a coarse lag that is a few samples off.
const PAD: usize = 32;
/// The windows may be one part in this many of the record; with more edges all samples are used.
const SHARE: usize = 8;
/// Points of the coarse correlation: the blocks are joined until there are no more.
const COARSE: usize = 4096;

/// The estimate, or `None` where all samples are needed.
pub(super) fn estimate(p: &Leg<'_>, n: &Leg<'_>, interval_s: f64, reference: &Reference) -> Option<SkewEstimate> {
    let usable = |value: f64| value.is_finite() && value > 0.0;
    let told = usable(interval_s) && reference.period_s.is_none_or(usable);
    let edged = matches!(reference.shape, Shape::Edges | Shape::Unknown);
    if !told || !edged || p.len() != n.len() || p.len() < LEAST_SAMPLES {
        return None;
    }
    let (means_p, means_n) = (p.block_means(0), n.block_means(0));
    let most = p.len() / (SHARE * 2 * HALF);
    let (edges_p, edges_n) = (edges::find(&means_p, most)?, edges::find(&means_n, most)?);
    let (coarse, seen) = coarse(&means_p, &means_n, interval_s, reference)?;
    let reach = 1.5 * BLOCK as f64 * join(means_p.len()) as f64;
    let matched = edges::matched(&edges_p, &edges_n, coarse, reach)?;
    let windows = Windows::cut(p, n, &matched)?;
    let start = windows.start()?;
    let settled = settle(&windows, start, interval_s, Shape::Edges).ok()?;
    let tau = settled.at.tau;
    if (tau - windows.whole as f64).abs() > 8.0 {
        return None;
    }
    let late: Vec<Edge> = edges_n.iter().map(|edge| Edge { at: edge.at - tau, ..*edge }).collect();
    let alternative = alternative_lag(tau, interval_s, reference, seen);
    let found = report(&settled, interval_s, alternative).ok()?;
    let blocks = levels::Blocks::new(p, n, windows.whole, &[&edges_p, &late]);
    if reference.shape == Shape::Unknown && blocks.share_a_signal(p, n)? {
        return None;
    }
    blocks.complete(found, &settled)
}

/// How many blocks are joined to one point of the coarse correlation.
fn join(blocks: usize) -> usize {
    blocks.div_ceil(COARSE).max(1)
}

/// The lag in samples from the joined block means, right to a point or so, and another that fits as well.
fn coarse(p: &[f64], n: &[f64], interval_s: f64, reference: &Reference) -> Option<(f64, Option<f64>)> {
    let many = join(p.len());
    let joined = |means: &[f64]| -> Vec<f64> {
        means.chunks_exact(many).map(|part| part.iter().sum::<f64>() / many as f64).collect()
    };
    let point = (BLOCK * many) as f64;
    let (at, other) = begin(&joined(p), &joined(n), interval_s * point, reference).ok()?;
    Some((at.tau * point, other.map(|lag| lag as f64 * point)))
}

/// The samples round the edges of both legs, joined.
struct Windows {
    /// Samples of the positive leg, [`HALF`] + [`PAD`] on either side of an edge, window by window.
    p: Vec<f64>,
    /// Samples of the negative leg, [`HALF`] on either side, `whole` samples later.
    n: Vec<f64>,
    whole: isize,
    joins: Vec<usize>,
}

impl Windows {
    fn cut(p: &Leg<'_>, n: &Leg<'_>, matched: &edges::Matched) -> Option<Self> {
        let mut windows = Self { p: Vec::new(), n: Vec::new(), whole: matched.lag, joins: Vec::new() };
        for centre in &matched.centres {
            let Some(from) = centre.checked_sub(HALF + PAD) else { continue };
            let of_p = p.window(from..centre + HALF + PAD);
            let Some(from) = (centre - HALF).checked_add_signed(matched.lag) else { continue };
            let of_n = n.window(from..from + 2 * HALF);
            // An edge too near an end of either record is left out.
            if let (Some(of_p), Some(of_n)) = (of_p, of_n) {
                windows.p.extend(of_p);
                windows.n.extend(of_n);
                windows.joins.push(windows.n.len());
            }
        }
        windows.joins.pop()?;
        let finite = windows.p.iter().chain(&windows.n).all(|x| x.is_finite());
        finite.then_some(windows)
    }

    fn start(&self) -> Option<Point> {
        let level = |x: &[f64]| x.iter().sum::<f64>() / x.len() as f64;
        let spread = |x: &[f64], level: f64| x.iter().map(|x| (x - level).powi(2)).sum::<f64>() / x.len() as f64;
        let (level_p, level_n) = (level(&self.p), level(&self.n));
        let gain = (spread(&self.n, level_n) / spread(&self.p, level_p)).sqrt();
        gain.is_finite().then_some(Point { tau: self.whole as f64, gain, offset: level_n - gain * level_p })
    }
}

impl Legs for Windows {
    fn at(&self, tau: f64) -> Result<View<'_>, SkewError> {
        let interpolator = Interpolator::new(self.whole as f64 - tau);
        let support = interpolator.support(2 * (HALF + PAD));
        let inside = PAD..PAD + 2 * HALF;
        if support.start > inside.start || support.end < inside.end {
            return Err(SkewError::NotSettled { steps: 0, skew_s: f64::NAN });
        }
        let needed = inside.start - support.start..inside.end + 2 * (HALF + PAD) - support.end;
        let mut p = Vec::with_capacity(self.n.len());
        for window in self.p.chunks_exact(2 * (HALF + PAD)) {
            p.extend(interpolator.apply(&window[needed.clone()]));
        }
        Ok(View { p, n: &self.n, noise_gain: interpolator.noise_gain(), range: 0..self.n.len() })
    }

    fn joins(&self) -> &[usize] {
        &self.joins
    }
}

#[cfg(test)]
mod tests;
