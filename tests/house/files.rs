//! What every file of the project must look like.

use std::path::{Path, PathBuf};

use evenpair_tests::project;

/// The longest source file: one that grows over it does more than one thing.
const LONGEST_FILE: usize = 400;

/// Every file below `folder` with this ending, but nothing that was built or belongs to git.
pub(crate) fn below(folder: &Path, ending: &str) -> Vec<PathBuf> {
    let mut found = Vec::new();
    for entry in std::fs::read_dir(folder).unwrap_or_else(|error| panic!("{}: {error}", folder.display())) {
        let path = entry.expect("a folder's entry").path();
        let name = path.file_name().unwrap_or_default().to_string_lossy().into_owned();
        if path.is_dir() && name != "target" && !name.starts_with('.') {
            found.extend(below(&path, ending));
        } else if name.ends_with(ending) {
            found.push(path);
        }
    }
    found.sort();
    found
}

/// A path as the messages show it.
pub(crate) fn show(path: &Path) -> String {
    path.strip_prefix(project()).unwrap_or(path).display().to_string()
}

/// Whether a file holds only tests: it is below `tests`, or its parent declares it so.
pub(crate) fn is_test(path: &Path) -> bool {
    let stem = path.file_stem().unwrap_or_default().to_string_lossy().into_owned();
    let folder = path.parent().unwrap_or(path);
    let parents = [folder.join("mod.rs"), folder.join("main.rs"), folder.join("lib.rs"), folder.with_extension("rs")];
    let declared = |parent: &PathBuf| {
        let text = std::fs::read_to_string(parent).unwrap_or_default();
        text.contains(&format!("#[cfg(test)]\nmod {stem};"))
            || text.contains(&format!("#[cfg(test)]\npub(crate) mod {stem};"))
    };
    path.starts_with(project().join("tests")) || show(path).contains("/tests/") || parents.iter().any(declared)
}

fn sources() -> Vec<(String, String)> {
    let files = below(&project(), ".rs");
    assert!(files.len() > 50, "the walk over the project must find its sources");
    files.iter().map(|path| (show(path), std::fs::read_to_string(path).expect("a readable file"))).collect()
}

#[test]
fn every_module_says_what_it_holds() {
    let silent: Vec<String> = below(&project(), ".rs")
        .into_iter()
        .filter(|path| path.file_name().is_some_and(|name| name != "tests.rs"))
        .filter(|path| !std::fs::read_to_string(path).expect("a readable file").starts_with("//!"))
        .map(|path| show(&path))
        .collect();
    assert!(silent.is_empty(), "begin these with `//!` and what they hold: {silent:#?}");
}

#[test]
fn no_file_grows_beyond_one_thing() {
    let long: Vec<String> = sources()
        .into_iter()
        .filter(|(_, text)| text.lines().count() > LONGEST_FILE)
        .map(|(name, text)| format!("{name}: {} lines", text.lines().count()))
        .collect();
    assert!(long.is_empty(), "split these, each does more than one thing: {long:#?}");
}

#[test]
fn no_test_sleeps() {
    let sleeping: Vec<String> = below(&project(), ".rs")
        .into_iter()
        .filter(|path| is_test(path) && !path.ends_with("house/files.rs"))
        .filter(|path| {
            let text = std::fs::read_to_string(path).expect("a readable file");
            text.contains("thread::sleep") || text.contains("time::sleep(") || text.contains(" sleep(")
        })
        .map(|path| show(&path))
        .collect();
    assert!(sleeping.is_empty(), "wait for an event, or advance a paused clock: {sleeping:#?}");
}

#[test]
fn nothing_is_left_open() {
    let open: Vec<String> = sources()
        .into_iter()
        .filter(|(name, _)| !name.ends_with("house/files.rs"))
        .flat_map(|(name, text)| {
            let marks = ["todo!(", "unimplemented!(", "TODO", "FIXME", "#[ignore]"];
            marks
                .into_iter()
                .filter(|mark| text.contains(mark))
                .map(|mark| format!("{name}: {mark}"))
                .collect::<Vec<_>>()
        })
        .collect();
    assert!(open.is_empty(), "{open:#?}");
}

#[test]
fn the_top_level_is_as_designed() {
    let known = [
        "Cargo.lock",
        "Cargo.toml",
        "DEVELOPERS.md",
        "LICENSE-APACHE",
        "LICENSE-MIT",
        "README.md",
        "client",
        "clippy.toml",
        "configs",
        "daemon",
        "rustfmt.toml",
        "sim",
        "target",
        "tests",
    ];
    for entry in std::fs::read_dir(project()).unwrap() {
        let name = entry.expect("a folder's entry").file_name().to_string_lossy().into_owned();
        assert!(name.starts_with('.') || known.contains(&name.as_str()), "`{name}` has no place at the top level");
    }
}
