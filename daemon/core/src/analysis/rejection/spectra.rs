//! Averaged spectra of difference and common mode, from which rejection is read.
//!
//! A record of up to [`LONGEST`] samples is one segment. A longer one is cut into half-overlapping segments, in three
//! resolutions: [`SEGMENT`] samples of the record itself, and longer segments of the record brought to a 16th and a
//! 256th of its rate by a smooth average, so that every band has at least [`LEAST_PLACE`] bins below it while no
//! transform is long. (The average's slope acts on difference and common mode alike; what it folds down is at least
//! 80 dB lower in the bands that are read there.) At the full rate only segments in which the common mode moves are
//! transformed, and a few of the others, which hold nothing but noise.

use realfft::num_complex::Complex;

use super::super::apply::Corrected;
use super::super::band::{self, Transform};
use super::super::interpolate::BAND;
use super::super::peaks;
use super::super::signal::{BLOCK, Outline, Signal};
use super::super::wide::widest;
use super::residual::{Noise, Spectra, sort_bins};

/// The longest record that is transformed as a whole.
const LONGEST: usize = 32_768;
/// Samples per segment at the full rate, and at the lower rates.
const SEGMENT: usize = 4096;
const SLOW_SEGMENT: usize = 65_536;
/// Each resolution's rate is this part of the one before.
const STEP: usize = 16;
/// A band is read at the highest rate at which its centre lies at least so many bins up.
pub(super) const LEAST_PLACE: f64 = 8.0;
/// A segment whose common mode ranges over more than so many standard deviations of its noise moves.
const MOVES: f64 = 12.0;
/// So many segments that hold only noise are enough.
const ENOUGH_QUIET: usize = 8;

/// Sums over segments.
struct Average {
    cross: Vec<Complex<f64>>,
    common: Vec<f64>,
    difference: Vec<f64>,
    segments: usize,
}

impl Average {
    fn new(points: usize) -> Self {
        let bins = points / 2 + 1;
        Self {
            cross: vec![Complex::default(); bins],
            common: vec![0.0; bins],
            difference: vec![0.0; bins],
            segments: 0,
        }
    }

    fn add(&mut self, d: &[Complex<f32>], c: &[Complex<f32>]) {
        accumulate(d, c, &mut self.cross, &mut self.common, &mut self.difference);
        self.segments += 1;
    }

    fn finish(mut self) -> Self {
        let share = 1.0 / self.segments.max(1) as f64;
        self.cross.iter_mut().for_each(|x| *x *= share);
        self.common.iter_mut().chain(&mut self.difference).for_each(|x| *x *= share);
        self
    }
}

widest! {
    fn accumulate(
        d: &[Complex<f32>],
        c: &[Complex<f32>],
        cross: &mut [Complex<f64>],
        common: &mut [f64],
        difference: &mut [f64],
    ) {
        let sums = cross.iter_mut().zip(common).zip(difference);
        for (((cross, common), difference), (d, c)) in sums.zip(d.iter().zip(c)) {
            cross.re += f64::from(d.re * c.re + d.im * c.im);
            cross.im += f64::from(d.im * c.re - d.re * c.im);
            *common += f64::from(c.re * c.re + c.im * c.im);
            *difference += f64::from(d.re * d.re + d.im * d.im);
        }
    }
}

/// The spectra of all acquisitions in every resolution, the finest in time first. Empty without any.
pub(super) fn of(captures: &[Corrected]) -> Vec<Spectra> {
    let Some(points) = captures.iter().map(|c| c.difference_v.len()).min() else { return Vec::new() };
    let Some(interval_s) = captures.first().map(|c| c.interval_s) else { return Vec::new() };
    if points <= LONGEST {
        let points = band::fast_up_to(points);
        let average = whole(captures.iter().map(|c| (&c.difference_v, c.common())), points, points);
        return vec![sorted(average, 1.0 / (points as f64 * interval_s), None)];
    }
    let (first, quiet) = segments(captures, points);
    let mut found = vec![sorted(first, 1.0 / (SEGMENT as f64 * interval_s), quiet)];
    let mut slow: Vec<(Vec<f32>, Vec<f32>)> =
        captures.iter().map(|c| (slower(&c.difference_v, points), slower(&c.common(), points))).collect();
    let mut rate = STEP;
    while points / rate >= 256 {
        let length = points / rate;
        let size = if length > SLOW_SEGMENT { SLOW_SEGMENT } else { band::fast_up_to(length) };
        let average = whole(slow.iter().map(|(d, c)| (d, c)), length, size);
        // White noise is the same per hertz: a bin of the slower spectrum holds less of it.
        let noise = found[0].noise_anywhere().map(|noise| noise.per_bin(1.0 / rate as f64));
        found.push(sorted(average, 1.0 / ((size * rate) as f64 * interval_s), noise.map(Quiet::Same)));
        slow = slow.iter().map(|(d, c)| (slower(d, length), slower(c, length))).collect();
        rate *= STEP;
    }
    found
}

/// What is known of the noise beside the spectra themselves.
enum Quiet {
    /// Spectra of noise alone.
    Measured(Average),
    /// The same in every bin, for where the spectrum has no bins without signal.
    Same(Noise),
}

