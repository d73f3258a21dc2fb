//! A deskew from each kind of reference against the truth, and skew carried from another range.

use evenpair_tests::{Lab, LabPlan, Truth, quantity, run_to_end, set_in_nth};
use serde_json::{Value, json};

use crate::deskew::Tally;
use crate::worlds::world;

/// Deskews of each kind: 6 worlds, 5 deskews each.
const WORLDS: u64 = 6;
const REPEATS: usize = 5;

/// The call of the shipped bench that starts the reference `fast`.
const SQUARE: &str = "call = \"source.square\", channel = 1, frequency_hz = \"1 MHz\", amplitude_v = \"10 V\", \
                      offset_v = \"5 V\", edge_s = \"3 ns\"";

/// The shipped bench with its reference `fast` of another kind, which the pair takes everything from, on its own range.
fn bench(kind: &str, frequency: &str, call: &str) -> LabPlan {
    let mut plan = LabPlan::default();
    assert!(plan.bench.contains(SQUARE), "the bench starts its reference otherwise");
    plan.bench = plan.bench.replace(
        SQUARE,
        &format!("{call}, channel = 1, frequency_hz = \"{frequency}\", amplitude_v = \"10 V\", offset_v = \"5 V\""),
    );
    plan.with_bench("reference.fast", "kind", &format!("\"{kind}\""))
        .with_bench("reference.fast", "frequency", &format!("\"{frequency}\""))
        .with_bench("reference.fast", "averages", "16")
        .with_bench("pair.gate", "gain_reference", "\"fast\"")
        .with_bench("pair.gate", "span", "\"20 V\"")
        .with_bench("pair.gate", "offset", "\"5 V\"")
        .with_bench("pair.gate", "most_acquisitions", "4")
}

async fn deskew(lab: &Lab) -> Value {
    let run = lab.api.begin("/pairs/gate/deskew", &json!({})).await;
    let run = lab.api.ended(&run).await;
    assert_eq!(run["state"], "passed", "{run}");
    lab.api.get("/pairs/gate/correction").await.json()
}

/// 30 deskews in `WORLDS` worlds; each of skew, gain and offset must cover the truth as often as chance allows.
async fn covers(what: &str, plan: &LabPlan) {
    let (mut skew, mut gain, mut offset) = (Tally::default(), Tally::default(), Tally::default());
    for seed in 1..=WORLDS {
        let scenario = world(seed);
        let truth = Truth::of(&scenario, 2.0);
        let lab = Lab::start(&LabPlan { scenario, ..plan.clone() }).await;
        for _ in 0..REPEATS {
            let correction = deskew(&lab).await;
            assert_eq!(correction["state"], "fresh", "{correction}");
            assert!(correction["conditions"].get("carried").is_none(), "{correction}");
            skew.add(quantity(&correction["skew"], "s"), truth.skew_s);
            gain.add(quantity(&correction["gain"], "1"), truth.gain);
            offset.add(quantity(&correction["offset"], "V"), truth.offset_v);
        }
    }
    skew.judge(&format!("{what}: skew"));
    gain.judge(&format!("{what}: gain"));
    offset.judge(&format!("{what}: offset"));
}

/// Catches: an estimator that is right for one kind of signal only, or is not told which kind it has; and edges of three
/// samples that all meet the sampler at one phase (1 MHz at 1 GS/s) without an allowance for what then folds back.
#[tokio::test(flavor = "multi_thread", worker_threads = 2)]
async fn a_square_wave_gives_the_truth() {
    covers("square", &bench("square", "1 MHz", "call = \"source.square\", edge_s = \"3 ns\"")).await;
}

/// At a frequency that does not divide the sample rate the noise is all there is.
#[tokio::test(flavor = "multi_thread", worker_threads = 2)]
async fn a_square_wave_of_another_frequency_gives_the_truth() {
    let plan = bench("square", "1.0107 MHz", "call = \"source.square\", edge_s = \"3 ns\"");
    covers("square, 1.0107 MHz", &plan).await;
}

/// A pulse of a tenth of its period.
#[tokio::test(flavor = "multi_thread", worker_threads = 2)]
async fn pulses_give_the_truth() {
    covers("pulse", &bench("pulse", "1 MHz", "call = \"source.pulse\", duty = 0.1, edge_s = \"3 ns\"")).await;
}

#[tokio::test(flavor = "multi_thread", worker_threads = 2)]
async fn a_sine_gives_the_truth() {
    covers("sine", &bench("sine", "10 MHz", "call = \"source.sine\"")).await;
}

/// Sixteen tones cross any level several times in a period, so the generator's sync edge triggers.
#[tokio::test(flavor = "multi_thread", worker_threads = 2)]
async fn a_multitone_gives_the_truth() {
    let plan = bench("multitone", "1 MHz", "call = \"source.multitone\"").with_bench(
        "reference.fast",
        "trigger",
        "{ channel = 0, level = \"1 V\" }",
    );
    covers("multitone", &plan).await;
}

