//! `evenpair analyse` on files as people have them: made by hand, and exported from the simulated bench.

#![allow(clippy::unwrap_used, reason = "a test may panic; not all of these helpers are marked as tests")]

use std::path::{Path, PathBuf};

use evenpair_tests::{Lab, LabPlan, run_to_end};
use serde_json::{Value, json};

const SKEW_S: f64 = 2.6e-9;
const GAIN: f64 = 1.017;

/// A square wave of ±1 with smooth edges.
fn square(t: f64, period_s: f64) -> f64 {
    ((std::f64::consts::TAU * t / period_s).sin() * period_s / (std::f64::consts::TAU * 20e-9)).tanh()
}

/// Noise of about 5 mV rms that is the same in every run: three rounds of a 64-bit linear congruential generator
/// (Knuth's constants), summed to something near a bell.
fn noise(seed: &mut u64) -> f64 {
    let mut one = || {
        *seed = seed.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (*seed >> 11) as f64 / (1_u64 << 53) as f64 - 0.5
    };
    (one() + one() + one()) * 0.01
}

/// Rows of time, positive and negative leg in seconds and volts.
fn rows(points: u32, interval_s: f64, start_s: f64, p: impl Fn(f64) -> f64, n: impl Fn(f64) -> f64) -> Vec<[f64; 3]> {
    let mut seed = 42;
    (0..points)
        .map(|i| {
            let t = f64::from(i).mul_add(interval_s, start_s);
            [t, p(t) + noise(&mut seed), GAIN * n(t - SKEW_S) + noise(&mut seed)]
        })
        .collect()
}

fn write(folder: &Path, name: &str, header: &str, rows: &[[f64; 3]], line: impl Fn(&[f64; 3]) -> String) -> PathBuf {
    let path = folder.join(name);
    let body: String = rows.iter().map(line).collect();
    std::fs::write(&path, format!("{header}{body}")).unwrap();
    path
}

/// Two hand-made files in different styles, rates, lengths and trigger positions: a reference, and a device of two
/// inverted legs (±1.5 V each) with 1 V of a 450 kHz sine mixed onto both.
fn files(folder: &Path) -> (PathBuf, PathBuf) {
    let reference = |t: f64| 2.0 * square(t, 1e-5);
    let rows_r = rows(60_000, 2e-9, -6e-5, reference, reference);
    let reference = write(folder, "reference.csv", "Zeit (ns);P (mV);N (mV)\n", &rows_r, |[t, p, n]| {
        format!("{:.3};{:.4};{:.4}\n", t * 1e9, p * 1e3, n * 1e3).replace('.', ",")
    });
    let sine = |t: f64| (std::f64::consts::TAU * 450e3 * t).sin();
    let half = |t: f64| 1.5 * square(t, 1e-5);
    let rows_d = rows(30_000, 2.5e-9, 1e-6, |t| half(t) + sine(t), |t| sine(t) - half(t));
    let device = write(folder, "device.txt", "a second file\ntime\tminus\tplus\nµs\tV\tV\n", &rows_d, |[t, p, n]| {
        format!("{:.6}\t{n:.6}\t{p:.6}\n", t * 1e6)
    });
    (reference, device)
}

fn text(path: &Path) -> &str {
    path.to_str().unwrap()
}

fn figure<'a>(found: &'a Value, name: &str) -> &'a Value {
    found["figures"].as_array().unwrap().iter().find(|figure| figure["name"] == name).unwrap()
}

/// Sees that a quantity is what it should be within four of its standard uncertainties and an allowance.
fn near(quantity: &Value, truth: f64, allowance: f64) {
    let (value, u) = (quantity["value"].as_f64().unwrap(), quantity["u"].as_f64().unwrap());
    assert!((value - truth).abs() < 4.0 * u + allowance, "{value} ± {u}, not {truth}");
}

