//! Each condition that differs is named, and rounding is not a difference.

#![allow(clippy::unwrap_used, clippy::float_cmp)]

use super::*;

fn leg(channel: u32) -> LegConditions {
    LegConditions {
        channel,
        span_v: 100.0,
        offset_v: 35.0,
        coupling: "DC".to_owned(),
        attenuation: 10.0,
        probe: "p10a".to_owned(),
        scope_skew_s: Some(0.0),
    }
}

fn conditions() -> Conditions {
    Conditions {
        scope_identity: "bench,scope,1,1".to_owned(),
        positive: leg(1),
        negative: leg(2),
        skew_reference: "fast".to_owned(),
        gain_reference: "in_situ".to_owned(),
        carried: Some(Carried { from_span_v: 20.0, u_s: 25e-12 }),
    }
}

#[test]
fn equal_conditions_hold_through_rounded_replies_and_other_references() {
    let mut now = conditions();
    now.positive.span_v = 100.000_000_01;
    now.negative.offset_v = 34.999_999;
    now.skew_reference = "other".to_owned();
    now.carried = None;
    assert_eq!(differences(&conditions(), &now), Vec::<String>::new());
}

#[test]
fn each_condition_that_differs_is_named() {
    type Change = fn(&mut Conditions);
    let table: [(Change, &str); 8] = [
        (|c| c.scope_identity = "other".to_owned(), "it was made with the scope `bench,scope,1,1`, now it is `other`"),
        (|c| c.positive.channel = 3, "the positive leg's channel was 1, now it is 3"),
        (|c| c.negative.probe = "p10b".to_owned(), "the negative leg's probe was `p10a`, now it is `p10b`"),
        (|c| c.negative.attenuation = 1.0, "the negative leg's attenuation was 10, now it is 1"),
        (|c| c.negative.coupling = "AC".to_owned(), "the negative leg's coupling was DC, now it is AC"),
        (|c| c.positive.span_v = 50.0, "the positive leg's vertical span at the tip was 100 V, now it is 50 V"),
        (|c| c.negative.offset_v = 0.0, "the negative leg's vertical offset at the tip was 35 V, now it is 0 V"),
        (
            |c| c.negative.scope_skew_s = Some(2.3e-9),
            "the negative leg's skew setting in the scope was 0 s, now it is 2.3 ns",
        ),
    ];
    for (change, wanted) in table {
        let mut now = conditions();
        change(&mut now);
        assert_eq!(differences(&conditions(), &now), [wanted]);
    }
}

#[test]
fn age_makes_stale_only_beyond_the_limit() {
    assert_eq!(too_old(3600.0, 3600.0), None);
    assert_eq!(too_old(45_000.0, 43_200.0).as_deref(), Some("it is 12.5 h old, the pair allows 12 h"));
    assert!(too_old(-1.0, 3600.0).is_some());
}

#[test]
fn conditions_survive_json() {
    let text = serde_json::to_string(&conditions()).unwrap();
    assert_eq!(serde_json::from_str::<Conditions>(&text).unwrap(), conditions());
}
