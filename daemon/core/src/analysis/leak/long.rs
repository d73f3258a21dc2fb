//! The leak of a long record, without a transform of its whole length.
//!
//! The residual is split by a smooth crossover, between [`FROM`] and [`TO`] bins of a segment. What lies below is done as
//! a whole, on the record brought to a [`STEP`]th of its rate by block means (their droop there is below 4 %, and made up
//! for); what lies above, in half-overlapping segments of [`SEGMENT`] samples under Hann windows, which add up to one.
//! Both parts are linear and add up in phase and in quadrature. Segments in which the common mode stands still hold
//! nothing above the crossover but noise, whose share is worked out from its power.

use realfft::num_complex::Complex;
use realfft::{ComplexToReal, RealToComplex};
use std::sync::Arc;

use super::super::band::plans;
use super::super::signal::{BLOCK, Outline, Signal, blocks, range_of};
use super::super::spectrum::cosines;
use super::super::wide::widest;
use super::{Moving, quadrature};

const SEGMENT: usize = 4096;
const HALF: usize = SEGMENT / 2;
/// The crossover, in bins of a segment.
const FROM: f64 = 1.5;
const TO: f64 = 5.0;
/// Samples per block mean.
const STEP: usize = 64;
/// A segment whose common mode ranges over more than so many standard deviations of its noise moves.
const MOVES: f64 = 12.0;

/// Rms and peak of the common mode less its mean, weighted by the residual.
pub(super) fn filtered<S: Signal + ?Sized>(
    common: &S,
    interval_s: f64,
    mean: f64,
    noise: f64,
    residual: &impl Fn(f64) -> f64,
) -> Moving {
    let n = common.points();
    let segment_hz = 1.0 / (SEGMENT as f64 * interval_s);
    // The part below the crossover, 1 to 0.
    let below = |f: f64| {
        let x = ((f / segment_hz - FROM) / (TO - FROM)).clamp(0.0, 1.0);
        0.5 * (1.0 + (std::f64::consts::PI * x).cos())
    };
    let slow_s = STEP as f64 * interval_s;
    let droop = |f: f64| {
        let x = std::f64::consts::PI * f * slow_s;
        if x > 1e-6 { x.sin() / x } else { 1.0 }
    };
    let slow_residual = |f: f64| {
        let share = below(f);
        if share > 0.0 { residual(f) * share / droop(f) } else { 0.0 }
    };
    let (slow_phase, slow_quadrature, _) = quadrature(block_means(common, mean), slow_s, &slow_residual);
    let mut segments = Segments::new(segment_hz, |f| residual(f) * (1.0 - below(f)));
    let noise_power = noise * noise * segments.noise_gain;

    let outline = Outline::of(common);
    let moves = |from: usize| {
        let end = (from + SEGMENT).min(n).div_ceil(BLOCK).min(outline.blocks.len());
        let (low, high) = outline.within(from / BLOCK..end);
        f64::from(high - low) > MOVES * noise
    };
    let (mut power, mut peak) = (0.0, 0.0f64);
    let mut from = 0;
    // What the segment before this half left for it; segments begin half a segment early so that windows add up.
    segments.load(common, 0, true, mean, moves(0));
    while from < n {
        let here = from..(from + HALF).min(n);
        let moved = segments.moving;
        segments.load(common, from, false, mean, moves(from));
        if moved || segments.moving {
            let halves = [&slow_phase, &slow_quadrature].map(|slow| between_blocks(slow, from));
            let (sum, most) = segments.sum(&halves, here.len());
            power += sum;
            peak = peak.max(most);
        } else {
            let means = here.start / STEP..(here.end.div_ceil(STEP)).min(slow_phase.len());
            let share = here.len() as f64 / means.len().max(1) as f64;
            for i in means {
                let (a, b) = (slow_phase[i], slow_quadrature[i]);
                power += share * a * a;
                peak = peak.max(a * a + b * b);
            }
            power += noise_power * here.len() as f64;
        }
        from += HALF;
    }
    Moving { rms: (power / n as f64).sqrt(), peak: peak.sqrt() }
}

