//! What a response, a compensation and a limit do to the figures of a capture: both tips on one node, so that the true
//! difference is nought at every moment.
#![allow(clippy::unwrap_used)]

use super::*;
use crate::analysis::compensation::Compensation;
use crate::analysis::figures::FigureKind;
use crate::analysis::response::tests::{NEGATIVE, acquire, deskewed, reference};
use crate::analysis::{Estimate, response};

fn of(measured: &Measured, kind: FigureKind) -> &Figure {
    measured.figures.iter().find(|figure| figure.kind == kind).unwrap()
}

/// What is known beyond the correction, and nothing else.
fn seen(beyond: &Beyond) -> Known<'_> {
    Known { beyond: Some(beyond), scale_spec: Some(0.0), ..Known::default() }
}

fn term(figure: &Figure, name: &str) -> f64 {
    figure.budget.iter().find(|term| term.name == name).map_or(0.0, |term| term.u)
}

/// Catches: a response that is not applied, that claims to leave nothing, or that is applied where it does not hold.
#[test]
fn a_response_is_applied_and_what_it_leaves_is_in_every_budget() {
    let (p, n) = acquire(&NEGATIVE, 57_500, 0.05, 31, 4);
    let correction = deskewed(&p, &n);
    let found = response::fit(&p, &n, &correction, &reference()).unwrap();
    let with = Beyond { response: Some(found), ..Beyond::default() };
    let (p, n) = acquire(&NEGATIVE, 57_500, 0.05, 32, 1);
    let plain = measure(&p[0], &n[0], &correction, &[], Some(0.0)).unwrap();
    let measured = measure_with(&p[0], &n[0], &correction, &seen(&with)).unwrap();
    let (before, after) = (of(&plain, FigureKind::Rms), of(&measured, FigureKind::Rms));
    assert!(after.value < before.value / 10.0, "{} {}", before.value, after.value);
    assert!(term(after, "response") > 0.0 && after.coverage.unwrap().low <= 1e-9, "{after:?}");
    let mean = of(&measured, FigureKind::Mean);
    assert!(mean.coverage.unwrap().low <= 0.0 && mean.coverage.unwrap().high >= 0.0, "{mean:?}");
    assert!(measured.leak.rms_v + 2.0 * after.u >= after.value, "{:?} {after:?}", measured.leak);
    assert!(measured.warnings.iter().all(|warning| !warning.contains("response")), "{:?}", measured.warnings);

    let (mut p, mut n) = (p[0].clone(), n[0].clone());
    (p.interval_s, n.interval_s) = (2.0 * p.interval_s, 2.0 * n.interval_s);
    let other = measure_with(&p, &n, &correction, &seen(&with)).unwrap();
    assert!(other.warnings.iter().any(|warning| warning.contains("the response is not applied")), "{other:?}");
    assert!(term(of(&other, FigureKind::Rms), "response") < 1e-12);
}

/// Catches: a leak bound or a figure that claims more than the converters let through. By hand: 40 dB of a common mode of
/// 100 V rms are 1 V.
#[test]
fn nothing_claims_more_than_the_converters_limit() {
    let (p, n) = acquire(&NEGATIVE, 25_100, 0.05, 33, 2);
    let correction = deskewed(&p, &n);
    let with = Beyond { limit_db: Some(40.0), ..Beyond::default() };
    let measured = measure_with(&p[0], &n[0], &correction, &seen(&with)).unwrap();
    assert!((0.97..1.1).contains(&measured.leak.rms_v), "{:?}", measured.leak);
    let rms = of(&measured, FigureKind::Rms);
    assert!((0.97..1.03).contains(&term(rms, "response")), "{rms:?}");
}

/// Catches: a compensation that is in no budget, or that harms where the offset was taken. By hand: 10⁻³ of the 100 V
/// between the mean of the capture (0 V) and that of the reference (100 V).
#[test]
fn a_compensation_counts_by_the_distance_from_the_references_mean() {
    let (p, n) = acquire(&NEGATIVE, 25_100, 0.05, 34, 2);
    let correction = deskewed(&p, &n);
    let at = |level_v| {
        let compensation =
            Compensation { relative: Estimate { value: 0.6e-3, u: 0.8e-3 }, time_constant_s: 95e-6, level_v };
        let with = Beyond { compensation: Some(compensation), ..Beyond::default() };
        measure_with(&p[0], &n[0], &correction, &seen(&with)).unwrap()
    };
    let (far, near) = (at(100.0), at(0.0));
    let u = |measured: &Measured| term(of(measured, FigureKind::Mean), "compensation");
    assert!((0.09..0.12).contains(&u(&far)) && u(&near) < 0.02, "{} {}", u(&far), u(&near));
    assert!(far.leak.mean_v > near.leak.mean_v + 0.15, "{:?} {:?}", far.leak, near.leak);
}
