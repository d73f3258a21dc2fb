//! The one pass over both records: codes → fractional delay → volts → difference, with sums and outlines on the way.
//!
//! In single precision: codes are exact in it, and 44 terms of the interpolation leave a rounding of at most 4·10⁻⁷ of
//! the signal (−128 dB, measured), below the interpolation's own −120 dB. Samples that are numbers are taken relative to
//! the first one, so that a large constant costs no digits. Written in chunks that stay in the first-level cache and in
//! arrays of fixed length that the compiler turns into vector instructions.
//!
//! Every chunk is computed from the records alone, and sums are added up section by section: the result has the same
//! bits with one thread and with two.

use std::num::NonZeroUsize;
use std::ops::Range;

use super::super::interpolate::Interpolator;
use super::super::signal::{BLOCK, Outline, extremes_of};
use super::super::wide::widest;
use super::super::{Record, Samples};
use super::sums::{LEAD, REACH, Sums};
use super::wave::Wave;

/// Output samples per chunk: whole blocks of the outlines.
const CHUNK: usize = 4 * BLOCK;

/// Chunks whose sums are added up before they join the others'.
const SECTION: usize = 64 * CHUNK;

/// Output samples that are computed side by side: 48 single-precision sums stay in registers, and are enough of them to
/// keep every adder busy.
const WIDE: usize = 48;

/// A chunk and its neighbours, in whole steps of [`WIDE`].
const PADDED: usize = (CHUNK + LEAD + REACH).next_multiple_of(WIDE);

/// Records from this length on are worth a second thread: starting it takes about a tenth of a millisecond.
const LONG: usize = 500_000;

/// What the pass leaves behind.
#[derive(Default)]
pub(super) struct Pass {
    pub(super) difference_v: Wave,
    pub(super) negative_v: Wave,
    pub(super) sums: Sums,
    pub(super) outlines: [Outline; 2],
}

/// What to compute of a pair.
pub(super) struct Task<'a> {
    pub(super) p: &'a Record,
    pub(super) n: &'a Record,
    pub(super) interpolator: &'a Interpolator,
    pub(super) gain: f64,
    pub(super) offset_v: f64,
    /// Whether the sums are wanted.
    pub(super) summed: bool,
    /// The outputs for which every tap has a sample.
    pub(super) valid: Range<usize>,
}

/// Carries out the correction for the valid outputs; `n` becomes `(volts(n) − offset)/gain` at `i + advance`.
pub(super) fn pass(task: &Task<'_>) -> Pass {
    let points = task.valid.len();
    let processors = std::thread::available_parallelism().map_or(1, NonZeroUsize::get);
    pass_by(task, if points >= LONG { processors.min(2) } else { 1 })
}

/// As [`pass`], with one or two threads.
pub(super) fn pass_by(task: &Task<'_>, threads: usize) -> Pass {
    let points = task.valid.len();
    let sections = points.div_ceil(SECTION);
    let half = if threads > 1 { (sections.div_ceil(2) * SECTION).min(points) } else { points };
    let mut found = Pass::with_capacity(points);
    let mut parts = Vec::with_capacity(sections);
    if half < points {
        let (mut rest, mut others) = (Pass::with_capacity(points - half), Vec::new());
        std::thread::scope(|scope| {
            scope.spawn(|| some(task, half..points, &mut rest, &mut others));
            some(task, 0..half, &mut found, &mut parts);
        });
        found.difference_v.extend(&rest.difference_v);
        found.negative_v.extend(&rest.negative_v);
        for (outline, rest) in found.outlines.iter_mut().zip(rest.outlines) {
            outline.append(rest);
        }
        parts.append(&mut others);
    } else {
        some(task, 0..points, &mut found, &mut parts);
    }
    parts.iter().for_each(|part| found.sums.add(part));
    found
}

impl Pass {
    fn with_capacity(points: usize) -> Self {
        Self {
            difference_v: Wave::with_capacity(points),
            negative_v: Wave::with_capacity(points),
            sums: Sums::default(),
            outlines: [(); 2].map(|()| Outline::with_capacity(points)),
        }
    }
}

/// Appends some of the valid outputs, from a section's first on, and each section's sums.
fn some(task: &Task<'_>, range: Range<usize>, found: &mut Pass, parts: &mut Vec<Sums>) {
    let mut chunk = Chunk::new(task);
    let mut from = range.start;
    while from < range.end {
        let end = (from + SECTION).min(range.end);
        let mut sums = Sums::default();
        while from < end {
            let count = CHUNK.min(end - from);
            chunk.compute(task, from, count, &mut sums);
            let own = chunk.before..chunk.before + count;
            found.difference_v.extend(&chunk.difference[own.clone()]);
            found.negative_v.extend(&chunk.negative[own]);
            for block in 0..count.div_ceil(BLOCK) {
                found.outlines.iter_mut().zip(chunk.extremes[block]).for_each(|(outline, both)| outline.push(both));
            }
            from += count;
        }
        parts.push(sums);
    }
}

