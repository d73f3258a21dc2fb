//! What the daemon tells of a capture beside its usual figures: its spectrum, times beyond thresholds, what limits the
//! correction.

use evenpair_tests::{Lab, LabPlan};
use serde_json::Value;

use crate::scripts::{ALWAYS, DESKEW, DEVICE, capture, sequence, text};

fn numbers(value: &Value) -> Vec<f64> {
    value.as_array().unwrap().iter().map(|x| x.as_f64().unwrap()).collect()
}

/// Catches: a spectrum whose power is not that of the capture (a wrong scale or a wrong common mode), thresholds that do
/// not reach the figures, a correction that does not say what limits it.
#[tokio::test]
async fn a_capture_has_a_spectrum_and_what_was_asked_of_it() {
    let asked = "thresholds = { high = \"8 V\", low = \"2 V\" }\nsettling_band = \"10 %\"";
    let script = sequence(&[DESKEW, DEVICE, &capture(asked), ALWAYS]);
    let lab = Lab::start(&LabPlan::default()).await;
    let id = lab.api.begin("/runs", &text(&script)).await;
    let run = lab.api.ended(&id).await;
    assert_eq!(run["state"], "passed", "{run}");
    let captured = lab.api.get(&format!("/runs/{id}/captures")).await.json()["items"][0].clone();
    let figure = |name: &str| {
        let all = captured["figures"].as_array().unwrap();
        all.iter().find(|f| f["name"] == name).unwrap_or_else(|| panic!("no {name}: {all:?}")).clone()
    };
    let (above, below, period) = (figure("time_above"), figure("time_below"), figure("period"));
    assert_eq!((&above["valid"], &below["valid"]), (&Value::Bool(true), &Value::Bool(true)), "{above} {below}");
    let value = |f: &Value| f["value"].as_f64().unwrap();
    // Both together leave only the edges of the period.
    let rest = value(&period) - value(&above) - value(&below);
    assert!(rest > 0.0 && rest < 0.1 * value(&period), "{rest} of {period}");
    assert!(!above["budget"].as_array().unwrap().is_empty());

    let path = format!("/runs/{id}/captures/1/spectrum");
    let spectrum = lab.api.get(&format!("{path}?segment=1024")).await;
    assert_eq!(spectrum.status, 200, "{}", String::from_utf8_lossy(&spectrum.bytes));
    let spectrum = spectrum.json();
    assert_eq!((&spectrum["window"], &spectrum["segment"]), (&Value::from("hann"), &Value::from(1024)));
    let bin_hz = spectrum["bin"]["value"].as_f64().unwrap();
    let interval_s = captured["sample_interval"]["value"].as_f64().unwrap();
    assert!((bin_hz * interval_s * 1024.0 - 1.0).abs() < 1e-9);
    for line in ["difference", "common"] {
        let (rms, density) = (numbers(&spectrum[line]["rms_v"]), numbers(&spectrum[line]["density"]));
        assert_eq!((rms.len(), density.len()), (513, 513));
        for (rms, density) in rms.iter().zip(&density) {
            assert!((rms - density * (1.5 * bin_hz).sqrt()).abs() <= 1e-9 * rms + 1e-15, "{line}: {rms} {density}");
        }
    }
    // The common mode swings by the bus, the difference by the drive: each moves by what its power says, to the part that
    // lies below the first bin of so short a segment.
    let power = |line: &str| numbers(&spectrum[line]["density"]).iter().map(|d| d * d * bin_hz).sum::<f64>().sqrt();
    let rms = captured["leak"]["common_rms"]["value"].as_f64().unwrap();
    assert!(power("common") > 0.02 * rms && power("common") < 1.2 * rms, "{} {rms}", power("common"));
    assert!(power("difference") < 1.2 * value(&figure("rms")), "{}", power("difference"));

    for (query, status) in [("?segment=4", 422), ("?segment=x", 422), ("?segment=100000", 422), ("", 200)] {
        assert_eq!(lab.api.get(&format!("{path}{query}")).await.status, status, "{query}");
    }
    assert_eq!(lab.api.get(&format!("/runs/{id}/captures/9/spectrum")).await.status, 404);

    let correction = lab.api.get("/pairs/gate/correction").await.json();
    assert!(correction["limited_by"].as_str().is_some_and(|words| words.contains(':')), "{correction}");
    assert!(correction["freedom"].is_object(), "{correction}");
    let shown = lab.evenpair(&["deskew", "gate", "--most", "4"]).await;
    let shown = String::from_utf8(shown.stdout).unwrap();
    assert!(shown.contains("the skew is limited by"), "{shown}");
}
