//! `evenpaird dialect`: a dialect tried on one instrument, and benches whose dialects are files of their own.

use std::path::Path;
use std::process::Output;

use evenpair_tests::{Lab, LabPlan, ask, run_to_end};
use serde_json::json;

/// Tries a dialect; the exit status and what was said.
async fn tried(dialect: &str, at: &str, more: &[&str]) -> (i32, String) {
    let Output { status, stdout, stderr } =
        run_to_end("evenpaird", &[&["dialect", dialect, "--at", at, "--timeout", "3"], more].concat()).await;
    let said = String::from_utf8_lossy(&stdout).into_owned() + &String::from_utf8_lossy(&stderr);
    (status.code().expect("it ended by itself"), said)
}

/// The line of an intent in the table.
#[track_caller]
fn row<'t>(table: &'t str, intent: &str) -> &'t str {
    let found = table.lines().find(|line| line.split_whitespace().next() == Some(intent));
    found.unwrap_or_else(|| panic!("no row for {intent}:\n{table}"))
}

fn outcome<'t>(table: &'t str, intent: &str) -> &'t str {
    row(table, intent).split_whitespace().nth(1).unwrap_or_default()
}

fn write(folder: &Path, name: &str, text: &str) -> String {
    let path = folder.join(name);
    std::fs::write(&path, text).expect("writing a test's file");
    path.to_str().expect("a temporary path is UTF-8").to_owned()
}

/// Catches: an intent of the bundled dialect that the instrument understands otherwise, a setting that is left changed,
/// an output that is switched by a trial.
#[tokio::test]
async fn the_bundled_dialect_works_everywhere() {
    let lab = Lab::start(&LabPlan::default()).await;
    let scope = &lab.instruments["scope"];
    let settings = [
        "SENS1:VOLT:RANG:PTP?",
        "SENS1:VOLT:RANG:OFFS?",
        "INP1:COUP?",
        "SWE:TINT?",
        "SWE:POIN?",
        "TRIG:SOUR?",
        "TRIG:SLOP?",
        "AVER:STAT?",
        "INP1:DEL?",
    ];
    let mut before = Vec::new();
    for query in settings {
        before.push(ask(scope, query).await);
    }
    let roles =
        [("scope", "scope", "1"), ("generator", "source", "1"), ("supply", "supply", "1"), ("switch", "switch", "101")];
    for (instrument, role, channel) in roles {
        for allow in [&[][..], &["--allow-set"][..]] {
            let more = [&["--as", role, "--channel", channel], allow].concat();
            let (status, table) = tried("scpi-99", &lab.instruments[instrument], &more).await;
            // Before anything was acquired there are no samples to read.
            let fresh = instrument == "scope" && allow.is_empty();
            assert_eq!(status, i32::from(fresh), "{instrument} {allow:?}:\n{table}");
            assert_eq!(outcome(&table, "identify"), "works", "{table}");
            assert!(row(&table, "identify").contains("*IDN?  "), "{table}");
            for never in ["source.voltage", "output.set", "route.close", "route.open_all", "reset"] {
                if table.contains(&format!("\n{never} ")) {
                    assert_eq!(outcome(&table, never), "skipped", "{table}");
                }
            }
            if instrument == "scope" {
                let set = if allow.is_empty() { "skipped" } else { "works" };
                for intent in ["vertical.set", "coupling.set", "timebase.set", "trigger.set", "average.set", "skew.set"]
                {
                    assert_eq!(outcome(&table, intent), set, "{intent}:\n{table}");
                }
            }
            if instrument == "scope" && !allow.is_empty() {
                assert_eq!(outcome(&table, "record.data"), "works", "{table}");
            }
        }
    }
    let mut after = Vec::new();
    for query in settings {
        after.push(ask(scope, query).await);
    }
    assert_eq!(after, before);
    assert_eq!(ask(&lab.instruments["supply"], "OUTP1:STAT?").await, "0");
}

/// Catches: a mistake that is passed over, one that spoils the rows after it, an exit status that says nothing.
#[tokio::test]
async fn three_mistakes_are_three_rows() {
    let lab = Lab::start(&LabPlan::default()).await;
    let folder = tempfile::tempdir().expect("a temporary folder");
    let file = write(
        folder.path(),
        "mistaken.toml",
        r#"
name = "mistaken"
like = "scpi-99"
# A header that the instrument does not have.
[intent."coupling.get"]
ask = [{ send = "INPut{channel}:KOPPlung?", reply = ["coupling:coupling"] }]
# Two parts where one comes.
[intent."skew.get"]
ask = [{ send = "INPut{channel}:DELay?", reply = ["delay_s", "_"] }]
# Half the span goes out, the whole one comes back.
[convert."vertical.set"]
half = "span_v / 2.0"
[intent."vertical.set"]
send = ["SENSe{channel}:VOLTage:RANGe:PTPeak {half}", "SENSe{channel}:VOLTage:RANGe:OFFSet {offset_v}"]
"#,
    );
    let (status, table) = tried(&file, &lab.instruments["scope"], &["--as", "scope", "--allow-set"]).await;
    assert_eq!(status, 1, "{table}");
    let bad: Vec<(&str, &str)> = table
        .lines()
        .filter_map(|line| {
            let mut words = line.split_whitespace();
            Some((words.next()?, words.next()?))
        })
        .filter(|(_, word)| matches!(*word, "differs" | "refused"))
        .collect();
    assert_eq!(bad, [("vertical.set", "differs"), ("coupling.get", "refused"), ("skew.get", "differs")], "{table}");
    assert!(table.contains("error -113"), "{table}");
    assert!(table.contains("it has 1 parts, but the dialect expects 2"), "{table}");
    assert!(table.contains("span_v: "), "{table}");
    assert!(table.lines().last().is_some_and(|line| line.contains("2 differs, 1 refused")), "{table}");
}

