//! Which answers agree with what was set.

use super::*;

fn vertical(span_v: f64, offset_v: f64) -> Fields {
    let mut fields = Fields::new();
    fields.set("span_v", span_v);
    fields.set("offset_v", offset_v);
    fields
}

#[test]
fn a_trial_changes_one_thing_and_stays_within_the_range() {
    assert_eq!(other(Intent::VerticalSet, &vertical(8.0, 1.0), None), vertical(4.0, 1.0));
    let skew = SkewSetting { step_s: 50e-12, range_s: 100e-9 };
    let delay = |delay_s: f64| {
        let mut fields = Fields::new();
        fields.set("delay_s", delay_s);
        other(Intent::SkewSet, &fields, Some(skew)).number("delay_s").unwrap_or(0.0)
    };
    assert!((delay(0.0) - 0.5e-9).abs() < 1e-15);
    assert!((delay(100e-9) - 99.5e-9).abs() < 1e-15);
}

#[test]
fn rounding_is_told_from_a_factor() {
    let (asked, before) = (vertical(4.0, 1.0), vertical(8.0, 1.0));
    let agree = |said: &Fields| compare(&asked, said, &before, None);
    assert_eq!(agree(&vertical(4.001, 1.01)), Agreement::Same);
    assert!(matches!(agree(&vertical(5.0, 1.0)), Agreement::Rounded(words) if words.contains("span_v: 4e0 was asked")));
    // Nothing happened; half of it happened; the other way round.
    for said in [vertical(8.0, 1.0), vertical(2.0, 1.0), vertical(4.0, -1.0), Fields::new()] {
        assert!(matches!(agree(&said), Agreement::Differs(_)), "{said:?}");
    }
}
