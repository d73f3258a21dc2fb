//! Every command of `evenpair`, with its exit status: 0 passed, 1 a limit failed, 2 not completed, 3 wrong usage.

use std::process::Output;

use evenpair_tests::{Fake, Lab, LabPlan, Program, project, run_to_end};
use serde_json::Value;

use crate::scripts::{ALWAYS, DEVICE, limit, night, sequence, sweep};

fn text(bytes: &[u8]) -> String {
    String::from_utf8(bytes.to_vec()).expect("the output is UTF-8")
}

/// The command ended with `status`; what it printed, no line of it wider than a terminal.
#[track_caller]
fn printed(output: &Output, status: i32) -> String {
    let (out, err) = (text(&output.stdout), text(&output.stderr));
    assert_eq!(output.status.code(), Some(status), "{out}\n{err}");
    let wide: Vec<&str> = out.lines().filter(|line| line.chars().count() > 80).collect();
    assert!(wide.is_empty(), "{wide:#?}");
    out
}

/// The command failed with `status` and one message that has all of `words`.
#[track_caller]
fn complained(output: &Output, status: i32, words: &[&str]) {
    let err = text(&output.stderr);
    assert_eq!(output.status.code(), Some(status), "{err}");
    for word in words {
        assert!(err.contains(word), "`{word}` in: {err}");
    }
    assert!(!err.contains("panicked"), "{err}");
}

#[track_caller]
fn json(output: &Output, status: i32) -> Value {
    assert_eq!(output.status.code(), Some(status), "{}", text(&output.stderr));
    serde_json::from_slice(&output.stdout).unwrap_or_else(|error| panic!("{error}: {}", text(&output.stdout)))
}

/// Catches: a command that shows nothing, or something else than the API has, or ends with another status.
#[tokio::test]
async fn a_session_at_the_bench() {
    let lab = Lab::start(&LabPlan::default().with_sequence("short", &night(&[24, 48], ""))).await;
    let shown = printed(&lab.evenpair(&["bench"]).await, 0);
    for word in ["greenhouse fan", "scope", "gate", "in_situ", "bus_voltage", "device", "earth"] {
        assert!(shown.contains(word), "`{word}` in: {shown}");
    }
    assert_eq!(json(&lab.evenpair(&["--json", "bench"]).await, 0)["name"], "greenhouse fan");
    assert!(printed(&lab.evenpair(&["runs"]).await, 0).contains("no runs yet"));
    complained(&lab.evenpair(&["verify", "gate"]).await, 3, &["gate", "deskew"]);

    let shown = printed(&lab.evenpair(&["deskew", "gate", "--most", "4"]).await, 0);
    for word in ["skew", "gain", "offset", "±", "1 MHz", "dB"] {
        assert!(shown.contains(word), "`{word}` in: {shown}");
    }
    let verified = json(&lab.evenpair(&["verify", "gate", "--json"]).await, 0);
    assert_eq!(verified["pair"], "gate");
    assert!(!verified["rejection"].as_array().unwrap().is_empty());

    let shown = printed(&lab.evenpair(&["run", "short", "--wait"]).await, 0);
    assert!(shown.contains("capture 2") && shown.contains("passed"), "{shown}");
    let runs = json(&lab.evenpair(&["runs", "--json"]).await, 0);
    assert_eq!(runs["items"].as_array().unwrap().len(), 3);
    let id = runs["items"][0]["id"].as_str().unwrap().to_owned();
    assert!(printed(&lab.evenpair(&["runs"]).await, 0).contains(&id));
    for run in [id.as_str(), "last"] {
        let shown = printed(&lab.evenpair(&["show", run]).await, 0);
        for word in [id.as_str(), "passed", "capture 2", "high_level", "leak bound"] {
            assert!(shown.contains(word), "`{word}` in: {shown}");
        }
    }
    let shown = json(&lab.evenpair(&["show", "last", "--json"]).await, 0);
    assert_eq!((&shown["run"]["id"], shown["captures"].as_array().unwrap().len()), (&Value::from(id.as_str()), 2));
    // A run that is over is watched to its end all the same, and stopping it changes nothing.
    assert!(printed(&lab.evenpair(&["watch", &id]).await, 0).contains("passed"));
    assert!(printed(&lab.evenpair(&["stop", &id]).await, 0).contains("passed"));

    for (format, ending) in [("csv", "csv"), ("parquet", "parquet")] {
        let folder = lab.folder().join(format!("out-{format}"));
        let to = folder.to_str().unwrap();
        let exported = json(&lab.evenpair(&["export", "last", "--to", format, to, "--json"]).await, 0);
        assert_eq!(exported["captures"], 2);
        let mut names: Vec<String> = std::fs::read_dir(&folder)
            .unwrap()
            .map(|entry| entry.unwrap().file_name().into_string().unwrap())
            .collect();
        names.sort();
        let captures = [format!("capture-00001.{ending}"), format!("capture-00002.{ending}")];
        let expected = ["captures.json", "figures.csv"].map(str::to_owned);
        assert_eq!(
            names,
            [captures, expected]
                .concat()
                .into_iter()
                .collect::<std::collections::BTreeSet<_>>()
                .into_iter()
                .collect::<Vec<_>>()
        );
        let figures = std::fs::read_to_string(folder.join("figures.csv")).unwrap();
        assert!(
            figures.starts_with("capture,made_at,bus_voltage,figure,value,u,low,high,unit,plain,grade,valid\n"),
            "{figures}"
        );
        assert!(figures.lines().any(|line| line.starts_with("2,") && line.contains(",48,high_level,")), "{figures}");
    }
}

