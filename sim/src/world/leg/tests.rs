//! Ranges and coupling.

use super::*;
use crate::world::fixture::{scenario, scope};
use crate::world::wave::Wave;

#[test]
fn a_listed_range_is_taken_as_it_is() {
    let leg = &scenario().legs[0];
    assert_eq!(range(leg, 1, 2.0 + 1e-9), leg.ranges[0]);
}

#[test]
fn other_ranges_are_placed_by_the_seed_within_their_limits() {
    let legs = scenario().legs;
    let spans = [0.05, 0.1, 0.2, 0.5, 1.0, 5.0, 10.0, 20.0, 50.0];
    let mut seen = Vec::new();
    for (leg, seed) in [(&legs[0], 1), (&legs[1], 1), (&legs[0], 2)] {
        for span_v in spans {
            let found = range(leg, seed, span_v);
            assert_eq!(found, range(leg, seed, span_v));
            assert!((found.gain - 1.0).abs() <= 0.005, "{found:?}");
            assert!(found.offset_v.abs() <= 0.005 * span_v && found.delay_s.abs() <= 20e-12, "{found:?}");
            seen.push(found.gain);
        }
    }
    seen.sort_by(f64::total_cmp);
    assert!(seen.windows(2).all(|pair| pair[0] < pair[1]), "two ranges are alike: {seen:?}");
    // 27 draws out of ±0.5 %: all on one side, or all within a tenth, would be no draw.
    assert!(seen[0] < 0.999 && seen[26] > 1.001, "{seen:?}");
}

#[test]
fn coupling_takes_the_mean_or_all_but_not_the_offset() {
    let leg = &scenario().legs[0];
    let tip = Wave::polyline(1e-6, &[(0.0, 10.0), (0.1e-6, 20.0), (0.5e-6, 20.0), (0.6e-6, 10.0)]);
    let levels = [Coupling::Dc, Coupling::Ac, Coupling::Ground].map(|coupling| {
        let channel = ChannelSettings { coupling, ..scope(2.0, 0.0, 1e-9, 10).channels[0].clone() };
        let signal = Signal::new(leg, 1, 0.0, &channel, &tip);
        signal.gain * signal.wave.mean() + signal.offset_v
    });
    // Mean of the trapezoid: 15 V; gain 0.99·1.01/10; offset of the range 2 mV.
    for (found, expected) in levels.iter().zip([15.0 * 0.09999 + 0.002, 0.002, 0.002]) {
        assert!((found - expected).abs() < 1e-9, "{levels:?}");
    }
}
