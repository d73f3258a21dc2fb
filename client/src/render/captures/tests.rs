use evenpair_api::{Condition, Coverage, LeakBound, LimitVerdict, Quantity};

use super::*;
use crate::render::WIDTH;

fn capture() -> Capture {
    let volts = |value| Quantity::exact(value, "V");
    let figure = |name: &str, value: f64, unit: &str| Figure {
        name: name.to_owned(),
        quantity: Quantity::new(value, value.abs() * 0.004, unit),
        coverage: Some(Coverage { low: value * 0.992, high: value * 1.008, basis: CoverageBasis::Normal }),
        plain: Some(value * 0.93),
        grade: Grade::Shaded,
        valid: true,
        why: None,
        budget: vec![],
    };
    let mut broken = figure("rise_time", 0.0, "s");
    broken.valid = false;
    broken.why = Some("the record holds no rising transition that is complete from 10 % to 90 %".to_owned());
    Capture {
        run: uuid::Uuid::nil(),
        number: 112,
        pair: "gate".to_owned(),
        made_at: jiff::Timestamp::UNIX_EPOCH,
        conditions: vec![
            Condition { setting: "bus_voltage".to_owned(), value: volts(48.0) },
            Condition { setting: "fan_brake".to_owned(), value: Quantity::exact(1.5, "A") },
        ],
        correction: None,
        correction_state: None,
        figures: vec![figure("high_level", 11.8712, "V"), broken],
        leak: LeakBound { rms: volts(0.004), peak: volts(0.02), common_rms: volts(30.0), common_swing: volts(48.0) },
        limits: vec![LimitVerdict {
            figure: "high_level".to_owned(),
            min: None,
            max: Some(11.0),
            passed: false,
            uncertain: false,
        }],
        warnings: vec![],
        points: 10_000,
        sample_interval: Quantity::exact(1e-9, "s"),
        file: String::new(),
    }
}

#[test]
fn tables_fit_the_terminal_and_hold_what_they_say() {
    for text in [captures(&[capture()], "high_level"), figures(&capture()), capture_summary(&capture())] {
        assert!(text.lines().all(|line| line.chars().count() <= WIDTH), "{text}");
    }
    let text = captures(&[capture()], "high_level");
    for word in ["112", "48.0 V, 1.50 A", "11.871 V ± 0.095 V", "11.04 V", "shaded", "EXCEEDED"] {
        assert!(text.contains(word), "{word} is missing in\n{text}");
    }
    assert!(figures(&capture()).contains("not valid"));
    let mut limited = capture();
    limited.figures[0].coverage = Some(Coverage { low: 11.0, high: 11.9, basis: CoverageBasis::CommonMode });
    let text = figures(&limited);
    assert!(text.contains("11.87 +0.03/−0.87 V") && text.contains("common-mode limited"), "{text}");
    assert!(text.lines().all(|line| line.chars().count() <= WIDTH), "{text}");
    assert!(capture_summary(&capture()).contains("1 limit(s) exceeded"));
}
