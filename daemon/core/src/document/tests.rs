use proptest::prelude::*;

use super::*;
use crate::units::Unit;

#[test]
fn collects_every_mistake_with_its_place() {
    let text = "title = 3\nspan = \"5 ns\"\n[extra]\nx = 1\n";
    let mistakes = read(text, |top| {
        let title = top.text("title");
        let span = top.amount("span", Unit::Volt);
        let name = top.text("name").or_else(|| top.missing("name", "give one"));
        Some((title?, span?, name?))
    })
    .unwrap_err();
    let found: Vec<(&str, &str)> = mistakes.iter().map(|m| (&text[m.span.clone()], m.what.as_str())).collect();
    assert_eq!(
        found,
        [
            ("t", "the file has no `name`"),
            ("3", "`title` must be a text in quotes"),
            ("\"5 ns\"", "`span`: this is in s, but it must be in V"),
            ("extra", "`extra` is not a key of the top of the file"),
        ]
    );
}

#[test]
fn reads_nested_tables_and_lists() {
    let text = "[pair.gate]\nspans = [\"1 V\", 2.5]\n[[stage]]\ndo = \"wait\"\n[[stage]]\ndo = \"capture\"\n";
    let (spans, stages) = read(text, |top| {
        let mut pairs = top.named_tables("pair");
        let spans: Vec<f64> = pairs[0].1.amounts("spans", Unit::Volt)?.into_iter().map(|item| item.value).collect();
        let stages: Vec<String> =
            top.tables("stage")?.into_iter().filter_map(|mut t| t.text("do")).map(|item| item.value).collect();
        Some((spans, stages))
    })
    .unwrap();
    assert_eq!(spans, [1.0, 2.5]);
    assert_eq!(stages, ["wait", "capture"]);
}

#[test]
fn text_that_is_no_toml_has_a_place() {
    let mistakes = read("a = \n", |_| Some(())).unwrap_err();
    assert_eq!(mistakes.len(), 1);
    assert_eq!(line_and_column("a = \n", mistakes[0].span.start).0, 1);
}

proptest! {
    #[test]
    fn no_text_panics(text in "\\PC{0,200}") {
        let _ = read(&text, |top| { let _ = top.number("a"); top.table("b").map(|_| ()) });
    }
}
