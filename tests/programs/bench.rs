//! Benches on which something is wrong: each fault gives one message that names what, where and what to try.

use evenpair_tests::{Fake, Lab, LabPlan};
use serde_json::{Value, json};

/// Deskews the pair of a bench and returns the run, which must be broken for a reason that has all of `words`.
async fn broken_deskew(lab: &Lab, words: &[&str]) -> Value {
    let run = lab.api.begin("/pairs/gate/deskew", &json!({ "most_acquisitions": 4 })).await;
    let run = lab.api.ended(&run).await;
    assert_eq!(run["state"], "broken", "{run}");
    let reason = run["reason"].as_str().unwrap();
    for word in words {
        assert!(reason.contains(word), "`{word}` in: {reason}");
    }
    assert_eq!(lab.api.get("/pairs/gate/correction").await.status, 404, "nothing half done is kept");
    run
}

/// After a failure on the bench the next deskew is refused or not, and the daemon serves on.
async fn still_serves(lab: &mut Lab) {
    assert_eq!(lab.api.get("/health").await.status, 200);
    assert!(!lab.log().contains("panicked"), "{}", lab.log());
    assert_eq!(lab.daemon.signal("TERM").await.code(), Some(0), "{}", lab.log());
}

/// The bench is unsettled since it cannot be brought to rest, and then nothing starts.
async fn nothing_starts(lab: &Lab, instrument: &str) {
    let bench = lab.api.get("/bench").await.json();
    assert_eq!(bench["rest"], "unsettled", "{bench}");
    let instruments = bench["instruments"].as_array().unwrap();
    let bad = instruments.iter().find(|one| one["name"] == instrument).unwrap();
    assert_eq!(bad["link"], "down", "{bad}");
    assert!(bad["trouble"].as_str().is_some_and(|trouble| !trouble.is_empty()), "{bad}");
    let refused = lab.api.post("/pairs/gate/deskew", &json!({})).await;
    assert_eq!((refused.status, refused.json()["code"].as_str()), (409, Some("bench-unsettled")));
    let detail = refused.json()["detail"].as_str().unwrap().to_owned();
    assert!(detail.contains(instrument) && detail.contains("settle"), "{detail}");
}

/// Catches: an instrument that is not there and a bench that works on without it.
#[tokio::test]
async fn an_unreachable_instrument_leaves_the_bench_unsettled() {
    let nobody = Fake::nobody().await;
    let mut lab = Lab::start(&LabPlan::default().with_instrument_at("supply", &nobody)).await;
    broken_deskew(&lab, &["unsettled", "supply", "connection", "settle"]).await;
    nothing_starts(&lab, "supply").await;
    // The others were brought to rest all the same.
    let bench = lab.api.get("/bench").await.json();
    let up = bench["instruments"].as_array().unwrap().iter().filter(|one| one["link"] == "up").count();
    assert!(up >= 2, "generator and switch: {bench}");
    still_serves(&mut lab).await;
}

/// Catches: waiting for ever for an instrument that takes the connection and says nothing.
#[tokio::test]
async fn a_silent_instrument_leaves_the_bench_unsettled() {
    let silent = Fake::silent().await;
    let mut lab = Lab::start(&LabPlan::default().with_instrument_at("switch", &silent.resource)).await;
    broken_deskew(&lab, &["unsettled", "switch", "settle"]).await;
    nothing_starts(&lab, "switch").await;
    still_serves(&mut lab).await;
}

/// Catches: a reply of garbage that is taken for an answer, or that brings the daemon down.
#[tokio::test]
async fn a_garbling_instrument_leaves_the_bench_unsettled() {
    let garbage = Fake::saying(b"\x00\xff\xfe#9zzz;;\"\n").await;
    let mut lab = Lab::start(&LabPlan::default().with_instrument_at("generator", &garbage.resource)).await;
    broken_deskew(&lab, &["unsettled", "generator", "settle"]).await;
    nothing_starts(&lab, "generator").await;
    still_serves(&mut lab).await;
}

