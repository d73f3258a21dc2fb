//! The factor by which few degrees of freedom widen an interval.

use statrs::distribution::{ContinuousCDF, Normal, StudentsT};

/// From so many degrees of freedom the expansion about the normal distribution is closer than 10⁻⁸; it needs no search.
const MANY: f64 = 200.0;

/// Student's t for an interval that holds `probability` (two-sided, above 0.5 and below 1) with `freedom` degrees of
/// freedom, at least 1; fewer count as 1 (JCGM 100, G.3 and Table G.2).
///
/// The library's own inverse is not used: for large fractional degrees of freedom its search does not end.
#[must_use]
pub fn student(probability: f64, freedom: f64) -> f64 {
    let upper = 0.5 * (1.0 + probability);
    let freedom = freedom.max(1.0);
    let z = Normal::standard().inverse_cdf(upper);
    if freedom > MANY {
        // Abramowitz and Stegun, 26.7.5.
        let z2 = z * z;
        let first = z * (z2 + 1.0) / 4.0;
        let second = z * ((5.0 * z2 + 16.0) * z2 + 3.0) / 96.0;
        let third = z * (((3.0 * z2 + 19.0) * z2 + 17.0) * z2 - 15.0) / 384.0;
        return z + (first + (second + third / freedom) / freedom) / freedom;
    }
    let Ok(distribution) = StudentsT::new(0.0, 1.0, freedom) else { return z };
    // No factor is below the normal one; with one degree of freedom it is tan(π·probability/2).
    let (mut low, mut high) = (z, (std::f64::consts::FRAC_PI_2 * probability).tan() + 1.0);
    for _ in 0..60 {
        let middle = 0.5 * (low + high);
        if distribution.cdf(middle) < upper { low = middle } else { high = middle }
    }
    0.5 * (low + high)
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    /// JCGM 100, Table G.2 (from memory), to its two decimals.
    #[test]
    fn the_guides_table() {
        for (freedom, at_95, at_95_45) in [
            (1.0, 12.71, 13.97),
            (2.0, 4.30, 4.53),
            (5.0, 2.57, 2.65),
            (10.0, 2.23, 2.28),
            (50.0, 2.01, 2.05),
            (100.0, 1.984, 2.025),
        ] {
            let unit = if freedom < 100.0 { 0.0051 } else { 0.000_51 };
            assert!((student(0.95, freedom) - at_95).abs() < unit, "{freedom}: {}", student(0.95, freedom));
            assert!((student(0.9545, freedom) - at_95_45).abs() < unit, "{freedom}: {}", student(0.9545, freedom));
        }
    }

    #[test]
    fn both_ways_meet() {
        let (below, above) = (student(0.95, MANY), student(0.95, MANY + 1e-6));
        assert!((below - above).abs() < 1e-7, "{below} {above}");
    }

    proptest! {
        /// Catches: a search that does not end, and a factor below the normal one.
        #[test]
        fn more_freedom_never_widens(log in 0.0f64..15.0, step in 0.001f64..1.0) {
            let (fewer, more) = (student(0.95, 10f64.powf(log)), student(0.95, 10f64.powf(log + step)));
            prop_assert!(fewer >= more - 1e-9 && more >= 1.959_963);
        }
    }
}
