//! Lowest and highest samples: of a stretch, and of every block of a signal.

use std::borrow::Cow;
use std::ops::Range;

use super::super::wide::widest;
use super::{BLOCK, Signal, blocks};

/// So many values side by side that the compiler keeps the loop over them and makes vectors of it, instead of unrolling
/// it into shuffles.
const LANES: usize = 32;

widest! {
    /// The lowest and the highest sample; samples that are not a number are passed over.
    pub(in crate::analysis) fn range_of(samples: &[f32]) -> (f32, f32) {
        range_within(samples)
    }
}

/// As [`range_of`], as a part of another kernel.
#[inline(always)]
pub(in crate::analysis) fn range_within(samples: &[f32]) -> (f32, f32) {
    let mut range = Extremes::default();
    let (chunks, rest) = samples.as_chunks::<LANES>();
    for chunk in chunks {
        range.take(chunk);
    }
    range.over(rest)
}

widest! {
    /// Lowest and highest difference, and lowest and highest common mode, of a stretch of difference and negative leg.
    pub(in crate::analysis) fn extremes_of(difference: &[f32], negative: &[f32]) -> [(f32, f32); 2] {
        let (mut of_difference, mut of_common) = (Extremes::default(), Extremes::default());
        let ((d, last_d), (n, last_n)) = (difference.as_chunks::<LANES>(), negative.as_chunks::<LANES>());
        let mut common = [0.0f32; LANES];
        for (d, n) in d.iter().zip(n) {
            of_difference.take(d);
            for k in 0..LANES {
                common[k] = n[k] + 0.5 * d[k];
            }
            of_common.take(&common);
        }
        common.iter_mut().zip(last_d).zip(last_n).for_each(|((common, d), n)| *common = n + 0.5 * d);
        [of_difference.over(last_d), of_common.over(&common[..last_d.len()])]
    }
}

/// Lowest and highest value in each lane.
struct Extremes {
    low: [f32; LANES],
    high: [f32; LANES],
}

impl Default for Extremes {
    #[inline(always)]
    fn default() -> Self {
        Self { low: [f32::INFINITY; LANES], high: [f32::NEG_INFINITY; LANES] }
    }
}

impl Extremes {
    #[inline(always)]
    fn take(&mut self, chunk: &[f32; LANES]) {
        for (low, x) in self.low.iter_mut().zip(chunk) {
            *low = if *x < *low { *x } else { *low };
        }
        for (high, x) in self.high.iter_mut().zip(chunk) {
            *high = if *x > *high { *x } else { *high };
        }
    }

    /// With the last samples, which are no whole chunk.
    #[inline(always)]
    fn over(mut self, rest: &[f32]) -> (f32, f32) {
        // Halved step by step: one value after the other would wait for itself.
        let mut width = LANES / 2;
        while width > 0 {
            for k in 0..width {
                self.low[k] = if self.low[k + width] < self.low[k] { self.low[k + width] } else { self.low[k] };
                self.high[k] = if self.high[k + width] > self.high[k] { self.high[k + width] } else { self.high[k] };
            }
            width /= 2;
        }
        rest.iter().fold((self.low[0], self.high[0]), |(low, high), x| (low.min(*x), high.max(*x)))
    }
}

/// Lowest and highest sample of every block of 256 samples of a signal: a block that stays on one side of a threshold
/// need not be looked into.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Outline {
    pub(in crate::analysis) blocks: Vec<(f32, f32)>,
}

impl Outline {
    /// The signal's own, or else made by reading it.
    pub(in crate::analysis) fn of<S: Signal + ?Sized>(signal: &S) -> Cow<'_, Self> {
        if let Some(known) = signal.outline() {
            return Cow::Borrowed(known);
        }
        let mut found = Self::with_capacity(signal.points());
        blocks(signal, 0..signal.points(), |_, part| found.push(range_of(part)));
        Cow::Owned(found)
    }

    /// Of a signal of so many samples, none of which is known yet.
    pub(in crate::analysis) fn with_capacity(points: usize) -> Self {
        Self { blocks: Vec::with_capacity(points.div_ceil(BLOCK)) }
    }

    /// Adds a block.
    pub(in crate::analysis) fn push(&mut self, range: (f32, f32)) {
        self.blocks.push(range);
    }

    /// Adds all blocks of another.
    pub(in crate::analysis) fn append(&mut self, mut other: Self) {
        self.blocks.append(&mut other.blocks);
    }

    /// The lowest and the highest sample of all; low above high without any.
    pub(in crate::analysis) fn range(&self) -> (f64, f64) {
        let (low, high) = self.within(0..self.blocks.len());
        (f64::from(low), f64::from(high))
    }

    /// The lowest and the highest sample of some blocks.
    pub(in crate::analysis) fn within(&self, blocks: Range<usize>) -> (f32, f32) {
        self.blocks[blocks]
            .iter()
            .fold((f32::INFINITY, f32::NEG_INFINITY), |(low, high), block| (low.min(block.0), high.max(block.1)))
    }
}