/// Buffers for a chunk, and what is the same for all chunks.
struct Chunk {
    taps: Vec<f32>,
    first: isize,
    pivot: f32,
    scale: f32,
    zero: f32,
    input: Vec<f32>,
    difference: [f32; PADDED],
    negative: [f32; PADDED],
    /// How many samples before the chunk's own ones there are in both.
    before: usize,
    /// Lowest and highest difference and common mode per block.
    extremes: [[(f32, f32); 2]; CHUNK / BLOCK],
}

impl Chunk {
    fn new(task: &Task<'_>) -> Self {
        let n = task.n;
        let (taps, first) = task.interpolator.kernel();
        let pivot = first_sample(&n.samples);
        let zero = (f64::from(pivot).mul_add(n.volts_per_code, n.zero_v) - task.offset_v) / task.gain;
        Self {
            taps: taps.iter().map(|tap| *tap as f32).collect(),
            first,
            pivot,
            scale: (n.volts_per_code / task.gain) as f32,
            zero: zero as f32,
            input: vec![0.0; PADDED + taps.len()],
            difference: [0.0; PADDED],
            negative: [0.0; PADDED],
            before: 0,
            extremes: [[(0.0, 0.0); 2]; CHUNK / BLOCK],
        }
    }

    /// The outputs from the valid ones' `from`th on, and their sums. The slope needs neighbours, which are computed again
    /// in the next chunk.
    fn compute(&mut self, task: &Task<'_>, from: usize, count: usize, sums: &mut Sums) {
        let points = task.valid.len();
        self.before = from.min(LEAD);
        let after = (points - from - count).min(REACH);
        let whole = self.before + count + after;
        let place = task.valid.start + from - self.before;
        let needed = whole + self.taps.len() - 1;
        load(&task.n.samples, place.wrapping_add_signed(self.first), self.pivot, &mut self.input[..needed]);
        self.input[needed..].fill(0.0);
        convolve(&self.input, &self.taps, &mut self.negative[..whole.next_multiple_of(WIDE)]);
        load_volts(task.p, place, &mut self.difference[..whole]);
        subtract(&mut self.difference[..whole], &mut self.negative[..whole], self.scale, self.zero);
        let own = self.before..self.before + count;
        if task.summed {
            sums.extend(&self.difference[..whole], &self.negative[..whole], own.clone());
        }
        for (block, from) in own.clone().step_by(BLOCK).enumerate() {
            let part = from..(from + BLOCK).min(own.end);
            self.extremes[block] = extremes_of(&self.difference[part.clone()], &self.negative[part]);
        }
    }
}

widest! {
    /// `y[i] = Σ h[k]·x[i + k]` for every `y`, whose length is a multiple of [`WIDE`].
    fn convolve(x: &[f32], h: &[f32], y: &mut [f32]) {
        for (block, y) in y.chunks_exact_mut(WIDE).enumerate() {
            let x = &x[block * WIDE..];
            let mut sums = [0.0f32; WIDE];
            for (k, &h) in h.iter().enumerate() {
                let Some(x) = x[k..].first_chunk::<WIDE>() else { continue };
                for j in 0..WIDE {
                    sums[j] += h * x[j];
                }
            }
            y.copy_from_slice(&sums);
        }
    }
}

widest! {
    /// Brings the negative leg to volts, and takes it from the positive one.
    fn subtract(positive: &mut [f32], negative: &mut [f32], scale: f32, zero: f32) {
        for (p, n) in positive.iter_mut().zip(negative) {
            *n = *n * scale + zero;
            *p -= *n;
        }
    }
}

fn first_sample(samples: &Samples) -> f32 {
    match samples {
        Samples::Codes(_) => 0.0,
        Samples::Numbers(numbers) => numbers.first().copied().filter(|x| x.is_finite()).unwrap_or(0.0),
    }
}

/// Samples less `pivot`.
fn load(samples: &Samples, from: usize, pivot: f32, out: &mut [f32]) {
    let count = out.len();
    match samples {
        Samples::Codes(codes) => convert(&codes[from..from + count], 1.0, 0.0, out),
        Samples::Numbers(numbers) => {
            out.iter_mut().zip(&numbers[from..from + count]).for_each(|(out, number)| *out = number - pivot);
        }
    }
}

/// Samples in volts, in single precision.
pub(super) fn load_volts(record: &Record, from: usize, out: &mut [f32]) {
    let pivot = first_sample(&record.samples);
    let scale = record.volts_per_code as f32;
    let zero = f64::from(pivot).mul_add(record.volts_per_code, record.zero_v) as f32;
    match &record.samples {
        Samples::Codes(codes) => convert(&codes[from..from + out.len()], scale, zero, out),
        Samples::Numbers(_) => {
            load(&record.samples, from, pivot, out);
            out.iter_mut().for_each(|x| *x = *x * scale + zero);
        }
    }
}

widest! {
    fn convert(codes: &[i16], scale: f32, zero: f32, out: &mut [f32]) {
        out.iter_mut().zip(codes).for_each(|(out, code)| *out = f32::from(*code) * scale + zero);
    }
}
