//! Devices whose voltages follow from Ohm's and Kirchhoff's laws by hand, measured through simulator, link and daemon.
//!
//! Nothing of the tool's own mathematics is used to say what is right. The legs are the demo's: 2.8 % apart in gain and
//! 2.3 ns in time, each with an offset and noise of its own, so that plain subtraction is visibly wrong.

use std::f64::consts::{FRAC_2_PI, FRAC_PI_2, TAU};

use evenpair_tests::{Lab, LabPlan, figure, quantity, set_in_table};
use serde_json::Value;

use crate::scripts::{ALWAYS, DESKEW, sequence, text};

/// The bus at 10 V and the tips on the device.
const TEN_VOLTS: &str = "[[stage]]\ndo = \"set\"\nsetting = \"bus_voltage\"\nvalue = \"10 V\"\n\
                         [[stage]]\ndo = \"route\"\nroute = \"device\"\n";

/// What each probe loads its node with, in ohms (the scenario's; common for a ×10 probe).
const PROBE_OHM: f64 = 10e6;

/// The generator's second output, which the bench keeps running at 100 kHz: for devices that cross no level of use.
const SYNC: &str = "trigger = { channel = 0, level = \"1 V\" }";

/// The demo's bench with another device, deskewed on the generator's square alone and on the very range of the
/// measurement, `span` about `offset`.
fn plan(device: &str, span: &str, offset: &str) -> LabPlan {
    let mut plan = LabPlan::default();
    let from = plan.scenario.find("[device]").expect("the scenario ends with its device");
    plan.scenario.truncate(from);
    plan.scenario.push_str(device);
    // The reference in situ is not used, but must fit the range all the same.
    plan.bench = set_in_table(&plan.bench, "reference.in_situ", "high", "\"10 V\"");
    let mut plan = plan.with_bench("pair.gate", "gain_reference", "\"fast\"");
    for table in ["pair.gate", "reference.fast"] {
        plan = plan.with_bench(table, "span", &format!("\"{span}\""));
        plan = plan.with_bench(table, "offset", &format!("\"{offset}\""));
    }
    plan
}

/// The same with a reference that rests longer than the time constant of the probes (95 µs): only such a one shows how far
/// slow and fast gain differ, and a steady voltage is measured by the slow one.
fn slow(plan: LabPlan) -> LabPlan {
    let mut plan = plan;
    for (key, value) in [("frequency", "\"1 kHz\""), ("edge", "\"1 us\""), ("interval", "\"200 ns\"")] {
        plan = plan.with_bench("reference.fast", key, value);
    }
    for (fast, slow) in
        [("frequency_hz = \"1 MHz\"", "frequency_hz = \"1 kHz\""), ("edge_s = \"3 ns\"", "edge_s = \"1 us\"")]
    {
        assert!(plan.bench.contains(fast), "{fast}");
        plan.bench = plan.bench.replacen(fast, slow, 1);
    }
    plan
}

/// What a run left: the correction, its only capture, and that capture's samples (seconds, and volts of the positive
/// leg, the negative leg and the corrected difference).
struct Measured {
    correction: Value,
    capture: Value,
    samples: Vec<[f64; 4]>,
}

/// Deskews, puts the tips on the device and takes one capture; `more` says how.
async fn measure(plan: &LabPlan, more: &str) -> Measured {
    let lab = Lab::start(plan).await;
    let capture = format!("[[stage]]\ndo = \"capture\"\npair = \"gate\"\n{more}\n");
    let run = lab.api.begin("/runs", &text(&sequence(&[DESKEW, TEN_VOLTS, &capture, ALWAYS]))).await;
    let ended = lab.api.ended(&run).await;
    assert_eq!(ended["state"], "passed", "{ended}");
    let page = lab.api.get(&format!("/runs/{run}/captures")).await.json();
    let path = format!("/runs/{run}/captures/1/waveform");
    let csv = lab.api.send(|client, base| client.get(format!("{base}{path}")).header("accept", "text/csv")).await;
    assert_eq!(csv.status, 200);
    let line = |line: &str| -> Option<[f64; 4]> {
        let numbers: Vec<f64> = line.split(',').map(|field| field.parse().ok()).collect::<Option<_>>()?;
        numbers.try_into().ok()
    };
    let csv = String::from_utf8(csv.bytes).unwrap();
    Measured {
        correction: lab.api.get("/pairs/gate/correction").await.json(),
        capture: page["items"][0].clone(),
        // The ends, for which the correction has no support, have no difference.
        samples: csv.lines().skip(1).filter_map(line).filter(|sample| sample[3].is_finite()).collect(),
    }
}

