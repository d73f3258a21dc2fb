//! A waveform to be read from: samples held in memory, or computed on the way from others, so that a record of ten
//! million samples needs no second copy for each thing that is asked of it.

use std::borrow::Cow;
use std::ops::Range;

use super::wide::widest;

/// Samples between which [`Outline`] remembers the lowest and the highest.
pub(super) const BLOCK: usize = 256;

/// A waveform of evenly spaced samples.
pub trait Signal {
    /// How many samples there are.
    fn points(&self) -> usize;

    /// One sample.
    fn at(&self, index: usize) -> f64;

    /// The samples from `from` on, as many as `out` holds, in single precision: for searching and for sums whose
    /// terms carry noise far above 2⁻²⁴ of the value. The caller stays within [`Signal::points`].
    fn load(&self, from: usize, out: &mut [f32]);

    /// The samples themselves, where they are held in single precision.
    fn samples(&self) -> Option<&[f32]> {
        None
    }

    /// Lowest and highest sample of every block, where they are known already.
    fn outline(&self) -> Option<&Outline> {
        None
    }
}

impl Signal for [f32] {
    fn points(&self) -> usize {
        self.len()
    }

    fn at(&self, index: usize) -> f64 {
        f64::from(self[index])
    }

    fn load(&self, from: usize, out: &mut [f32]) {
        out.copy_from_slice(&self[from..from + out.len()]);
    }

    fn samples(&self) -> Option<&[f32]> {
        Some(self)
    }
}

impl Signal for [f64] {
    fn points(&self) -> usize {
        self.len()
    }

    fn at(&self, index: usize) -> f64 {
        self[index]
    }

    fn load(&self, from: usize, out: &mut [f32]) {
        let points = out.len();
        for (out, value) in out.iter_mut().zip(&self[from..from + points]) {
            *out = *value as f32;
        }
    }
}

impl<T> Signal for Vec<T>
where
    [T]: Signal,
{
    fn points(&self) -> usize {
        self.len()
    }

    fn at(&self, index: usize) -> f64 {
        self.as_slice().at(index)
    }

    fn load(&self, from: usize, out: &mut [f32]) {
        self.as_slice().load(from, out);
    }

    fn samples(&self) -> Option<&[f32]> {
        self.as_slice().samples()
    }
}

impl<T, const N: usize> Signal for [T; N]
where
    [T]: Signal,
{
    fn points(&self) -> usize {
        N
    }

    fn at(&self, index: usize) -> f64 {
        self.as_slice().at(index)
    }

    fn load(&self, from: usize, out: &mut [f32]) {
        self.as_slice().load(from, out);
    }

    fn samples(&self) -> Option<&[f32]> {
        self.as_slice().samples()
    }
}

impl<S: Signal + ?Sized> Signal for &S {
    fn points(&self) -> usize {
        (**self).points()
    }

    fn at(&self, index: usize) -> f64 {
        (**self).at(index)
    }

    fn load(&self, from: usize, out: &mut [f32]) {
        (**self).load(from, out);
    }

    fn samples(&self) -> Option<&[f32]> {
        (**self).samples()
    }

    fn outline(&self) -> Option<&Outline> {
        (**self).outline()
    }
}

/// Another waveform that is added to a first one in some proportion.
pub(super) struct Moved<'a, S: ?Sized, D: ?Sized> {
    pub(super) signal: &'a S,
    pub(super) along: &'a D,
    pub(super) step: f64,
}

impl<S: Signal + ?Sized, D: Signal + ?Sized> Signal for Moved<'_, S, D> {
    fn points(&self) -> usize {
        self.signal.points()
    }

    fn at(&self, index: usize) -> f64 {
        self.along.at(index).mul_add(self.step, self.signal.at(index))
    }

    fn load(&self, from: usize, out: &mut [f32]) {
        self.signal.load(from, out);
        let step = self.step as f32;
        let mut along = [0.0; BLOCK];
        for (i, out) in out.chunks_mut(BLOCK).enumerate() {
            let along = &mut along[..out.len()];
            self.along.load(from + i * BLOCK, along);
            out.iter_mut().zip(along).for_each(|(out, along)| *out += step * *along);
        }
    }
}

