//! The same bench with instruments that are spoken to in other ways: nothing but a dialect file differs.

use evenpair_tests::{Lab, LabPlan, Truth, figure, project, quantity};
use serde_json::{Value, json};

use crate::scripts::text;

/// The pair's measuring range at the scope's input: 100 V at ×10 tips.
const SPAN_V: f64 = 10.0;

/// Every dialect below `tests/dialects`: each is named after the personality that it is for.
fn personalities() -> Vec<String> {
    let files = std::fs::read_dir(project().join("tests/dialects")).unwrap();
    let mut names: Vec<String> =
        files.map(|file| file.unwrap().path().file_stem().unwrap().to_string_lossy().into_owned()).collect();
    names.sort();
    assert!(names.len() >= 3, "{names:?}");
    names
}

async fn passed(lab: &Lab, run: &str) -> Value {
    let run = lab.api.ended(run).await;
    assert_eq!(run["state"], "passed", "{run}\n{}", lab.log());
    run
}

/// Catches: a dialect that cannot say what an instrument needs, and values that are turned round on the way.
#[tokio::test]
async fn a_dialect_file_is_enough() {
    for personality in personalities() {
        let plan = LabPlan::default().speaking(&personality);
        let truth = Truth::of(&plan.scenario, SPAN_V);
        let mut lab = Lab::start(&plan).await;
        let run = lab.api.begin("/pairs/gate/deskew", &json!({ "most_acquisitions": 6 })).await;
        passed(&lab, &run).await;
        let correction = lab.api.get("/pairs/gate/correction").await.json();
        // Once each for three personalities: beyond three standard uncertainties by chance in 1 of 60 such tests.
        for (key, unit, true_value) in [("skew", "s", truth.skew_s), ("gain", "1", truth.gain)] {
            let found = quantity(&correction[key], unit);
            assert!(found.score(true_value).abs() < 3.0, "{personality}: {key} {found:?}, truth {true_value}");
        }
        let script = std::fs::read_to_string(project().join("configs/sequences/quick-look.toml")).unwrap();
        let run = lab.api.begin("/runs", &text(&script)).await;
        passed(&lab, &run).await;
        let captures = lab.api.get(&format!("/runs/{run}/captures")).await.json();
        let captures = captures["items"].as_array().unwrap();
        assert_eq!(captures.len(), 2, "{personality}");
        for capture in captures {
            // The gate over the node, driven high: 11.9 V by the scenario.
            let high = quantity(figure(capture, "high_level"), "V");
            assert!((high.value - 11.9).abs() < 0.2, "{personality}: {high:?}");
        }
        assert_eq!(lab.daemon.signal("TERM").await.code(), Some(0), "{personality}: {}", lab.log());
    }
}

/// Catches: a skew setting of another step and direction taken for the usual one.
#[tokio::test]
async fn the_scopes_own_skew_setting_takes_its_part_in_its_own_steps() {
    for personality in personalities() {
        let plan = LabPlan::default().speaking(&personality);
        let truth = Truth::of(&plan.scenario, SPAN_V);
        let dialect = std::fs::read_to_string(project().join(format!("tests/dialects/{personality}.toml"))).unwrap();
        let table: toml::Table = dialect.parse().unwrap();
        let step = table["skew"]["step"].as_str().unwrap();
        let step_s: f64 = step.strip_suffix(" ps").expect("a step in picoseconds").parse::<f64>().unwrap() * 1e-12;
        let lab = Lab::start(&plan).await;
        let request = json!({ "use_scope_skew": true, "most_acquisitions": 6 });
        let run = lab.api.begin("/pairs/gate/deskew", &request).await;
        passed(&lab, &run).await;
        let correction = lab.api.get("/pairs/gate/correction").await.json();
        let skew = quantity(&correction["skew"], "s");
        assert!(skew.score(truth.skew_s).abs() < 3.0, "{personality}: {skew:?}, truth {}", truth.skew_s);
        let scope_skew = correction["scope_skew"]["value"].as_f64().unwrap();
        // Half a step each way, and the same again for the other leg's.
        assert!((scope_skew - truth.skew_s).abs() <= step_s + 30e-12, "{personality}: {scope_skew}");
    }
}
