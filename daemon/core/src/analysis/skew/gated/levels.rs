//! Gain and offset from the block means that hold no edge, and what they say about the legs.

use super::super::super::Estimate;
use super::super::super::line::{deming, mean};
use super::super::fine::Settled;
use super::super::leg::{BLOCK, Leg};
use super::super::report::DIFFERENT;
use super::super::{SkewEstimate, Warning};
use super::HALF;
use super::edges::Edge;

/// Stretches between edges that are compared sample by sample, and blocks in each.
const STRETCHES: usize = 32;
const STRETCH: usize = 8;

/// Points of the regression: the blocks are joined until there are no more. A few then hold both levels, no harm done.
const POINTS: usize = 2048;

/// Block means of both legs at the same instants of the signal, apart from edges.
pub(super) struct Blocks {
    p: Vec<f64>,
    n: Vec<f64>,
    /// First sample of each block in the positive leg.
    at: Vec<usize>,
    whole: isize,
    /// Mean and variance of the positive leg's blocks, edges included.
    level: f64,
    spread: f64,
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
        Self { p: keep(&means_p), n: keep(&means_n), at, whole, level, spread }
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

    /// `found` from the windows, with gain and offset from the blocks. `None` where these are too few.
    pub(super) fn complete(&self, mut found: SkewEstimate, settled: &Settled<'_>) -> Option<SkewEstimate> {
        let many = self.p.len().div_ceil(POINTS).max(1);
        let joined = |means: &[f64]| -> Vec<f64> {
            means.chunks_exact(many).map(|part| part.iter().sum::<f64>() / many as f64).collect()
        };
        let each = 1.0 / ((BLOCK * many) as f64).sqrt();
        let (noise_p, noise_n) = (found.noise_p_v, found.noise_n_v);
        let line = deming(&joined(&self.p), &joined(&self.n), noise_p * each, noise_n * each).ok()?;
        // Many blocks show their scatter better than the noise at the edges predicts it.
        let scale = line.residual;
        let windows = found.gain;
        found.gain = Estimate { value: line.slope.value, u: line.slope.u * scale };
        found.offset_v = Estimate { value: line.intercept.value, u: line.intercept.u * scale };
        let covariance = line.covariance * scale * scale;
        let (skew, gain, offset) = (found.skew_s.u, found.gain.u, found.offset_v.u);
        found.covariance =
            [[skew * skew, 0.0, 0.0], [0.0, gain * gain, covariance], [0.0, covariance, offset * offset]];
        let used = (self.p.len() * BLOCK) as f64;
        let all = used + settled.view.n.len() as f64;
        let share = (used / all).min(1.0).sqrt();
        found.bound = [found.bound[0], gain * share, offset * share];
        found.samples = all as usize;
        found.level_v = self.level;
        found.signal_rms_v = (self.spread - noise_p.powi(2) / BLOCK as f64).max(0.0).sqrt();
        let expected2 = noise_n.powi(2) + (found.gain.value * noise_p).powi(2);
        let beyond = (line.residual.powi(2) - 1.0) * expected2 * each * each;
        let apart = (windows.value - found.gain.value).abs();
        let slow = apart > 6.0 * windows.u.hypot(found.gain.u);
        let known = found.warnings.iter().any(|warning| matches!(warning, Warning::ResponsesDiffer { .. }));
        if !known && (line.residual.powi(2) > DIFFERENT || slow) {
            // Round the edges another gain than between them: a difference that dies away slowly.
            let excess_v = beyond.max(0.0).sqrt().max(if slow { apart * found.signal_rms_v } else { 0.0 });
            found.warnings.push(Warning::ResponsesDiffer { excess_v });
        }
        Some(found)
    }
}
