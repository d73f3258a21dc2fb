//! A waveform to be read from: samples held in memory, or computed on the way from others, so that a record of ten
//! million samples needs no second copy for each thing that is asked of it.

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
    range: std::ops::Range<usize>,
    mut visit: impl FnMut(usize, &[f32]),
) {
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
    const LANES: usize = 4;
    let (mut sums, mut squares) = ([0.0f64; LANES], [0.0f64; LANES]);
    blocks(signal, 0..signal.points(), |_, part| {
        let (chunks, rest) = part.as_chunks::<LANES>();
        for chunk in chunks {
            for k in 0..LANES {
                let x = f64::from(chunk[k]);
                sums[k] += x;
                squares[k] += x * x;
            }
        }
        for &x in rest {
            sums[0] += f64::from(x);
            squares[0] += f64::from(x) * f64::from(x);
        }
    });
    let n = signal.points().max(1) as f64;
    (sums.iter().sum::<f64>() / n, squares.iter().sum::<f64>() / n)
}

/// The lowest and the highest sample; samples that are not a number are passed over.
pub(super) fn range_of(samples: &[f32]) -> (f32, f32) {
    // So many that the compiler keeps the loop over them and makes vectors of it, instead of unrolling it into shuffles.
    const LANES: usize = 64;
    let (mut low, mut high) = ([f32::INFINITY; LANES], [f32::NEG_INFINITY; LANES]);
    let (chunks, rest) = samples.as_chunks::<LANES>();
    for chunk in chunks {
        for (low, x) in low.iter_mut().zip(chunk) {
            *low = if *x < *low { *x } else { *low };
        }
        for (high, x) in high.iter_mut().zip(chunk) {
            *high = if *x > *high { *x } else { *high };
        }
    }
    let least = low.iter().chain(rest).fold(f32::INFINITY, |a, b| a.min(*b));
    (least, high.iter().chain(rest).fold(f32::NEG_INFINITY, |a, b| a.max(*b)))
}

/// Lowest and highest sample of every [`BLOCK`] of a signal: a block that stays on one side of a threshold need not be
/// looked into.
pub(super) struct Outline {
    pub(super) blocks: Vec<(f32, f32)>,
    pub(super) low: f64,
    pub(super) high: f64,
}

impl Outline {
    pub(super) fn of<S: Signal + ?Sized>(signal: &S) -> Self {
        let mut found = Vec::with_capacity(signal.points().div_ceil(BLOCK));
        blocks(signal, 0..signal.points(), |_, part| found.push(range_of(part)));
        let low = found.iter().fold(f32::INFINITY, |low, block| low.min(block.0));
        let high = found.iter().fold(f32::NEG_INFINITY, |high, block| high.max(block.1));
        Self { blocks: found, low: f64::from(low), high: f64::from(high) }
    }
}

#[cfg(test)]
mod tests;
