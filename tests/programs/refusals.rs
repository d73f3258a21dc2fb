//! Requests that the daemon refuses: each a problem document (RFC 9457) with its code, and nothing changed.

use evenpair_tests::{Answer, Lab, LabPlan};
use serde_json::json;

use crate::scripts::{DEVICE, capture, sequence};

/// The answer is a problem document of this status and code; its detail.
#[track_caller]
fn problem(answer: &Answer, status: u16, code: &str) -> String {
    let text = String::from_utf8_lossy(&answer.bytes);
    assert_eq!(answer.status, status, "{text}");
    assert_eq!(answer.media_type, "application/problem+json", "{text}");
    let document = answer.json();
    assert_eq!(document["status"], status, "{text}");
    assert_eq!(document["code"], code, "{text}");
    assert_eq!(document["type"], format!("urn:evenpair:problem:{code}"), "{text}");
    assert!(document["title"].as_str().is_some_and(|title| !title.is_empty()), "{text}");
    let detail = document["detail"].as_str().unwrap_or_default();
    assert!(detail.len() > 15, "a detail says what to try: {text}");
    detail.to_owned()
}

/// Nothing was started.
async fn nothing_ran(lab: &Lab) {
    assert_eq!(lab.api.get("/runs").await.json()["items"].as_array().unwrap().len(), 0);
}

/// Catches: a name that is not there answered by a fault, by an empty answer, or by another name's.
#[tokio::test]
async fn what_there_is_not_is_not_found() {
    let lab = Lab::start(&LabPlan::default()).await;
    let nil = "00000000-0000-0000-0000-000000000000";
    let gets = [
        ("/pairs/hub/correction".to_owned(), "unknown-pair"),
        ("/pairs/gate/correction".to_owned(), "no-correction"),
        (format!("/runs/{nil}"), "unknown-run"),
        ("/runs/yesterday".to_owned(), "unknown-run"),
        (format!("/runs/{nil}/captures"), "unknown-run"),
        (format!("/runs/{nil}/captures/1/waveform"), "unknown-run"),
        (format!("/runs/{nil}/events"), "unknown-run"),
        ("/nonsense".to_owned(), "unknown-path"),
    ];
    for (path, code) in gets {
        problem(&lab.api.get(&path).await, 404, code);
    }
    let posts = [
        ("/pairs/hub/deskew".to_owned(), json!({}), "unknown-pair"),
        ("/pairs/hub/verify".to_owned(), json!({}), "unknown-pair"),
        ("/pairs/gate/verify".to_owned(), json!({}), "no-correction"),
        ("/runs".to_owned(), json!({ "sequence": "tomorrow" }), "unknown-sequence"),
        ("/runs".to_owned(), json!({ "sequence": "../bench" }), "unknown-sequence"),
        (format!("/runs/{nil}/stop"), json!({}), "unknown-run"),
    ];
    for (path, body, code) in posts {
        problem(&lab.api.post(&path, &body).await, 404, code);
    }
    let detail = problem(&lab.api.get("/pairs/hub/correction").await, 404, "unknown-pair");
    assert!(detail.contains("hub") && detail.contains("gate"), "{detail}");
    nothing_ran(&lab).await;
    // A run that is there, but not that capture of it.
    let run = lab.api.begin("/runs", &json!({ "text": sequence(&[DEVICE]) })).await;
    assert_eq!(lab.api.ended(&run).await["state"], "passed");
    for number in ["1", "0", "-1", "one", "4294967296"] {
        let answer = lab.api.get(&format!("/runs/{run}/captures/{number}/waveform")).await;
        problem(&answer, 404, "unknown-capture");
    }
}

