//! Gain and offset from the block means that hold no edge and the windows round the edges, and what they say about the
//! legs.

use super::super::super::Estimate;
use super::super::super::line::{deming, mean};
use super::super::fine::Settled;
use super::super::leg::{BLOCK, Leg};
use super::super::report::DIFFERENT;
use super::super::{SkewEstimate, Warning};
use super::HALF;
use super::edges::Edge;
use nalgebra::{Matrix2, Vector2};

/// Stretches between edges that are compared sample by sample, and blocks in each.
const STRETCHES: usize = 32;
const STRETCH: usize = 8;

/// Points of the regression: the blocks between two edges are joined until there are about as few, but one at least of
/// each stretch. Across an edge none are joined: a point that holds both levels tells little of the gain.
const POINTS: usize = 2048;

/// Standard deviations to which windows and blocks must agree for the windows to count: a difference of the legs that
/// dies away between the edges would pull the gain.
const AGREE: f64 = 3.0;

/// Block means of both legs at the same instants of the signal, apart from edges.
pub(super) struct Blocks {
    p: Vec<f64>,
    n: Vec<f64>,
    /// First sample of each block in the positive leg.
    at: Vec<usize>,
    whole: isize,
    /// Mean and variance of the positive leg's blocks, edges included, and the samples in all of these.
    level: f64,
    spread: f64,
    samples: f64,
}

impl Blocks {
    /// The blocks of `p` and, `whole` samples later, of `n`, that lie apart from all `edges` (times of `p`).
    pub(super) fn new(p: &Leg<'_>, n: &Leg<'_>, whole: isize, edges: &[&[Edge]]) -> Self {
        let from = (-whole).max(0).unsigned_abs();
        let (mut means_p, mut means_n) = (p.block_means(from), n.block_means(whole.max(0).unsigned_abs()));
        let count = means_p.len().min(means_n.len());
        means_p.truncate(count);
        means_n.truncate(count);
        let level = mean(&means_p);
        let spread = means_p.iter().map(|x| (x - level).powi(2)).sum::<f64>() / count as f64;
        let mut open = vec![true; count];
        for edge in edges.iter().copied().flatten() {
            let place = |samples: f64| ((edge.at + samples - from as f64) / BLOCK as f64).floor().max(0.0) as usize;
            let (start, end) = (place(-(HALF as f64)), place(HALF as f64) + 1);
            open[start.min(count)..end.min(count)].fill(false);
        }
        let keep = |means: &[f64]| means.iter().zip(&open).filter(|(_, open)| **open).map(|(x, _)| *x).collect();
        let at = (0..count).filter(|k| open[*k]).map(|k| from + k * BLOCK).collect();
        Self { p: keep(&means_p), n: keep(&means_n), at, whole, level, spread, samples: (count * BLOCK) as f64 }
    }

    /// Whether the legs have a signal in common between the edges, which the windows would miss.
    pub(super) fn share_a_signal(&self, p: &Leg<'_>, n: &Leg<'_>) -> Option<bool> {
        let length = STRETCH * BLOCK;
        let (mut cross, mut power_p, mut power_n, mut count) = (0.0, 0.0, 0.0, 0.0);
        let stride = (self.at.len() / STRETCHES).max(STRETCH);
        for part in self.at.windows(STRETCH).step_by(stride) {
            if part[STRETCH - 1] - part[0] != length - BLOCK {
                continue;
            }
            let of_p = p.window(part[0]..part[0] + length)?;
            let from = part[0].checked_add_signed(self.whole)?;
            let of_n = n.window(from..from + length)?;
            let (mean_p, mean_n) = (mean(&of_p), mean(&of_n));
            for (p, n) in of_p.iter().zip(&of_n) {
                cross += (p - mean_p) * (n - mean_n);
                power_p += (p - mean_p).powi(2);
                power_n += (n - mean_n).powi(2);
            }
            count += length as f64;
        }
        let correlation = cross / (power_p * power_n).sqrt();
        Some(count > 0.0 && correlation.abs() > 5.0 / count.sqrt() + 0.02)
    }

