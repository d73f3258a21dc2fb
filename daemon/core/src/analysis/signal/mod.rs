//! A waveform to be read from: samples held in memory, or computed on the way from others, so that a record of ten
//! million samples needs no second copy for each thing that is asked of it.

use std::ops::Range;

use super::wide::widest;

mod outline;

pub use outline::Outline;
pub(super) use outline::{extremes_of, range_of, range_within};

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

    /// Mean and mean square, where they are known already.
    fn means(&self) -> Option<(f64, f64)> {
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

    fn means(&self) -> Option<(f64, f64)> {
        (**self).means()
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
pub(super) fn blocks<S: Signal + ?Sized>(signal: &S, range: Range<usize>, mut visit: impl FnMut(usize, &[f32])) {
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
    if let Some(known) = signal.means() {
        return known;
    }
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
    /// The sum of some samples and of their squares.
    pub(super) fn sum_and_square(part: &[f32]) -> (f64, f64) {
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

#[cfg(test)]
mod tests;
