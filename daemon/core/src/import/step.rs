//! The converter's step, read from the values themselves.
//!
//! A converter of b bits gives at most 2^b different values, all whole steps apart. The smallest gap between different
//! values is the step as soon as two neighbouring codes occur, which noise sees to. Text has its own rounding, so gaps
//! are only nearly multiples.

/// How many samples are looked at, spread over the record.
const LOOKED_AT: usize = 50_000;

/// More different values than this are no converter's codes but averages, or numbers that were computed.
const MOST_CODES: usize = 1 << 14;

/// How far a gap may be from a whole number of steps, in steps.
const TOLERANCE: f64 = 0.2;

/// The step of a record in its own unit; `None` where the values do not lie on a grid.
pub(super) fn of(values: &[f64]) -> Option<f64> {
    let stride = values.len().div_ceil(LOOKED_AT).max(1);
    let mut sorted: Vec<f64> = values.iter().step_by(stride).copied().filter(|v| v.is_finite()).collect();
    sorted.sort_by(f64::total_cmp);
    let samples = sorted.len();
    let range = sorted.last()? - sorted.first()?;
    // Digits below a double's (or a stored single's) precision are no gaps.
    let size = sorted.last()?.abs().max(sorted.first()?.abs());
    let least = (range * 1e-6).max(size * 1e-7);
    sorted.dedup_by(|a, b| (*a - *b).abs() <= least);
    if sorted.len() < 3 || sorted.len() > MOST_CODES || sorted.len() * 2 > samples {
        return None;
    }
    let gaps: Vec<f64> = sorted.windows(2).map(|pair| pair[1] - pair[0]).collect();
    let smallest = gaps.iter().copied().fold(f64::INFINITY, f64::min);
    // Rounding may make one gap smaller than the step: the mean of the gaps that are about one step is better.
    let single: Vec<f64> = gaps.iter().copied().filter(|gap| *gap < 1.5 * smallest).collect();
    let step = single.iter().sum::<f64>() / single.len() as f64;
    let count = |gap: f64| (gap / step).round().max(1.0);
    let fits = gaps.iter().filter(|&&gap| (gap / step - count(gap)).abs() < TOLERANCE).count();
    if fits * 20 < gaps.len() * 19 {
        return None;
    }
    // Over many codes the rounding of the text averages out.
    let (total, steps) = gaps
        .iter()
        .filter(|gap| **gap < 64.0 * step)
        .fold((0.0, 0.0), |(total, steps), &gap| (total + gap, steps + count(gap)));
    (steps > 0.0).then(|| total / steps)
}

/// How many samples stand at exactly the highest and the lowest value, where these are suspiciously many: more than
/// eight, and more than three times as many as one step further in. Clipping does that, and so does a level whose noise
/// stays below the converter's step.
pub(super) fn crowded(values: &[f64], step: f64) -> Option<usize> {
    let (low, high) =
        values.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), &v| (low.min(v), high.max(v)));
    let (mut ends, mut next) = ([0_usize; 2], [0_usize; 2]);
    for value in values {
        for (i, distance) in [value - low, high - value].into_iter().enumerate() {
            let codes = (distance / step).round();
            ends[i] += usize::from(codes < 0.5);
            next[i] += usize::from(codes > 0.5 && codes < 1.5);
        }
    }
    let count: usize = (0..2).filter(|&i| ends[i] > 8 && ends[i] > 3 * next[i]).map(|i| ends[i]).sum();
    (count > 0).then_some(count)
}
