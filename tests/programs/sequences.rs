//! Sequences that fail, that a person stops, and that a shutdown cuts off.

use evenpair_tests::{Lab, LabPlan};
use serde_json::{Value, json};

use crate::scripts::{ALWAYS, DESKEW, DEVICE, capture, limit, night, sequence, sweep, text};

/// What the supply says of its outputs, bus and brake.
pub(crate) async fn outputs(lab: &Lab) -> [String; 2] {
    [lab.ask("supply", "OUTPut1:STATe?").await, lab.ask("supply", "OUTPut2:STATe?").await]
}

/// Every capture of a run can be read, as figures and as waveform; how many there are.
pub(crate) async fn readable_captures(lab: &Lab, run: &str) -> usize {
    let page = lab.api.get(&format!("/runs/{run}/captures?limit=200")).await.json();
    let captures = page["items"].as_array().unwrap();
    for (index, capture) in captures.iter().enumerate() {
        assert_eq!(capture["number"], json!(index + 1));
        let file = lab.api.get(&format!("/runs/{run}/captures/{}/waveform", index + 1)).await;
        assert_eq!((file.status, file.media_type.as_str()), (200, "application/vnd.apache.parquet"));
        assert!(file.bytes.starts_with(b"PAR1") && file.bytes.ends_with(b"PAR1"), "a Parquet file is whole");
    }
    captures.len()
}

fn is_capture(event: &Value) -> bool {
    event["kind"] == "captured"
}

/// Catches: a limit that is not judged, a failed run that stops measuring, or one that counts as passed.
#[tokio::test]
async fn a_limit_that_is_exceeded_fails_the_run_and_the_rest_is_measured() {
    // 12.4 V is never reached by a drive of 11.9 V.
    let script = night(&[24, 36, 48], &limit("high_level", "12.4 V", "13 V"));
    let lab = Lab::start(&LabPlan::default().with_sequence("strict", &script)).await;
    let output = lab.evenpair(&["run", "strict", "--wait"]).await;
    assert_eq!(output.status.code(), Some(1), "{}", String::from_utf8_lossy(&output.stdout));
    let run = lab.api.get("/runs").await.json()["items"][0].clone();
    assert_eq!(run["state"], "failed", "{run}");
    let id = run["id"].as_str().unwrap();
    assert_eq!(readable_captures(&lab, id).await, 3);
    let failures = run["failures"].as_array().unwrap();
    let numbers: Vec<u64> = failures.iter().map(|failure| failure["capture"].as_u64().unwrap()).collect();
    assert_eq!(numbers, [1, 2, 3], "{failures:?}");
    assert!(failures.iter().all(|failure| failure["figure"] == "high_level"));
    assert!(run["reason"].as_str().is_some_and(|reason| !reason.is_empty()), "{run}");
    let captures = lab.api.get(&format!("/runs/{id}/captures")).await.json();
    let verdict = &captures["items"][0]["limits"][0];
    assert_eq!((&verdict["passed"], &verdict["min"]), (&json!(false), &json!(12.4)), "{verdict}");
}

/// Catches: `on_limit = "end"` that measures on, and an `always` part that is left out then.
#[tokio::test]
async fn on_limit_end_ends_at_the_first() {
    let script = night(&[24, 36, 48], &("on_limit = \"end\"\n".to_owned() + &limit("high_level", "12.4 V", "13 V")));
    let lab = Lab::start(&LabPlan::default()).await;
    let id = lab.api.begin("/runs", &text(&script)).await;
    let run = lab.api.ended(&id).await;
    assert_eq!(run["state"], "failed", "{run}");
    assert_eq!(readable_captures(&lab, &id).await, 1);
    let stages = run["stages"].as_array().unwrap();
    let last = stages.last().unwrap();
    assert!(last["text"].as_str().unwrap().contains("bus_voltage") && last["ended_s"].is_number(), "{stages:?}");
    assert_eq!(lab.ask("supply", "SOURce1:VOLTage?").await.parse::<f64>().unwrap(), 0.0, "the `always` part");
    assert_eq!(outputs(&lab).await, ["0", "0"]);
}

/// Catches: a stop that leaves the bus on, loses what was measured, or lets the run go on.
#[tokio::test]
async fn a_stop_in_the_middle_brings_the_bench_to_rest() {
    let script = night(&[24, 36, 48, 60, 30, 40, 50, 55, 25, 35, 45, 58], "");
    let lab = Lab::start(&LabPlan::default()).await;
    let id = lab.api.begin("/runs", &text(&script)).await;
    lab.api.events_until(&id, is_capture).await;
    assert_eq!(outputs(&lab).await, ["1", "1"], "the bench is at work");
    let answer = lab.api.post(&format!("/runs/{id}/stop"), &json!({})).await;
    assert_eq!(answer.status, 202);
    let run = lab.api.ended(&id).await;
    assert_eq!(run["state"], "stopped", "{run}");
    assert!(run["reason"].as_str().unwrap().contains("person"), "{run}");
    assert_eq!(outputs(&lab).await, ["0", "0"]);
    assert_eq!(lab.ask("supply", "SOURce1:VOLTage?").await.parse::<f64>().unwrap(), 0.0, "the `always` part");
    let captures = readable_captures(&lab, &id).await;
    assert!((1..12).contains(&captures), "{captures}");
    assert_eq!(run["progress"]["captures"], json!(captures));
    // Stopping again changes nothing, and the bench is free for the next.
    assert_eq!(lab.api.post(&format!("/runs/{id}/stop"), &json!({})).await.status, 202);
    let next = lab.api.begin("/runs", &text(&sequence(&[DEVICE, &sweep(&[24], ""), ALWAYS]))).await;
    assert_eq!(lab.api.ended(&next).await["state"], "passed");
    assert_eq!(lab.api.get(&format!("/runs/{id}")).await.json()["state"], "stopped");
}

