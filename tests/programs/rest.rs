//! The API as programs use it: pages, waveforms in both formats, events that go on where they stopped, its description.

use std::collections::BTreeSet;

use evenpair_tests::{Lab, LabPlan, project};
use serde_json::{Value, json};

use crate::scripts::{DEVICE, night, text};

/// A lab with one run of three captures; the run's identity.
async fn lab_with_a_run() -> (Lab, String) {
    let lab = Lab::start(&LabPlan::default()).await;
    let id = lab.api.begin("/runs", &text(&night(&[24, 36, 48], ""))).await;
    assert_eq!(lab.api.ended(&id).await["state"], "passed");
    (lab, id)
}

/// Catches: a page that leaves a capture out, repeats one, or never ends.
#[tokio::test]
async fn pages_hold_every_capture_once() {
    let (lab, id) = lab_with_a_run().await;
    let (mut after, mut numbers) = (json!(0), Vec::new());
    for _ in 0..3 {
        let page = lab.api.get(&format!("/runs/{id}/captures?after={after}&limit=2")).await.json();
        assert_eq!(page["total"], 3, "{page}");
        numbers.extend(page["items"].as_array().unwrap().iter().map(|item| item["number"].as_u64().unwrap()));
        match page.get("next") {
            Some(next) => after = next.clone(),
            None => break,
        }
    }
    assert_eq!(numbers, [1, 2, 3]);
    let beyond = lab.api.get(&format!("/runs/{id}/captures?after=3")).await.json();
    assert_eq!((beyond["items"].as_array().unwrap().len(), beyond.get("next")), (0, None), "{beyond}");
}

/// Catches: a figure that does not come from the waveform beside it; two formats that do not agree; a file that other
/// programs cannot open. The reading is done by pyarrow and duckdb, which share no code with the writer.
#[tokio::test]
async fn csv_and_parquet_hold_the_same_waveform() {
    let (lab, id) = lab_with_a_run().await;
    let folder = tempfile::tempdir().unwrap();
    let path = format!("/runs/{id}/captures/2/waveform");
    for (accept, name) in [("text/csv", "wave.csv"), ("application/vnd.apache.parquet", "wave.parquet")] {
        let answer = lab.api.send(|client, base| client.get(format!("{base}{path}")).header("accept", accept)).await;
        assert_eq!(answer.status, 200);
        assert!(answer.media_type.starts_with(accept), "{}", answer.media_type);
        std::fs::write(folder.path().join(name), &answer.bytes).unwrap();
    }
    let refused = lab.api.send(|client, base| client.get(format!("{base}{path}")).header("accept", "image/png")).await;
    assert_eq!((refused.status, refused.json()["code"].as_str()), (406, Some("not-acceptable")));

    let page = lab.api.get(&format!("/runs/{id}/captures?after=1&limit=1")).await.json();
    let capture = &page["items"][0];
    let csv = std::fs::read_to_string(folder.path().join("wave.csv")).unwrap();
    let mut lines = csv.lines();
    assert_eq!(lines.next(), Some("time_s,positive_v,negative_v,difference_v"));
    assert_eq!(lines.count() as u64, capture["points"].as_u64().unwrap());
    std::fs::write(folder.path().join("capture.json"), capture.to_string()).unwrap();

    let Ok(python) = std::env::var("EVENPAIR_PYTHON") else {
        println!("EVENPAIR_PYTHON is not set, so pyarrow and duckdb do not read the file; tests/run sets it");
        return;
    };
    let script = project().join("tests/reference/read_waveforms.py");
    let output = tokio::process::Command::new(python).arg(script).arg(folder.path()).output().await.unwrap();
    let said = String::from_utf8_lossy(&output.stdout).into_owned() + &String::from_utf8_lossy(&output.stderr);
    assert!(output.status.success() && said.contains("20000 samples agree"), "{said}");
}

