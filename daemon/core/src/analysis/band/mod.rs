//! Spectra for the rejection and the leak bound: a window of very low leakage, and the transforms.

use realfft::RealFftPlanner;
use realfft::num_complex::Complex;

/// How far the main lobe of [`window`] reaches to each side, in bins.
pub(super) const LOBE: usize = 4;

/// Equivalent noise bandwidth of [`window`] in bins (Harris, Proc. IEEE 66, 1978, table 1: 2.00): neighbouring bins
/// of white noise are alike, so that `K` of them count as about `K/2` independent ones.
pub(super) const NOISE_BANDWIDTH: f64 = 2.0;

/// The four-term Blackman–Harris window (Harris 1978, table 1; coefficients from memory): side lobes below −92 dB, so
/// that records which do not hold whole periods do no harm.
pub(super) fn window(points: usize) -> Vec<f64> {
    let step = std::f64::consts::TAU / points as f64;
    (0..points)
        .map(|i| {
            let x = step * i as f64;
            0.358_75 - 0.488_29 * x.cos() + 0.141_28 * (2.0 * x).cos() - 0.011_68 * (3.0 * x).cos()
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
    let plan = RealFftPlanner::<f64>::new().plan_fft_forward(signal.len());
    let mut spectrum = plan.make_output_vec();
    let outcome = plan.process(&mut signal, &mut spectrum);
    debug_assert!(outcome.is_ok(), "the plan made its own buffer");
    spectrum
}

/// The real signal of `points` samples with this spectrum, normalised so that it undoes [`forward`].
pub(super) fn inverse(mut spectrum: Vec<Complex<f64>>, points: usize) -> Vec<f64> {
    let plan = RealFftPlanner::<f64>::new().plan_fft_inverse(points);
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

#[cfg(test)]
mod tests;
