//! Plans as files, and as JSON.

use super::*;

const EXAMPLE: &str = include_str!("../../../../../configs/budgets/high-side-gate.toml");

#[test]
fn the_example_is_complete_and_will_do_after_a_deskew() {
    let written = read(EXAMPLE).unwrap();
    let found = budget(&written.plan).unwrap();
    assert_eq!(found.verdict, Verdict::AfterDeskew, "{:?}", found.words);
    assert!(found.assumed.is_empty(), "{:?}", found.assumed);
    // It survives the way over JSON.
    let json = serde_json::to_value(&written.plan).unwrap();
    assert_eq!(serde_json::from_value::<Plan>(json).unwrap(), written.plan);
}

#[test]
fn mistakes_stand_at_their_places() {
    let text = "[signal]\nswing = \"48 ns\"\naccuracy = \"2 s\"\nwidth = 3\n[scope]\nscale_spec = \"two\"\n";
    let found: Vec<(String, String)> =
        read(text).unwrap_err().into_iter().map(|m| (text[m.span].to_owned(), m.what)).collect();
    let places: Vec<&str> = found.iter().map(|(place, _)| place.as_str()).collect();
    assert_eq!(places, ["\"48 ns\"", "\"2 s\"", "width", "\"two\""], "{found:?}");
}

#[test]
fn flaws_become_mistakes_at_their_keys() {
    let text = "[signal]\nswing = \"-48 V\"\nedge = \"25 ns\"\nfrequency = \"1 MHz\"\n[probe]\nattenuation = 10\n";
    let written = read(text).unwrap();
    let flaws = budget(&written.plan).unwrap_err();
    let mistakes = written.mistakes(&flaws);
    let at = |key: &str| {
        let mistake = mistakes.iter().find(|mistake| mistake.what.starts_with(&format!("`{key}`"))).unwrap();
        text[mistake.span.clone()].to_owned()
    };
    assert_eq!(at("signal.swing"), "swing");
    assert_eq!(at("signal.frequency"), "frequency");
    assert!(at("probe.rating").starts_with("[probe]"), "a key that is missing is missed in its table");
    assert!(at("scope.bits").is_empty(), "and a table in the file");
}

#[test]
fn volts_and_ratios_are_told_apart() {
    assert_eq!(parse_volts_or_ratio("100 mV").unwrap(), (Some(0.1), None));
    assert_eq!(parse_volts_or_ratio("2 %").unwrap(), (None, Some(0.02)));
    assert_eq!(parse_volts_or_ratio("0.02").unwrap(), (None, Some(0.02)));
    assert!(parse_volts_or_ratio("2 ns").is_err() && parse_volts_or_ratio("2 V %").is_err());
    assert_eq!(parse_ratio("1.5%").unwrap(), 0.015);
    assert!(parse_ratio("1.5 V").is_err());
}

#[test]
fn what_is_laid_over_replaces_and_the_rest_stays() {
    let mut over = Plan::default();
    over.signal.frequency_hz = Some(1e6);
    over.signal.accuracy_v = Some(0.5);
    over.scope.enob = Some(7.0);
    let plan = gate().overlaid(over);
    assert_eq!((plan.signal.edge_s, plan.signal.frequency_hz), (None, Some(1e6)));
    assert_eq!((plan.signal.accuracy_v, plan.signal.accuracy_ratio), (Some(0.5), None));
    assert_eq!((plan.scope.bits, plan.scope.enob), (None, Some(7.0)));
    assert_eq!(plan.signal.swing_v, Some(48.0));
    assert_eq!(gate().overlaid(Plan::default()), gate());
}