impl Measured {
    /// Fails unless the figure is valid and not drowned by the common mode, its 95 % interval holds `expected_v`, and
    /// that interval is no wider than ± `within_v`, so that it says something.
    fn holds(&self, name: &str, expected_v: f64, within_v: f64) {
        let figure = figure(&self.capture, name);
        assert!(figure["valid"] == true && figure["grade"] != "swamped", "{figure}");
        let found = quantity(figure, "V");
        let end = |key: &str| figure["coverage"][key].as_f64().unwrap_or_else(|| panic!("no interval: {figure}"));
        let (low, high) = (end("low"), end("high"));
        println!("{name}: {:.4} V, 95 % {low:.4} to {high:.4} V; by hand {expected_v:.4} V", found.value);
        assert!(low <= expected_v && expected_v <= high, "{name}: {expected_v} V by hand: {figure}");
        assert!(high - low <= 2.0 * within_v, "{name}: {figure}");
    }

    /// The amplitude at `frequency_hz` of what `of` makes of a sample, over whole periods of 10 µs.
    fn component(&self, of: impl Fn(&[f64; 4]) -> f64, frequency_hz: f64) -> f64 {
        let interval_s = (self.samples[1][0] - self.samples[0][0]).abs();
        let period = (10e-6 / interval_s).round() as usize;
        let count = self.samples.len() / period * period;
        let turn = TAU * frequency_hz / (period as f64 * 100e3);
        let sum = self.samples[..count].iter().enumerate().fold((0.0, 0.0), |(re, im), (i, sample)| {
            let (sin, cos) = (turn * i as f64).sin_cos();
            (of(sample).mul_add(cos, re), of(sample).mul_add(sin, im))
        });
        2.0 / count as f64 * sum.0.hypot(sum.1)
    }
}

/// Catches: a gain, an offset or a scale that is lost on the way from the tips to the figure.
///
/// Common practice, no source: across the middle one of three equal resistors on 10 V a third appears, 3.33 V, though
/// neither of its ends is earth. By hand with the probes, each 10 MΩ to earth, `ε = 100 Ω/10 MΩ`, Kirchhoff's current law
/// at both ends times 100 Ω: `(2 + ε)·p − n = 10 V` and `(2 + ε)·n − p = 0`, so that
/// `p − n = 10 V·(1 + ε)/((2 + ε)² − 1)`.
#[tokio::test]
async fn a_third_of_ten_volts_is_across_the_middle_of_three_equal_resistors() {
    let device = "[device]\nkind = \"divider\"\nresistors_ohm = [100.0, 100.0, 100.0]\n";
    let found = measure(&slow(plan(device, "20 V", "5 V")), &format!("{SYNC}\npoints = 4000")).await;
    let loss = 100.0 / PROBE_OHM;
    let expected_v = 10.0 * (1.0 + loss) / ((2.0 + loss).powi(2) - 1.0);
    assert!((expected_v - 3.33).abs() < 0.005, "{expected_v}");
    // The scope's scale, ±1.5 % (the bench file's), is 50 mV of it; nothing else may add much.
    found.holds("mean", expected_v, 0.055);
    assert_eq!(figure(&found.capture, "mean")["grade"], "clean");
    // Plain subtraction of these legs is off by more than that: it is the correction that makes it right.
    let plain: f64 = found.samples.iter().map(|s| s[1] - s[2]).sum::<f64>() / found.samples.len() as f64;
    assert!((plain - expected_v).abs() > 0.06, "{plain}");
}

/// Catches: levels that a high divider's load is left out of, or counted twice: what is measured is what is there with
/// the probes on.
///
/// By hand, 10 MΩ throughout, probes too: lower end 10 ∥ 10 = 5 MΩ; upper end 10 ∥ (10 + 5) = 6 MΩ; 10 V·6/16 = 3.75 V
/// at the upper end and a third of that, 1.25 V, at the lower: 2.5 V between them, where without probes 3.33 V were.
#[tokio::test]
async fn probes_load_three_resistors_of_ten_megohms() {
    let device = "[device]\nkind = \"divider\"\nresistors_ohm = [10e6, 10e6, 10e6]\n";
    let found = measure(&slow(plan(device, "20 V", "5 V")), &format!("{SYNC}\npoints = 4000")).await;
    found.holds("mean", 2.5, 0.045);
}

