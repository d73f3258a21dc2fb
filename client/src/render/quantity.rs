//! A quantity for people: value ± expanded uncertainty, to the digit that the uncertainty reaches; a figure with the
//! interval that it states, also where that is not symmetric.

use evenpair_api::{Figure, Quantity};
use evenpair_core::units::{Unit, show};

/// The coverage factor of a ± for which no interval is stated (JCGM 100, 6.2).
const COVERAGE: f64 = 2.0;

/// Prefixes by power of ten.
const PREFIXES: [(i32, &str); 9] =
    [(-15, "f"), (-12, "p"), (-9, "n"), (-6, "µ"), (-3, "m"), (0, ""), (3, "k"), (6, "M"), (9, "G")];

/// `2.301 ns ± 0.012 ns`: two digits of the expanded uncertainty (JCGM 100, 7.2.6), the value to the same place.
/// Without an uncertainty, four digits of the value.
pub(crate) fn with_uncertainty(quantity: &Quantity) -> String {
    let unit = Unit::from_symbol(&quantity.unit).unwrap_or(Unit::One);
    let Some(u) = quantity.u.filter(|u| *u > 0.0 && u.is_finite() && quantity.value.is_finite()) else {
        return show(quantity.value, unit, 4);
    };
    symmetric(quantity.value, COVERAGE * u, unit)
}

/// A figure with its interval of 95 %: `±` where that is symmetric, `+…/−…` where not; as [`with_uncertainty`] where
/// it states none.
pub(crate) fn figure(figure: &Figure) -> String {
    let quantity = &figure.quantity;
    let unit = Unit::from_symbol(&quantity.unit).unwrap_or(Unit::One);
    let Some(interval) = figure.coverage.as_ref().filter(|_| quantity.value.is_finite()) else {
        return with_uncertainty(quantity);
    };
    let (up, down) = (interval.high - quantity.value, quantity.value - interval.low);
    if !(up >= 0.0 && down >= 0.0 && up.max(down) > 0.0 && up.is_finite() && down.is_finite()) {
        return with_uncertainty(quantity);
    }
    let larger = up.max(down);
    // Two digits of the larger half do not show a smaller difference.
    if (up - down).abs() < 0.02 * larger {
        return symmetric(quantity.value, larger, unit);
    }
    let (power, prefix) = prefix_for(quantity.value.abs().max(larger), unit);
    let scale = 10f64.powi(power);
    let decimals = decimals_for(larger / scale);
    let symbol = if unit == Unit::One { String::new() } else { format!(" {prefix}{unit}") };
    let (value, up, down) = (quantity.value / scale, up / scale, down / scale);
    format!("{value:.decimals$} +{up:.decimals$}/−{down:.decimals$}{symbol}")
}

fn symmetric(value: f64, expanded: f64, unit: Unit) -> String {
    let (power, prefix) = prefix_for(value.abs().max(expanded), unit);
    let scale = 10f64.powi(power);
    let decimals = decimals_for(expanded / scale);
    let symbol = if unit == Unit::One { String::new() } else { format!(" {prefix}{unit}") };
    let (value, expanded) = (value / scale, expanded / scale);
    format!("{value:.decimals$}{symbol} ± {expanded:.decimals$}{symbol}")
}

/// The prefix that brings `size` to 1…999; numbers and decibels have none.
fn prefix_for(size: f64, unit: Unit) -> (i32, &'static str) {
    if matches!(unit, Unit::One | Unit::Decibel) || size <= 0.0 {
        return (0, "");
    }
    let wanted = (size.log10() / 3.0).floor() as i32 * 3;
    PREFIXES.iter().copied().min_by_key(|(power, _)| (power - wanted).abs()).unwrap_or((0, ""))
}

/// How many decimals show two digits of `expanded`.
fn decimals_for(expanded: f64) -> usize {
    // Rounded to two digits first: 0.0996 needs two decimals, not three.
    let text = format!("{expanded:.1e}");
    let exponent: i32 = text.rsplit('e').next().and_then(|power| power.parse().ok()).unwrap_or(0);
    usize::try_from(1 - exponent).unwrap_or(0).min(12)
}

#[cfg(test)]
mod tests {
    use evenpair_api::{Coverage, CoverageBasis, Grade};

    use super::*;

    #[test]
    fn the_uncertainty_decides_the_digits() {
        let text = |value, u, unit| with_uncertainty(&Quantity::new(value, u, unit));
        assert_eq!(text(2.30123e-9, 6.1e-12, "s"), "2.301 ns ± 0.012 ns");
        assert_eq!(text(0.976_012_3, 1.05e-5, "1"), "0.976012 ± 0.000021");
        assert_eq!(text(11.9, 0.0498, "V"), "11.90 V ± 0.10 V");
        assert_eq!(text(-0.0352, 0.00055, "V"), "-35.2 mV ± 1.1 mV");
        assert_eq!(text(1e-12, 1e-9, "s"), "0.0 ns ± 2.0 ns");
        assert_eq!(text(99_987.0, 600.0, "Hz"), "100.0 kHz ± 1.2 kHz");
    }

    #[test]
    fn a_figure_prints_the_interval_that_it_states() {
        let text = |value, coverage: Option<(f64, f64)>| {
            figure(&Figure {
                name: "rms".to_owned(),
                quantity: Quantity::new(value, 0.05, "V"),
                coverage: coverage.map(|(low, high)| Coverage { low, high, basis: CoverageBasis::Normal }),
                plain: None,
                grade: Grade::Clean,
                valid: true,
                why: None,
                budget: vec![],
            })
        };
        assert_eq!(text(12.0, Some((11.9, 12.1))), "12.00 V ± 0.10 V");
        assert_eq!(text(0.3536, Some((0.3486, 0.4506))), "354 +97/−5 mV");
        assert_eq!(text(12.0, None), "12.00 V ± 0.10 V");
    }

    #[test]
    fn without_an_uncertainty_four_digits_stand() {
        assert_eq!(with_uncertainty(&Quantity::exact(48.0, "V")), "48.00 V");
        assert_eq!(with_uncertainty(&Quantity::exact(f64::NAN, "V")), "NaN V");
    }
}
