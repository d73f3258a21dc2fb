//! Each term against a value worked by hand.

use statrs::distribution::{ContinuousCDF, Normal};

use super::super::motion::Motion;
use super::*;

/// The closed forms that the design names: 1 % of gain 39.96 dB, 1 ns at 1 MHz 44.04 dB; both together 38.5237 dB, from
/// a table of the same closed form made with numpy for this project.
#[test]
fn rejection_is_the_closed_form() {
    let rejection = budget(&sine()).unwrap().rejection;
    assert!((rejection.gain_before_db.unwrap() - 39.9565).abs() < 5e-5);
    assert!((rejection.skew_before_db.unwrap() - 44.0364).abs() < 5e-5);
    assert!((rejection.before_db.unwrap() - 38.5237).abs() < 5e-5);
}

/// 1 % of 48 V is 0.48 V; as a rectangular limit at k = 2 that is 0.48·2/√3 = 0.554256 V (JCGM 100, 4.3.7).
#[test]
fn gain_is_a_part_of_the_common_mode() {
    let found = budget(&gate()).unwrap();
    close(term(&found, "gain").before_v, 0.554_256_258, 1e-8);
    close(term(&found, "gain").after_v, 0.027_712_813, 1e-8);
    // From -400 V to -352 V the swing is the same, but 1 % of 400 V is 4 V.
    let mut low = gate();
    (low.signal.low_v, low.probe.rating_v, low.scope.spans_v) = (Some(-400.0), Some(600.0), vec![10.0]);
    close(term(&budget(&low).unwrap(), "gain").before_v, 4.0 * 1.154_700_538, 1e-8);
}

/// Two phasors of 24 V, 2π·10⁻³ rad apart: 48 V·sin(π·10⁻³) = 0.1507962 V; times 2/√3.
#[test]
fn skew_of_a_sine_is_the_difference_of_two_phasors() {
    close(term(&budget(&sine()).unwrap(), "skew").before_v, 0.150_796_2 * 1.154_700_538, 1e-6);
}

/// The edge that the closed form stands on has the duration it is said to have, and the difference of two of them is
/// nowhere larger than told, by a search over the normal distribution.
#[test]
fn skew_of_an_edge_is_the_largest_difference_of_two_edges() {
    let (duration_s, swing_v) = (25e-9, 48.0);
    let normal = Normal::standard();
    let sigma_s = duration_s / (normal.inverse_cdf(0.9) - normal.inverse_cdf(0.1));
    for skew_s in [10e-12, 1e-9, 10e-9, 40e-9] {
        let difference =
            |at_s: f64| normal.cdf((at_s + skew_s / 2.0) / sigma_s) - normal.cdf((at_s - skew_s / 2.0) / sigma_s);
        let largest = (-500..=500).map(|step| difference(f64::from(step) * 0.1e-9)).fold(0.0, f64::max);
        close(Motion::Edge(duration_s).skew_error_v(swing_v, skew_s), swing_v * largest, 1e-9);
    }
    close(Motion::Edge(duration_s).frequency_hz(), 14e6, 1e-12);
}

#[test]
fn no_skew_makes_more_than_the_swing() {
    for motion in [Motion::Edge(1e-9), Motion::Sine(1e6)] {
        close(motion.skew_error_v(10.0, 1.0), 10.0, 1e-12);
        assert_eq!(motion.skew_for(10.0, 10.5), None);
        let skew_s = motion.skew_for(10.0, 2.5).unwrap();
        close(motion.skew_error_v(10.0, skew_s), 2.5, 1e-9);
    }
}

/// Ohm's law by hand: 100 kΩ into 10 MΩ lose 0.1/10.1 = 0.00990099 of what the tip sees. The positive tip sees
/// 48 V + 12 V, the negative one stands on 0 Ω: 0.594059 V; on equal sources only the difference's 0.118812 V is left.
#[test]
fn loading_at_dc_is_ohms_law() {
    let mut plan = gate();
    plan.source.positive_ohm = Some(100e3);
    (plan.probe.resistance_ohm, plan.probe.capacitance_f) = (Some(10e6), Some(0.0));
    let found = budget(&plan).unwrap();
    close(found.loading[0].at_dc, 0.009_900_990, 1e-7);
    assert_eq!(found.loading[1].at_dc, 0.0);
    close(term(&found, "loading, settled").after_v, 0.594_059_406 * 1.154_700_538, 1e-8);
    plan.source.negative_ohm = Some(100e3);
    let found = budget(&plan).unwrap();
    close(term(&found, "loading, settled").before_v, 0.118_811_881 * 1.154_700_538, 1e-8);
}

/// 1 kΩ and 10 pF have a corner at 1/(2π·10 ns) = 15.915494 MHz, where |1 − H| = |j/(1 + j)| = 1/√2 (Kirchhoff). On
/// that sine the common mode's 24 V and the difference's 12 V lose 36 V/√2.
#[test]
fn loading_of_a_sine_is_the_divider_of_r_and_c() {
    let mut plan = sine();
    plan.signal.frequency_hz = Some(15.915_494_309e6);
    (plan.source.positive_ohm, plan.probe.capacitance_f) = (Some(1e3), Some(10e-12));
    plan.probe.resistance_ohm = Some(1e15);
    let found = budget(&plan).unwrap();
    close(found.loading[0].at_frequency, std::f64::consts::FRAC_1_SQRT_2, 1e-9);
    close(term(&found, "loading, moving").after_v, 25.455_844_1 * 1.154_700_538, 1e-8);
}

