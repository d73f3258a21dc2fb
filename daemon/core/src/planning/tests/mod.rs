//! Tests of the error budget.

#![expect(clippy::float_cmp, reason = "the values come out of exact arithmetic")]

use super::*;

mod files;
mod properties;
mod ratings;
mod terms;
mod verdicts;

/// A complete plan: 48 V in 25 ns, 12 V of difference to 5 %, x10 probes, 8 bits. Nothing in it is left to a default
/// that matters to a test.
pub(super) fn gate() -> Plan {
    Plan {
        signal: Signal {
            swing_v: Some(48.0),
            edge_s: Some(25e-9),
            difference_v: Some(12.0),
            accuracy_ratio: Some(0.05),
            ..Signal::default()
        },
        source: Source { positive_ohm: Some(0.0), negative_ohm: Some(0.0) },
        probe: Probe { attenuation: Some(10.0), rating_v: Some(300.0), ..Probe::default() },
        scope: Scope {
            bits: Some(8.0),
            spans_v: vec![1.0, 2.0, 5.0, 10.0],
            scale_spec: Some(0.015),
            noise_ratio: Some(0.0027),
            linearity_steps: Some(0.3),
            averages: Some(16.0),
            ..Scope::default()
        },
        before: Agreement { skew_s: Some(1e-9), gain: Some(0.01), offset: Some(0.005), scale: None },
        after: Agreement { skew_s: Some(40e-12), gain: Some(0.0005), offset: Some(0.0001), scale: None },
    }
}

/// The same with a sine of 1 MHz.
pub(super) fn sine() -> Plan {
    let mut plan = gate();
    plan.signal.edge_s = None;
    plan.signal.frequency_hz = Some(1e6);
    plan
}

/// The named term.
pub(super) fn term<'b>(budget: &'b Budget, name: &str) -> &'b Term {
    budget.terms.iter().find(|term| term.name == name).unwrap_or_else(|| panic!("{name} in {:?}", budget.terms))
}

/// Whether two numbers agree to this relative error.
pub(super) fn close(found: f64, wanted: f64, relative: f64) {
    assert!((found / wanted - 1.0).abs() <= relative, "{found} instead of {wanted}");
}