/// The slow part at each sample of half a segment that begins at `from`: on straight lines between the middles of blocks.
fn between_blocks(values: &[f64], from: usize) -> [f32; HALF] {
    let at = |block: isize| {
        let last = values.len().saturating_sub(1);
        values.get(usize::try_from(block).unwrap_or(0).min(last)).copied().unwrap_or(0.0) as f32
    };
    let mut out = [0.0; HALF];
    let first = (from / STEP) as isize;
    for (half, out) in out.chunks_exact_mut(STEP / 2).enumerate() {
        // The first half of a block lies behind the middle of the block before, the second behind its own.
        let block = first + (half as isize - 1).div_euclid(2);
        let (start, end) = (at(block), at(block + 1));
        let place = if half % 2 == 0 { 0.5 } else { 0.0 };
        for (k, out) in out.iter_mut().enumerate() {
            *out = start + (end - start) * (place + (k as f32 + 0.5) / STEP as f32);
        }
    }
    out
}

widest! {
    fn sum_of(part: &[f32]) -> f32 {
        const LANES: usize = 16;
        let mut sums = [0.0f32; LANES];
        let (chunks, rest) = part.as_chunks::<LANES>();
        for chunk in chunks {
            for k in 0..LANES {
                sums[k] += chunk[k];
            }
        }
        sums.iter().chain(rest).sum()
    }
}

widest! {
    /// The sum of the squares of `a`, and the largest sum of squares of both, where each is a sum of three.
    fn power_and_peak(a: [&[f32]; 3], b: [&[f32]; 3]) -> (f64, f32) {
        const LANES: usize = 16;
        let (mut squares, mut most) = ([0.0f64; LANES], [0.0f32; LANES]);
        let count = a[0].len();
        let (a0, a1, a2) = (&a[0][..count], &a[1][..count], &a[2][..count]);
        let (b0, b1, b2) = (&b[0][..count], &b[1][..count], &b[2][..count]);
        let mut from = 0;
        while from < count {
            for k in 0..LANES.min(count - from) {
                let i = from + k;
                let (x, y) = (a0[i] + a1[i] + a2[i], b0[i] + b1[i] + b2[i]);
                squares[k] += f64::from(x * x);
                let both = x * x + y * y;
                most[k] = if both > most[k] { both } else { most[k] };
            }
            from += LANES;
        }
        (squares.iter().sum(), most.iter().copied().fold(0.0, f32::max))
    }
}

/// Means of blocks of [`STEP`] samples, less the mean of all.
fn block_means<S: Signal + ?Sized>(common: &S, mean: f64) -> Vec<f64> {
    let mut means = Vec::with_capacity(common.points() / STEP + 1);
    blocks(common, 0..common.points(), |_, part| {
        for part in part.chunks(STEP) {
            means.push(f64::from(sum_of(part)) / part.len() as f64 - mean);
        }
    });
    means
}

/// Filters segments, and keeps the later half of each for the next to be added to.
struct Segments {
    window: Vec<f32>,
    /// The residual's share for each bin, divided by the length.
    weights: Vec<f32>,
    /// Mean square of what the filter leaves of white noise of one.
    noise_gain: f64,
    forward: Arc<dyn RealToComplex<f32>>,
    inverse: Arc<dyn ComplexToReal<f32>>,
    buffer: Vec<f32>,
    spectrum: Vec<Complex<f32>>,
    turned: Vec<Complex<f32>>,
    scratch: Vec<Complex<f32>>,
    /// In phase and in quadrature, of the segment before and of this one.
    before: [Vec<f32>; 2],
    now: [Vec<f32>; 2],
    moving: bool,
}