/// Catches: a body that is half understood, a page that is refused by a fault, a type that a foreign page could send.
#[tokio::test]
async fn a_body_that_is_not_what_the_route_takes_is_refused() {
    let lab = Lab::start(&LabPlan::default()).await;
    let bodies = [
        ("/runs", "{"),
        ("/runs", "[]"),
        ("/runs", "{}"),
        ("/runs", r#"{"sequence": "gate-night", "text": "title = 1"}"#),
        ("/runs", r#"{"sequence": 5}"#),
        ("/runs", r#"{"sequence": "gate-night", "speed": "fast"}"#),
        ("/pairs/gate/deskew", r#"{"target_u_skew_s": -1.0}"#),
        ("/pairs/gate/deskew", r#"{"target_u_skew_s": 1e999}"#),
        ("/pairs/gate/deskew", r#"{"most_acquisitions": 0}"#),
        ("/pairs/gate/deskew", r#"{"most_acquisitions": 4000000000}"#),
        ("/pairs/gate/deskew", r#"{"skew_reference": "moon"}"#),
        ("/pairs/gate/deskew", r#"{"most": 4}"#),
    ];
    for (path, body) in bodies {
        let send = |client: &reqwest::Client, base: &str| {
            client.post(format!("{base}{path}")).header("content-type", "application/json").body(body)
        };
        problem(&lab.api.send(send).await, 422, "invalid-request");
    }
    let large = "x".repeat(3 << 20);
    problem(&lab.api.post("/runs", &json!({ "text": large })).await, 413, "body-too-large");
    for kind in ["text/plain", "application/x-www-form-urlencoded"] {
        let body = r#"{"sequence": "gate-night"}"#;
        let send = |client: &reqwest::Client, base: &str| {
            client.post(format!("{base}/runs")).header("content-type", kind).body(body)
        };
        problem(&lab.api.send(send).await, 415, "unsupported-media-type");
    }
    let delete = |client: &reqwest::Client, base: &str| client.delete(format!("{base}/runs"));
    problem(&lab.api.send(delete).await, 405, "method-not-allowed");
    problem(&lab.api.get("/pairs/gate/deskew").await, 405, "method-not-allowed");
    nothing_ran(&lab).await;

    let run = lab.api.begin("/runs", &json!({ "text": sequence(&[DEVICE]) })).await;
    lab.api.ended(&run).await;
    for query in ["limit=0", "limit=201", "limit=many", "after=-1"] {
        problem(&lab.api.get(&format!("/runs/{run}/captures?{query}")).await, 422, "invalid-request");
    }
    let send = |client: &reqwest::Client, base: &str| {
        client.get(format!("{base}/runs/{run}/events")).header("last-event-id", "yesterday")
    };
    problem(&lab.api.send(send).await, 422, "invalid-request");
}

/// Catches: a page from elsewhere that drives the bench through a person's browser.
#[tokio::test]
async fn another_host_or_origin_is_refused() {
    let lab = Lab::start(&LabPlan::default()).await;
    for (header, value) in [("host", "bench.example"), ("origin", "http://bench.example"), ("origin", "null")] {
        let get = |client: &reqwest::Client, base: &str| client.get(format!("{base}/bench")).header(header, value);
        let detail = problem(&lab.api.send(get).await, 422, "invalid-request");
        assert!(detail.contains(value), "{detail}");
        let post = |client: &reqwest::Client, base: &str| {
            client.post(format!("{base}/pairs/gate/deskew")).header(header, value).json(&json!({}))
        };
        problem(&lab.api.send(post).await, 422, "invalid-request");
    }
    nothing_ran(&lab).await;
    let own = |client: &reqwest::Client, base: &str| client.get(format!("{base}/bench")).header("origin", &lab.url);
    assert_eq!(lab.api.send(own).await.status, 200, "the daemon's own page may ask");
}

/// Catches: a sequence that is begun before it was checked whole, or of which only the first mistake is told.
#[tokio::test]
async fn a_sequence_with_mistakes_starts_nothing() {
    let wrong = "title = \"wrong\"\n\
                 [[stage]]\ndo = \"set\"\nsetting = \"bus_voltage\"\nvalue = \"48 V\"\n\
                 [[stage]]\ndo = \"set\"\nsetting = \"bus_voltage\"\nvalue = \"480 V\"\n\
                 [[stage]]\ndo = \"capture\"\npair = \"hub\"\n\
                 [[stage]]\ndo = \"dance\"\n\
                 [[stage]]\ndo = \"wait\"\ntime = \"3 V\"\n";
    let lab = Lab::start(&LabPlan::default().with_sequence("wrong", wrong)).await;
    let by_text = lab.api.post("/runs", &json!({ "text": wrong })).await;
    problem(&by_text, 422, "sequence-refused");
    let by_name = lab.api.post("/runs", &json!({ "sequence": "wrong" })).await;
    problem(&by_name, 422, "sequence-refused");
    assert_eq!(by_text.json()["mistakes"], by_name.json()["mistakes"]);
    let mistakes = by_text.json()["mistakes"].as_array().unwrap().clone();
    let lines: Vec<u64> = mistakes.iter().map(|mistake| mistake["line"].as_u64().unwrap()).collect();
    // The value of 480 V, the pair `hub`, the stage that dances, the time in volts.
    assert_eq!(lines, [9, 12, 14, 17], "{mistakes:#?}");
    for mistake in &mistakes {
        for key in ["what", "help"] {
            assert!(mistake[key].as_str().is_some_and(|text| text.len() > 5), "{mistake}");
        }
    }
    let listed = lab.api.get("/sequences").await.json();
    let item = listed["items"].as_array().unwrap().iter().find(|item| item["name"] == "wrong").unwrap().clone();
    assert_eq!(item["check"]["mistakes"], by_text.json()["mistakes"]);
    // Not TOML at all.
    let nonsense = lab.api.post("/runs", &json!({ "text": "title = [" })).await;
    problem(&nonsense, 422, "sequence-refused");
    nothing_ran(&lab).await;
    assert_eq!(lab.ask("supply", "SOURce1:VOLTage?").await.parse::<f64>().unwrap(), 0.0);
}

/// Catches: a sequence whose declared voltages are more than the probes are rated for.
#[tokio::test]
async fn a_stage_beyond_the_probes_rating_is_refused() {
    let plan = LabPlan::default();
    let bench = plan.bench.replace("rating = \"300 V\"", "rating = \"80 V\"");
    assert_ne!(bench, plan.bench);
    let lab = Lab::start(&LabPlan { bench, ..plan }).await;
    // 60 V and the headroom of 25 V that the bench declares.
    let stage = "[[stage]]\ndo = \"set\"\nsetting = \"bus_voltage\"\nvalue = \"60 V\"\n";
    let text = sequence(&[stage, "[[stage]]\ndo = \"route\"\nroute = \"device\"\n", &capture("")]);
    let answer = lab.api.post("/runs", &json!({ "text": text })).await;
    problem(&answer, 422, "sequence-refused");
    assert!(answer.json()["mistakes"].to_string().contains("80"), "{}", answer.json());
    nothing_ran(&lab).await;
}
