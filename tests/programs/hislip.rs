//! The demo bench over HiSLIP: the same truth as over plain sockets, and a time-out that costs no connection.

use evenpair_tests::{Lab, LabPlan, Truth, figure, quantity, set_in_nth};
use serde_json::json;

use crate::scripts::{limit, night, text};

/// The pair's measuring range at the scope's input: 100 V at ×10 tips.
const SPAN_V: f64 = 10.0;

/// Instruments of the demo.
const INSTRUMENTS: usize = 4;

fn over_hislip() -> LabPlan {
    let mut plan = LabPlan::default();
    for nth in 0..INSTRUMENTS {
        plan.scenario = set_in_nth(&plan.scenario, "[[instrument]]", nth, "protocol", "\"hislip\"");
    }
    plan
}

/// How often the daemon's log says `event` of an instrument.
fn logged(lab: &Lab, instrument: &str, event: &str) -> usize {
    lab.log().lines().filter(|line| line.contains(&format!(": {event} instrument={instrument} "))).count()
}

/// Catches: a protocol that carries short replies only, mixes replies up, or loses bytes of a record.
#[tokio::test]
async fn a_run_over_hislip_finds_the_truth() {
    let plan = over_hislip();
    let truth = Truth::of(&plan.scenario, SPAN_V);
    let mut lab = Lab::start(&plan).await;
    assert_eq!(lab.instruments.len(), INSTRUMENTS);
    for resource in lab.instruments.values() {
        assert!(resource.contains("::hislip0,") && resource.ends_with("::INSTR"), "{resource}");
    }
    let run = lab.api.begin("/runs", &text(&night(&[24, 48], &limit("high_level", "11 V", "13 V")))).await;
    let run = lab.api.ended(&run).await;
    assert_eq!(run["state"], "passed", "{run}");

    let correction = lab.api.get("/pairs/gate/correction").await.json();
    let (skew, gain) = (quantity(&correction["skew"], "s"), quantity(&correction["gain"], "1"));
    assert!(skew.covers(truth.skew_s), "skew {skew:?}, truth {}", truth.skew_s);
    assert!(gain.covers(truth.gain), "gain {gain:?}, truth {}", truth.gain);
    let page = lab.api.get(&format!("/runs/{}/captures", run["id"].as_str().unwrap())).await.json();
    let captures = page["items"].as_array().unwrap();
    assert_eq!(captures.len(), 2);
    for capture in captures {
        // 11.9 V by the scenario.
        let high = quantity(figure(capture, "high_level"), "V");
        assert!((high.value - 11.9).abs() < 0.2, "{capture}");
    }

    assert_eq!(lab.api.get("/bench").await.json()["rest"], "settled");
    assert_eq!(lab.ask("supply", "OUTPut1:STATe?").await, "0");
    for instrument in lab.instruments.keys() {
        assert_eq!(logged(&lab, instrument, "connected"), 1, "{}", lab.log());
    }
    assert!(!lab.log().contains("late reply"), "{}", lab.log());
    assert!(!lab.log().contains("panicked"), "{}", lab.log());
    assert_eq!(lab.daemon.signal("TERM").await.code(), Some(0), "{}", lab.log());
}

/// Catches: a time-out that throws the connection away though the instrument is well, or that leaves it waiting.
#[tokio::test]
async fn a_time_out_over_hislip_is_cleared_on_the_same_connection() {
    // Declared is a node of up to 84 V; the one there reaches 48 V and rings a little, so 80 V never comes.
    let trigger = "{ channel = 1, level = \"80 V\", slope = \"positive\" }";
    let plan = over_hislip()
        .with_bench("pair.gate", "trigger", trigger)
        .with_bench("reference.in_situ", "high", "\"84 V\"")
        .with_bench("instrument.scope", "timeout", "\"3 s\"");
    let mut lab = Lab::start(&plan).await;
    let run = lab.api.begin("/pairs/gate/deskew", &json!({ "most_acquisitions": 4 })).await;
    let run = lab.api.ended(&run).await;
    assert_eq!(run["state"], "broken", "{run}");
    let reason = run["reason"].as_str().unwrap();
    assert!(reason.contains("trigger on channel 1"), "{reason}");

    let log = lab.log();
    assert!(logged(&lab, "scope", "cleared") >= 1, "{log}");
    assert_eq!(logged(&lab, "scope", "connected"), 1, "the connection was made once and kept: {log}");
    // Whose wait is over, and what is asked next finds its own reply.
    assert_eq!(lab.ask("scope", "STATus:OPERation:CONDition?").await, "0");
    assert_eq!(lab.ask("scope", "SYSTem:ERRor?").await.split(',').next(), Some("0"));
    assert_eq!(lab.api.get("/bench").await.json()["rest"], "settled");
    assert!(!log.contains("panicked"), "{log}");
    assert_eq!(lab.daemon.signal("TERM").await.code(), Some(0), "{}", lab.log());
}
