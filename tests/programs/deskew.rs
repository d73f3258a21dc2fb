//! Deskew against the truth of scenarios with other seeds, gains, offsets, delays and noise than the demo's.

use evenpair_tests::{Estimate, Lab, LabPlan, Truth, quantity, set_in_nth, set_in_table};
use serde_json::{Value, json};

/// The pair's measuring range at the scope's input: 100 V at ×10 tips.
const SPAN_V: f64 = 10.0;

/// Deskews of each scenario.
const REPEATS: usize = 5;

/// Of 30 intervals with k = 2, each covers with probability 0.9545: 26 or more do with probability 0.99 (binomial), so
/// fewer say that the stated uncertainties are too small.
const LEAST_COVERED: usize = 26;

/// What is other than in the demo. `compensation` is that of both probes: equal, so that one gain and one offset are
/// true for every signal.
struct Mismatch {
    seed: u64,
    gain: f64,
    offset_v: f64,
    delay_s: f64,
    noise_of_span: f64,
    compensation: f64,
}

const MISMATCHES: [Mismatch; 6] = [
    Mismatch { seed: 1, gain: 0.979, offset_v: 0.0022, delay_s: 7.27e-9, noise_of_span: 0.0027, compensation: 0.0 },
    Mismatch { seed: 2, gain: 1.021, offset_v: -0.0110, delay_s: 4.10e-9, noise_of_span: 0.0030, compensation: 1e-4 },
    Mismatch { seed: 3, gain: 0.940, offset_v: 0.0300, delay_s: 5.03e-9, noise_of_span: 0.0050, compensation: -1e-4 },
    Mismatch { seed: 4, gain: 1.003, offset_v: 0.0000, delay_s: 19.6e-9, noise_of_span: 0.0040, compensation: 0.0 },
    Mismatch { seed: 5, gain: 1.060, offset_v: 0.0180, delay_s: 3.77e-9, noise_of_span: 0.0027, compensation: 2e-4 },
    Mismatch { seed: 6, gain: 0.990, offset_v: -0.0250, delay_s: 6.41e-9, noise_of_span: 0.0080, compensation: 0.0 },
];

impl Mismatch {
    fn scenario(&self, shipped: &str) -> String {
        let mut text = set_in_table(shipped, "", "seed", &self.seed.to_string());
        for leg in [0, 1] {
            text = set_in_nth(&text, "[[leg]]", leg, "noise_of_span", &format!("{:?}", self.noise_of_span));
            text = set_in_nth(&text, "[[leg]]", leg, "compensation_error", &format!("{:?}", self.compensation));
        }
        text = set_in_nth(&text, "[[leg]]", 1, "gain", &format!("{:?}", self.gain));
        text = set_in_nth(&text, "[[leg]]", 1, "delay_s", &format!("{:?}", self.delay_s));
        // The negative leg's 10 V range is the last of all.
        set_in_nth(&text, "[[leg.range]]", 7, "offset_v", &format!("{:?}", self.offset_v))
    }
}

async fn deskew(lab: &Lab, request: &Value) -> Value {
    let run = lab.api.begin("/pairs/gate/deskew", request).await;
    let run = lab.api.ended(&run).await;
    assert_eq!(run["state"], "passed", "{run}");
    lab.api.get("/pairs/gate/correction").await.json()
}

#[derive(Default)]
pub(crate) struct Tally {
    scores: Vec<f64>,
}

impl Tally {
    pub(crate) fn add(&mut self, found: Estimate, truth: f64) {
        self.scores.push(found.score(truth));
    }

    pub(crate) fn judge(&self, what: &str) {
        let covered = self.scores.iter().filter(|score| score.abs() <= 2.0).count();
        println!("{what}: {covered} of {}, (estimate - truth)/u = {:.2?}", self.scores.len(), self.scores);
        assert!(covered >= LEAST_COVERED, "{what}: {covered} of {} covered, {:.2?}", self.scores.len(), self.scores);
    }
}

/// Catches: a biased estimator, an uncertainty that is too small, a wrong sign, a correction taken on the wrong range.
///
/// Skew is taken in situ too, on the measuring range, so that its uncertainty is that of the estimate alone.
#[tokio::test(flavor = "multi_thread", worker_threads = 2)]
async fn estimates_lie_within_their_uncertainty_of_the_truth() {
    let shipped = LabPlan::default();
    let (mut skew, mut gain, mut offset) = (Tally::default(), Tally::default(), Tally::default());
    for mismatch in &MISMATCHES {
        let scenario = mismatch.scenario(&shipped.scenario);
        let truth = Truth::of(&scenario, SPAN_V);
        assert!((truth.gain - truth.slow_gain).abs() < 1e-12, "one gain for slow and fast");
        let lab = Lab::start(&LabPlan { scenario, ..shipped.clone() }).await;
        for _ in 0..REPEATS {
            let correction = deskew(&lab, &json!({ "skew_reference": "in_situ" })).await;
            assert_eq!(correction["state"], "fresh");
            skew.add(quantity(&correction["skew"], "s"), truth.skew_s);
            gain.add(quantity(&correction["gain"], "1"), truth.gain);
            offset.add(quantity(&correction["offset"], "V"), truth.offset_v);
        }
    }
    for (tally, what) in [(&skew, "skew"), (&gain, "gain"), (&offset, "offset")] {
        println!("{what}: {:.2?}", tally.scores);
    }
    skew.judge("skew");
    gain.judge("gain");
    offset.judge("offset");
}

