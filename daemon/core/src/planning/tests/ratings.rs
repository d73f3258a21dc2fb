//! Ratings come first.

use super::super::rating::{Fall, rating_at};
use super::*;

#[test]
fn a_rating_falls_as_it_is_stated() {
    assert_eq!(rating_at(300.0, &Fall::Flat, 1e9), Some(300.0));
    let corner = Fall::Corner { corner_hz: 3e6, slope: 1.0 };
    assert_eq!(rating_at(300.0, &corner, 1e3), Some(300.0));
    close(rating_at(300.0, &corner, 30e6).unwrap(), 30.0, 1e-12);
    let point = |frequency_hz, rating_v| Derating { frequency_hz, rating_v };
    let points = Fall::Points(vec![point(1e6, 300.0), point(100e6, 3.0)]);
    assert_eq!(rating_at(400.0, &points, 1e3), Some(300.0), "the first point is a lower statement than the rating");
    // Straight on logarithmic axes: the geometric mean in the middle.
    close(rating_at(300.0, &points, 10e6).unwrap(), 30.0, 1e-12);
    assert_eq!(rating_at(300.0, &points, 100e6), Some(3.0));
    assert_eq!(rating_at(300.0, &points, 101e6), None, "nothing is stated there");
}

/// 48 V and 12 V either way and 5 V of ringing: 65 V at 14 MHz, where 20 dB per decade from 2.5 MHz leave 300 V·2.5/14 =
/// 53.6 V. Refused although the accuracy would be reached.
#[test]
fn a_tip_above_its_rating_is_refused_first() {
    let mut plan = gate();
    plan.signal.headroom_v = Some(5.0);
    assert_eq!(budget(&plan).unwrap().verdict, Verdict::AfterDeskew);
    plan.probe.rating_corner_hz = Some(2.5e6);
    let found = budget(&plan).unwrap();
    assert_eq!(found.verdict, Verdict::Refused);
    assert_eq!(
        found.words[0],
        "Do not connect these probes: a tip would see 65.0 V, but is rated for 53.6 V at 14.0 MHz."
    );
    assert!(found.range.is_none() && found.terms.is_empty() && found.needed.is_none() && found.totals.is_none());
    // What is asked of a differential probe holds the voltage.
    assert_eq!(found.differential.unwrap().common_v, 65.0);
}

#[test]
fn a_rating_that_ends_too_early_is_refused() {
    let mut plan = gate();
    plan.probe.derating = vec![Derating { frequency_hz: 1e6, rating_v: 300.0 }];
    let found = budget(&plan).unwrap();
    assert_eq!(found.verdict, Verdict::Refused);
    assert!(found.words[0].contains("not stated up to 14.0 MHz"), "{}", found.words[0]);
    assert_eq!(found.tip.rating_v, None);
}

#[test]
fn the_scopes_input_has_a_rating_too() {
    let mut plan = gate();
    plan.scope.rating_v = Some(5.0);
    let found = budget(&plan).unwrap();
    assert_eq!(found.verdict, Verdict::Refused);
    assert!(
        found.words[0].contains("the scope's input would see 6.00 V, but is rated for 5.00 V"),
        "{:?}",
        found.words
    );
    // 12 V behind 2 are above 5 V, behind 5 they are not.
    let wanted = found.differential.unwrap();
    assert!(wanted.attenuations.iter().all(|attenuation| 12.0 / attenuation <= 5.0), "{wanted:?}");
}
