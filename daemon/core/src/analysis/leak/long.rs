//! The leak of a long record, without a transform of its whole length.
//!
//! The residual is split by a smooth crossover, between [`FROM`] and [`TO`] bins of a segment. What lies below is done as
//! a whole, on the record brought to a [`STEP`]th of its rate by block means (their droop there is below 4 %, and made up
//! for); what lies above, in half-overlapping segments of [`SEGMENT`] samples under Hann windows, which add up to one.
//! Both parts are linear and add up in phase and in quadrature. Segments in which the common mode stands still hold
//! nothing above the crossover but noise, whose share is worked out from its power.

use realfft::num_complex::Complex;
use realfft::{ComplexToReal, RealFftPlanner, RealToComplex};
use std::sync::Arc;

use super::super::signal::{BLOCK, Outline, Signal, blocks, range_of};
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
    // At a sample, the slow part lies between the middles of two blocks.
    let slow_at = |values: &[f64], i: usize| {
        let place = ((i as f64 + 0.5) / STEP as f64 - 0.5).clamp(0.0, (values.len() - 1) as f64);
        let low = (place as usize).min(values.len().saturating_sub(2));
        let high = (low + 1).min(values.len() - 1);
        (values[high] - values[low]).mul_add(place - low as f64, values[low])
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
            for (k, i) in here.clone().enumerate() {
                let (a, b) = segments.sum(k);
                let (a, b) = (a + slow_at(&slow_phase, i), b + slow_at(&slow_quadrature, i));
                power += a * a;
                peak = peak.max(a * a + b * b);
            }
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

/// Means of blocks of [`STEP`] samples, less the mean of all.
fn block_means<S: Signal + ?Sized>(common: &S, mean: f64) -> Vec<f64> {
    let mut means = Vec::with_capacity(common.points() / STEP + 1);
    blocks(common, 0..common.points(), |_, part| {
        for part in part.chunks(STEP) {
            means.push(f64::from(part.iter().sum::<f32>()) / part.len() as f64 - mean);
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
        let mut planner = RealFftPlanner::<f32>::new();
        let (forward, inverse) = (planner.plan_fft_forward(SEGMENT), planner.plan_fft_inverse(SEGMENT));
        let weights: Vec<f64> = (0..=HALF).map(|k| weight(k as f64 * bin_hz)).collect();
        let scratch = forward.get_scratch_len().max(inverse.get_scratch_len());
        let angle = |i: usize| std::f64::consts::TAU * (i as f64 + 0.5) / SEGMENT as f64;
        Self {
            window: (0..SEGMENT).map(|i| (0.5 - 0.5 * angle(i).cos()) as f32).collect(),
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

    /// In phase and in quadrature at the `k`th sample of the half that both segments share.
    fn sum(&self, k: usize) -> (f64, f64) {
        let both = |part: usize| f64::from(self.before[part][HALF + k] + self.now[part][k]);
        (both(0), both(1))
    }
}