/// The legs' compensation where it differs: positive, negative. The first is the demo's.
const UNEQUAL: [(f64, f64); 6] =
    [(1.0e-4, -0.5e-4), (0.0, 8e-4), (-1e-3, 1e-3), (2e-4, -3e-4), (1.5e-3, 0.0), (-4e-4, 1e-4)];

/// Means of a common mode at which the offset is to hold, in volts; the reference's is near 24 V.
const MEANS_V: [f64; 4] = [0.0, 12.0, 48.0, 60.0];

/// Catches: an offset that claims to hold at every common mode, while slow and fast gain of the legs differ. What the
/// correction leaves at a mean m is its own uncertainty and that of the compensation, times the distance from the mean of
/// the reference that it was taken on.
#[tokio::test(flavor = "multi_thread", worker_threads = 2)]
async fn the_offset_holds_at_any_common_mode_where_compensation_differs() {
    let shipped = LabPlan::default();
    let mut tallies = MEANS_V.map(|_| Tally::default());
    for (mismatch, (positive, negative)) in MISMATCHES.iter().zip(UNEQUAL) {
        let mut scenario = mismatch.scenario(&shipped.scenario);
        for (leg, error) in [positive, negative].into_iter().enumerate() {
            scenario = set_in_nth(&scenario, "[[leg]]", leg, "compensation_error", &format!("{error:?}"));
        }
        let truth = Truth::of(&scenario, SPAN_V);
        assert!((truth.gain - truth.slow_gain).abs() > 1e-4, "unequal, or nothing is tested");
        let lab = Lab::start(&LabPlan { scenario, ..shipped.clone() }).await;
        for _ in 0..REPEATS {
            let correction = deskew(&lab, &json!({ "skew_reference": "in_situ" })).await;
            let offset = quantity(&correction["offset"], "V");
            let compensation = &correction["compensation"];
            let relative = quantity(&compensation["relative"], "1");
            let level_v = compensation["level"]["value"].as_f64().unwrap();
            for (tally, mean_v) in tallies.iter_mut().zip(MEANS_V) {
                let slow = relative.value.hypot(relative.u) * (mean_v - level_v);
                let found = Estimate { value: offset.value, u: offset.u.hypot(slow) };
                tally.add(found, truth.offset_at_mean(mean_v));
            }
        }
    }
    for (tally, mean_v) in tallies.iter().zip(MEANS_V) {
        tally.judge(&format!("offset at {mean_v} V"));
    }
}

/// Catches: skew of one range used on another without the uncertainty that this costs, or without saying so.
#[tokio::test]
async fn skew_carried_from_another_range_says_so_and_still_covers() {
    let plan = LabPlan::default();
    let lab = Lab::start(&plan).await;
    let correction = deskew(&lab, &json!({})).await;
    let carried = &correction["conditions"]["carried"];
    assert_eq!(carried["from_span"]["value"].as_f64(), Some(20.0), "{carried}");
    let skew = quantity(&correction["skew"], "s");
    assert!(skew.u >= carried["added"]["value"].as_f64().unwrap());
    let (here, there) = (Truth::of(&plan.scenario, SPAN_V), Truth::of(&plan.scenario, 2.0));
    assert!((here.skew_s - there.skew_s).abs() > 10e-12, "the two ranges differ, or nothing is tested");
    assert!(skew.covers(here.skew_s), "{skew:?}, truth {}", here.skew_s);
}

/// Catches: a skew that is taken off twice, or lost, when the scope's own setting takes a part of it.
#[tokio::test]
async fn the_scopes_own_skew_setting_takes_its_part_once() {
    let plan = LabPlan::default();
    let truth = Truth::of(&plan.scenario, SPAN_V);
    let lab = Lab::start(&plan).await;
    let correction = deskew(&lab, &json!({ "use_scope_skew": true })).await;
    assert!(quantity(&correction["skew"], "s").covers(truth.skew_s), "{correction}");
    let scope_skew = correction["scope_skew"]["value"].as_f64().unwrap();
    // The dialect's step is 50 ps.
    assert!((scope_skew - truth.skew_s).abs() <= 75e-12, "{scope_skew}");
    let set: Vec<f64> = [
        lab.ask("scope", "INPut1:DELay?").await.parse::<f64>().unwrap(),
        lab.ask("scope", "INPut2:DELay?").await.parse::<f64>().unwrap(),
    ]
    .into();
    assert!((set[1] - set[0] - scope_skew).abs() < 1e-13, "the scope is set to {set:?}");
    let before = correction["rejection"].as_array().unwrap().len();
    let run = lab.api.begin("/pairs/gate/verify", &json!({})).await;
    assert_eq!(lab.api.ended(&run).await["state"], "passed");
    let verified = lab.api.get("/pairs/gate/correction").await.json();
    assert_eq!(verified["rejection"].as_array().unwrap().len(), before);
    for point in verified["rejection"].as_array().unwrap() {
        let (after, floor) = (point["after_db"].as_f64().unwrap(), point["floor_db"].as_f64().unwrap());
        assert!(after > 30.0 && after > floor - 10.0, "{point}");
    }
}
