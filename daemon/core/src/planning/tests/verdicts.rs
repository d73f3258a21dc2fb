//! Ranges, verdicts, what agreement is needed, and what a differential probe must offer.

use super::*;

#[test]
fn the_smallest_span_that_holds_the_signal_is_chosen() {
    // -12 V to 60 V at the tip is 7.2 V at the input, around 24 V.
    let range = budget(&gate()).unwrap().range.unwrap();
    assert_eq!((range.input_span_v, range.middle_v), (10.0, 24.0));
    // A range that cannot be shifted must hold 60 V either way: 12 V at the input.
    let mut plan = gate();
    plan.scope.shifts = Some(false);
    let found = budget(&plan).unwrap();
    assert_eq!(found.range, None);
    assert!(!found.verdict.two_probes_do());
    assert!(found.words[0].contains("no range of the scope shows 120 V"), "{:?}", found.words);
    plan.scope.spans_v.push(20.0);
    let range = budget(&plan).unwrap().range.unwrap();
    assert_eq!((range.input_span_v, range.middle_v), (20.0, 0.0));
    // 72 V are just the whole span.
    plan = gate();
    plan.scope.spans_v = vec![7.2, 10.0];
    assert_eq!(budget(&plan).unwrap().range.unwrap().input_span_v, 7.2);
}

#[test]
fn a_deskew_decides() {
    let mut plan = gate();
    let found = budget(&plan).unwrap();
    assert_eq!(found.verdict, Verdict::AfterDeskew);
    assert!(found.differential.is_none());
    plan.signal.accuracy_ratio = Some(0.3);
    assert_eq!(budget(&plan).unwrap().verdict, Verdict::AsTheyAre);
    plan.signal.accuracy_ratio = Some(0.001);
    let found = budget(&plan).unwrap();
    assert_eq!(found.verdict, Verdict::OutOfReach, "the scope's own scale is 1.5 %");
    assert!(found.words.iter().any(|words| words.contains("scale alone")), "{:?}", found.words);
}

/// What is told as needed, put in as reached, gives just the accuracy wanted.
#[test]
fn the_needed_agreement_is_just_enough() {
    for mut plan in [gate(), sine()] {
        let found = budget(&plan).unwrap();
        let needed = found.needed.unwrap();
        plan.after.skew_s = needed.skew_s;
        plan.after.gain = Some(needed.gain);
        (plan.before.skew_s, plan.before.gain) = (Some(1.0), Some(0.5));
        close(budget(&plan).unwrap().totals.unwrap().after_v, found.wanted_v, 1e-9);
    }
}

/// 1 mV over a shunt that swings by 400 V: out of a rejection of 1 % and 1 ns, but no wonder for a probe made for it.
///
/// By hand: wanted is 10 mV, half of it is 5 mV, as a limit 4.330127 mV. 400 V over that are 99.3114 dB. The gain may
/// be 4.330127 mV of 0.2 V, 2.165 %.
#[test]
fn a_differential_probe_is_described() {
    let mut plan = gate();
    plan.signal = Signal {
        swing_v: Some(400.0),
        edge_s: Some(35e-9),
        difference_v: Some(0.2),
        accuracy_v: Some(0.010),
        ..Signal::default()
    };
    (plan.probe.attenuation, plan.probe.rating_v) = (Some(100.0), Some(1000.0));
    plan.scope.spans_v = vec![0.05, 0.1, 0.2, 0.5, 1.0, 2.0, 5.0, 10.0];
    let found = budget(&plan).unwrap();
    assert_eq!(found.verdict, Verdict::DifferentialProbe);
    let needs = found.differential.clone().unwrap();
    close(needs.rejection_dc_db, 99.3114, 1e-5);
    close(needs.rejection_db, 99.3114, 1e-5);
    close(needs.frequency_hz, 10e6, 1e-12);
    close(needs.bandwidth_hz, 30e6, 1e-12);
    close(needs.gain, 0.021_650_635, 1e-7);
    close(needs.common_v, 400.2, 1e-12);
    assert_eq!((needs.differential_v, needs.capacitance_f), (0.2, None));
    // x1 shows ±0.2 V on 0.5 V: the scale's 3.46 mV, noise, steps and linearity keep within 5 mV; on x100 they do not.
    assert!(needs.attenuations.contains(&1.0) && !needs.attenuations.contains(&100.0), "{needs:?}");
    assert!(found.words.iter().any(|words| words.contains("rejection of 100 dB at 10.0 MHz")), "{:?}", found.words);
}

