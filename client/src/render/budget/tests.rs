use evenpair_core::planning::{self, Plan};

use super::*;
use crate::render::WIDTH;

fn example() -> Plan {
    planning::read(include_str!("../../../../configs/budgets/high-side-gate.toml")).unwrap().plan
}

fn shown(plan: &Plan) -> String {
    let text = budget(&planning::budget(plan).unwrap());
    for line in text.lines() {
        assert!(line.chars().count() <= WIDTH, "{} columns: {line}", line.chars().count());
        assert_eq!(line, line.trim_end());
    }
    text
}

#[test]
fn the_example_fits_the_screen_and_shows_every_term_with_its_source() {
    let text = shown(&example());
    assert!(text.starts_with("two single-ended probes: will do after a deskew\n"), "{text}");
    for term in planning::budget(&example()).unwrap().terms {
        // Once in the table, once with its formula.
        assert!(text.matches(&term.name).count() >= 2, "{} in {text}", term.name);
    }
    assert!(text.contains("JCGM 100") && text.contains("Ohm's and Kirchhoff's laws"));
}

#[test]
fn every_verdict_fits_the_screen() {
    let mut plan = example();
    plan.before = planning::Agreement::default();
    plan.after = planning::Agreement::default();
    plan.scope.linearity_steps = None;
    let mut seen = Vec::new();
    for (accuracy, rating_v, spans_v) in [
        (0.5, 300.0, vec![10.0]),
        (0.05, 300.0, vec![10.0]),
        (0.02, 60.0, vec![10.0]),
        (0.04, 300.0, vec![2.0, 5.0]),
        (0.001, 300.0, vec![10.0]),
    ] {
        plan.signal.accuracy_ratio = Some(accuracy);
        plan.probe.rating_v = Some(rating_v);
        plan.scope.spans_v = spans_v;
        let text = shown(&plan);
        let verdict = planning::budget(&plan).unwrap().verdict;
        assert!(text.contains(verdict_word(verdict)));
        assert_eq!(text.contains("Do not connect"), verdict == Verdict::Refused, "{text}");
        seen.push(verdict);
    }
    use Verdict as V;
    assert_eq!(seen, [V::AsTheyAre, V::AfterDeskew, V::Refused, V::DifferentialProbe, V::OutOfReach]);
}