/// Calls `visit` with every stretch of a range of a signal, in order: index of its first sample, and the samples, at
/// most [`BLOCK`].
pub(super) fn blocks<S: Signal + ?Sized>(
    signal: &S,
    range: Range<usize>,
    mut visit: impl FnMut(usize, &[f32]),
) {
    if let Some(samples) = signal.samples() {
        let mut from = range.start;
        for part in samples[range].chunks(BLOCK) {
            visit(from, part);
            from += part.len();
        }
        return;
    }
    let mut buffer = [0.0; BLOCK];
    let mut from = range.start;
    while from < range.end {
        let part = &mut buffer[..BLOCK.min(range.end - from)];
        signal.load(from, part);
        visit(from, part);
        from += part.len();
    }
}

/// The mean and the mean square of a signal; zero without samples.
pub(super) fn mean_and_square<S: Signal + ?Sized>(signal: &S) -> (f64, f64) {
    let (mut sum, mut square) = (0.0, 0.0);
    blocks(signal, 0..signal.points(), |_, part| {
        let (s, q) = sum_and_square(part);
        sum += s;
        square += q;
    });
    let n = signal.points().max(1) as f64;
    (sum / n, square / n)
}

widest! {
    fn sum_and_square(part: &[f32]) -> (f64, f64) {
        const LANES: usize = 16;
        let (mut sums, mut squares) = ([0.0f64; LANES], [0.0f64; LANES]);
        let (chunks, rest) = part.as_chunks::<LANES>();
        for chunk in chunks {
            for k in 0..LANES {
                let x = f64::from(chunk[k]);
                sums[k] += x;
                squares[k] += x * x;
            }
        }
        for (k, &x) in rest.iter().enumerate() {
            sums[k] += f64::from(x);
            squares[k] += f64::from(x) * f64::from(x);
        }
        (sums.iter().sum(), squares.iter().sum())
    }
}

/// So many values side by side that the compiler keeps the loop over them and makes vectors of it, instead of unrolling
/// it into shuffles.
const LANES: usize = 64;

widest! {
    /// The lowest and the highest sample; samples that are not a number are passed over.
    pub(super) fn range_of(samples: &[f32]) -> (f32, f32) {
        let mut range = Extremes::default();
        let (chunks, rest) = samples.as_chunks::<LANES>();
        chunks.iter().for_each(|chunk| range.take(chunk));
        range.over(rest)
    }
}

widest! {
    /// Lowest and highest difference, and lowest and highest common mode, of a stretch of difference and negative leg.
    pub(super) fn extremes_of(difference: &[f32], negative: &[f32]) -> [(f32, f32); 2] {
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
    pub(super) blocks: Vec<(f32, f32)>,
}

impl Outline {
    /// The signal's own, or else made by reading it.
    pub(super) fn of<S: Signal + ?Sized>(signal: &S) -> Cow<'_, Self> {
        if let Some(known) = signal.outline() {
            return Cow::Borrowed(known);
        }
        let mut found = Self::with_capacity(signal.points());
        blocks(signal, 0..signal.points(), |_, part| found.push(range_of(part)));
        Cow::Owned(found)
    }

    /// Of a signal of so many samples, none of which is known yet.
    pub(super) fn with_capacity(points: usize) -> Self {
        Self { blocks: Vec::with_capacity(points.div_ceil(BLOCK)) }
    }

    /// Adds a block.
    pub(super) fn push(&mut self, range: (f32, f32)) {
        self.blocks.push(range);
    }

    /// Adds all blocks of another.
    pub(super) fn append(&mut self, mut other: Self) {
        self.blocks.append(&mut other.blocks);
    }

    /// The lowest and the highest sample of all; low above high without any.
    pub(super) fn range(&self) -> (f64, f64) {
        let (low, high) = self.within(0..self.blocks.len());
        (f64::from(low), f64::from(high))
    }

    /// The lowest and the highest sample of some blocks.
    pub(super) fn within(&self, blocks: Range<usize>) -> (f32, f32) {
        self.blocks[blocks]
            .iter()
            .fold((f32::INFINITY, f32::NEG_INFINITY), |(low, high), block| (low.min(block.0), high.max(block.1)))
    }
}

#[cfg(test)]
mod tests;
