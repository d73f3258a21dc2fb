//! What a capture asks of its figures: thresholds, and the band within which a waveform has settled.

use super::super::step::Limit;
use crate::analysis::figures::{Asked, FigureKind, SETTLING_BAND, Thresholds};
use crate::bench::field;
use crate::document::Table;
use crate::units::Unit;

/// Voltages that a threshold may have: what a probe may be rated for, many times over.
const VOLTS: std::ops::RangeInclusive<f64> = -1e6..=1e6;

/// `thresholds` and `settling_band`.
pub(super) fn read(table: &mut Table<'_>) -> Asked {
    let thresholds = table.table("thresholds").map(|mut inner| {
        let high = field::amount(&mut inner, "high", Unit::Volt, &VOLTS);
        let low = field::amount(&mut inner, "low", Unit::Volt, &VOLTS);
        inner.refuse_others();
        if !inner.has("high") && !inner.has("low") {
            inner.mistakes().add(inner.span(), "`thresholds` needs `high`, `low` or both", "such as `high = \"8 V\"`");
        }
        Thresholds { high_v: high, low_v: low }
    });
    let settling_band = field::ratio(table, "settling_band", &(1e-6..=0.4));
    Asked { thresholds: thresholds.unwrap_or_default(), settling_band: settling_band.unwrap_or(SETTLING_BAND) }
}

/// Makes a mistake of a limit on a figure that needs a threshold where there is none: it could never be kept.
pub(super) fn needed(table: &Table<'_>, asked: &Asked, limits: &[Limit]) {
    let needs = [
        (FigureKind::TimeAbove, "high", asked.thresholds.high_v),
        (FigureKind::TimeBelow, "low", asked.thresholds.low_v),
    ];
    for (kind, key, threshold) in needs {
        if threshold.is_none() && limits.iter().any(|limit| limit.figure == kind.name()) {
            table.mistakes().add(
                table.span(),
                format!("`{}` is limited, but there is no threshold for it", kind.name()),
                format!("write `thresholds = {{ {key} = \"1 V\" }}` with the level that is meant"),
            );
        }
    }
}