/// 5 Ω and 9.5 pF are late by 47.5 ps; 48 V that move by 1.0225·48 V/25 ns at their steepest are then off by 93.25 mV,
/// and the difference's 12 V by 23.31 mV. An edge through that pole, computed sample by sample, is not worse.
#[test]
fn loading_of_an_edge_is_a_lag() {
    let mut plan = gate();
    (plan.source.positive_ohm, plan.probe.capacitance_f) = (Some(5.0), Some(9.5e-12));
    plan.probe.resistance_ohm = Some(10e6);
    let found = budget(&plan).unwrap();
    close(found.loading[0].lag_s, 47.5e-12, 1e-5);
    let told_v = term(&found, "loading, edges").after_v / 1.154_700_538;
    close(told_v, 0.116_56, 1e-3);
    // Backward Euler of one pole on the Gaussian edge of the whole 60 V.
    let normal = Normal::standard();
    let (sigma_s, step_s, tau_s) = (25e-9 / 2.563_103_131, 1e-12, 47.5e-12);
    let (mut out_v, mut worst_v) = (0.0, 0.0_f64);
    for step in -60_000..60_000 {
        let in_v = 60.0 * normal.cdf(f64::from(step) * step_s / sigma_s);
        out_v += (in_v - out_v) * step_s / (tau_s + step_s);
        worst_v = worst_v.max(in_v - out_v);
    }
    assert!(worst_v < told_v * 1.0001 && worst_v > told_v * 0.99, "{worst_v} against {told_v}");
}

/// 10 V at the input behind x10 are 100 V in 256 steps of 0.390625 V: u = q/√12 = 0.1127637 V a leg, times 2·√2. With
/// 0.27 V of noise 16 sweeps leave a quarter of it (0.69 steps of noise leave 2·10⁻⁵ of the rest).
#[test]
fn quantisation_and_noise_by_hand() {
    let mut plan = gate();
    plan.scope.averages = Some(1.0);
    let found = budget(&plan).unwrap();
    assert_eq!(found.range.unwrap().input_span_v, 10.0);
    close(found.range.unwrap().step_v, 0.390_625, 1e-12);
    close(term(&found, "quantisation").before_v, 0.318_944_0, 1e-6);
    close(term(&found, "noise").before_v, 0.27 * 8f64.sqrt(), 1e-12);
    close(term(&found, "linearity").before_v, 0.3 * 0.390_625 * 8f64.sqrt() / 3f64.sqrt(), 1e-12);
    let averaged = budget(&gate()).unwrap();
    close(term(&averaged, "quantisation").before_v, 0.318_944_0 / 4.0, 1e-3);
    close(term(&averaged, "noise").before_v, 0.27 * 8f64.sqrt() / 4.0, 1e-12);
    // Without noise nothing but q²/12 − q²/2π² averages.
    plan.scope.noise_ratio = Some(0.0);
    plan.scope.averages = Some(1e9);
    let pi = std::f64::consts::PI;
    let stays_v = 8f64.sqrt() * 0.390_625 / (pi * std::f64::consts::SQRT_2);
    close(term(&budget(&plan).unwrap(), "quantisation").after_v, stays_v, 1e-6);
}

/// IEEE Std 1057 (from memory): ENOB = N − log₂(rms/(q/√12)), so 7 effective bits on 100 V are 100/(128·√12) V rms.
#[test]
fn effective_bits_count_noise_and_linearity() {
    let mut plan = gate();
    plan.scope = Scope { enob: Some(7.0), spans_v: vec![10.0], averages: Some(100.0), ..Scope::default() };
    let found = budget(&plan).unwrap();
    close(term(&found, "quantisation").after_v, 8f64.sqrt() * 100.0 / (128.0 * 12f64.sqrt()), 1e-12);
    assert!(found.terms.iter().all(|term| !["noise", "linearity"].contains(&term.name.as_str())));
}

/// A pole of 10 MHz on a 1 MHz sine: 1 − 1/√1.01 = 0.4962809 %.
#[test]
fn bandwidth_of_a_sine_is_one_pole() {
    let mut plan = sine();
    plan.probe.bandwidth_hz = Some(10e6);
    close(term(&budget(&plan).unwrap(), "bandwidth").after_v, 12.0 * 0.004_962_809 * 1.154_700_538, 1e-6);
}

#[test]
fn totals_are_root_sums_of_squares() {
    let found = budget(&gate()).unwrap();
    let totals = found.totals.unwrap();
    let sum =
        |keep: fn(&&Term) -> bool| found.terms.iter().filter(keep).map(|t| t.after_v * t.after_v).sum::<f64>().sqrt();
    close(totals.after_v, sum(|_| true), 1e-12);
    close(totals.settled_after_v.unwrap(), sum(|term| term.when == When::Always), 1e-12);
    assert_eq!(budget(&sine()).unwrap().totals.unwrap().settled_after_v, None);
}