/// Catches: a status that hides how a run ended.
#[tokio::test]
async fn the_exit_status_tells_how_a_run_ended() {
    let strict = night(&[24], &limit("high_level", "12.4 V", "13 V"));
    let long = night(&[24, 36, 48, 60, 30, 40, 50, 55, 25, 35, 45, 58], "");
    let plan = LabPlan::default()
        .with_sequence("strict", &strict)
        .with_sequence("long", &long)
        .with_sequence("early", &sequence(&[DEVICE, &sweep(&[24], ""), ALWAYS]));
    let lab = Lab::start(&plan).await;
    let broken = lab.evenpair(&["run", "early", "--wait"]).await;
    assert!(printed(&broken, 2).contains("broken"));
    assert!(printed(&lab.evenpair(&["run", "strict", "--wait"]).await, 1).contains("failed"));
    let watched = lab.evenpair(&["--json", "watch", "last"]).await;
    assert_eq!(json(&watched, 1)["state"], "failed");

    // Not waited for, then watched by one and stopped by another.
    let begun = json(&lab.evenpair(&["run", "long", "--json"]).await, 0);
    let id = begun["id"].as_str().unwrap();
    let server = ["--server", lab.url.as_str(), "watch", id];
    let mut watch = Program::start("evenpair", &server, &lab.folder().join("watch.log"));
    while !watch.line().await.expect("the run goes on").contains("capture 1 ") {}
    assert!(printed(&lab.evenpair(&["stop", "last"]).await, 0).contains("stopped"));
    assert_eq!(watch.ended().await.code(), Some(2));

    // By the path of a file.
    let path = lab.folder().join("mine.toml");
    std::fs::write(&path, sequence(&[DEVICE])).unwrap();
    assert!(printed(&lab.evenpair(&["run", path.to_str().unwrap(), "--wait"]).await, 0).contains("passed"));
}

