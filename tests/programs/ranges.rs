//! Corrections of several vertical ranges: transferred from one to another against the truth, and each capture with the
//! one that holds.

use evenpair_tests::{Lab, LabPlan, Truth, figure, quantity, set_in_nth};
use serde_json::{Value, json};

use crate::deskew::Tally;
use crate::scripts::{ALWAYS, DESKEW, DEVICE, capture, sequence, text};
use crate::worlds::world;

/// A new range for the pair, which is deskewed on 100 V around 35 V: span and offset at the tip.
const NARROW: (f64, f64) = (20.0, 5.0);
const MIDDLE: (f64, f64) = (50.0, 15.0);

async fn passed(lab: &Lab, path: &str, body: &Value) {
    let run = lab.api.begin(path, body).await;
    let run = lab.api.ended(&run).await;
    assert_eq!(run["state"], "passed", "{run}");
}

async fn deskew(lab: &Lab) -> Value {
    passed(lab, "/pairs/gate/deskew", &json!({ "skew_reference": "in_situ" })).await;
    lab.api.get("/pairs/gate/correction").await.json()
}

async fn transfer(lab: &Lab, (span_v, offset_v): (f64, f64), by: &str) -> Value {
    let body = json!({ "reference": "fast", "span_v": span_v, "offset_v": offset_v, "by": by });
    passed(lab, "/pairs/gate/transfer", &body).await;
    let newest = lab.api.get("/pairs/gate/corrections").await.json()["items"][0].clone();
    let conditions = &newest["conditions"];
    for leg in ["positive", "negative"] {
        assert_eq!(conditions[leg]["span"]["value"].as_f64(), Some(span_v), "{newest}");
        assert_eq!(conditions[leg]["offset"]["value"].as_f64(), Some(offset_v), "{newest}");
    }
    newest
}

#[derive(Default)]
struct Tallies {
    skew: Tally,
    gain: Tally,
    offset: Tally,
}

impl Tallies {
    fn add(&mut self, correction: &Value, truth: &Truth) {
        self.skew.add(quantity(&correction["skew"], "s"), truth.skew_s);
        self.gain.add(quantity(&correction["gain"], "1"), truth.gain);
        self.offset.add(quantity(&correction["offset"], "V"), truth.offset_v);
    }

    fn judge(&self, what: &str) {
        self.skew.judge(&format!("{what}: skew"));
        self.gain.judge(&format!("{what}: gain"));
        self.offset.judge(&format!("{what}: offset"));
    }
}

/// Catches: a transfer that is biased, loses a correlation, states too little, or takes the wrong range's correction.
/// The ranges differ by up to 1 % in gain, 0.5 % of the span in offset and 50 ps in delay.
#[tokio::test(flavor = "multi_thread", worker_threads = 2)]
async fn transferred_corrections_cover_the_truth() {
    let (mut legs, mut best) = (Tallies::default(), Tallies::default());
    for seed in 21..=26 {
        let scenario = world(seed);
        let lab = Lab::start(&LabPlan { scenario: scenario.clone(), ..LabPlan::default() }).await;
        for repeat in 0..5 {
            // A deskew for each: their errors are then independent.
            let from = deskew(&lab).await;
            let (one, other) = if repeat % 2 == 0 { (NARROW, MIDDLE) } else { (MIDDLE, NARROW) };
            let found = transfer(&lab, one, "legs").await;
            let told = &found["transferred_from"];
            assert_eq!(told["correction"], from["id"], "{found}");
            assert_eq!((&told["levels_by"], &told["reference"]), (&"legs".into(), &"fast".into()), "{found}");
            legs.add(&found, &Truth::of(&scenario, one.0 / 10.0));
            let found = transfer(&lab, other, "best").await;
            assert_eq!(found["state"], "fresh", "{found}");
            assert!(!found["rejection"].as_array().unwrap().is_empty(), "{found}");
            best.add(&found, &Truth::of(&scenario, other.0 / 10.0));
            // What holds on the pair's own range is still the deskew's.
            assert_eq!(lab.api.get("/pairs/gate/correction").await.json()["id"], from["id"]);
        }
    }
    legs.judge("leg by leg");
    best.judge("the surer way");
}

/// A transfer in a sequence, with `more` in its stage.
fn stage(more: &str) -> String {
    format!("[[stage]]\ndo = \"transfer\"\npair = \"gate\"\nreference = \"fast\"\n{more}\n")
}