/// The events of a finished run after `last`, as its stream gives them.
async fn events_after(lab: &Lab, id: &str, last: &str) -> Vec<(u64, Value)> {
    let get = |client: &reqwest::Client, base: &str| {
        client.get(format!("{base}/runs/{id}/events")).header("last-event-id", last)
    };
    let answer = lab.api.send(get).await;
    assert_eq!((answer.status, answer.media_type.as_str()), (200, "text/event-stream"));
    let text = String::from_utf8(answer.bytes).unwrap();
    let blocks = text.split("\n\n").filter(|block| !block.is_empty());
    let field = |block: &str, name: &str| {
        block.lines().find_map(|line| line.strip_prefix(name)).expect("id and data").trim_start().to_owned()
    };
    blocks
        .map(|block| (field(block, "id:").parse().unwrap(), serde_json::from_str(&field(block, "data:")).unwrap()))
        .collect()
}

/// Catches: an event that is lost or doubled when a connection drops; a stream that does not close.
#[tokio::test]
async fn events_go_on_after_the_last_one_seen() {
    let (lab, id) = lab_with_a_run().await;
    let all = events_after(&lab, &id, "0").await;
    assert!(all.len() > 20, "{}", all.len());
    for (at, (generation, event)) in all.iter().enumerate() {
        assert_eq!(*generation, at as u64 + 1);
        assert_eq!(event["generation"], *generation);
    }
    assert_eq!(all.first().unwrap().1["state"], "waiting");
    assert_eq!(all.last().unwrap().1["state"], "passed");
    let numbers: Vec<u64> = all.iter().filter_map(|(_, event)| event["capture"]["number"].as_u64()).collect();
    assert_eq!(numbers, [1, 2, 3]);
    for last in [1, all.len() / 2, all.len() - 1] {
        assert_eq!(events_after(&lab, &id, &last.to_string()).await, all[last..]);
    }
    assert_eq!(events_after(&lab, &id, &all.len().to_string()).await, []);
    assert_eq!(events_after(&lab, &id, "999999").await, []);
}

/// Catches: a description that is made by hand and has fallen behind the routes.
#[tokio::test]
async fn the_description_lists_every_route() {
    let lab = Lab::start(&LabPlan::default()).await;
    let answer = lab.api.get("/openapi.json").await;
    assert_eq!((answer.status, answer.media_type.as_str()), (200, "application/json"));
    let description = answer.json();
    assert!(description["openapi"].as_str().unwrap().starts_with("3."), "{}", description["openapi"]);
    let paths = description["paths"].as_object().unwrap();
    let mut described = BTreeSet::new();
    for (path, methods) in paths {
        for (method, operation) in methods.as_object().unwrap() {
            described.insert(format!("{method} {}", path.strip_prefix("/api/v1").expect("all below /api/v1")));
            assert!(!operation["responses"].as_object().unwrap().is_empty(), "{method} {path}");
        }
    }
    for needed in [
        "get /bench",
        "get /health",
        "get /pairs",
        "get /pairs/{pair}/correction",
        "get /runs",
        "get /runs/{id}",
        "get /runs/{id}/captures",
        "get /runs/{id}/captures/{n}/waveform",
        "get /runs/{id}/events",
        "get /sequences",
        "post /pairs/{pair}/deskew",
        "post /pairs/{pair}/verify",
        "post /runs",
        "post /runs/{id}/stop",
    ] {
        assert!(described.contains(needed), "`{needed}` is not described: {described:#?}");
    }
    // Every reference within the document leads somewhere.
    let text = description.to_string();
    for part in text.split("\"$ref\":\"#").skip(1) {
        let pointer = part.split('"').next().unwrap();
        assert!(description.pointer(pointer).is_some(), "{pointer}");
    }
}

/// Catches: a quantity without a unit or with a bare number in its place, anywhere in what a run says.
#[tokio::test]
async fn a_run_without_captures_has_an_empty_page() {
    let lab = Lab::start(&LabPlan::default()).await;
    let id = lab.api.begin("/runs", &text(&crate::scripts::sequence(&[DEVICE]))).await;
    let run = lab.api.ended(&id).await;
    assert_eq!((&run["state"], &run["kind"]), (&json!("passed"), &json!("sequence")), "{run}");
    let stages: Vec<&str> =
        run["stages"].as_array().unwrap().iter().map(|stage| stage["text"].as_str().unwrap()).collect();
    assert_eq!(stages.len(), 3, "prepare, set, route: {stages:?}");
    let page = lab.api.get(&format!("/runs/{id}/captures")).await.json();
    assert_eq!(page, json!({ "items": [], "total": 0 }));
}
