//! Sums over a whole waveform.

/// The mean.
pub(super) fn mean(x: &[f64]) -> f64 {
    x.iter().sum::<f64>() / x.len().max(1) as f64
}

/// The mean of a product.
pub(super) fn product(x: &[f64], y: &[f64]) -> f64 {
    x.iter().zip(y).map(|(x, y)| x * y).sum::<f64>() / x.len().max(1) as f64
}

/// The rms of a signal with its noise power taken away, the standard uncertainty that the noise leaves, and the rms to
/// divide sensitivities by: never below what noise could fake, so that a difference of nothing has finite ones.
pub(super) fn without_noise(x: &[f64], noise: f64) -> (f64, f64, f64) {
    let n = x.len().max(1) as f64;
    let power = (product(x, x) - noise * noise).max(0.0);
    let value = power.sqrt();
    // Variance of the mean square: 4R²s²/n + 2s⁴/n.
    let variance = (4.0 * power * noise * noise + 2.0 * noise.powi(4)) / n;
    let size = value.max(variance.powf(0.25)).max(f64::MIN_POSITIVE.sqrt());
    (value, 0.5 * variance.sqrt() / size, size)
}
