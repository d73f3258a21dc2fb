//! Literal lines to the slow instruments. That they are deaf after a line belongs to the connection and is tested there.

use crate::instrument::Device;
use crate::instrument::fixture::{Rack, dialogue, rack};
use crate::scenario::PersonalitySpec;

fn slow() -> Rack {
    rack(PersonalitySpec::Slow)
}

/// Polls, as a controller must, until all of `bits` are set.
async fn until(scope: &Device, bits: u8) {
    loop {
        let reply = String::from_utf8(scope.run(b"TELL STATE").await).unwrap();
        if reply.trim_end().parse::<u8>().unwrap() & bits == bits {
            return;
        }
        tokio::task::yield_now().await;
    }
}

#[tokio::test]
async fn settings_are_halved_turned_round_clamped_and_never_complained_about() {
    let lines = [
        ("TELL HALF/1", "5.0E+0\n"),
        ("PUT HALF/1 3", ""),
        ("TELL HALF/1", "5.0E+0\n"),
        ("PUT HALF/1 2.5", ""),
        ("TELL HALF/1", "2.5E+0\n"),
        ("PUT HALF/1 900", ""),
        ("TELL HALF/1", "5.0E+1\n"),
        ("PUT SHIFT/2 3.5", ""),
        ("TELL SHIFT/2", "3.5E+0\n"),
        ("TELL SHIFT/1", "0.0E+0\n"),
        ("PUT GAP 3E-9", ""),
        ("TELL GAP", "4.0E-9\n"),
        ("PUT DEPTH 2E9", ""),
        ("TELL DEPTH", "1000000\n"),
        ("PUT BEFORE 10", ""),
        ("TELL BEFORE", "1.0E+1\n"),
        ("PUT MEAN 16", ""),
        ("TELL MEAN", "16\n"),
        ("PUT CAUSE 0", ""),
        ("TELL CAUSE", "0\n"),
        ("PUT CAUSE -1", ""),
        ("TELL CAUSE", "-1\n"),
        ("PUT COUPLE/2 MOVING", ""),
        ("TELL COUPLE/2", "MOVING\n"),
        ("PUT WAY DOWNWARD", ""),
        ("TELL WAY", "DOWNWARD\n"),
        ("PUT NONSENSE 1", ""),
        ("TELL NONSENSE", "?\n"),
        ("HALF/1", ""),
        ("TELL NAME", "A,B,C,D\n"),
    ];
    dialogue(&slow().scope, &lines).await;
}

#[tokio::test]
async fn a_record_is_polled_for_and_read_in_windows_counted_from_one() {
    let scope = slow().scope;
    let lines = [("TELL STATE", "0\n"), ("PUT CAUSE -1", ""), ("PUT DEPTH 5000", ""), ("DO ONCE", "")];
    dialogue(&scope, &lines).await;
    until(&scope, 12).await;
    let facts = String::from_utf8(scope.run(b"TELL FACTS/1").await).unwrap();
    // 256 codes over 10 V around 0 V: 0.0390625 V each, code 128 at 0 V.
    assert_eq!(facts, "1,5000,1e-9,-2.4995e-6,-5e0,3.90625e-2,0,255,1\n");
    let first = scope.run(b"TELL CODES/1 1 4096").await;
    assert_eq!((&first[..6], first.len()), (&b"#44096"[..], 4096 + 7));
    let overlap = scope.run(b"TELL CODES/1 4096 2").await;
    assert_eq!((&overlap[..3], overlap[3]), (&b"#12"[..], first[6 + 4095]));
    let rest = scope.run(b"TELL CODES/1 4097 4096").await;
    assert_eq!((&rest[..5], rest.len()), (&b"#3904"[..], 904 + 6));
    assert_eq!(overlap[4], rest[5]);
    assert_eq!(scope.run(b"TELL CODES/1 1 5000").await.len(), 4096 + 7, "never more than a window");
    assert_eq!(scope.run(b"TELL CODES/1 5001 1").await, b"#10\n");
    assert_eq!(scope.run(b"TELL FACTS/2").await.split(|byte| *byte == b',').next(), Some(&b"1"[..]), "still held");
}

#[tokio::test]
async fn it_runs_free_until_it_is_held() {
    let scope = slow().scope;
    dialogue(&scope, &[("PUT CAUSE -1", ""), ("PUT DEPTH 10", "")]).await;
    let number = async || {
        let facts = String::from_utf8(scope.run(b"TELL FACTS/1").await).unwrap();
        facts.split(',').next().unwrap().parse::<u64>().unwrap()
    };
    assert_eq!((number().await, number().await), (1, 2), "every reading is of a new acquisition");
    dialogue(&scope, &[("DO HOLD", ""), ("TELL STATE", "12\n")]).await;
    assert_eq!((number().await, number().await), (2, 2));
    dialogue(&scope, &[("PUT DEPTH 20", ""), ("DO RUN", "")]).await;
    until(&scope, 8).await;
    dialogue(&scope, &[("DO HOLD", ""), ("TELL STATE", "12\n")]).await;
    let facts = scope.run(b"TELL FACTS/1").await;
    assert!(facts.starts_with(b"3,20,"), "the first one since it runs, with the settings of that moment");
    dialogue(&scope, &[("DO FRESH", ""), ("TELL STATE", "0\n")]).await;
}

#[tokio::test]
async fn without_a_trigger_the_bits_say_so() {
    let scope = slow().scope;
    dialogue(&scope, &[("PUT CAUSE 0", ""), ("DO ONCE", "")]).await;
    until(&scope, 7).await;
    dialogue(&scope, &[("DO HOLD", ""), ("TELL STATE", "4\n"), ("TELL FACTS/1", "?\n")]).await;
}

#[tokio::test]
async fn generator_supply_and_switch() {
    let rack = slow();
    let lines = [
        ("PUT SHAPE/1 BOX", ""),
        ("TELL SHAPE/1", "BOX\n"),
        ("PUT PACE/1 1E6", ""),
        ("PUT LEVELS/1 0 10", ""),
        ("TELL LEVELS/1", "0 10\n"),
        ("PUT SHARE/1 29", ""),
        ("TELL SHARE/1", "2.9E+1\n"),
        ("PUT RAMP/1 3E-9", ""),
        ("PUT LIVE/1 1", ""),
        ("TELL LIVE/1", "1\n"),
        ("DO FRESH", ""),
        ("TELL LIVE/1", "0\n"),
    ];
    dialogue(&rack.generator, &lines).await;
    dialogue(&rack.supply, &[("PUT VOLTS/1 48", ""), ("PUT AMPS/1 5", ""), ("PUT LIVE/1 1", "")]).await;
    let reading = String::from_utf8(rack.supply.run(b"TELL METER/1").await).unwrap();
    let volts: f64 = reading.split(',').next().unwrap().parse().unwrap();
    assert!((volts - 48.0).abs() < 0.48, "{reading}");
    let lines = [
        ("DO LINK (@102)", ""),
        ("TELL LINK (@101,102)", "0,1\n"),
        ("DO LINK (@101)", ""),
        ("TELL LINK (@101)", "0\n"),
        ("DO CUTALL", ""),
        ("TELL LINK (@102)", "0\n"),
    ];
    dialogue(&rack.switch, &lines).await;
}