/// Each of the four shares at its end: together they are the accuracy wanted and no more (JCGM 100, 5.1.2).
#[test]
fn a_differential_probes_load_keeps_its_share() {
    let mut plan = gate();
    plan.signal.accuracy_ratio = Some(0.04);
    (plan.source.positive_ohm, plan.source.negative_ohm) = (Some(10e3), Some(0.0));
    (plan.probe.resistance_ohm, plan.probe.capacitance_f) = (Some(10e6), Some(9.5e-12));
    let found = budget(&plan).unwrap();
    let needs = found.differential.unwrap();
    // With such inputs the load's two terms are half of the accuracy at most.
    plan.probe.resistance_ohm = needs.resistance_ohm;
    plan.probe.capacitance_f = needs.capacitance_f;
    let again = budget(&plan).unwrap();
    let load_v = term(&again, "loading, settled").after_v.hypot(term(&again, "loading, edges").after_v);
    assert!(load_v <= found.wanted_v / 2.0 * (1.0 + 1e-9) && load_v > found.wanted_v / 2.5, "{load_v}");
}

#[test]
fn what_is_not_said_is_assumed_and_told() {
    let mut plan = gate();
    (plan.before, plan.after) = (Agreement::default(), Agreement::default());
    plan.scope = Scope { bits: Some(8.0), ..Scope::default() };
    let found = budget(&plan).unwrap();
    for told in [
        "skew before a deskew: 1.0 ns (common practice, no source)",
        "gain before a deskew: 2 % (common practice, no source)",
        "scale specification: ±2 % (common practice, no source)",
        "noise: 0.3 % of the span, rms (common practice, no source)",
    ] {
        assert!(found.assumed.iter().any(|text| text == told), "{told} in {:?}", found.assumed);
    }
    assert!(budget(&gate()).unwrap().assumed.iter().all(|text| text.starts_with("fall of the rating")));
}

#[test]
fn every_flaw_is_told_at_once() {
    let keys = |plan: &Plan| -> Vec<String> { budget(plan).unwrap_err().into_iter().map(|flaw| flaw.key).collect() };
    assert_eq!(
        keys(&Plan::default()),
        [
            "signal.swing",
            "signal.edge",
            "signal.difference",
            "signal.accuracy",
            "probe.attenuation",
            "probe.rating",
            "scope.bits"
        ]
    );
    let mut plan = gate();
    plan.signal.frequency_hz = Some(1e6);
    plan.signal.accuracy_v = Some(0.1);
    plan.source.positive_ohm = Some(50.0);
    plan.scope.spans_v = vec![2.0, 1.0];
    plan.after.skew_s = Some(2e-9);
    plan.before.scale = Some(0.1);
    plan.probe.rating_slope = Some(1.0);
    assert_eq!(
        keys(&plan),
        [
            "signal.frequency",
            "signal.accuracy",
            "probe.resistance",
            "probe.capacitance",
            "probe.rating_corner",
            "scope.spans",
            "before.scale",
            "after.skew"
        ]
    );
    let flaw = &budget(&Plan { signal: Signal { swing_v: Some(-1.0), ..gate().signal }, ..gate() }).unwrap_err()[0];
    assert_eq!(flaw.to_string(), "`signal.swing` is -1.000 V; allowed here: 1.000 µV to 1.000 MV");
}
