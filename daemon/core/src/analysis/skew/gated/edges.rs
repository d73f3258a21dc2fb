//! Edges in block means: where they are, and which of one leg belongs to which of the other.

use super::super::leg::BLOCK;
use super::HALF;

/// Standard deviations of the noise by which the step from block to block must stand out.
const CLEAR: f64 = 8.0;
/// The least step from block to block that counts, as a share of the largest.
const LEAST_STEP: f64 = 0.05;
/// Blocks over which an edge may go: a slower one does not fit its window.
const LONGEST: usize = 4;
/// The median size of normal noise, in standard deviations.
const MEDIAN: f64 = 0.6745;

/// One edge.
#[derive(Debug, Clone, Copy)]
pub(super) struct Edge {
    /// Its centroid, in samples.
    pub(super) at: f64,
    /// Its height in volts, positive when rising.
    pub(super) height: f64,
}

/// The edges in the block means of a record, in order of time; `None` if there are none, more than `most`, or such as
/// the windows are not made for.
pub(super) fn find(means: &[f64], most: usize) -> Option<Vec<Edge>> {
    let steps: Vec<f64> = means.windows(2).map(|pair| pair[1] - pair[0]).collect();
    let mut sizes: Vec<f64> = steps.iter().map(|step| step.abs()).collect();
    let largest = sizes.iter().fold(0.0, |top: f64, size| top.max(*size));
    let middle = sizes.len() / 2;
    let noise = *sizes.select_nth_unstable_by(middle, f64::total_cmp).1 / MEDIAN;
    let least = (CLEAR * noise).max(LEAST_STEP * largest);
    if !(largest.is_finite() && least > 0.0 && steps.iter().all(|step| step.is_finite())) {
        return None;
    }
    let mut edges = Vec::new();
    let mut k = 0;
    while k < steps.len() {
        if steps[k].abs() < least {
            k += 1;
            continue;
        }
        let run = steps[k..].iter().take_while(|step| step.abs() >= least).count();
        // A block that the edge only touches holds a part of it that may not stand out.
        let part = k.saturating_sub(1)..(k + run + 1).min(steps.len());
        let height: f64 = steps[part.clone()].iter().sum();
        let moment: f64 = part.map(|i| steps[i] * ((i + 1) * BLOCK) as f64).sum();
        let both_ways: f64 = steps[k..k + run].iter().map(|step| step.abs()).sum();
        edges.push(Edge { at: moment / height, height });
        if run > LONGEST || height.abs() < both_ways / 2.0 || edges.len() > most {
            return None;
        }
        k += run;
    }
    let apart = (2 * HALF + BLOCK) as f64;
    let separate = edges.windows(2).all(|pair| pair[1].at - pair[0].at >= apart);
    (!edges.is_empty() && separate).then_some(edges)
}

/// Edges that both legs show.
pub(super) struct Matched {
    /// The nearest whole samples to the positive leg's edges.
    pub(super) centres: Vec<usize>,
    /// The negative leg's lag in whole samples.
    pub(super) lag: isize,
}

/// Pairs the edges of the legs near the lag `coarse` (samples), which is right to `reach`. `None` if they do not
/// agree about the lag.
pub(super) fn matched(p: &[Edge], n: &[Edge], coarse: f64, reach: f64) -> Option<Matched> {
    let partner = |edge: &Edge, lag: f64, reach: f64| {
        let wanted = edge.at + lag;
        let next = n.partition_point(|other| other.at < wanted);
        let near = [next.checked_sub(1), Some(next)].into_iter().flatten().filter_map(|i| n.get(i));
        near.filter(|other| other.height * edge.height > 0.0)
            .map(|other| other.at - edge.at)
            .filter(|found| (found - lag).abs() <= reach)
            .min_by(|a, b| (a - lag).abs().total_cmp(&(b - lag).abs()))
    };
    let mut lags: Vec<f64> = p.iter().filter_map(|edge| partner(edge, coarse, reach)).collect();
    if lags.is_empty() {
        return None;
    }
    let middle = lags.len() / 2;
    let lag = *lags.select_nth_unstable_by(middle, f64::total_cmp).1;
    let agree = |edge: &&Edge| partner(edge, lag, BLOCK as f64 / 4.0).is_some();
    let kept: Vec<&Edge> = p.iter().filter(agree).collect();
    // Edges beyond the ends of the other record have no partner; most must have one.
    if 5 * kept.len() < 4 * p.len().min(n.len()) {
        return None;
    }
    let centres = kept.iter().map(|edge| edge.at.round().max(0.0) as usize).collect();
    Some(Matched { centres, lag: lag.round() as isize })
}
