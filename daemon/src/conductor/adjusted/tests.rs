//! Which differences are told, which are errors, and which are neither.

#![allow(clippy::unwrap_used)]

use evenpair_core::bench::{Slope, Trigger};

use super::*;

const ASKED: Acquisition = Acquisition {
    span_v: 80.0,
    offset_v: 20.0,
    interval_s: 2e-9,
    points: 20_000,
    averages: 16,
    position: 0.5,
    trigger: Trigger { channel: 1, level_v: 24.0, slope: Slope::Positive },
};

fn leg(span_v: f64, offset_v: f64) -> LegSettings {
    LegSettings { span_v, offset_v, coupling: "DC".to_owned(), delay_s: 0.0 }
}

fn judged(got: Acquisition, positive: &LegSettings, negative: &LegSettings) -> Result<Vec<String>, TooSmall> {
    judge(&ASKED, &got, [("positive", positive), ("negative", negative)])
}

#[test]
fn what_was_asked_for_is_not_told() {
    let good = leg(80.0, 20.0);
    assert_eq!(judged(ASKED, &good, &good), Ok(Vec::new()));
    // Digits that the scope does not have, and a hundredth of the span.
    let nearly = Acquisition { interval_s: 2.000_001e-9, position: 0.5001, ..ASKED };
    assert_eq!(judged(nearly, &leg(79.9, 20.3), &good), Ok(Vec::new()));
}

#[test]
fn a_smaller_window_is_an_error_even_where_only_its_middle_moved() {
    let good = leg(80.0, 20.0);
    let small = judged(ASKED, &good, &leg(40.0, 20.0)).unwrap_err();
    assert_eq!(
        small,
        TooSmall { leg: "negative", asked: "-20.00 V to 60.00 V".into(), got: "0.000 V to 40.00 V".into() }
    );
    assert_eq!(judged(ASKED, &leg(80.0, 15.0), &good).unwrap_err().leg, "positive");
    // A wider one that holds it is told only.
    let told = judged(ASKED, &leg(100.0, 15.0), &good).unwrap();
    assert_eq!(told, ["the scope set the positive leg to -35.00 V to 65.00 V instead of -20.00 V to 60.00 V"]);
}

#[test]
fn every_rounded_setting_is_told() {
    let good = leg(80.0, 20.0);
    let trigger = Trigger { level_v: 20.0, ..ASKED.trigger };
    let got = Acquisition { interval_s: 2.5e-9, points: 16_384, averages: 8, position: 0.1, trigger, ..ASKED };
    let told = judged(got, &good, &good).unwrap();
    let expected = [
        "the scope samples every 2.5000 ns instead of every 2.0000 ns",
        "the scope records 16384 samples instead of 20000",
        "the scope averages 8 sweeps instead of 16",
        "the scope has the trigger at 10.0 % of the record instead of 50.0 %",
        "the scope set the trigger's level to 20.00 V instead of 24.00 V",
    ];
    assert_eq!(told, expected);
}
