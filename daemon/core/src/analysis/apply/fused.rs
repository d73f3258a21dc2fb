//! The one pass over both records: codes → fractional delay → volts → difference, with the sums on the way.
//!
//! In single precision: codes are exact in it, and 44 terms of the interpolation leave a rounding of at most 4·10⁻⁷ of
//! the signal (−128 dB, measured), below the interpolation's own −120 dB. Samples that are numbers are taken relative to the first
//! one, so that a large constant costs no digits. Written in chunks that stay in the first-level cache and in arrays of
//! fixed length that the compiler turns into vector instructions.

use super::super::interpolate::Interpolator;
use super::super::{Record, Samples};
use super::sums::Sums;

/// Output samples per chunk.
const CHUNK: usize = 1024;

/// Output samples that are computed side by side: 32 single-precision sums stay in registers.
const WIDE: usize = 32;

/// What the pass leaves behind.
pub(super) struct Pass {
    pub(super) difference_v: Vec<f32>,
    pub(super) negative_v: Vec<f32>,
    pub(super) sums: Sums,
}

/// Carries out the correction for the outputs `valid`; `n` becomes `(volts(n) − offset)/gain` at `i + advance`.
pub(super) fn pass(
    p: &Record,
    n: &Record,
    interpolator: &Interpolator,
    valid: std::ops::Range<usize>,
    (gain, offset_v): (f64, f64),
) -> Pass {
    let (taps, first) = interpolator.kernel();
    let kernel: Vec<f32> = taps.iter().map(|tap| *tap as f32).collect();
    let pivot = first_sample(&n.samples);
    let scale = n.volts_per_code / gain;
    let zero = (f64::from(pivot).mul_add(n.volts_per_code, n.zero_v) - offset_v) / gain;
    let points = valid.len();
    let mut found = Pass {
        difference_v: Vec::with_capacity(points),
        negative_v: Vec::with_capacity(points),
        sums: Sums::default(),
    };
    let mut input = vec![0.0f32; CHUNK + kernel.len() + WIDE];
    let mut positive = [0.0f32; CHUNK];
    let mut output = [0.0f32; CHUNK + WIDE];
    let mut from = valid.start;
    while from < valid.end {
        let count = CHUNK.min(valid.end - from);
        let begin = from.wrapping_add_signed(first);
        let needed = count + kernel.len() - 1;
        load(&n.samples, begin, pivot, &mut input[..needed]);
        input[needed..].fill(0.0);
        convolve(&input, &kernel, &mut output[..count.next_multiple_of(WIDE)]);
        load_volts(p, from, &mut positive[..count]);
        let (scale, zero) = (scale as f32, zero as f32);
        found.negative_v.extend(output[..count].iter().map(|y| y * scale + zero));
        let done = found.negative_v.len() - count;
        let negative = &found.negative_v[done..];
        found.difference_v.extend(positive[..count].iter().zip(negative).map(|(p, n)| p - n));
        let whole = found.negative_v.len();
        let end = if whole == points { points } else { whole.saturating_sub(2) };
        found.sums.extend(&found.difference_v, &found.negative_v, end);
        from += count;
    }
    found
}

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
        Samples::Codes(codes) => {
            out.iter_mut().zip(&codes[from..from + count]).for_each(|(out, code)| *out = f32::from(*code));
        }
        Samples::Numbers(numbers) => {
            out.iter_mut().zip(&numbers[from..from + count]).for_each(|(out, number)| *out = number - pivot);
        }
    }
}

/// Samples in volts, in single precision.
pub(super) fn load_volts(record: &Record, from: usize, out: &mut [f32]) {
    let pivot = first_sample(&record.samples);
    load(&record.samples, from, pivot, out);
    let scale = record.volts_per_code as f32;
    let zero = f64::from(pivot).mul_add(record.volts_per_code, record.zero_v) as f32;
    out.iter_mut().for_each(|x| *x = *x * scale + zero);
}