/// Catches: a run that waits for the bench and cannot be stopped, or that begins although it was.
#[tokio::test]
async fn a_waiting_run_is_stopped_without_ever_beginning() {
    let lab = Lab::start(&LabPlan::default()).await;
    let first = lab.api.begin("/runs", &text(&night(&[24, 36], ""))).await;
    let second = lab.api.begin("/runs", &text(&night(&[24], ""))).await;
    lab.api.post(&format!("/runs/{second}/stop"), &json!({})).await;
    let stopped = lab.api.ended(&second).await;
    assert_eq!(stopped["state"], "stopped", "{stopped}");
    assert!(stopped.get("started_at").is_none(), "{stopped}");
    assert_eq!(lab.api.ended(&first).await["state"], "passed");
}

/// Catches: a shutdown that leaves the bench at work or loses the run's end.
#[tokio::test]
async fn a_shutdown_in_the_middle_stops_the_run_and_says_why() {
    let mut lab = Lab::start(&LabPlan::default()).await;
    let id = lab.api.begin("/runs", &text(&night(&[24, 36, 48, 60, 30, 40, 50, 55, 25, 35], ""))).await;
    lab.api.events_until(&id, is_capture).await;
    let status = lab.daemon.signal("TERM").await;
    assert_eq!(status.code(), Some(0), "{}", lab.log());
    assert_eq!(outputs(&lab).await, ["0", "0"]);
    lab.restart_daemon().await;
    let run = lab.api.get(&format!("/runs/{id}")).await.json();
    assert_eq!(run["state"], "stopped", "{run}");
    assert!(run["reason"].as_str().unwrap().contains("shut down"), "{run}");
    let captures = readable_captures(&lab, &id).await;
    assert!((1..10).contains(&captures), "{captures}");
    // The correction is there too, and the bench works on.
    let next = lab.api.begin("/runs", &text(&sequence(&[DEVICE, &sweep(&[24], ""), ALWAYS]))).await;
    assert_eq!(lab.api.ended(&next).await["state"], "passed");
}

/// Catches: a correction that is applied under other conditions than it was made with, silently.
#[tokio::test]
async fn a_void_correction_is_refused_or_marked_as_the_sequence_says() {
    let mut lab = Lab::start(&LabPlan::default()).await;
    let other = |what: &str| capture(&format!("span = \"50 V\"\noffset = \"15 V\"\n{what}"));
    // On another range than the deskew before it: that much is known before anything is sent.
    let refused = lab.api.post("/runs", &text(&sequence(&[DESKEW, DEVICE, &other("")]))).await;
    assert_eq!((refused.status, refused.json()["code"].as_str()), (422, Some("sequence-refused")));
    let mistakes = refused.json()["mistakes"].to_string();
    assert!(mistakes.contains("range") && mistakes.contains("on_void"), "{mistakes}");
    let id = lab.api.begin("/runs", &text(&sequence(&[DESKEW, DEVICE, &other("on_void = \"mark\"")]))).await;
    assert_eq!(lab.api.ended(&id).await["state"], "passed");
    let captures = lab.api.get(&format!("/runs/{id}/captures")).await.json();
    let marked = &captures["items"][0];
    assert_eq!(marked["correction_state"], "void", "{marked}");
    let warnings = marked["warnings"].to_string();
    assert!(warnings.contains("void") && warnings.contains("span"), "{warnings}");

    // Another probe since: only the daemon that compares the conditions can know.
    lab.daemon.signal("TERM").await;
    let path = lab.folder().join("bench.toml");
    let bench = std::fs::read_to_string(&path).unwrap();
    let leg = "{ channel = 1, probe = \"p10b\" }";
    std::fs::write(&path, evenpair_tests::set_in_table(&bench, "pair.gate", "positive", leg)).unwrap();
    lab.restart_daemon().await;
    let correction = lab.api.get("/pairs/gate/correction").await.json();
    assert_eq!(correction["state"], "void", "{correction}");
    assert!(correction["reasons"].to_string().contains("probe"), "{correction}");
    let id = lab.api.begin("/runs", &text(&sequence(&[DEVICE, &capture("")]))).await;
    let run = lab.api.ended(&id).await;
    assert_eq!(run["state"], "broken", "{run}");
    let reason = run["reason"].as_str().unwrap();
    for word in ["gate", "void", "probe", "deskew"] {
        assert!(reason.contains(word), "`{word}` in: {reason}");
    }
    assert_eq!(readable_captures(&lab, &id).await, 0);
}

/// Catches: a capture of a pair that was never deskewed.
#[tokio::test]
async fn a_capture_without_a_correction_is_refused() {
    let lab = Lab::start(&LabPlan::default()).await;
    let id = lab.api.begin("/runs", &text(&sequence(&[DEVICE, &capture("")]))).await;
    let run = lab.api.ended(&id).await;
    assert_eq!(run["state"], "broken", "{run}");
    let reason = run["reason"].as_str().unwrap();
    assert!(reason.contains("gate") && reason.contains("deskew"), "{reason}");
}