fn check(found: &Value) {
    near(&found["skew"], SKEW_S, 0.0);
    near(&found["gain"], GAIN, 0.0);
    near(&found["offset"], 0.0, 0.0);
    assert_eq!(found["verified_on"], "other-half");
    assert_eq!(found["independent"], false);
    let bands = found["rejection"].as_array().unwrap();
    assert!(bands.len() >= 3, "{bands:?}");
    // Closed form ½·|1 + H|/|1 − H| for this gain and skew at 100 kHz: 35.5 dB.
    let before = bands[0]["before_db"].as_f64().unwrap();
    assert!((before - 35.5).abs() < 0.3, "{before}");
    assert!(bands[0]["after_db"].as_f64().unwrap() > before + 20.0, "{bands:?}");
    // ±1.5 V on each of two inverted legs are ±3 V between them, whatever was mixed onto both.
    near(figure(found, "high_level"), 3.0, 1e-4);
    near(figure(found, "low_level"), -3.0, 1e-4);
    near(figure(found, "frequency"), 1e5, 0.0);
    // The common mode is the sine: 1 V in amplitude, so 0.7071 V rms and 2 V from peak to peak.
    near(figure(found, "common_rms"), std::f64::consts::FRAC_1_SQRT_2, 0.01);
    near(figure(found, "common_swing"), 2.0, 0.05);
}

#[tokio::test]
async fn two_files_in_different_styles_without_a_daemon() {
    let folder = tempfile::tempdir().unwrap();
    let (reference, device) = files(folder.path());
    let arguments = ["analyse", "--reference", text(&reference), "--device", text(&device), "--json"];
    let output = run_to_end("evenpair", &arguments).await;
    assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
    check(&serde_json::from_slice(&output.stdout).unwrap());

    // For people: everything that was guessed, and that the verification is not independent.
    let output = run_to_end("evenpair", &arguments[..5]).await;
    let shown = String::from_utf8_lossy(&output.stdout);
    for part in ["--separator = semicolon", "--decimal = comma", "--time-unit = ns", "--positive = plus", "not an"] {
        assert!(shown.contains(part), "`{part}` is not in:\n{shown}");
    }
    assert!(shown.lines().all(|line| line.chars().count() <= 80), "{shown}");

    // A wrong column is a wrong usage and says what there is.
    let wrong = [&arguments[..5], &["--positive", "gate"]].concat();
    let output = run_to_end("evenpair", &wrong).await;
    assert_eq!(output.status.code(), Some(3));
    let told = String::from_utf8_lossy(&output.stderr);
    assert!(told.contains("gate") && told.contains("P (mV)"), "{told}");
}

#[tokio::test]
async fn the_api_answers_the_same_and_an_export_comes_back() {
    let folder = tempfile::tempdir().unwrap();
    let (reference, device) = files(folder.path());
    let lab = Lab::start(&LabPlan::default()).await;
    let read = |path: &Path| std::fs::read_to_string(path).unwrap();
    let body = json!({ "reference": { "text": read(&reference) }, "device": { "text": read(&device) } });
    let answer = lab.api.post("/analyse", &body).await;
    assert_eq!(answer.status, 200, "{}", String::from_utf8_lossy(&answer.bytes));
    check(&answer.json());
    let refused = lab.api.post("/analyse", &json!({ "reference": { "text": "no numbers" } })).await;
    assert_eq!((refused.status, &refused.media_type[..]), (422, "application/problem+json"));
    assert!(refused.json()["detail"].as_str().unwrap().contains("reading the reference"));

    // A capture of the bench, as CSV and as the stored file: the same figures from both. The hand-made reference stands
    // in for one, so it is the two readings that are compared, not the device.
    let run = lab.api.begin("/runs", &json!({ "sequence": "quick-look" })).await;
    assert_eq!(lab.api.ended(&run).await["state"], "passed");
    let mut results = Vec::new();
    for to in ["csv", "parquet"] {
        let place = folder.path().join(to);
        let export = ["--server", &lab.url, "export", &run, "--to", to, text(&place)];
        assert!(run_to_end("evenpair", &export).await.status.success());
        let capture = place.join(format!("capture-00001.{to}"));
        let arguments =
            ["analyse", "--reference", text(&reference), "--device", text(&capture), "--json", "--scale-spec", "1 %"];
        let output = run_to_end("evenpair", &arguments).await;
        assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
        results.push(serde_json::from_slice::<Value>(&output.stdout).unwrap());
    }
    for name in ["high_level", "mean", "rms", "common_rms"] {
        let [csv, parquet] = [0, 1].map(|i| figure(&results[i], name)["value"].as_f64().unwrap());
        // The CSV has ten digits.
        assert!((csv - parquet).abs() < 1e-4 * parquet.abs() + 1e-6, "{name}: {csv} and {parquet}");
    }
}
