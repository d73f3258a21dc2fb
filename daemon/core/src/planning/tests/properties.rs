//! What must hold for every plan.

use proptest::prelude::*;

use super::*;

/// Numbers over decades.
fn decades(from: f64, to: f64) -> impl Strategy<Value = f64> {
    (from.log10()..to.log10()).prop_map(|power| 10f64.powf(power))
}

fn maybe(strategy: impl Strategy<Value = f64>) -> impl Strategy<Value = Option<f64>> {
    proptest::option::of(strategy)
}

fn signals() -> impl Strategy<Value = Signal> {
    let moves = prop_oneof![
        decades(1e-10, 1e-3).prop_map(|edge_s| (Some(edge_s), None)),
        decades(1.0, 1e9).prop_map(|frequency_hz| (None, Some(frequency_hz))),
    ];
    (decades(0.01, 1e4), -1e3..1e3, moves, decades(1e-3, 1e3), 0.0..100.0, decades(1e-4, 1.0)).prop_map(
        |(swing, low, (edge_s, frequency_hz), difference, headroom, accuracy)| Signal {
            swing_v: Some(swing),
            low_v: Some(low),
            edge_s,
            frequency_hz,
            difference_v: Some(difference),
            headroom_v: Some(headroom),
            accuracy_v: None,
            accuracy_ratio: Some(accuracy),
        },
    )
}

fn probes() -> impl Strategy<Value = Probe> {
    let corner = maybe(decades(1e3, 1e8));
    (decades(1.0, 1e3), decades(1e5, 1e8), decades(1e-13, 1e-10), decades(10.0, 1e4), corner, any::<bool>()).prop_map(
        |(attenuation, resistance, capacitance, rating_v, corner_hz, points)| Probe {
            attenuation: Some(attenuation),
            resistance_ohm: Some(resistance),
            capacitance_f: Some(capacitance),
            bandwidth_hz: Some(350e6),
            rating_v: Some(rating_v),
            rating_corner_hz: corner_hz.filter(|_| !points),
            rating_slope: None,
            derating: match corner_hz {
                Some(frequency_hz) if points => vec![
                    Derating { frequency_hz, rating_v },
                    Derating { frequency_hz: 20.0 * frequency_hz, rating_v: rating_v / 7.0 },
                ],
                _ => Vec::new(),
            },
        },
    )
}

fn plans() -> impl Strategy<Value = Plan> {
    let scope = (4.0..16.0, maybe(decades(1.0, 400.0)), 1.0..1000.0, 0.0..0.01);
    let sources = (maybe(decades(0.01, 1e6)), maybe(decades(0.01, 1e6)));
    let after = (decades(1e-13, 1e-9), decades(1e-6, 0.02));
    (signals(), probes(), scope, sources, after).prop_map(
        |(signal, probe, (bits, rating_v, averages, scale), (positive_ohm, negative_ohm), (skew_s, gain))| Plan {
            signal,
            probe,
            source: Source { positive_ohm, negative_ohm },
            scope: Scope {
                bits: Some(bits),
                rating_v,
                averages: Some(averages),
                scale_spec: Some(scale),
                ..Scope::default()
            },
            before: Agreement::default(),
            after: Agreement { skew_s: Some(skew_s), gain: Some(gain), ..Agreement::default() },
        },
    )
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(2000))]

    #[test]
    fn more_deskew_never_predicts_more_error(plan in plans(), less_skew in 0.0..1.0, less_gain in 0.0..1.0) {
        let found = budget(&plan).unwrap();
        let mut better = plan.clone();
        better.after.skew_s = plan.after.skew_s.map(|skew_s| skew_s * less_skew);
        better.after.gain = plan.after.gain.map(|gain| gain * less_gain);
        let again = budget(&better).unwrap();
        if let (Some(before), Some(after)) = (found.totals, again.totals) {
            prop_assert!(before.after_v <= before.before_v);
            prop_assert!(after.after_v <= before.after_v * (1.0 + 1e-12));
            prop_assert!(after.settled_after_v <= before.settled_after_v.map(|v| v * (1.0 + 1e-12)));
        }
        prop_assert_eq!(found.totals.is_some(), again.totals.is_some());
        prop_assert!(!found.verdict.two_probes_do() || again.verdict.two_probes_do());
    }

    #[test]
    fn no_recommendation_exceeds_a_stated_rating(plan in plans()) {
        let found = budget(&plan).unwrap();
        let tip = found.tip;
        let (probe, scope_rating_v) = (&plan.probe, plan.scope.rating_v.unwrap_or(f64::INFINITY));
        // Recomputed from the plan alone.
        let signal = &plan.signal;
        let beyond_v = signal.difference_v.unwrap() + signal.headroom_v.unwrap();
        let high_v = signal.low_v.unwrap() + signal.swing_v.unwrap() + beyond_v;
        let most_v = high_v.abs().max((signal.low_v.unwrap() - beyond_v).abs());
        close(tip.most_v, most_v, 1e-12);
        let frequency_hz = signal.frequency_hz.or_else(|| signal.edge_s.map(|edge_s| 0.35 / edge_s)).unwrap();
        let mut allowed_v = probe.rating_v.unwrap();
        if let Some(corner_hz) = probe.rating_corner_hz {
            allowed_v *= (corner_hz / frequency_hz).min(1.0);
        }
        if let Some(last) = probe.derating.last() {
            allowed_v = if frequency_hz > last.frequency_hz { 0.0 } else { allowed_v };
        }
        let holds = most_v <= allowed_v && most_v / probe.attenuation.unwrap() <= scope_rating_v;
        if !holds {
            prop_assert_eq!(found.verdict, Verdict::Refused);
            prop_assert!(found.words[0].starts_with("Do not connect"));
        }
        if found.verdict == Verdict::Refused {
            prop_assert!(found.range.is_none() && found.needed.is_none() && found.terms.is_empty());
        } else {
            prop_assert!(tip.most_v <= tip.rating_v.unwrap());
            prop_assert!(tip.rating_v.unwrap() <= allowed_v);
        }
        if let Some(needs) = &found.differential {
            prop_assert!(!needs.attenuations.is_empty() && needs.common_v >= most_v * (1.0 - 1e-12));
            for attenuation in &needs.attenuations {
                prop_assert!(beyond_v / attenuation <= scope_rating_v * (1.0 + 1e-12));
            }
        }
    }

    #[test]
    fn every_number_is_finite_and_every_plan_has_words(plan in plans()) {
        let found = budget(&plan).unwrap();
        prop_assert!(!found.words.is_empty());
        for term in &found.terms {
            prop_assert!(term.before_v.is_finite() && term.after_v.is_finite() && term.after_v >= 0.0, "{:?}", term);
        }
        // Infinities and NaN become null in JSON: there must be no more of them than fields left empty.
        let json = serde_json::to_value(&found).unwrap();
        prop_assert!(json["tip"]["most_v"].is_number() && json["frequency_hz"].is_number());
        if let Some(needs) = found.differential {
            for value in [needs.bandwidth_hz, needs.rejection_db, needs.rejection_dc_db, needs.gain] {
                prop_assert!(value.is_finite() && value >= 0.0);
            }
        }
        // A deskew that is enough is no better than the one that is needed.
        if found.verdict == Verdict::AfterDeskew {
            let needed = found.needed.unwrap();
            prop_assert!(plan.after.gain.unwrap() <= needed.gain * (1.0 + 1e-9));
            prop_assert!(needed.skew_s.is_none_or(|skew_s| plan.after.skew_s.unwrap() <= skew_s * (1.0 + 1e-6)));
        }
    }
}
