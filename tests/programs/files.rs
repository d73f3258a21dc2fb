//! What keeps a daemon from starting: mistakes in its bench file, a port or a data folder that is in use.

use std::path::Path;

use evenpair_tests::{Lab, LabPlan, run_to_end, set_in_table};

async fn start(bench: &Path, data: &Path, listen: &str) -> (Option<i32>, String) {
    let arguments = ["--bench", bench.to_str().unwrap(), "--data", data.to_str().unwrap(), "--listen", listen];
    let output = run_to_end("evenpaird", &arguments).await;
    assert!(output.stdout.is_empty(), "{}", String::from_utf8_lossy(&output.stdout));
    (output.status.code(), String::from_utf8(output.stderr).unwrap())
}

/// The line of `text` that has `part`, from 1.
fn line_of(text: &str, part: &str) -> usize {
    text.lines().position(|line| line.contains(part)).unwrap_or_else(|| panic!("no `{part}`")) + 1
}

/// Catches: a bench file of which only the first mistake is shown, or whose mistakes have no place.
#[tokio::test]
async fn every_mistake_of_a_bench_file_is_shown_at_its_line() {
    let folder = tempfile::tempdir().unwrap();
    let bench = folder.path().join("mistaken.toml");
    let mut text = LabPlan::default().bench;
    for (table, key, value) in [
        ("instrument.supply", "resource", "\"TCPIP::somewhere\""),
        ("probe.p10a", "rating", "\"300 A\""),
        ("pair.gate", "skew_reference", "\"slow\""),
        ("setting.bus_voltage", "unit", "\"parsec\""),
    ] {
        text = set_in_table(&text, table, key, value);
    }
    text.push_str("\n[colour]\nred = 1\n");
    std::fs::write(&bench, &text).unwrap();
    let data = folder.path().join("data");
    let (status, shown) = start(&bench, &data, "127.0.0.1:0").await;
    assert_eq!(status, Some(2), "{shown}");
    for part in ["TCPIP::somewhere", "300 A", "\"slow\"", "parsec", "[colour]"] {
        let line = line_of(&text, part);
        let place = format!("mistaken.toml:{line}:");
        assert!(shown.contains(&place), "`{place}` for {part} in:\n{shown}");
        assert!(shown.contains(part.trim_matches(['[', ']'])), "the line itself is shown: {part} in:\n{shown}");
    }
    let carets = shown.lines().filter(|line| line.contains("here")).count();
    assert!(carets >= 5, "{carets} of 5 mistakes are pointed at:\n{shown}");
    assert!(!data.join("evenpair.sqlite").exists(), "nothing was begun");

    // The client shows the same without a daemon.
    let checked = run_to_end("evenpair", &["check", bench.to_str().unwrap()]).await;
    assert_eq!(checked.status.code(), Some(3));
    let checked = String::from_utf8(checked.stderr).unwrap();
    assert!(checked.contains(&format!("mistaken.toml:{}:", line_of(&text, "parsec"))), "{checked}");
}

/// Catches: a panic, or silence, over a bench file that is not there or is no TOML.
#[tokio::test]
async fn a_bench_file_that_cannot_be_read_is_named() {
    let folder = tempfile::tempdir().unwrap();
    let (data, bench) = (folder.path().join("data"), folder.path().join("none.toml"));
    let (status, shown) = start(&bench, &data, "127.0.0.1:0").await;
    assert_eq!(status, Some(2));
    assert!(shown.contains("none.toml"), "{shown}");
    std::fs::write(&bench, "name = \"x\"\n[instrument\n").unwrap();
    let (status, shown) = start(&bench, &data, "127.0.0.1:0").await;
    assert_eq!(status, Some(2));
    assert!(shown.contains("none.toml:2:"), "{shown}");
    std::fs::write(&bench, [0xff, 0xfe, 0x00]).unwrap();
    let (status, shown) = start(&bench, &data, "127.0.0.1:0").await;
    assert_eq!(status, Some(2));
    assert!(shown.contains("none.toml"), "{shown}");
}

/// Catches: two daemons on one port, on one data folder, and a daemon that everybody on the network can drive.
#[tokio::test]
async fn a_port_and_a_data_folder_belong_to_one_daemon() {
    let lab = Lab::start(&LabPlan::default()).await;
    let bench = lab.folder().join("bench.toml");
    let address = lab.url.strip_prefix("http://").unwrap();
    let (status, shown) = start(&bench, &lab.folder().join("other"), address).await;
    assert_eq!(status, Some(2));
    assert!(shown.contains(address) && shown.contains("--listen"), "{shown}");

    let (status, shown) = start(&bench, &lab.data(), "127.0.0.1:0").await;
    assert_eq!(status, Some(2));
    let holder = lab.daemon.id().unwrap().to_string();
    assert!(shown.contains(lab.data().to_str().unwrap()) && shown.contains(&holder), "{shown}");

    let (status, shown) = start(&bench, &lab.folder().join("other"), "0.0.0.0:0").await;
    assert_eq!(status, Some(2));
    assert!(shown.contains("loopback"), "{shown}");
    assert_eq!(lab.api.get("/health").await.status, 200, "the first one goes on");
}

/// Catches: a check that finds nothing in a data folder that was damaged.
#[tokio::test]
async fn the_check_finds_what_was_damaged() {
    let mut lab = Lab::start(&LabPlan::default()).await;
    let script = crate::scripts::night(&[24], "");
    let id = lab.api.begin("/runs", &crate::scripts::text(&script)).await;
    assert_eq!(lab.api.ended(&id).await["state"], "passed");
    lab.daemon.signal("TERM").await;
    let data = lab.data();
    let check = async || run_to_end("evenpaird", &["--check", "--data", data.to_str().unwrap()]).await;
    assert_eq!(check().await.status.code(), Some(0));
    let file = data.join("waveforms").join(&id).join("1.parquet");
    let bytes = std::fs::read(&file).unwrap();
    std::fs::write(&file, &bytes[..bytes.len() - 1]).unwrap();
    let output = check().await;
    assert_eq!(output.status.code(), Some(2));
    assert!(String::from_utf8_lossy(&output.stderr).contains("1.parquet"), "{output:?}");
    std::fs::remove_file(&file).unwrap();
    assert_eq!(check().await.status.code(), Some(2), "a file that is gone");
}
