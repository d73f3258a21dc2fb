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

/// The words in backquotes of a document.
fn quoted_words(text: &str) -> BTreeSet<&str> {
    let quoted = text.split('`').skip(1).step_by(2);
    quoted.flat_map(|code| code.split(|c: char| !(c.is_alphanumeric() || matches!(c, '_' | '.')))).collect()
}

#[test]
fn every_key_and_intent_of_a_dialect_is_documented() {
    let guide = std::fs::read_to_string(project().join("configs/dialects/README.md")).unwrap();
    let words = quoted_words(&guide);
    let mut seen = BTreeSet::new();
    for path in below(&project().join("daemon/core/src/dialect/read"), ".rs") {
        let source = std::fs::read_to_string(&path).unwrap();
        for (at, _) in source.match_indices('"') {
            // A key is asked for as `table.text("key")`, or by a helper that takes the table first.
            let before = source[..at].trim_end();
            let asked = ["text(", "texts(", "whole(", "flag(", "amount(", "table(", "tables(", "(&mut table,"];
            let key = source[at + 1..].split('"').next().unwrap_or_default();
            let word = !key.is_empty() && key.chars().all(|c| c.is_ascii_lowercase() || c == '_');
            if word && asked.iter().any(|asked| before.ends_with(asked)) {
                seen.insert(key.to_owned());
            }
        }
    }
    assert!(seen.len() >= 35, "keys are asked for in another way now: {seen:?}");
    let missing: Vec<&String> = seen.iter().filter(|key| !words.contains(key.as_str())).collect();
    assert!(missing.is_empty(), "describe these keys in configs/dialects/README.md: {missing:?}");

    let intents: Vec<&str> = evenpair_core::dialect::Intent::all()
        .map(evenpair_core::dialect::Intent::name)
        // They have tables of their own.
        .filter(|name| !matches!(*name, "error" | "complete"))
        .collect();
    let missing: Vec<&&str> = intents.iter().filter(|name| !words.contains(**name)).collect();
    assert!(missing.is_empty(), "describe these intents in configs/dialects/README.md: {missing:?}");
}

#[test]
fn the_examples_of_the_dialects_guide_are_dialects() {
    let guide = std::fs::read_to_string(project().join("configs/dialects/README.md")).unwrap();
    let examples: Vec<&str> = guide.split("```toml\n").skip(1).filter_map(|rest| rest.split("```").next()).collect();
    assert!(examples.len() >= 3, "the guide has examples");
    for example in examples {
        // A piece of a file is laid over the bundled dialect.
        let piece = if example.contains("like = ") { String::new() } else { "like = \"scpi-99\"\n".to_owned() };
        if let Err(found) = evenpair_core::dialect::Dialect::read(&format!("{piece}{example}")) {
            // An expression over names of a preamble that is not shown is right as it stands.
            let others: Vec<_> =
                found.iter().filter(|mistake| !mistake.what.contains("which no reply gives")).collect();
            assert!(others.is_empty(), "{example}\n{others:#?}");
        }
    }
}
