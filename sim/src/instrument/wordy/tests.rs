//! Literal lines to the wordy instruments.

use crate::instrument::fixture::{Rack, dialogue, rack};
use crate::scenario::PersonalitySpec;

fn wordy() -> Rack {
    rack(PersonalitySpec::Wordy)
}

#[tokio::test]
async fn it_greets_and_serves_one_client() {
    let scope = wordy().scope;
    assert_eq!(scope.greeting(), b"Good day. One guest at a time, please.\r\n");
    let first = scope.admit();
    assert!(first.is_some());
    assert!(scope.admit().is_none());
    drop(first);
    assert!(scope.admit().is_some(), "the place is free again");
}

#[tokio::test]
async fn settings_carry_units_both_ways() {
    let lines = [
        ("CHANNEL1.SPAN=2 V\r", ""),
        ("CHANNEL1.SPAN?\r", "2.0E+0 V\r\n"),
        ("channel1.centre=-250 MV", ""),
        ("CHANNEL1.CENTRE?", "-2.5E-1 V\r\n"),
        ("RECORD.LENGTH=20000", ""),
        ("RECORD.LENGTH?", "20000\r\n"),
        // Ten divisions of 2 us are 20 us: 1 ns from sample to sample.
        ("RECORD.DIVISION=2E-6", ""),
        ("RECORD.DIVISION?", "2.0E-6 S\r\n"),
        ("RECORD.BEFORE=0.1", ""),
        ("RECORD.SWEEPS=64", ""),
        ("RECORD.SWEEPS?", "64\r\n"),
        ("CHANNEL2.ADVANCE=2.32 NS", ""),
        ("CHANNEL2.ADVANCE?", "2.3E-9 S\r\n"),
        ("CHANNEL2.COUPLING=BLOCKED", ""),
        ("CHANNEL2.COUPLING?", "BLOCKED\r\n"),
        ("TRIGGER.FROM=OUTSIDE", ""),
        ("TRIGGER.FROM?", "OUTSIDE\r\n"),
        ("TRIGGER.FROM=CHANNEL3", ""),
        ("TRIGGER.FROM?", "CHANNEL3\r\n"),
        ("TRIGGER.EDGE=FALL", ""),
        ("TRIGGER.EDGE?", "FALL\r\n"),
        ("IDENTITY?", "A,B,C,D\r\n"),
        ("TROUBLE?", "0, all is well\r\n"),
    ];
    dialogue(&wordy().scope, &lines).await;
}

#[tokio::test]
async fn errors_are_unquoted() {
    let lines = [
        ("CHANNEL1.SPON=1", ""),
        ("TROUBLE?", "1113, undefined header\r\n"),
        ("RECORD.LENGTH=1", ""),
        ("TROUBLE?", "1222, data out of range\r\n"),
        ("CHANNEL1.SAMPLES?", ""),
        ("TROUBLE.FORGET", ""),
        ("TROUBLE?", "0, all is well\r\n"),
    ];
    dialogue(&wordy().scope, &lines).await;
}

#[tokio::test]
async fn a_record_is_text_with_units_and_a_preamble_of_keys() {
    let scope = wordy().scope;
    dialogue(&scope, &[("RECORD.LENGTH=10", ""), ("TRIGGER.FROM=NOTHING", ""), ("ACQUIRE.STATE?", "IDLE\r\n")]).await;
    dialogue(&scope, &[("ACQUIRE.BEGIN", "")]).await;
    while scope.run(b"ACQUIRE.STATE?").await != b"IDLE\r\n" {
        tokio::task::yield_now().await;
    }
    let scale = String::from_utf8(scope.run(b"CHANNEL1.SCALE?").await).unwrap();
    // 256 steps of a span of 10 V around 0 V: from -5 V up to 5 V less one step.
    let expected = "NUMBER=1; SAMPLES=10; SWEEPS=1; SPACING=1.0E-9 S; FIRST=-4.5E-9 S; LOWEST=-5.0E+0 V; \
                    HIGHEST=4.9609375E+0 V; GRAIN=3.90625E-2 V; STEP=3.90625E-2 V\r\n";
    assert_eq!(scale, expected);
    let samples = String::from_utf8(scope.run(b"CHANNEL1.SAMPLES?").await).unwrap();
    let volts: Vec<f64> =
        samples.trim_end().split(',').map(|part| part.strip_suffix(" V").unwrap().parse().unwrap()).collect();
    assert_eq!(volts.len(), 10);
    assert!(volts.iter().all(|v| v.abs() < 0.5), "{samples}");
}

#[tokio::test]
async fn a_missing_trigger_is_told_by_a_word() {
    let scope = wordy().scope;
    dialogue(&scope, &[("TRIGGER.FROM=OUTSIDE", ""), ("ACQUIRE.BEGIN", "")]).await;
    while scope.run(b"ACQUIRE.STATE?").await != b"WAITING\r\n" {
        tokio::task::yield_now().await;
    }
    dialogue(&scope, &[("ACQUIRE.CEASE", ""), ("ACQUIRE.STATE?", "IDLE\r\n")]).await;
}

#[tokio::test]
async fn generator_supply_and_switch() {
    let rack = wordy();
    let lines = [
        ("OUTPUT1.SHAPE=SQUARE", ""),
        ("OUTPUT1.SHAPE?", "SQUARE\r\n"),
        ("OUTPUT1.FREQUENCY=1 MHZ", ""),
        ("OUTPUT1.FREQUENCY?", "1.0E+6 HZ\r\n"),
        ("OUTPUT1.SWING=10 V", ""),
        ("OUTPUT1.MIDDLE=5", ""),
        ("OUTPUT1.DUTY=29 PCT", ""),
        ("OUTPUT1.DUTY?", "2.9E+1 PCT\r\n"),
        ("OUTPUT1.EDGE=3 NS", ""),
        ("OUTPUT1.STATE=ON", ""),
        ("OUTPUT1.STATE?", "ON\r\n"),
        ("RESTORE", ""),
        ("OUTPUT1.STATE?", "OFF\r\n"),
        ("TROUBLE?", "0, all is well\r\n"),
    ];
    dialogue(&rack.generator, &lines).await;
    let lines = [("OUTPUT1.VOLTAGE=48 V", ""), ("OUTPUT1.CURRENT=5 A", ""), ("OUTPUT1.STATE=ON", "")];
    dialogue(&rack.supply, &lines).await;
    let reading = String::from_utf8(rack.supply.run(b"OUTPUT1.VOLTAGE.NOW?").await).unwrap();
    let volts: f64 = reading.strip_suffix(" V\r\n").unwrap().parse().unwrap();
    assert!((volts - 48.0).abs() < 0.48, "{reading}");
    let lines = [("PATH.JOIN=(@103)", ""), ("PATH.JOINED?(@101:103)", "0,0,1\r\n"), ("PATH.CLEAR", "")];
    dialogue(&rack.switch, &lines).await;
    dialogue(&rack.switch, &[("PATH.JOINED?(@103)", "0\r\n"), ("TROUBLE?", "0, all is well\r\n")]).await;
}
