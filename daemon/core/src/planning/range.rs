//! The vertical range: the smallest span that holds all that a tip sees.

use super::check::Checked;
use super::outcome::{RangeChoice, TipVoltage};

/// The span that must be seen at the tip, in volts.
pub(super) fn wanted_span_v(plan: &Checked, tip: &TipVoltage) -> f64 {
    if plan.scope.shifts { tip.high_v - tip.low_v } else { 2.0 * tip.most_v }
}

/// The smallest range that holds it; nothing where none does.
pub(super) fn choose(plan: &Checked, tip: &TipVoltage) -> Option<RangeChoice> {
    let wanted_v = wanted_span_v(plan, tip);
    let middle_v = if plan.scope.shifts { f64::midpoint(tip.low_v, tip.high_v) } else { 0.0 };
    plan.scope.range_for(wanted_v, plan.attenuation).map(|range| RangeChoice { middle_v, ..range })
}