/// Catches: a file that is shown without its line, a variant's mistake shown in the wrong file, nobody at an address.
#[tokio::test]
async fn what_cannot_be_tried_says_why() {
    let folder = tempfile::tempdir().expect("a temporary folder");
    write(folder.path(), "base.toml", "name = \"base\"\nlike = \"scpi-99\"\n\n[line]\npause = \"1 h\"\n");
    let file = write(folder.path(), "own.toml", "name = \"own\"\nlike = \"base.toml\"\n[skew]\nstep = \"1 V\"\n");
    let nobody = evenpair_tests::Fake::nobody().await;
    let (status, said) = tried(&file, &nobody, &[]).await;
    assert_eq!(status, 2, "{said}");
    assert!(said.contains("base.toml:5:") && said.contains("own.toml:4:"), "{said}");
    assert!(said.contains("2 mistake(s)"), "{said}");
    let (status, said) = tried("scpi-99", &nobody, &[]).await;
    assert_eq!(status, 2, "{said}");
    assert!(said.contains("nobody answered as the dialect expects"), "{said}");
    let (status, said) = tried("scpi-99", "TCPIP::x::y::SOCKET", &[]).await;
    assert_eq!(status, 2, "{said}");
    assert!(said.contains("`y` is not a port"), "{said}");
    let Output { status, stdout, .. } = run_to_end("evenpaird", &["dialect", "scpi-99"]).await;
    let said = String::from_utf8_lossy(&stdout);
    assert!(status.success() && said.contains("words for: identify, options, clear"), "{said}");
    let (status, said) = tried("scpi-98", &nobody, &[]).await;
    assert_eq!(status, 2, "{said}");
    assert!(said.contains("scpi-99"), "{said}");
}

/// The bundled dialect with a span that is read back in parts, for an instrument that goes on acquiring and serves one
/// client. `PARTS` is how many parts of a span are read as one.
const IN_PARTS: &str = r#"
name = "in-parts"
like = "scpi-99"

[line]
one_client = true

[acquisition]
mode = "free"

[convert."vertical.set"]
whole_span = "span_v"

[intent."vertical.set"]
send = ["SENSe{channel}:VOLTage:RANGe:PTPeak {whole_span}", "SENSe{channel}:VOLTage:RANGe:OFFSet {offset_v}"]

[convert."vertical.get"]
span_v = "part * PARTS"

[intent."vertical.get"]
ask = [
    { send = "SENSe{channel}:VOLTage:RANGe:PTPeak?", reply = ["part"] },
    { send = "SENSe{channel}:VOLTage:RANGe:OFFSet?", reply = ["offset_v"] },
]
"#;

/// Catches: a bench that reads only bundled dialects, a window that is smaller than asked for and taken all the same,
/// options that are asked for and not shown.
#[tokio::test]
async fn a_bench_speaks_the_dialect_of_a_file() {
    let folder = tempfile::tempdir().expect("a temporary folder");
    let with = |name: &str, parts: &str| {
        let file = write(folder.path(), name, &IN_PARTS.replace("PARTS", parts));
        LabPlan::default().with_bench("instrument.scope", "dialect", &format!("\"{file}\""))
    };
    let lab = Lab::start(&with("good.toml", "1.0")).await;
    let run = lab.api.begin("/runs", &json!({ "sequence": "quick-look" })).await;
    let ended = lab.api.ended(&run).await;
    assert_eq!(ended["state"], "passed", "{ended}");
    let bench = lab.api.get("/bench").await.json();
    let instruments = bench["instruments"].as_array().unwrap();
    let options: Vec<&str> = instruments.iter().filter_map(|instrument| instrument["options"].as_str()).collect();
    assert_eq!(options, ["0"; 4], "{bench}");
    drop(lab);

    // The scope seems to give an eighth of what it was set to: only reading back can see that.
    let lab = Lab::start(&with("wrong.toml", "0.125")).await;
    let run = lab.api.begin("/runs", &json!({ "sequence": "quick-look" })).await;
    let ended = lab.api.ended(&run).await;
    assert_eq!(ended["state"], "broken", "{ended}");
    assert!(ended.to_string().contains("was asked for; ask for a window that it has"), "{ended}");
}
