//! Who may know whom: the floors of the house, checked on the text of the imports and on the manifests.

use std::path::Path;

use evenpair_tests::project;

use crate::files::{below, is_test, show};

/// Fails if a source below `folder` (its tests aside) contains one of `words`.
fn must_not_know(folder: &str, words: &[&str]) {
    let place = project().join(folder);
    let files = if place.is_dir() { below(&place, ".rs") } else { vec![place] };
    assert!(!files.is_empty(), "{folder} has no sources");
    let mut found = Vec::new();
    for path in files.iter().filter(|path| !is_test(path)) {
        let text = std::fs::read_to_string(path).expect("a readable file");
        let code = text.split("#[cfg(test)]").next().unwrap_or(&text);
        for line in code.lines().filter(|line| !line.trim_start().starts_with("//")) {
            found.extend(
                words.iter().filter(|word| line.contains(**word)).map(|word| format!("{}: {word}", show(path))),
            );
        }
    }
    assert!(found.is_empty(), "{folder} must not know these: {found:#?}");
}

fn dependencies(package: &str) -> Vec<String> {
    let text = std::fs::read_to_string(project().join(package).join("Cargo.toml")).expect("a manifest");
    let manifest: toml::Table = toml::from_str(&text).expect("a manifest is TOML");
    let table = manifest.get("dependencies").and_then(toml::Value::as_table).cloned().unwrap_or_default();
    table.keys().cloned().collect()
}

#[test]
fn the_core_touches_nothing_of_the_world() {
    must_not_know(
        "daemon/core/src",
        &[
            "std::fs",
            "std::net",
            // Scoped threads, which end where they began, may share a long sum as long as its bits do not show it.
            "use std::thread",
            "std::thread::spawn",
            "std::thread::sl",
            "std::thread::park",
            "std::thread::Builder",
            "std::thread::current",
            "std::process",
            "std::env",
            "Instant::now",
            "SystemTime",
            "tokio",
            "println!",
            // Chance comes seeded: the same budget twice is the same interval twice.
            "rand::rng",
            "from_os_rng",
        ],
    );
    for name in dependencies("daemon/core") {
        assert!(
            !["tokio", "rusqlite", "axum", "reqwest", "jiff"].contains(&name.as_str()),
            "the core depends on {name}"
        );
    }
}

#[test]
fn the_floors_of_the_core_stand_on_each_other() {
    let above_mathematics = ["crate::scpi", "crate::document", "crate::dialect", "crate::bench", "crate::sequence"];
    must_not_know("daemon/core/src/analysis", &above_mathematics);
    must_not_know("daemon/core/src/units", &above_mathematics);
    must_not_know("daemon/core/src/scpi", &["crate::dialect", "crate::bench", "crate::sequence", "crate::analysis"]);
    must_not_know(
        "daemon/core/src/document",
        &["crate::scpi", "crate::dialect", "crate::bench", "crate::sequence", "crate::analysis"],
    );
    must_not_know("daemon/core/src/planning", &["crate::scpi", "crate::dialect", "crate::bench", "crate::sequence"]);
    must_not_know("daemon/core/src/dialect", &["crate::bench", "crate::sequence"]);
    must_not_know("daemon/core/src/bench", &["crate::sequence"]);
}

#[test]
fn the_floors_of_the_daemon_stand_on_each_other() {
    must_not_know("daemon/src/session", &["crate::store", "crate::conductor", "crate::http", "crate::app"]);
    must_not_know("daemon/src/store", &["crate::session", "crate::conductor", "crate::http", "crate::app"]);
    must_not_know("daemon/src/clock", &["crate::session", "crate::store", "crate::conductor", "crate::http"]);
    must_not_know("daemon/src/conductor", &["crate::http", "crate::app", "axum"]);
    must_not_know("daemon/src/http", &["crate::session", "crate::app"]);
}

#[test]
fn an_instruments_words_are_in_dialects_only() {
    for folder in ["daemon/src/conductor", "daemon/src/http", "daemon/core/src/bench", "daemon/core/src/sequence"] {
        must_not_know(folder, &["SENS", "TRAC", "INIT:", "OUTP", "*IDN", "*OPC", "SYST:"]);
    }
}

#[test]
fn the_simulator_shares_no_code() {
    for name in dependencies("sim") {
        assert!(
            !name.starts_with("evenpair"),
            "the simulator depends on {name}: an echo of our own mistake proves nothing"
        );
    }
}

#[test]
fn the_client_is_light() {
    for name in dependencies("client") {
        assert!(!["evenpair-daemon", "rusqlite", "axum"].contains(&name.as_str()), "the client depends on {name}");
    }
}

#[test]
fn unsafe_code_is_forbidden_everywhere() {
    for package in ["daemon", "daemon/core", "daemon/api", "client", "sim", "tests"] {
        let text = std::fs::read_to_string(project().join(package).join("Cargo.toml")).expect("a manifest");
        assert!(text.contains("[lints]\nworkspace = true"), "{package} does not take the workspace's lints");
    }
    let text = std::fs::read_to_string(Path::new(&project()).join("Cargo.toml")).expect("a manifest");
    assert!(text.contains("unsafe_code = \"forbid\""));
}