/// Catches: a mistake of the person that looks like a fault of the bench, and the other way round.
#[tokio::test]
async fn mistakes_on_the_command_line_are_told_from_troubles() {
    let lab =
        Lab::start(&LabPlan::default().with_sequence("wrong", "title = \"x\"\n[[stage]]\ndo = \"dance\"\n")).await;
    complained(&lab.evenpair(&["deskew", "hub"]).await, 3, &["hub", "gate"]);
    complained(&lab.evenpair(&["show", "yesterday"]).await, 3, &["yesterday"]);
    complained(&lab.evenpair(&["show", "last"]).await, 3, &["no run yet"]);
    complained(&lab.evenpair(&["run", "tomorrow"]).await, 3, &["tomorrow", "gate-night"]);
    complained(&lab.evenpair(&["run", "wrong", "--wait"]).await, 3, &["line 3", "dance"]);
    complained(&lab.evenpair(&["run", "/nowhere/at-all.toml"]).await, 2, &["/nowhere/at-all.toml"]);
    complained(&lab.evenpair(&["dance"]).await, 3, &["dance"]);
    complained(&lab.evenpair(&["export", "last", "--to", "stone", "x"]).await, 3, &["stone"]);
    complained(&run_to_end("evenpair", &["--server", "bench.example", "runs"]).await, 3, &["bench.example"]);
    let nobody = Fake::nobody().await;
    let url = format!("http://127.0.0.1:{}", nobody.split("::").nth(2).unwrap());
    complained(&run_to_end("evenpair", &["--server", &url, "runs"]).await, 2, &[&url, "evenpaird", "--server"]);
    let help = run_to_end("evenpair", &["--help"]).await;
    assert_eq!(help.status.code(), Some(0));
    let help = text(&help.stdout);
    for command in ["demo", "bench", "deskew", "verify", "run", "runs", "show", "watch", "stop", "export", "check"] {
        assert!(help.contains(&format!("  {command} ")), "`{command}` in: {help}");
    }
}

/// Catches: a client that takes any HTTP server for a daemon.
#[tokio::test]
async fn another_program_at_the_address_is_told_from_a_daemon() {
    let other = Fake::saying(b"HTTP/1.1 200 OK\r\ncontent-length: 5\r\n\r\nhello").await;
    let url = format!("http://127.0.0.1:{}", other.resource.split("::").nth(2).unwrap());
    complained(&run_to_end("evenpair", &["--server", &url, "bench"]).await, 2, &[&url, "daemon"]);
}

/// Catches: a check that needs a daemon, passes what the daemon refuses, or refuses what is shipped.
#[tokio::test]
async fn check_looks_at_files_without_a_daemon() {
    let shipped = |name: &str| project().join("configs").join(name).to_str().unwrap().to_owned();
    let bench = shipped("benches/greenhouse-fan.toml");
    let good = run_to_end("evenpair", &["check", &bench]).await;
    assert_eq!(good.status.code(), Some(0));
    assert!(text(&good.stdout).contains("4 instruments, 1 pairs; no mistakes"), "{}", text(&good.stdout));
    for (name, captures) in [("gate-night", 12), ("quick-look", 2)] {
        let path = shipped(&format!("sequences/{name}.toml"));
        let checked = json(&run_to_end("evenpair", &["--json", "check", &path, "--bench", &bench]).await, 0);
        assert_eq!(
            (&checked["captures"], &checked["mistakes"]),
            (&captures.into(), &serde_json::json!([])),
            "{checked}"
        );
    }
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("wrong.toml");
    std::fs::write(&path, "title = \"x\"\n[[stage]]\ndo = \"dance\"\n").unwrap();
    let path = path.to_str().unwrap();
    let wrong = run_to_end("evenpair", &["check", path, "--bench", &bench]).await;
    complained(&wrong, 3, &["wrong.toml:3:", "dance", "1 mistake"]);
    let wrong = json(&run_to_end("evenpair", &["--json", "check", path, "--bench", &bench]).await, 3);
    assert_eq!(wrong["mistakes"][0]["line"], 3, "{wrong}");
    complained(&run_to_end("evenpair", &["check", "/nowhere/at-all.toml"]).await, 2, &["/nowhere/at-all.toml"]);
}

/// Catches: help that a terminal of eighty columns breaks anywhere, in any program and any command.
#[tokio::test]
async fn help_fits_eighty_columns() {
    for program in ["evenpaird", "evenpair-sim"] {
        printed(&run_to_end(program, &["--help"]).await, 0);
    }
    let help = printed(&run_to_end("evenpair", &["--help"]).await, 0);
    let listed = help.split("Commands:").nth(1).and_then(|rest| rest.split("\n\n").next()).expect("a list of commands");
    // A command stands two columns in, what is said of it further.
    let commands: Vec<&str> = listed
        .lines()
        .filter(|line| line.starts_with("  ") && !line.starts_with("   "))
        .filter_map(|line| line.split_whitespace().next())
        .collect();
    assert!(commands.len() > 10 && commands.contains(&"deskew"), "{commands:?}");
    for command in commands {
        printed(&run_to_end("evenpair", &["help", command]).await, 0);
    }
}