/// Catches: figures that a waveform which rests on its base spoils, a common mode that is taken for signal, a record
/// of milliseconds that is corrected by nanoseconds wrongly.
///
/// Common practice, no source: a bridge takes two drops of about 0.7 V from the magnitude. By hand, with 50 Ω before
/// the bridge and 1 kΩ behind it: where |v| > 1.4 V the load has (|v| − 1.4 V)·1000/1050, elsewhere nothing. While it
/// conducts one end of the load is a drop away from earth, so its probe changes nothing; the other end's 10 MΩ take
/// 0.7 V/10 MΩ more through 50 Ω and are beside the load: less than a ten-thousandth.
#[tokio::test]
async fn a_bridge_rectifier_gives_the_magnitude_less_two_drops() {
    let device = "[device]\nkind = \"rectifier\"\npeak_v = 10.0\nfrequency_hz = 50.0\nsource_ohm = 50.0\n\
                  drop_v = 0.7\nload_ohm = 1000.0\n";
    // Two periods, so four half waves.
    let more = "trigger = { channel = 1, level = \"4 V\" }\ninterval = \"2 us\"\npoints = 20000";
    let found = measure(&plan(device, "50 V", "0 V"), more).await;
    let load_ohm = 1.0 / (1.0 / 1000.0 + 1.0 / PROBE_OHM);
    let share = load_ohm / (load_ohm + 50.0);
    let (peak_v, off) = ((10.0 - 1.4) * share, 0.14f64.asin());
    // Means over a quarter of a period of 10·sin θ − 1.4 and of its square, θ from asin 0.14 to π/2; else nought.
    let on = FRAC_PI_2 - off;
    let mean_v = share * FRAC_2_PI * (10.0 * off.cos() - 1.4 * on);
    let square = 50.0 * (on + 0.5 * (2.0 * off).sin()) - 28.0 * off.cos() + 1.96 * on;
    let rms_v = share * (FRAC_2_PI * square).sqrt();
    // ±1.5 % of scale, and the noise of 8 bits on 50 V.
    found.holds("maximum", peak_v, 0.2);
    found.holds("mean", mean_v, 0.1);
    found.holds("rms", rms_v, 0.12);
    // Neither end is at earth: the negative one goes down with the input to 0.7 V above its trough, and up to 0.7 V.
    let lowest = found.samples.iter().map(|s| s[2]).fold(f64::MAX, f64::min);
    assert!(lowest < -8.0, "{lowest}");
}

/// Catches: a skew or a gain of the wrong sign or size; a rejection that is claimed and not kept; levels that what is
/// left of the common mode moves.
///
/// Two outputs of ±1 V, opposite, and a sine of 3 V peak and 1 MHz on both: ±2 V between them, less the five millionths
/// that 50 Ω lose to 10 MΩ, and no sine. The square's harmonics are odd multiples of 100 kHz, so that 1 MHz belongs to
/// the sine alone and the other even multiples to the noise.
#[tokio::test]
async fn a_sine_on_both_outputs_of_a_balanced_line_is_gone_from_the_difference() {
    let device = "[device]\nkind = \"balanced\"\nfrequency_hz = 100e3\nswing_v = 2.0\nmiddle_v = 5.0\nedge_s = 20e-9\n\
                  source_ohm = 50.0\nsine_v = 3.0\nsine_hz = 1e6\n";
    let more = format!("{SYNC}\npoints = 40100\naverages = 64");
    let found = measure(&plan(device, "20 V", "5 V"), &more).await;
    let (common, difference) = (|s: &[f64; 4]| 0.5 * (s[1] + s[2]), |s: &[f64; 4]| s[3]);
    let sine_v = found.component(common, 1e6);
    // Gains 1.005 and 0.977, and 3 V·(1 − (2π·1 MHz·475 ps)²/2).
    assert!((sine_v - 2.97).abs() < 0.03, "{sine_v}");
    let plain_v = found.component(|s| s[1] - s[2], 1e6);
    let left_v = found.component(difference, 1e6);
    let empty: Vec<f64> =
        (1..=9).filter(|k| *k != 5).map(|k| found.component(difference, f64::from(k) * 2e5)).collect();
    let noise_v = (empty.iter().map(|v| v * v).sum::<f64>() / empty.len() as f64).sqrt();
    let points = found.correction["rejection"].as_array().unwrap();
    let point = points.iter().find(|point| point["frequency_hz"].as_f64() == Some(1e6)).expect("1 MHz");
    let (before_db, after_db) = (point["before_db"].as_f64().unwrap(), point["after_db"].as_f64().unwrap());
    println!("1 MHz: sine {sine_v:.4} V, plain {plain_v:.6} V, left {left_v:.6} V, noise {noise_v:.6} V; {point}");
    // What is there before a deskew is what the tool said of it, to a tenth (rejection is told for equal amplitudes).
    let expected_v = sine_v / 10f64.powf(before_db / 20.0);
    assert!((plain_v / expected_v - 1.0).abs() < 0.1, "{plain_v} V, {expected_v} V by the rejection before");
    // What is left is no more than the measured rejection lets through, and noise: of a bin's power, exponentially
    // distributed, 9 times the mean is exceeded once in 8,000.
    let most_v = sine_v / 10f64.powf(after_db / 20.0) + 3.0 * noise_v;
    assert!(after_db - before_db > 40.0, "{point}");
    assert!(left_v <= most_v && 100.0 * left_v < plain_v, "{left_v} V is left, {most_v} V may be");
    // ±1.5 % of scale.
    found.holds("high_level", 2.0, 0.035);
    found.holds("low_level", -2.0, 0.035);
    found.holds("amplitude", 4.0, 0.07);
}
