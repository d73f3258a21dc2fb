//! The response that one acquisition of a periodic reference shows: two parts of it that begin at the same place of a period
//! stand for two acquisitions, of which one is fitted and the other judges.

use super::super::compensation::Compensation;
use super::super::response::fit;
use super::super::skew::{Reference, SkewEstimate};
use super::super::{Beyond, Correction, Record};
use super::Legs;

/// What is found beyond `correction`, or in words why nothing is.
pub(super) fn find(
    legs: &Legs,
    correction: &Correction,
    estimate: &SkewEstimate,
    known: &Reference,
) -> Result<Beyond, String> {
    let Some(period_s) = known.period_s else {
        return Err("tell the reference's period, so that two parts of its record can be compared".to_owned());
    };
    let period = period_s / legs.positive.interval_s;
    let points = legs.positive.samples.len().min(legs.negative.samples.len());
    let periods = (0.5 * points as f64 / period).floor();
    if !(periods >= 1.0 && periods.is_finite()) {
        return Err("the reference's record holds less than two of its periods; save a longer one".to_owned());
    }
    let second = (periods * period).round() as usize;
    let length = points - second;
    let parts = legs.parts(length, second);
    let of = |pick: fn(&Legs) -> &Record| -> Vec<Record> {
        // The second part begins whole periods later: on a time axis of its own.
        parts.iter().map(|part| pick(part).clone()).collect()
    };
    let response = fit(&of(|part| &part.positive), &of(|part| &part.negative), correction, known)
        .map_err(|error| error.to_string())?;
    // Without probes' data a time constant is known only where the record shows it.
    let compensation = response.pole_zero.map(|term| Compensation {
        relative: term.relative,
        time_constant_s: term.time_constant_s.value,
        level_v: estimate.level_v,
    });
    Ok(Beyond { response: response.corrects().then_some(response), compensation, limit_db: None })
}
