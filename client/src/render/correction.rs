//! A correction and the rejection that it reaches.

use evenpair_api::{Correction, CorrectionState, RejectionPoint};
use evenpair_core::units::{Unit, show};

use super::quantity::with_uncertainty;
use super::table::{lines, table};
use super::wrap::wrap;

/// Skew, gain and offset with their expanded uncertainties, where they hold, and what to know about them.
pub(crate) fn correction(correction: &Correction) -> String {
    let state = match correction.state {
        CorrectionState::Fresh => "fresh",
        CorrectionState::Stale => "stale",
        CorrectionState::Void => "void",
    };
    let conditions = &correction.conditions;
    let mut text = vec![
        format!("correction of the pair {}: {state}, from {} acquisitions", correction.pair, correction.acquisitions),
        format!("  skew    {}   (positive: the negative leg is late)", with_uncertainty(&correction.skew)),
        format!("  gain    {}   (negative leg relative to positive leg)", with_uncertainty(&correction.gain)),
        format!("  offset  {}   (at the tips)", with_uncertainty(&correction.offset)),
        "  ± is the expanded uncertainty, k = 2".to_owned(),
        format!(
            "  skew from `{}`, gain and offset from `{}`, on a span of {} at the tips",
            conditions.skew_reference,
            conditions.gain_reference,
            show(conditions.positive.span.value, Unit::Volt, 3)
        ),
    ];
    if let Some(limit) = &correction.limited_by {
        text.push(format!("  the skew is limited by {limit}"));
    }
    if let Some(carried) = &conditions.carried {
        let (from, added) = (show(carried.from_span.value, Unit::Volt, 3), show(carried.added.value, Unit::Second, 2));
        text.push(format!("  skew was taken on a span of {from}; carrying it adds {added} to its u"));
    }
    if correction.scope_skew.value != 0.0 {
        text.push(format!("  of the skew, {} is taken off by the scope", with_uncertainty(&correction.scope_skew)));
    }
    text.extend(correction.reasons.iter().map(|reason| format!("  {state}: {reason}")));
    text.extend(correction.warnings.iter().map(|warning| format!("  note: {warning}")));
    text.iter().map(|line| wrap(line, 4)).collect::<Vec<_>>().join("\n")
}

/// Rejection before and after, per frequency.
pub(crate) fn rejection(points: &[RejectionPoint]) -> String {
    if points.is_empty() {
        return "rejection was not verified".to_owned();
    }
    let mut rejection = table(&["rejection at", "plain subtraction", "corrected", "noise floor"], &[0, 1, 2, 3]);
    for point in points {
        let after =
            if point.at_least { format!("≥ {:.1} dB", point.after_db) } else { format!("{:.1} dB", point.after_db) };
        rejection.add_row([
            show(point.frequency_hz, Unit::Hertz, 1),
            format!("{:.1} dB", point.before_db),
            after,
            format!("{:.1} dB", point.floor_db),
        ]);
    }
    lines(&rejection)
}
