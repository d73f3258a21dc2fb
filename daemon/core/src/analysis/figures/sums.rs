//! What noise does to an rms value.

/// From the mean square of `points` samples: the rms with its noise power taken away, the standard uncertainty that the
/// noise leaves, and the rms to divide sensitivities by: never below what noise could fake, so that a difference of
/// nothing has finite ones.
pub(super) fn without_noise(square: f64, points: usize, noise: f64) -> (f64, f64, f64) {
    let n = points.max(1) as f64;
    let power = (square - noise * noise).max(0.0);
    let value = power.sqrt();
    // Variance of the mean square: 4R²s²/n + 2s⁴/n.
    let variance = (4.0 * power * noise * noise + 2.0 * noise.powi(4)) / n;
    let size = value.max(variance.powf(0.25)).max(f64::MIN_POSITIVE.sqrt());
    (value, 0.5 * variance.sqrt() / size, size)
}
