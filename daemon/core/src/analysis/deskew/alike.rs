//! What a reference costs whose edges all meet the sampler at the same phase.
//!
//! Where the sample rate is a whole multiple of a reference's frequency, every edge is sampled at the same instants of
//! itself. What the edge holds above half the sample rate then folds back alike in every edge and every repeat, and
//! shifts the skew by up to some thousandths of a sample, which no scatter shows. A frequency that is no divisor of the
//! sample rate spreads the phases, and the shifts cancel.

/// Share of a sample interval over which the phases of sampling must spread within the record.
const SPREAD: f64 = 0.5;

/// Standard uncertainty of a skew (seconds) from edges of `edge_s` (10–90 %; `None`: not known, taken as three samples)
/// sampled alike: every `interval_s`, `samples` of them, the reference repeating every `period_s`. Nought where the
/// phases spread.
///
/// The size is the rms bias that `tests/reference/sampled_alike.py` finds for straight edges behind two poles near a third
/// and a sixth of the sample rate, `1.3·10⁻³` of a sample at 3 samples an edge, falling about as the power −1.25; that
/// is at or above all it prints for 3 to 10 samples.
#[must_use]
pub fn sampled_alike(period_s: f64, edge_s: Option<f64>, interval_s: f64, samples: u32) -> f64 {
    let in_period = period_s / interval_s;
    let periods = f64::from(samples) / in_period;
    let spread = (in_period - in_period.round()).abs() * periods;
    if !spread.is_finite() || spread > SPREAD {
        return 0.0;
    }
    let edge = edge_s.map_or(3.0, |edge_s| (edge_s / interval_s).max(2.0));
    1.3e-3 * (3.0 / edge).powf(1.25) * interval_s
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn edges_sampled_alike_cost_and_others_do_not() {
        let near = |found: f64, wanted: f64| assert!((found - wanted).abs() < 1e-3 * wanted, "{found} {wanted}");
        near(sampled_alike(1e-6, Some(3e-9), 1e-9, 10_000), 1.3e-12);
        near(sampled_alike(1e-6, None, 1e-9, 10_000), 1.3e-12);
        near(sampled_alike(1e-6, Some(6e-9), 1e-9, 10_000), 0.5466e-12);
        // 1.0107 MHz: 989.4 samples a period, ten periods.
        assert!(sampled_alike(1.0 / 1.0107e6, Some(3e-9), 1e-9, 10_000).abs() < 1e-30);
        assert!(sampled_alike(f64::NAN, None, 1e-9, 10_000).abs() < 1e-30);
    }
}
