//! `evenpair demo`: what a newcomer sees first, checked against the truth of its scenario.

use std::path::Path;

use evenpair_tests::{Api, Program, Truth, figure, processes_naming, project, quantity, run_to_end};
use serde_json::Value;

/// The pair's measuring range at the scope's input: 100 V at ×10 tips.
const SPAN_V: f64 = 10.0;

fn scenario() -> String {
    std::fs::read_to_string(project().join("configs/scenarios/greenhouse-fan.toml")).unwrap()
}

fn rejection_at(correction: &Value, frequency_hz: f64) -> &Value {
    let points = correction["rejection"].as_array().unwrap();
    let near = |point: &&Value| (point["frequency_hz"].as_f64().unwrap() / frequency_hz - 1.0).abs() < 1e-6;
    points.iter().find(near).unwrap_or_else(|| panic!("no rejection at {frequency_hz} Hz: {points:?}"))
}

/// The mean of the third column of a waveform's CSV: the negative leg, in volts at the tip.
fn mean_of_negative(csv: &str) -> f64 {
    let values: Vec<f64> = csv.lines().skip(1).map(|line| line.split(',').nth(2).unwrap().parse().unwrap()).collect();
    assert!(values.len() > 1000);
    values.iter().sum::<f64>() / values.len() as f64
}

/// Starts the daemon on a demo's data as the demo's last lines tell, and reads what the node's mean was at 48 V, 0.5 A.
async fn mean_on_the_reference(folder: &Path, capture: &Value) -> f64 {
    let at = |name: &str| folder.join(name).to_str().unwrap().to_owned();
    let (bench, data) = (at("bench.toml"), at("data"));
    let arguments = ["--bench", &bench, "--data", &data, "--listen", "127.0.0.1:0", "--exit-with-stdin"];
    let mut daemon = Program::start("evenpaird", &arguments, &folder.join("again.log"));
    let line = daemon.line().await.expect("the daemon tells where it listens");
    let api = Api::new(line.strip_prefix("listening on ").expect("where it listens"));
    let path = format!("/runs/{}/captures/{}/waveform", capture["run"].as_str().unwrap(), capture["number"]);
    let csv = api.send(|client, base| client.get(format!("{base}{path}")).header("accept", "text/csv")).await;
    assert_eq!(csv.status, 200);
    // Its instruments are gone; it is not asked to bring them to rest, which it would try for a while.
    daemon.signal("KILL").await;
    mean_of_negative(std::str::from_utf8(&csv.bytes).unwrap())
}

/// Catches: a demo that measures something else than what the scenario says, or that leaves processes behind.
#[tokio::test]
async fn the_json_of_the_demo_holds_the_truth() {
    let folder = tempfile::tempdir().unwrap();
    let output = run_to_end("evenpair", &["demo", "--json", "--data", folder.path().to_str().unwrap()]).await;
    assert_eq!(output.status.code(), Some(0), "{}", String::from_utf8_lossy(&output.stderr));
    assert_eq!(processes_naming(folder.path()), Vec::<String>::new());

    let report: Value = serde_json::from_slice(&output.stdout).unwrap();
    assert_eq!(report["run"]["state"], "passed");
    assert_eq!(report["data"], folder.path().to_str().unwrap());
    let captures = report["captures"].as_array().unwrap();
    assert!(captures.len() >= 12, "{} captures", captures.len());
    assert!(captures.iter().any(|capture| !capture["limits"].as_array().unwrap().is_empty()));

    let truth = Truth::of(&scenario(), SPAN_V);
    let correction = &report["correction"];
    let skew = quantity(&correction["skew"], "s");
    assert!(skew.covers(truth.skew_s), "skew {skew:?}, truth {}", truth.skew_s);
    let gain = quantity(&correction["gain"], "1");
    assert!(gain.covers(truth.gain), "gain {gain:?}, truth {}", truth.gain);

    // The offset that goes with this gain depends on the common mode's mean, because the probes' compensation differs:
    // worked out from the node's mean at the very bus and load that the reference in situ uses.
    let at =
        |capture: &&Value, n: usize, value: f64| capture["conditions"][n]["value"]["value"].as_f64() == Some(value);
    let like = captures.iter().find(|capture| at(capture, 0, 48.0) && at(capture, 1, 0.5)).expect("48 V, 0.5 A");
    let mean_v = mean_on_the_reference(folder.path(), like).await / truth.gain;
    let offset = quantity(&correction["offset"], "V");
    let expected_v = truth.offset_at_mean(mean_v);
    assert!(offset.covers(expected_v), "offset {offset:?}, truth {expected_v} at a mean of {mean_v} V");

    let point = rejection_at(correction, 1e6);
    let gained = point["after_db"].as_f64().unwrap() - point["before_db"].as_f64().unwrap();
    assert!(gained >= 30.0, "{point}");

    // The gate over the node, driven high: 11.9 V by the scenario, and plain subtraction is far off at 60 V.
    for capture in captures {
        let high = figure(capture, "high_level");
        assert_eq!(high["valid"], true, "{high}");
        let found = quantity(high, "V");
        assert!((found.value - 11.9).abs() < 0.2, "{high}");
    }
}

/// Catches: text that does not fit a terminal, and a demo that does not say where its data lies.
#[tokio::test]
async fn the_text_of_the_demo_fits_eighty_columns() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().to_str().unwrap();
    let output = run_to_end("evenpair", &["demo", "--data", path, "--seed", "7"]).await;
    assert_eq!(output.status.code(), Some(0), "{}", String::from_utf8_lossy(&output.stderr));
    let text = String::from_utf8(output.stdout).unwrap();
    // How long a path is, is not ours to say.
    let wide: Vec<&str> = text.lines().filter(|line| line.chars().count() > 80 && !line.contains(path)).collect();
    assert!(wide.is_empty(), "{wide:#?}");
    assert!(text.contains(&format!("The data lies in {path}")), "{text}");
    for named in ["bench.toml", "data/evenpair.sqlite"] {
        assert!(text.contains(named) && folder.path().join(named).exists(), "{named}");
    }
    let file = text.lines().map(str::trim).find(|line| line.ends_with(".parquet")).expect("a waveform's file is named");
    assert!(folder.path().join(file).exists(), "{file}");
}

/// Catches: a demo that outlives Ctrl-C, or that calls itself done after it.
#[tokio::test]
async fn ctrl_c_in_the_middle_leaves_no_process() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().to_str().unwrap();
    let mut demo = Program::start("evenpair", &["demo", "--data", path], &folder.path().join("demo.log"));
    loop {
        let line = demo.line().await.expect("the demo shows its progress");
        if line.contains("capture 2 ") {
            break;
        }
    }
    assert!(!processes_naming(folder.path()).is_empty(), "the bench and the daemon run now");
    let status = demo.signal("INT").await;
    assert_eq!(status.code(), Some(2), "it could not be completed");
    assert_eq!(processes_naming(folder.path()), Vec::<String>::new());
}
