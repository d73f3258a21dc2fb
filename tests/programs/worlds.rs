//! Scenarios whose pairs and vertical ranges differ by chance, reproducibly, and one gain, offset and skew of each range
//! is true for every signal.

use evenpair_tests::{LabPlan, set_in_nth, set_in_table};

/// Number `index` of the sequence that `seed` begins, from −1 to 1 (the finaliser of the generator SplitMix64, Steele
/// et al. 2014, from memory; nothing depends on its being exact).
pub(crate) fn chance(seed: u64, index: u64) -> f64 {
    let mut state = (seed * 1000 + index + 1).wrapping_mul(0x9e37_79b9_7f4a_7c15);
    for (shift, factor) in [(30, 0xbf58_476d_1ce4_e5b9_u64), (27, 0x94d0_49bb_1331_11eb)] {
        state = (state ^ (state >> shift)).wrapping_mul(factor);
    }
    state ^= state >> 31;
    (state >> 11) as f64 / (1_u64 << 52) as f64 - 1.0
}

/// The spans that the shipped scenario lists for each leg, in its order, at the scope's input.
const SPANS_V: [f64; 4] = [1.0, 2.0, 5.0, 10.0];

/// The shipped scenario with another pair: gains, delays and noise of the legs by chance, and ranges that differ by up
/// to 1 % in gain, 0.5 % of the span in offset and 50 ps in delay. Both legs have one bandwidth and no error of
/// compensation, so that there is one truth for slow and fast signals alike.
pub(crate) fn world(seed: u64) -> String {
    let mut text = set_in_table(&LabPlan::default().scenario, "", "seed", &seed.to_string());
    let number = |value: f64| format!("{value:e}");
    let noise = 0.003 + 0.001 * chance(seed, 0);
    for leg in [0, 1] {
        for (key, value) in [("noise_of_span", noise), ("compensation_error", 0.0), ("bandwidth_hz", 340e6)] {
            text = set_in_nth(&text, "[[leg]]", leg, key, &number(value));
        }
    }
    text = set_in_nth(&text, "[[leg]]", 1, "gain", &number(1.0 + 0.05 * chance(seed, 1)));
    text = set_in_nth(&text, "[[leg]]", 1, "delay_s", &number(5e-9 + 3e-9 * chance(seed, 2)));
    for range in 0..2 * SPANS_V.len() {
        let by_chance = |what: u64| chance(seed, 10 * (range as u64 + 1) + what);
        let values = [
            ("gain", 1.0 + 0.005 * by_chance(0)),
            ("offset_v", 0.0025 * by_chance(1) * SPANS_V[range % SPANS_V.len()]),
            ("delay_s", 25e-12 * (1.0 + by_chance(2))),
        ];
        for (key, value) in values {
            text = set_in_nth(&text, "[[leg.range]]", range, key, &number(value));
        }
    }
    text
}
