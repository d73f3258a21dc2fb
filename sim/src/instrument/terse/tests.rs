//! Literal lines to the terse instruments.

use super::*;
use crate::instrument::fixture::{Rack, dialogue, rack};
use crate::scenario::PersonalitySpec;

fn terse() -> Rack {
    rack(PersonalitySpec::Terse)
}

#[tokio::test]
async fn replies_repeat_the_header() {
    let lines = [("ID?", "ID A,B,C,D\n"), ("er?", "ER 0\n"), ("VD2?", "VD2 1.0E+0\n"), ("LN?", "LN 10000\n"), ("", "")];
    dialogue(&terse().scope, &lines).await;
}

#[tokio::test]
async fn settings_are_told_per_division_as_a_rate_and_in_percent() {
    let lines = [
        // A span of 5 V goes up to 5 V, one of 6 V to 10 V: 1 V per division.
        ("VD1 0.5", ""),
        ("VD1?", "VD1 5.0E-1\n"),
        ("VD1 0.6", ""),
        ("VD1?", "VD1 1.0E+0\n"),
        ("VO1 -2.5", ""),
        ("VO1?", "VO1 -2.5E+0\n"),
        ("SR 250E6", ""),
        ("SR?", "SR 2.5E+8\n"),
        ("PO 10", ""),
        ("PO?", "PO 1.0E+1\n"),
        ("AV 16", ""),
        ("AV?", "AV 16\n"),
        ("AV 1", ""),
        ("AV?", "AV 1\n"),
        ("CP3 G", ""),
        ("CP3?", "CP3 G\n"),
        ("TS 2", ""),
        ("TS?", "TS 2\n"),
        ("TS E", ""),
        ("TS?", "TS E\n"),
        ("TG D", ""),
        ("TG?", "TG D\n"),
        ("ER?", "ER 0\n"),
    ];
    dialogue(&terse().scope, &lines).await;
}

#[tokio::test]
async fn the_skew_setting_counts_the_other_way_in_coarse_steps() {
    // 2.3 ns lies between 2.0 ns and 2.5 ns, nearer to the latter.
    let rack = terse();
    dialogue(&rack.scope, &[("SK2?", "SK2 0.0E+0\n"), ("SK2 -2.3E-9", ""), ("SK2?", "SK2 -2.5E-9\n")]).await;
    let scope = scope::table();
    let skew = scope.iter().find(|(header, _)| *header == ":SK#").map(|(_, action)| action);
    let Some(Action::Number(skew)) = skew else { panic!("a number") };
    assert!(
        (skew.meant)(-2.5e-9) > 0.0,
        "a negative number shifts the record earlier, which the world counts positive"
    );
}

#[tokio::test]
async fn errors_are_numbers_in_the_order_they_came() {
    let lines = [
        ("XX 1", ""),
        ("VD1 A", ""),
        ("VD1 1000", ""),
        ("WF1?", ""),
        ("VD9 1", ""),
        ("ER?", "ER 1\n"),
        ("ER?", "ER 2\n"),
        ("ER?", "ER 3\n"),
        ("ER?", "ER 5\n"),
        ("ER?", "ER 1\n"),
        ("ER?", "ER 0\n"),
        ("XX", ""),
        ("CE", ""),
        ("ER?", "ER 0\n"),
    ];
    dialogue(&terse().scope, &lines).await;
}

#[tokio::test]
async fn a_record_is_an_echoed_block_of_big_endian_codes() {
    let rack = terse();
    dialogue(&rack.scope, &[("LN 20", ""), ("TS N", ""), ("AV 16", ""), ("GO", ""), ("DN?", "DN 1\n")]).await;
    let preamble = String::from_utf8(rack.scope.run(b"PR2?").await).unwrap();
    let fields: Vec<&str> = preamble.trim_end().strip_prefix("PR2 ").unwrap().split(',').collect();
    assert_eq!(fields[5..10], ["1.0E+9", "-9.5E-9", "20", "16", "1"], "{preamble}");
    let data = rack.scope.run(b"WF2?").await;
    assert_eq!((&data[..8], data.len(), data[48]), (&b"WF2 #240"[..], 49, b'\n'));
    // A channel of 10 V whose tip hangs open lies near the middle: its averaged codes are small beside 2^15.
    let first = i16::from_be_bytes([data[8], data[9]]);
    assert!(first.abs() < 256, "{first}");
}

#[tokio::test]
async fn generator_supply_and_switch() {
    let rack = terse();
    let lines = [
        ("WV1 Q", ""),
        ("WV1?", "WV1 Q\n"),
        ("HZ1 1E6", ""),
        ("PP1 10", ""),
        ("OF1 5", ""),
        ("ED1 3E-9", ""),
        ("DU1 29", ""),
        ("DU1?", "DU1 2.9E+1\n"),
        ("ON1 1", ""),
        ("ON1?", "ON1 1\n"),
        ("ZE", ""),
        ("ON1?", "ON1 0\n"),
        ("ER?", "ER 0\n"),
    ];
    dialogue(&rack.generator, &lines).await;
    dialogue(&rack.supply, &[("VS1 48", ""), ("AS1 5", ""), ("ON1 1", ""), ("ER?", "ER 0\n")]).await;
    let reading = String::from_utf8(rack.supply.run(b"VM1?").await).unwrap();
    let volts: f64 = reading.trim_end().strip_prefix("VM1 ").unwrap().parse().unwrap();
    assert!((volts - 48.0).abs() < 0.48, "{reading}");
    let lines = [
        ("JN (@102)", ""),
        ("JN?(@101,102)", "JN 0,1\n"),
        ("JN (@101)", ""),
        ("ER?", "ER 4\n"),
        ("PA", ""),
        ("JN? (@102)", "JN 0\n"),
    ];
    dialogue(&rack.switch, &lines).await;
}
