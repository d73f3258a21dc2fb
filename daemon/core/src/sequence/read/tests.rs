//! What a capture asks of its figures.
#![allow(clippy::unwrap_used)]

use crate::analysis::figures::{Asked, FigureKind};
use crate::bench::{self, tests::GREENHOUSE};
use crate::document::line_and_column;
use crate::sequence::{Action, read};
use crate::units::Unit;

fn unit(name: &str) -> Option<Unit> {
    FigureKind::parse(name).map(FigureKind::unit)
}

fn capture(keys: &str) -> String {
    format!(
        "title = \"gate\"\n[[stage]]\ndo = \"route\"\nroute = \"device\"\n[[stage]]\ndo = \"capture\"\npair = \"gate\"\n{keys}\n"
    )
}

fn asked(keys: &str) -> Asked {
    let sequence = read(&capture(keys), &bench::read(GREENHOUSE).unwrap(), &unit).unwrap();
    let Some(Action::Capture(plan)) = sequence.steps.last().map(|step| &step.action) else { panic!("{sequence:?}") };
    plan.asked
}

#[test]
fn thresholds_and_the_band_are_read() {
    assert_eq!(asked(""), Asked::default());
    let found = asked("thresholds = { high = \"8 V\", low = \"1 V\" }\nsettling_band = \"5 %\"");
    assert_eq!((found.thresholds.high_v, found.thresholds.low_v), (Some(8.0), Some(1.0)));
    assert!((found.settling_band - 0.05).abs() < 1e-15);
    assert_eq!(asked("thresholds = { low = 1.5 }").thresholds.high_v, None);
}

#[test]
fn each_mistake_is_named_at_its_line() {
    let bench = bench::read(GREENHOUSE).unwrap();
    for (keys, line, what) in [
        ("thresholds = {}", 8, "`thresholds` needs `high`, `low` or both"),
        ("thresholds = { high = \"8 s\" }", 8, "`high`: this is in s"),
        ("thresholds = { top = \"8 V\" }", 8, "`top` is not a key"),
        ("settling_band = \"90 %\"", 8, "`settling_band` is 0.9"),
        ("[[stage.limit]]\nfigure = \"time_above\"\nmin = \"1 us\"", 5, "there is no threshold for it"),
    ] {
        let text = capture(keys);
        let found: Vec<(u32, String)> = read(&text, &bench, &unit)
            .unwrap_err()
            .into_iter()
            .map(|mistake| (line_and_column(&text, mistake.span.start).0, mistake.what))
            .collect();
        assert!(found.iter().any(|(at, text)| *at == line && text.contains(what)), "{keys}: {found:?}");
    }
}
