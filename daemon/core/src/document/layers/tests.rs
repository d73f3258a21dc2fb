//! Laying texts over one another, and finding the text a mistake stands in.

#![allow(clippy::unwrap_used)]

use super::*;

const RULES: Rules = Rules { whole: |path| matches!(path, ["whole", _]), together: ("whole", "with") };

const BASE: &str =
    "a = 1\nb = 2\n[deep.er]\nx = 1\ny = 2\n[whole.one]\nx = 1\ny = 2\n[with.one]\nz = 3\n[gone]\nx = 1\n";

/// Every key of the merged texts as a dotted path with its number.
fn merged(own: &str) -> String {
    fn walk(table: &mut Table<'_>, all: &mut Vec<String>) {
        for key in table.keys() {
            if let Some(mut inner) = table.has_table(&key.value).then(|| table.table(&key.value)).flatten() {
                walk(&mut inner, all);
            } else if let Some(number) = table.whole(&key.value) {
                let path = if table.path().is_empty() { String::new() } else { format!("{}.", table.path()) };
                all.push(format!("{path}{}={}", key.value, number.value));
            }
        }
    }
    read_layers(&[own, BASE], &RULES, |top| {
        let mut all = Vec::new();
        walk(top, &mut all);
        Some(all.join(" "))
    })
    .unwrap()
}

#[test]
fn tables_are_laid_over_key_by_key_but_some_as_a_whole() {
    assert_eq!(merged(""), "a=1 b=2 deep.er.x=1 deep.er.y=2 gone.x=1 whole.one.x=1 whole.one.y=2 with.one.z=3");
    assert_eq!(
        merged("b = 7\ngone = false\n[deep.er]\ny = 9\nz = 5\n"),
        "a=1 b=7 deep.er.x=1 deep.er.y=9 deep.er.z=5 whole.one.x=1 whole.one.y=2 with.one.z=3"
    );
    // The replaced entry takes its companion with it.
    assert_eq!(merged("gone = false\nb = 2\n[whole.one]\nx = 4\n"), "a=1 b=2 deep.er.x=1 deep.er.y=2 whole.one.x=4");
}

#[test]
fn a_mistake_is_shown_in_its_own_text() {
    let texts = ["a = \"x\"\n", "\n\nb = \"y\"\n", "c = 3\n"];
    let found = read_layers(&texts, &RULES, |top| {
        top.whole("a");
        top.whole("b");
        Some(())
    })
    .unwrap_err();
    let shown: Vec<(usize, &str)> =
        found.iter().map(|(text, mistake)| (*text, &texts[*text][mistake.span.clone()])).collect();
    assert_eq!(shown, [(0, "\"x\""), (1, "\"y\""), (2, "c")]);
    // What is no TOML at all is shown in its own text too.
    let found = read_layers(&["a = 1\n", "b = = 2\n"], &RULES, |_| Some(())).unwrap_err();
    assert_eq!(found.iter().map(|(text, _)| *text).collect::<Vec<_>>(), [1]);
}

#[test]
fn a_key_is_seen_without_reading_the_rest() {
    assert_eq!(peek("like = \"x\"\nother = 3\n", "like").unwrap().value, "x");
    assert_eq!(peek("like = 3\n", "like"), None);
    assert_eq!(peek("= = =", "like"), None);
}