    /// The means of both legs over points of about `many` blocks, none across an edge.
    fn joined(&self, many: usize) -> (Vec<f64>, Vec<f64>) {
        let (mut p, mut n) = (Vec::new(), Vec::new());
        let mut from = 0;
        for stretch in self.at.chunk_by(|a, b| b - a == BLOCK) {
            let points = ((stretch.len() + many / 2) / many).max(1);
            for point in 0..points {
                // Sizes differ by one block at most.
                let part = from + point * stretch.len() / points..from + (point + 1) * stretch.len() / points;
                let mean = |means: &[f64]| means[part.clone()].iter().sum::<f64>() / part.len() as f64;
                p.push(mean(&self.p));
                n.push(mean(&self.n));
            }
            from += stretch.len();
        }
        (p, n)
    }

    /// `found` from the windows, with gain and offset from the blocks too. `None` where these are too few.
    pub(super) fn complete(&self, mut found: SkewEstimate, settled: &Settled<'_>) -> Option<SkewEstimate> {
        let (p, n) = self.joined(self.p.len().div_ceil(POINTS).max(1));
        let each = (p.len() as f64 / (BLOCK * self.p.len()) as f64).sqrt();
        let (noise_p, noise_n) = (found.noise_p_v, found.noise_n_v);
        let line = deming(&p, &n, noise_p * each, noise_n * each).ok()?;
        // Many blocks show their scatter better than the noise at the edges predicts it.
        let scale = line.residual;
        let blocks = Levels {
            value: Vector2::new(line.slope.value, line.intercept.value),
            covariance: Matrix2::new(line.slope.u.powi(2), line.covariance, line.covariance, line.intercept.u.powi(2))
                * scale.powi(2),
        };
        let windows = Levels::of(&found);
        let apart = (windows.value[0] - blocks.value[0]).abs();
        let doubt = (windows.covariance[(0, 0)] + blocks.covariance[(0, 0)]).sqrt();
        let (used, round) = ((self.p.len() * BLOCK) as f64, settled.view.n.len() as f64);
        let both = (apart <= AGREE * doubt).then(|| blocks.with(&windows)).flatten();
        let all = if both.is_some() { used + round } else { used };
        let levels = both.unwrap_or(blocks);
        let u = |i: usize| levels.covariance[(i, i)].sqrt();
        found.gain = Estimate { value: levels.value[0], u: u(0) };
        found.offset_v = Estimate { value: levels.value[1], u: u(1) };
        let covariance = levels.covariance[(0, 1)];
        found.covariance = [
            [found.skew_s.u.powi(2), 0.0, 0.0],
            [0.0, levels.covariance[(0, 0)], covariance],
            [0.0, covariance, levels.covariance[(1, 1)]],
        ];
        let share = (all / self.samples).min(1.0).sqrt();
        found.bound = [found.bound[0], u(0) * share, u(1) * share];
        found.samples = all as usize;
        found.level_v = self.level;
        found.signal_rms_v = (self.spread - noise_p.powi(2) / BLOCK as f64).max(0.0).sqrt();
        let expected2 = noise_n.powi(2) + (found.gain.value * noise_p).powi(2);
        let beyond = (line.residual.powi(2) - 1.0) * expected2 * each * each;
        let slow = apart > 6.0 * doubt;
        let known = found.warnings.iter().any(|warning| matches!(warning, Warning::ResponsesDiffer { .. }));
        if !known && (line.residual.powi(2) > DIFFERENT || slow) {
            // Round the edges another gain than between them: a difference that dies away slowly.
            let excess_v = beyond.max(0.0).sqrt().max(if slow { apart * found.signal_rms_v } else { 0.0 });
            found.warnings.push(Warning::ResponsesDiffer { excess_v });
        }
        Some(found)
    }
}

/// Gain and offset with their covariance.
struct Levels {
    value: Vector2<f64>,
    covariance: Matrix2<f64>,
}

impl Levels {
    fn of(found: &SkewEstimate) -> Self {
        let [_, [_, gg, go], [.., oo]] = found.covariance;
        Self { value: Vector2::new(found.gain.value, found.offset_v.value), covariance: Matrix2::new(gg, go, go, oo) }
    }

    /// Both, each by the inverse of its covariance; they come from different samples.
    fn with(&self, other: &Self) -> Option<Self> {
        let (own, others) = (self.covariance.try_inverse()?, other.covariance.try_inverse()?);
        let covariance = (own + others).try_inverse()?;
        let usable = covariance.iter().all(|x| x.is_finite()) && covariance[(0, 0)] > 0.0 && covariance[(1, 1)] > 0.0;
        usable.then(|| Self { value: covariance * (own * self.value + others * other.value), covariance })
    }
}
