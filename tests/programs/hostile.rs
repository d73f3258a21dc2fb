//! Whoever talks to the API cannot talk to an instrument past the dialect: no value carries a second command.

use std::collections::BTreeSet;

use evenpair_tests::{Fake, Lab, LabPlan};
use proptest::prelude::*;
use proptest::strategy::ValueTree;
use proptest::test_runner::TestRunner;
use serde_json::{Value, json};

/// Every command of the bundled dialect, with its places.
fn templates() -> Vec<Vec<String>> {
    fn texts(value: &toml::Value, key: &str, found: &mut BTreeSet<String>) {
        match value {
            toml::Value::String(text) if key == "send" || key == "ask" => {
                found.insert(text.clone());
            }
            toml::Value::Array(items) => items.iter().for_each(|item| texts(item, key, found)),
            toml::Value::Table(table) => table.iter().for_each(|(key, value)| texts(value, key, found)),
            _ => {}
        }
    }
    let path = evenpair_tests::project().join("configs/dialects/scpi-99.toml");
    let file: toml::Value = toml::from_str(&std::fs::read_to_string(path).unwrap()).unwrap();
    let mut found = BTreeSet::new();
    texts(&file, "", &mut found);
    found
        .iter()
        .map(|text| {
            // What stands between the places.
            let mut literals = Vec::new();
            let mut rest = text.as_str();
            while let Some((literal, tail)) = rest.split_once('{') {
                literals.push(literal.to_owned());
                rest = tail.split_once('}').unwrap().1;
            }
            literals.push(rest.to_owned());
            literals
        })
        .collect()
}

/// Whether a line is this command with plain values in its places.
fn is(line: &str, literals: &[String]) -> bool {
    let Some(mut rest) = line.strip_prefix(literals[0].as_str()) else { return false };
    for (at, literal) in literals.iter().enumerate().skip(1) {
        let value = rest.find(|c: char| !(c.is_ascii_alphanumeric() || "+-.(@,)".contains(c))).unwrap_or(rest.len());
        let last = at + 1 == literals.len();
        let end = if last {
            rest.len() - literal.len().min(rest.len())
        } else {
            rest[..].find(literal.as_str()).unwrap_or(0)
        };
        if end == 0 || end > value || !rest[end..].starts_with(literal.as_str()) {
            return false;
        }
        rest = &rest[end + literal.len()..];
    }
    rest.is_empty()
}

#[test]
fn a_smuggled_command_would_be_seen() {
    let templates = templates();
    let known = |line: &str| templates.iter().any(|literals| is(line, literals));
    for good in [
        "*IDN?",
        "SOURce1:VOLTage 2.4E1",
        "ROUTe:CLOSe (@101,103)",
        "SENSe2:VOLTage:RANGe:PTPeak 1E1",
        "TRIGger:SOURce INTernal1",
    ] {
        assert!(known(good), "{good}");
    }
    for bad in ["SOURce1:VOLTage 2.4E1;*RST", "*RST *RST", "SOURce1:VOLTage ", "OUTPut1:STATe 1 OR 0", "DIAG:ERASE", ""]
    {
        assert!(!known(bad), "{bad}");
    }
}

/// Strings that would do harm if they reached an instrument as they are.
fn hostile() -> impl Strategy<Value = String> {
    use prop::sample::select;
    let end = select(vec!["\n", "\r\n", ";", " ;:", "\u{0}", "\"", "'", "}", "{channel}", ",", "\u{2028}"]);
    let command = select(vec!["*RST", "OUTP1:STAT ON", "SOUR1:VOLT 60", "DIAG:ERASE", "SYST:ERR?"]);
    let head = select(vec!["24 V", "gate", "fast", "1e3", "", "device", "10 ns", "0"]);
    (head, end, command, "[ -~\n]{0,6}").prop_map(|(head, end, command, tail)| format!("{head}{end}{command}{tail}"))
}

/// Every request that takes a text or a number, with `text` in one of its places.
fn requests(text: &str, which: usize) -> (String, Value) {
    let quoted = toml::Value::String(text.to_owned()).to_string();
    let set = |key: &str| {
        let values = [("setting", "\"bus_voltage\""), ("value", "\"24 V\"")];
        let lines: Vec<String> = values
            .iter()
            .map(|(name, usual)| format!("{name} = {}", if *name == key { quoted.as_str() } else { usual }))
            .collect();
        json!({ "text": format!("title = \"t\"\n[[stage]]\ndo = \"set\"\n{}\n", lines.join("\n")) })
    };
    match which % 9 {
        0 => ("/pairs/gate/deskew".to_owned(), json!({ "reference": text })),
        1 => ("/pairs/gate/verify".to_owned(), json!({ "reference": text })),
        2 => ("/runs".to_owned(), json!({ "sequence": text })),
        3 => ("/runs".to_owned(), set("setting")),
        4 => ("/runs".to_owned(), set("value")),
        5 => (
            "/runs".to_owned(),
            json!({ "text": format!("title = \"t\"\n[[stage]]\ndo = \"route\"\nroute = {quoted}\n") }),
        ),
        6 => (
            "/runs".to_owned(),
            json!({ "text": format!("title = \"t\"\n[[stage]]\ndo = \"capture\"\npair = \"gate\"\nspan = {quoted}\n") }),
        ),
        7 => (
            "/runs".to_owned(),
            json!({ "text": format!("title = {quoted}\n[[stage]]\ndo = \"set\"\nsetting = \"bus_voltage\"\nvalue = \"1 V\"\n") }),
        ),
        _ => (
            "/runs".to_owned(),
            json!({ "text": format!("title = \"t\"\n[[stage]]\ndo = \"sweep\"\naxes = [{{ setting = \"bus_voltage\", list = [{quoted}] }}]\n[[stage.stage]]\ndo = \"set\"\nsetting = \"bus_voltage\"\nvalue = \"1 V\"\n") }),
        ),
    }
}

/// Catches: a value of a request that reaches an instrument with a command of its own behind it.
#[tokio::test]
async fn no_request_brings_a_second_command() {
    let (fake, heard) = Fake::recording().await;
    let mut plan = LabPlan::default();
    for name in ["scope", "generator", "supply", "switch"] {
        plan.elsewhere.push((name.to_owned(), fake.resource.clone()));
    }
    let lab = Lab::start(&plan).await;
    let mut runner = TestRunner::deterministic();
    let mut refused = 0;
    for which in 0..180 {
        let text = hostile().new_tree(&mut runner).unwrap().current();
        let (path, body) = requests(&text, which);
        let answer = lab.api.post(&path, &body).await;
        // What is understood must be harmless; what is not is refused, and never a fault of the daemon.
        assert!(
            answer.status < 500 || answer.status == 503,
            "{body}: {} {}",
            answer.status,
            String::from_utf8_lossy(&answer.bytes)
        );
        refused += u32::from((400..500).contains(&answer.status));
        if answer.status < 300 && path == "/runs" {
            let run = answer.json()["id"].as_str().unwrap().to_owned();
            lab.api.ended(&run).await;
        }
    }
    assert!(refused > 120, "only {refused} of 180 were refused");
    let templates = templates();
    let heard = heard.lock().unwrap().clone();
    assert!(heard.len() > 10, "{heard:?}");
    for line in heard {
        assert!(templates.iter().any(|literals| is(&line, literals)), "{line:?} is no command of the dialect");
    }
}