impl Segments {
    fn new(bin_hz: f64, weight: impl Fn(f64) -> f64) -> Self {
        let (forward, inverse) =
            plans::single(|planner| (planner.plan_fft_forward(SEGMENT), planner.plan_fft_inverse(SEGMENT)));
        let weights: Vec<f64> = (0..=HALF).map(|k| weight(k as f64 * bin_hz)).collect();
        let scratch = forward.get_scratch_len().max(inverse.get_scratch_len());
        let step = std::f64::consts::TAU / SEGMENT as f64;
        Self {
            window: cosines(0.5 * step, step).take(SEGMENT).map(|cosine| (0.5 - 0.5 * cosine) as f32).collect(),
            noise_gain: weights.iter().map(|w| w * w).sum::<f64>() / weights.len() as f64,
            weights: weights.iter().map(|w| (w / SEGMENT as f64) as f32).collect(),
            buffer: forward.make_input_vec(),
            spectrum: forward.make_output_vec(),
            turned: forward.make_output_vec(),
            scratch: vec![Complex::default(); scratch],
            forward,
            inverse,
            before: [vec![0.0; SEGMENT], vec![0.0; SEGMENT]],
            now: [vec![0.0; SEGMENT], vec![0.0; SEGMENT]],
            moving: false,
        }
    }

    /// Makes the segment that begins at `from` (half a segment earlier if `early`) the present one. Beyond its ends the
    /// record goes on with its last value. A segment that stands still leaves nothing.
    fn load<S: Signal + ?Sized>(&mut self, common: &S, from: usize, early: bool, mean: f64, moves: bool) {
        std::mem::swap(&mut self.before, &mut self.now);
        self.moving = moves;
        if !moves {
            self.now.iter_mut().for_each(|half| half.fill(0.0));
            return;
        }
        let lead = if early { HALF } else { 0 };
        let count = (SEGMENT - lead).min(common.points() - from);
        common.load(from, &mut self.buffer[lead..lead + count]);
        let (first, last) = (self.buffer[lead], self.buffer[lead + count - 1]);
        self.buffer[..lead].fill(first);
        self.buffer[lead + count..].fill(last);
        // The mean of the segment has nothing above the crossover; without it single precision holds more digits.
        let (low, high) = range_of(&self.buffer);
        let middle = if low.is_finite() && high.is_finite() { 0.5 * (low + high) } else { mean as f32 };
        self.buffer.iter_mut().zip(&self.window).for_each(|(x, w)| *x = (*x - middle) * w);
        let scratch = &mut self.scratch[..self.forward.get_scratch_len()];
        let outcome = self.forward.process_with_scratch(&mut self.buffer, &mut self.spectrum, scratch);
        debug_assert!(outcome.is_ok(), "the plan made its own buffers");
        for ((x, turned), w) in self.spectrum.iter_mut().zip(&mut self.turned).zip(&self.weights) {
            *x *= *w;
            *turned = Complex::new(-x.im, x.re);
        }
        for (spectrum, out) in [&mut self.spectrum, &mut self.turned].into_iter().zip(&mut self.now) {
            // A real signal has real first and last bins.
            spectrum[0].im = 0.0;
            spectrum[HALF].im = 0.0;
            let scratch = &mut self.scratch[..self.inverse.get_scratch_len()];
            let outcome = self.inverse.process_with_scratch(spectrum, out, scratch);
            debug_assert!(outcome.is_ok(), "the spectrum has half the bins and one");
        }
    }

    /// Over the half that both segments share and with the slow parts added: the sum of the squares in phase, and the
    /// largest square of the envelope.
    fn sum(&self, slow: &[[f32; HALF]; 2], count: usize) -> (f64, f64) {
        let parts = |i: usize| [&self.before[i][HALF..HALF + count], &self.now[i][..count], &slow[i][..count]];
        let (power, peak) = power_and_peak(parts(0), parts(1));
        (power, f64::from(peak))
    }
}