/// Catches: a scope that is not needed for the safe state, so that only the deskew finds it dead.
#[tokio::test]
async fn a_silent_scope_breaks_the_run_and_the_rest_of_the_bench_is_safe() {
    let silent = Fake::silent().await;
    let mut plan = LabPlan::default().with_bench("instrument.scope", "timeout", "\"500 ms\"");
    plan.elsewhere.push(("scope".to_owned(), silent.resource.clone()));
    let mut lab = Lab::start(&plan).await;
    broken_deskew(&lab, &["deskew gate", "scope"]).await;
    assert_eq!(lab.api.get("/bench").await.json()["rest"], "settled");
    assert_eq!(lab.ask("supply", "OUTPut1:STATe?").await, "0");
    still_serves(&mut lab).await;
}

/// Catches: waiting for ever for a trigger that cannot come.
#[tokio::test]
async fn a_missing_trigger_is_named() {
    // Declared is a node of up to 84 V; the one there reaches 48 V and rings a little, so 80 V never comes.
    let trigger = "{ channel = 1, level = \"80 V\", slope = \"positive\" }";
    let plan = LabPlan::default()
        .with_bench("pair.gate", "trigger", trigger)
        .with_bench("reference.in_situ", "high", "\"84 V\"")
        .with_bench("instrument.scope", "timeout", "\"3 s\"");
    let mut lab = Lab::start(&plan).await;
    broken_deskew(&lab, &["deskew gate", "scope", "trigger on channel 1", "80.0 V"]).await;
    // The scope is given back, not left waiting: it takes the next command at once.
    assert_eq!(lab.ask("scope", "SYSTem:ERRor?").await.split(',').next(), Some("0"));
    still_serves(&mut lab).await;
}

/// Catches: a correction that is made from clipped records.
#[tokio::test]
async fn a_clipped_reference_is_named() {
    // Declared is a node of 0 to 30 V, which fits; the one there reaches 48 V.
    let plan = LabPlan::default()
        .with_bench("pair.gate", "span", "\"50 V\"")
        .with_bench("pair.gate", "offset", "\"10 V\"")
        .with_bench("reference.in_situ", "high", "\"30 V\"");
    let mut lab = Lab::start(&plan).await;
    broken_deskew(&lab, &["deskew", "gate", "in_situ", "clipped", "larger"]).await;
    assert_eq!(lab.api.get("/bench").await.json()["rest"], "settled");
    still_serves(&mut lab).await;
}

/// Catches: a skew found between two signals that have nothing to do with each other.
#[tokio::test]
async fn legs_without_a_common_signal_are_named() {
    // Nothing is connected to the scope's channel 3.
    let plan = LabPlan::default().with_bench("pair.gate", "negative", "{ channel = 3, probe = \"p10b\" }");
    let mut lab = Lab::start(&plan).await;
    let run = broken_deskew(&lab, &["deskew", "gate", "fast"]).await;
    let reason = run["reason"].as_str().unwrap();
    assert!(reason.contains("no common signal") || reason.contains("throughout"), "{reason}");
    still_serves(&mut lab).await;
}

/// Catches: a route that leads nowhere and goes unnoticed.
#[tokio::test]
async fn a_route_that_connects_nothing_is_noticed() {
    let plan = LabPlan::default().with_bench("instrument.scope", "timeout", "\"3 s\"");
    let bench = plan.bench.replace("channels = [101]", "channels = [104]");
    assert_ne!(bench, plan.bench);
    let mut lab = Lab::start(&LabPlan { bench, ..plan }).await;
    broken_deskew(&lab, &["deskew", "gate", "trigger", "signal"]).await;
    still_serves(&mut lab).await;
}

/// Catches: a daemon that leaves the bench in the middle of coming to rest, because whoever started it closes its standard
/// input and sends it a signal besides: that is one wish to end, not two.
#[tokio::test]
async fn closed_standard_input_and_a_signal_are_one_wish_to_end() {
    // A supply that says nothing keeps the daemon at it for a while.
    let silent = Fake::silent().await;
    let mut lab = Lab::start(&LabPlan::default().with_instrument_at("supply", &silent.resource)).await;
    lab.daemon.close_stdin();
    assert_eq!(lab.daemon.signal("TERM").await.code(), Some(0), "{}", lab.log());
    assert!(lab.log().contains("shutting down"), "{}", lab.log());
}