/// A sine of 20 ns and a skew of `late_s`.
fn far(late_s: f64) -> LabPlan {
    let plan = bench("sine", "50 MHz", "call = \"source.sine\"");
    let scenario = set_in_nth(&world(1), "[[leg]]", 1, "delay_s", &format!("{:e}", 5e-9 + late_s));
    LabPlan { scenario, ..plan }
}

/// Catches: a skew of more than half a period that is given out as the nearer one without a word.
#[tokio::test]
async fn a_sines_skew_beyond_half_a_period_is_told_as_ambiguous() {
    let plan = far(13.0e-9);
    let truth = Truth::of(&plan.scenario, 2.0);
    let lab = Lab::start(&plan).await;
    let correction = deskew(&lab).await;
    let skew = quantity(&correction["skew"], "s");
    assert!((skew.value - (truth.skew_s - 20e-9)).abs() < 0.1e-9, "{skew:?} {}", truth.skew_s);
    assert!(correction["warnings"].to_string().contains("fits as well"), "{correction}");
    // Nearer to half a period the sine is its own mirror image, and that is no skew to be given out at all.
    let lab = Lab::start(&far(10.2e-9)).await;
    let run = lab.api.begin("/pairs/gate/deskew", &json!({})).await;
    let run = lab.api.ended(&run).await;
    assert_eq!(run["state"], "broken", "{run}");
    let reason = run["reason"].as_str().unwrap();
    assert!(reason.contains("half a period") && reason.contains("longer period"), "{reason}");
}

/// Catches: an ambiguity that the other reference could have settled, or one that is settled wrongly.
#[tokio::test]
async fn another_reference_settles_which_period_is_meant() {
    let mut plan = far(13.0e-9);
    for (key, value) in [("gain_reference", "\"in_situ\""), ("span", "\"100 V\""), ("offset", "\"35 V\"")] {
        plan = plan.with_bench("pair.gate", key, value);
    }
    let truth = Truth::of(&plan.scenario, 10.0);
    let lab = Lab::start(&plan).await;
    let correction = deskew(&lab).await;
    let skew = quantity(&correction["skew"], "s");
    assert!(skew.covers(truth.skew_s), "{skew:?} {}", truth.skew_s);
    assert!(skew.value > 12e-9, "{skew:?}");
    assert!(!correction["warnings"].to_string().contains("fits as well"), "{correction}");
}

/// Catches: skew of a fast reference that is used on the measuring range as if both ranges had one delay. The ranges
/// differ by up to 50 ps, which `carry` states as 25 ps, k = 1: twice that covers the worst.
#[tokio::test]
async fn skew_carried_between_ranges_covers_the_truth() {
    let mut most_s = 0.0f64;
    for seed in 11..=18 {
        let scenario = world(seed);
        let (here, there) = (Truth::of(&scenario, 10.0), Truth::of(&scenario, 2.0));
        most_s = most_s.max((here.skew_s - there.skew_s).abs());
        let lab = Lab::start(&LabPlan { scenario, ..LabPlan::default() }).await;
        let correction = deskew(&lab).await;
        let carried = &correction["conditions"]["carried"];
        assert_eq!(carried["added"]["value"].as_f64(), Some(25e-12), "{correction}");
        let skew = quantity(&correction["skew"], "s");
        assert!(skew.u >= 25e-12 && skew.covers(here.skew_s), "{skew:?} {}", here.skew_s);
        // Gain and offset are of the measuring range itself.
        let (gain, offset) = (quantity(&correction["gain"], "1"), quantity(&correction["offset"], "V"));
        assert!(gain.score(here.gain).abs() < 4.0 && offset.score(here.offset_v).abs() < 4.0, "{correction}");
    }
    assert!(most_s > 20e-12, "the ranges differ, or nothing is tested: {most_s}");
}

/// Catches: a bench file, or a correction, that says nothing of what carrying skew costs.
#[tokio::test]
async fn skew_is_not_carried_without_a_word() {
    let plan = LabPlan::default();
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("bench.toml");
    let without = plan.bench.replace("carry = \"25 ps\"\n", "");
    assert_ne!(without, plan.bench);
    std::fs::write(&path, without).unwrap();
    let checked = run_to_end("evenpair", &["check", path.to_str().unwrap()]).await;
    assert_eq!(checked.status.code(), Some(3));
    let told = String::from_utf8_lossy(&checked.stderr).into_owned();
    assert!(told.contains("carry") && told.contains("another range"), "{told}");
    // A `carry` of nothing is allowed, and stands beside every such correction.
    let lab = Lab::start(&plan.with_bench("reference.fast", "carry", "\"0 s\"")).await;
    let correction = deskew(&lab).await;
    let warnings = correction["warnings"].to_string();
    assert!(warnings.contains("20.0 V") && warnings.contains("carry"), "{warnings}");
}
