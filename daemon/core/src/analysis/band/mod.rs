//! Spectra for the rejection and the leak bound: a window of very low leakage, and the transforms.

use realfft::RealToComplex;
use realfft::num_complex::Complex;

use super::signal::Signal;
use super::spectrum::cosines;
use super::wide::widest;

pub(super) mod plans;

/// How far the main lobe of [`window`] reaches to each side, in bins.
pub(super) const LOBE: usize = 4;

/// Equivalent noise bandwidth of [`window`] in bins (Harris, Proc. IEEE 66, 1978, table 1: 2.00): neighbouring bins
/// of white noise are alike, so that `K` of them count as about `K/2` independent ones.
pub(super) const NOISE_BANDWIDTH: f64 = 2.0;

/// The four-term Blackman–Harris window (Harris 1978, table 1; coefficients from memory): side lobes below −92 dB, so
/// that records which do not hold whole periods do no harm.
pub(super) fn window(points: usize) -> Vec<f64> {
    let step = std::f64::consts::TAU / points as f64;
    cosines(0.0, step)
        .take(points)
        .map(|c| {
            // cos 2x and cos 3x by their polynomials in cos x: a third of the work for long windows.
            0.358_75 - 0.488_29 * c + 0.141_28 * (2.0 * c * c - 1.0) - 0.011_68 * c * (4.0 * c * c - 3.0)
        })
        .collect()
}

/// The largest length up to `points` whose only prime factors are 2, 3 and 5: transforms of such lengths are several
/// times faster than those of others, and there is one within about a percent.
pub(super) fn fast_up_to(points: usize) -> usize {
    (1..=points).rev().find(|&n| is_fast(n)).unwrap_or(points)
}

/// The smallest such length from `points` on.
pub(super) fn fast_from(points: usize) -> usize {
    (points.max(1)..).find(|&n| is_fast(n)).unwrap_or(points)
}

fn is_fast(points: usize) -> bool {
    let mut rest = points;
    for prime in [2, 3, 5] {
        while rest > 0 && rest.is_multiple_of(prime) {
            rest /= prime;
        }
    }
    rest == 1
}

/// The spectrum of a real signal, bins 0 to n/2, not normalised (`X_k = Σ x_i·e^{−j2πik/n}`).
pub(super) fn forward(mut signal: Vec<f64>) -> Vec<Complex<f64>> {
    let plan = plans::double(|planner| planner.plan_fft_forward(signal.len()));
    let mut spectrum = plan.make_output_vec();
    let outcome = plan.process(&mut signal, &mut spectrum);
    debug_assert!(outcome.is_ok(), "the plan made its own buffer");
    spectrum
}

/// The real signal of `points` samples with this spectrum, normalised so that it undoes [`forward`].
pub(super) fn inverse(mut spectrum: Vec<Complex<f64>>, points: usize) -> Vec<f64> {
    let plan = plans::double(|planner| planner.plan_fft_inverse(points));
    // A real signal has a real bin at zero frequency and, for an even length, at half the sample rate.
    if let Some(first) = spectrum.first_mut() {
        first.im = 0.0;
    }
    if points.is_multiple_of(2)
        && let Some(last) = spectrum.last_mut()
    {
        last.im = 0.0;
    }
    let mut signal = plan.make_output_vec();
    let outcome = plan.process(&mut spectrum, &mut signal);
    debug_assert!(outcome.is_ok(), "the spectrum has n/2 + 1 bins");
    signal.iter_mut().for_each(|x| *x /= points as f64);
    signal
}

/// The spectrum of a signal after its (windowed) mean is taken away and the window is applied.
pub(super) fn windowed(signal: &[f64], window: &[f64]) -> Vec<Complex<f64>> {
    let weight: f64 = window.iter().sum();
    let mean = signal.iter().zip(window).map(|(x, w)| x * w).sum::<f64>() / weight;
    forward(signal.iter().zip(window).map(|(x, w)| (x - mean) * w).collect())
}

/// Windowed spectra of pairs of stretches of one length, in single precision: its rounding, 2⁻²⁴ of the largest sample
/// per sample and of random sign, is below the window's side lobes and any converter's noise. Planned once.
pub(super) struct Transform {
    window: Vec<f32>,
    weight: f64,
    plan: std::sync::Arc<dyn RealToComplex<f32>>,
    buffer: Vec<f32>,
    scratch: Vec<Complex<f32>>,
    /// The first stretch's spectrum after [`Transform::both`], scaled so that white noise of variance σ² has σ² in each
    /// bin.
    pub(super) first: Vec<Complex<f32>>,
    /// The second's.
    pub(super) second: Vec<Complex<f32>>,
}

impl Transform {
    pub(super) fn new(points: usize) -> Self {
        let plan = plans::single(|planner| planner.plan_fft_forward(points));
        let mut window = window(points);
        let scale = 1.0 / window.iter().map(|w| w * w).sum::<f64>().sqrt();
        window.iter_mut().for_each(|w| *w *= scale);
        Self {
            weight: window.iter().sum(),
            window: window.iter().map(|w| *w as f32).collect(),
            buffer: plan.make_input_vec(),
            scratch: plan.make_scratch_vec(),
            first: plan.make_output_vec(),
            second: plan.make_output_vec(),
            plan,
        }
    }

    /// Transforms the stretches of two signals that begin at a sample, each about its (windowed) mean.
    pub(super) fn both<A: Signal + ?Sized, B: Signal + ?Sized>(&mut self, a: &A, b: &B, from: usize) {
        a.load(from, &mut self.buffer);
        self.one(false);
        b.load(from, &mut self.buffer);
        self.one(true);
    }

    fn one(&mut self, second: bool) {
        let mean = (weighted_sum(&self.buffer, &self.window) / self.weight) as f32;
        apply_window(&mut self.buffer, &self.window, mean);
        let out = if second { &mut self.second } else { &mut self.first };
        let outcome = self.plan.process_with_scratch(&mut self.buffer, out, &mut self.scratch);
        debug_assert!(outcome.is_ok(), "the plan made its own buffers");
    }
}

widest! {
    /// `Σ x·w`, in single precision over 128 samples at a time.
    fn weighted_sum(x: &[f32], w: &[f32]) -> f64 {
        const LANES: usize = 16;
        let mut total = 0.0f64;
        for (x, w) in x.chunks(128).zip(w.chunks(128)) {
            let mut sums = [0.0f32; LANES];
            let ((x, last_x), (w, last_w)) = (x.as_chunks::<LANES>(), w.as_chunks::<LANES>());
            for (x, w) in x.iter().zip(w) {
                for k in 0..LANES {
                    sums[k] += x[k] * w[k];
                }
            }
            for ((sum, x), w) in sums.iter_mut().zip(last_x).zip(last_w) {
                *sum += x * w;
            }
            total += sums.iter().map(|sum| f64::from(*sum)).sum::<f64>();
        }
        total
    }
}

widest! {
    fn apply_window(x: &mut [f32], window: &[f32], mean: f32) {
        x.iter_mut().zip(window).for_each(|(x, w)| *x = (*x - mean) * w);
    }
}

#[cfg(test)]
mod tests;