fn sorted(average: Average, bin_hz: f64, quiet: Option<Quiet>) -> Spectra {
    let bins = average.common.len();
    let last = ((BAND * 2.0 * (bins - 1) as f64) as usize).min(bins.saturating_sub(1));
    let floor = match &quiet {
        Some(Quiet::Measured(noise)) => {
            let usable = noise.common.get(band::LOBE..=last).unwrap_or_default();
            Some(usable.iter().sum::<f64>() / usable.len().max(1) as f64)
        }
        _ => None,
    };
    let (signal, silent) = sort_bins(&average.common, last, floor);
    let averages = average.segments as f64;
    let mut found = Spectra {
        averages,
        bin_hz,
        cross: average.cross,
        common: average.common,
        difference: average.difference,
        signal,
        quiet: silent,
        measured: None,
        elsewhere: None,
    };
    match quiet {
        Some(Quiet::Measured(noise)) => found.measured = Some((noise.cross, noise.difference, noise.segments as f64)),
        Some(Quiet::Same(noise)) => found.elsewhere = Some(noise),
        None => {}
    }
    found
}

/// Half-overlapping segments of `size` over the first `points` samples of every acquisition.
fn whole<D: Signal, C: Signal>(captures: impl Iterator<Item = (D, C)>, points: usize, size: usize) -> Average {
    let mut transform = Transform::new(size);
    let mut average = Average::new(size);
    for (d, c) in captures {
        for from in starts(points, size) {
            transform.both(&d, &c, from);
            average.add(&transform.first, &transform.second);
        }
    }
    average.finish()
}

/// Where half-overlapping segments begin; the last one ends where the record does, unless that is hardly further than the
/// one before, which would count twice.
fn starts(points: usize, size: usize) -> impl Iterator<Item = usize> {
    let last = points.saturating_sub(size);
    let step = (size / 2).max(1);
    let before = last.saturating_sub(1) / step * step;
    (0..last).step_by(step).chain((last == 0 || last - before >= size / 4).then_some(last))
}

/// The segments in which the common mode moves; the second average is of some in which it does not, if there are any.
fn segments(captures: &[Corrected], points: usize) -> (Average, Option<Quiet>) {
    let mut transform = Transform::new(SEGMENT);
    let (mut moving, mut still) = (Average::new(SEGMENT), Average::new(SEGMENT));
    let enough = ENOUGH_QUIET.div_ceil(captures.len());
    for capture in captures {
        let common = capture.common();
        let outline = Outline::of(&common);
        let limit = MOVES * peaks::noise_of(&common);
        let moves = |from: &usize| {
            let end = (from + SEGMENT).div_ceil(BLOCK).min(outline.blocks.len());
            let (low, high) = outline.within(from / BLOCK..end);
            f64::from(high - low) > limit
        };
        let (mut move_at, mut still_at): (Vec<usize>, Vec<usize>) = starts(points, SEGMENT).partition(moves);
        if move_at.is_empty() {
            std::mem::swap(&mut move_at, &mut still_at);
        }
        for from in move_at {
            transform.both(&capture.difference_v, &common, from);
            moving.add(&transform.first, &transform.second);
        }
        for &from in still_at.iter().step_by(still_at.len().div_ceil(enough).max(1)) {
            transform.both(&capture.difference_v, &common, from);
            still.add(&transform.first, &transform.second);
        }
    }
    let quiet = (still.segments > 0).then(|| Quiet::Measured(still.finish()));
    (moving.finish(), quiet)
}

/// The signal at a [`STEP`]th of its rate, under the threefold convolution of a block of [`STEP`] equal weights: at the
/// frequencies that are read there what is folded down is at least 80 dB lower.
fn slower<S: Signal + ?Sized>(signal: &S, points: usize) -> Vec<f32> {
    let weights = weights();
    let mut before: [Option<f32>; 2] = [None; 2];
    let mut found = Vec::with_capacity(points / STEP);
    super::super::signal::blocks(signal, 0..points / STEP * STEP, |_, part| {
        let mut sums = [[0.0f32; 3]; BLOCK / STEP];
        let blocks = part.len() / STEP;
        weighted(part, &weights, &mut sums[..blocks]);
        for [first, middle, last] in &sums[..blocks] {
            // Before the first sample the record is taken to go on as its first block.
            let sum = first + middle + last;
            found.push(first + before[0].unwrap_or(sum - first));
            before = [Some(before[1].unwrap_or(*last) + middle), Some(*last)];
        }
    });
    found
}

/// The weights of a block's samples for the outputs at its own place, one block later and two blocks later.
fn weights() -> [[f32; STEP]; 3] {
    let mut triple = [0.0f64; 3 * STEP];
    for a in 0..STEP {
        for b in 0..STEP {
            for c in 0..STEP {
                triple[a + b + c] += 1.0 / (STEP * STEP * STEP) as f64;
            }
        }
    }
    // The newest samples have the first weights.
    [0, 1, 2].map(|block| std::array::from_fn(|k| triple[block * STEP + STEP - 1 - k] as f32))
}

widest! {
    fn weighted(part: &[f32], weights: &[[f32; STEP]; 3], sums: &mut [[f32; 3]]) {
        for (x, sums) in part.as_chunks::<STEP>().0.iter().zip(sums) {
            for (sum, weights) in sums.iter_mut().zip(weights) {
                let mut lanes = [0.0f32; 8];
                for k in 0..8 {
                    lanes[k] = x[k] * weights[k] + x[k + 8] * weights[k + 8];
                }
                *sum = lanes.iter().sum();
            }
        }
    }
}