/// Catches: a capture that takes another range's correction, or is refused although its range has one.
#[tokio::test]
async fn each_capture_takes_the_correction_of_its_range() {
    let to_middle = stage("span = \"50 V\"\noffset = \"15 V\"\nby = \"legs\"\nmost_acquisitions = 4");
    let on_middle = capture("span = \"50 V\"\noffset = \"15 V\"");
    let night = sequence(&[DESKEW, &to_middle, DEVICE, &on_middle, &capture(""), ALWAYS]);
    let lab = Lab::start(&LabPlan::default()).await;
    let id = lab.api.begin("/runs", &text(&night)).await;
    let run = lab.api.ended(&id).await;
    assert_eq!(run["state"], "passed", "{run}");
    let corrections = lab.api.get("/pairs/gate/corrections").await.json();
    let [transferred, deskewed] = &corrections["items"].as_array().unwrap()[..] else { panic!("{corrections}") };
    assert_eq!(transferred["transferred_from"]["correction"], deskewed["id"], "{corrections}");
    let captures = lab.api.get(&format!("/runs/{id}/captures")).await.json();
    for (capture, correction) in captures["items"].as_array().unwrap().iter().zip([transferred, deskewed]) {
        assert_eq!(capture["correction_state"], "fresh", "{capture}");
        assert_eq!(capture["correction"], correction["id"], "{capture}");
    }
    // Both see one gate drive: its amplitude agrees within the uncertainties of the two ranges.
    let amplitude = |place: usize| quantity(figure(&captures["items"][place], "amplitude"), "V");
    let (one, other) = (amplitude(0), amplitude(1));
    assert!((one.value - other.value).abs() < 3.0 * one.u.hypot(other.u) && one.value > 10.0, "{one:?} {other:?}");
    // Verifying is of the pair's own range, whichever correction is the newest.
    passed(&lab, "/pairs/gate/verify", &json!({})).await;
    let again = lab.api.get("/pairs/gate/corrections").await.json();
    assert_ne!(again["items"][1]["rejection"], deskewed["rejection"]);
    assert_eq!(again["items"][0]["rejection"], transferred["rejection"]);
    // Without the transfer that capture is known to be refused before anything is sent.
    let refused = lab.api.post("/runs", &text(&sequence(&[DESKEW, DEVICE, &on_middle]))).await;
    assert_eq!(refused.status, 422);
    let mistakes = refused.json()["mistakes"].to_string();
    assert!(mistakes.contains("range") && mistakes.contains("transfer"), "{mistakes}");
}

/// Catches: a transfer that begins although it cannot succeed, and one that hides that the pair has changed.
#[tokio::test]
async fn what_cannot_be_transferred_is_refused_and_what_has_changed_is_told() {
    let lab = Lab::start(&LabPlan::default()).await;
    let body = |span_v: f64, offset_v: f64| json!({ "reference": "fast", "span_v": span_v, "offset_v": offset_v });
    let missing = lab.api.post("/pairs/gate/transfer", &body(20.0, 5.0)).await;
    assert_eq!((missing.status, missing.json()["code"].as_str()), (404, Some("no-correction")));
    passed(&lab, "/pairs/gate/deskew", &json!({ "most_acquisitions": 4 })).await;
    for (wrong, words) in [
        (body(8.0, 5.0), ["between 0 V and 10 V", "1 V to 9 V"]),
        (body(100.0, 35.0), ["100 V around 35 V", "deskew"]),
        (body(-1.0, 0.0), ["-1 V", "range"]),
        (json!({ "reference": "slow", "span_v": 20.0 }), ["`slow`", "known"]),
        (json!({ "span_v": 20.0 }), ["reference", "openapi"]),
        (json!({ "reference": "fast", "span_v": 20.0, "by": "luck" }), ["luck", "legs"]),
    ] {
        let refused = lab.api.post("/pairs/gate/transfer", &wrong).await;
        assert_eq!(refused.status, 422, "{wrong}");
        let detail = refused.json()["detail"].as_str().unwrap().to_owned();
        assert!(words.iter().all(|word| detail.contains(word)), "{words:?} in: {detail}");
    }
    // A leg that drifted by a thousandth since: told, and the correction's own meaning is kept.
    let scenario = set_in_nth(&LabPlan::default().scenario, "[[leg]]", 1, "gain_drift_per_h", "30.0");
    let lab = Lab::start(&LabPlan { scenario, ..LabPlan::default() }).await;
    passed(&lab, "/pairs/gate/deskew", &json!({ "most_acquisitions": 4 })).await;
    let found = transfer(&lab, NARROW, "best").await;
    assert!(found["warnings"].to_string().contains("another gain"), "{found}");
    assert_eq!(found["transferred_from"]["levels_by"], "legs", "{found}");
}

/// Catches: a command that shows the wrong correction, or not what it came from.
#[tokio::test]
async fn the_command_shows_the_new_ranges_correction() {
    let lab = Lab::start(&LabPlan::default()).await;
    assert_eq!(lab.evenpair(&["deskew", "gate", "--most", "4"]).await.status.code(), Some(0));
    let arguments = ["transfer", "gate", "--reference", "fast", "--span", "20 V", "--most", "4"];
    let done = lab.evenpair(&arguments).await;
    let (out, err) = (String::from_utf8_lossy(&done.stdout), String::from_utf8_lossy(&done.stderr));
    assert_eq!(done.status.code(), Some(0), "{out}\n{err}");
    assert!(out.lines().all(|line| line.chars().count() <= 80), "{out}");
    let shown = out.split_whitespace().collect::<Vec<_>>().join(" ");
    for words in ["on a span of 20.0 V", "transferred from a span of 100 V around 35.0 V by `fast`", "rejection at"] {
        assert!(shown.contains(words), "`{words}` in: {out}");
    }
    // The default offset is the reference's.
    let newest = lab.api.get("/pairs/gate/corrections").await.json()["items"][0].clone();
    assert_eq!(newest["conditions"]["positive"]["offset"]["value"].as_f64(), Some(5.0), "{newest}");
    let wrong = lab.evenpair(&["transfer", "gate", "--reference", "fast", "--span", "20 s"]).await;
    assert_eq!(wrong.status.code(), Some(3));
    assert!(String::from_utf8_lossy(&wrong.stderr).contains("--span"));
}
