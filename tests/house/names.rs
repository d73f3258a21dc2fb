//! Names in prose that must lead somewhere: configuration keys to their documentation, paths to files.

use std::collections::BTreeSet;

use evenpair_tests::project;

use crate::files::{below, show};

/// Every key that stands in a table of `value`, but the names that a person chose (`[pair.gate]`).
fn keys(value: &toml::Value, chosen: &[&str], found: &mut BTreeSet<String>) {
    match value {
        toml::Value::Table(table) => {
            for (key, inner) in table {
                found.insert(key.clone());
                match inner {
                    toml::Value::Table(named) if chosen.contains(&key.as_str()) => {
                        named.values().for_each(|inner| keys(inner, chosen, found));
                    }
                    _ => keys(inner, chosen, found),
                }
            }
        }
        toml::Value::Array(items) => items.iter().for_each(|item| keys(item, chosen, found)),
        _ => {}
    }
}

#[test]
fn every_configuration_key_is_documented() {
    let documents: String = below(&project().join("configs"), "README.md")
        .iter()
        .map(|path| std::fs::read_to_string(path).expect("a readable file"))
        .collect();
    // Every word of what stands in backquotes.
    let words: BTreeSet<&str> = documents
        .split('`')
        .skip(1)
        .step_by(2)
        .flat_map(|code| code.split(|c: char| !(c.is_alphanumeric() || c == '_')))
        .collect();
    let files = below(&project().join("configs"), ".toml");
    assert!(files.len() >= 4, "benches, sequences, scenarios and dialects have an example each");
    let mut missing = Vec::new();
    for path in files {
        // A scenario is commented key by key in its own file.
        let text = std::fs::read_to_string(&path).unwrap();
        if show(&path).contains("scenarios/") {
            continue;
        }
        let value: toml::Value = toml::from_str(&text).unwrap_or_else(|error| panic!("{}: {error}", show(&path)));
        let chosen = [
            "instrument",
            "pair",
            "probe",
            "reference",
            "setting",
            "settings",
            "route",
            "intent",
            "reply",
            "words",
            "maps",
            "map",
        ];
        let mut found = BTreeSet::new();
        keys(&value, &chosen, &mut found);
        // What is no word is a value that a person chose, such as a channel in a map.
        found.retain(|key| key.starts_with(|c: char| c.is_ascii_lowercase()));
        missing.extend(
            found.iter().filter(|key| !words.contains(key.as_str())).map(|key| format!("{}: {key}", show(&path))),
        );
    }
    assert!(missing.is_empty(), "describe these in configs/README.md or configs/dialects/README.md: {missing:#?}");
}

#[test]
fn paths_named_in_the_documents_exist() {
    let mut wrong = Vec::new();
    for name in ["README.md", "DEVELOPERS.md", "configs/README.md", "configs/dialects/README.md"] {
        let text = std::fs::read_to_string(project().join(name)).unwrap();
        for word in text.split('`').skip(1).step_by(2) {
            let path = word.trim_end_matches('/');
            let starts =
                ["daemon/", "client/", "sim/", "tests/", "configs/", ".ci/"].iter().any(|top| word.starts_with(top));
            if starts
                && !path.contains(|c: char| c.is_whitespace() || "*<>{}…".contains(c))
                && !project().join(path).exists()
            {
                wrong.push(format!("{name}: {word}"));
            }
        }
    }
    assert!(wrong.is_empty(), "these lead nowhere: {wrong:#?}");
}
