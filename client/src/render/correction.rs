//! A correction and the rejection that it reaches.

use evenpair_api::{
    Compensation, Correction, CorrectionState, RejectionLimit, RejectionPoint, Response, TransferWay, TransferredFrom,
};
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
    text.extend(correction.compensation.as_ref().map(|found| compensation(found, &correction.response)));
    text.extend(correction.response.iter().flat_map(lines_of));
    text.extend(correction.limit.as_ref().map(limit));
    text.extend(correction.transferred_from.as_ref().map(transferred));
    if correction.scope_skew.value != 0.0 {
        text.push(format!("  of the skew, {} is taken off by the scope", with_uncertainty(&correction.scope_skew)));
    }
    text.extend(correction.reasons.iter().map(|reason| format!("  {state}: {reason}")));
    text.extend(correction.warnings.iter().map(|warning| format!("  note: {warning}")));
    text.iter().map(|line| wrap(line, 6)).collect::<Vec<_>>().join("\n")
}

/// Where the offset holds, and what it is worth elsewhere.
fn compensation(found: &Compensation, response: &Option<Response>) -> String {
    let applied = response.as_ref().and_then(|response| response.pole_zero.as_ref());
    let left = match applied {
        Some(term) => term.relative.u.unwrap_or(0.0),
        None => found.relative.value.hypot(found.relative.u.unwrap_or(0.0)),
    };
    format!(
        "  the offset holds at a mean common mode of {}; each volt away from it adds ±{} (slow and fast gain differ by {})",
        show(found.level.value, Unit::Volt, 3),
        show(2.0 * left, Unit::Volt, 2),
        with_uncertainty(&found.relative)
    )
}

/// What is applied after gain, skew and offset, in words and by bands.
pub(crate) fn response(response: &Response) -> String {
    lines_of(response).iter().map(|line| wrap(line, 6)).collect::<Vec<_>>().join("\n")
}

fn lines_of(response: &Response) -> Vec<String> {
    let mut text = vec!["  response, applied after gain, skew and offset:".to_owned()];
    text.extend(response.words.iter().map(|words| format!("    {words}")));
    for band in &response.improved {
        let after = if band.after_db >= band.floor_db { "≥ " } else { "" };
        text.push(format!(
            "    {} to {}: {:.1} dB without, {after}{:.1} dB with it",
            show(band.from_hz, Unit::Hertz, 2),
            show(band.to_hz, Unit::Hertz, 2),
            band.before_db,
            band.after_db
        ));
    }
    text
}

fn limit(limit: &RejectionLimit) -> String {
    let least = if limit.at_least { "at least " } else { "" };
    format!("  the converters' non-linearity limits the rejection to {least}{:.0} dB", limit.limit_db)
}

/// Where a transferred correction came from, and how.
fn transferred(from: &TransferredFrom) -> String {
    let way = |way| match way {
        TransferWay::Carried => "carried over as it was",
        TransferWay::Common => "deskewed on this range",
        TransferWay::Legs => "from each leg compared with itself on both ranges",
    };
    format!(
        "  transferred from a span of {} around {} by `{}`: skew {}, gain and offset {}",
        show(from.span.value, Unit::Volt, 3),
        show(from.offset.value, Unit::Volt, 3),
        from.reference,
        way(from.skew_by),
        way(from.levels_by)
    )
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
