//! Corrections between the mathematics, the API and the store: which one holds now, and whether it does.
//!
//! A pair has a correction for each vertical range that it was deskewed on or that one was transferred to.

use evenpair_api::{self as api, CorrectionState, Quantity, TransferWay};
use evenpair_core::analysis::rejection::RejectionBand;
use evenpair_core::analysis::{Correction, Drift, Estimate, Freedom};
use evenpair_core::bench::conditions::{self, Carried, Conditions, LegConditions};
use evenpair_core::bench::{Acquisition, LegSpec, PairSpec};

use super::scope::LegSettings;
use super::trouble::Trouble;
use super::workshop::Workshop;
use crate::store::StoreError;

/// The part of a correction that software has to do, when the scope's own skew settings take off `scope_skew_s`
/// (negative leg's less positive leg's).
pub(crate) fn for_software(correction: &api::Correction, scope_skew_s: f64) -> Correction {
    let estimate = |quantity: &Quantity| Estimate { value: quantity.value, u: quantity.u.unwrap_or(0.0) };
    let skew = estimate(&correction.skew);
    Correction {
        skew_s: Estimate { value: skew.value - scope_skew_s, u: skew.u },
        gain: estimate(&correction.gain),
        offset_v: estimate(&correction.offset),
        gain_offset: correction.gain_offset_correlation.unwrap_or(0.0),
    }
}

/// How well a correction's uncertainties are known.
pub(crate) fn freedom(correction: &api::Correction) -> Freedom {
    let api::CorrectionFreedom { skew, gain, offset } = correction.freedom;
    Freedom { gain, skew, offset }
}

/// What a pair's correction may have drifted by `at`, by what the bench file says of it.
pub(crate) fn drift(correction: &api::Correction, pair: &PairSpec, at: jiff::Timestamp) -> Drift {
    pair.drift.after(at.duration_since(since(correction)).as_secs_f64(), pair.max_age_s)
}

/// Rejection as the API tells it.
pub(crate) fn rejection_points(bands: &[RejectionBand]) -> Vec<api::RejectionPoint> {
    bands.iter().map(api::RejectionPoint::from).collect()
}

/// Rejection as the leak bound takes it. The number of bins is not kept; nothing that reads these asks for it.
pub(crate) fn rejection_bands(points: &[api::RejectionPoint]) -> Vec<RejectionBand> {
    let band = |point: &api::RejectionPoint| RejectionBand {
        frequency_hz: point.frequency_hz,
        before_db: point.before_db,
        after_db: point.after_db,
        floor_db: point.floor_db,
        at_least: point.at_least,
        bins: 1,
    };
    points.iter().map(band).collect()
}

/// The conditions that are in force, from what the scope says it is set to.
///
/// The scope's own skew setting is left out: it is read at every capture and taken off the correction's skew, so a
/// change of it does not make a correction void.
pub(crate) fn conditions_now(pair: &PairSpec, identity: String, [positive, negative]: &[LegSettings; 2]) -> Conditions {
    let leg = |spec: &LegSpec, settings: &LegSettings| LegConditions {
        channel: spec.channel,
        span_v: settings.span_v,
        offset_v: settings.offset_v,
        coupling: settings.coupling.clone(),
        attenuation: spec.probe.attenuation,
        probe: spec.probe.name.clone(),
        scope_skew_s: None,
    };
    Conditions {
        scope_identity: identity,
        positive: leg(&pair.positive, positive),
        negative: leg(&pair.negative, negative),
        skew_reference: pair.skew_reference.clone(),
        gain_reference: pair.gain_reference.clone(),
        carried: None,
    }
}

/// Conditions as the API tells them.
pub(crate) fn to_api(conditions: &Conditions) -> api::CorrectionConditions {
    let volts = |value| Quantity::exact(value, "V");
    let leg = |leg: &LegConditions| api::LegConditions {
        channel: leg.channel,
        span: volts(leg.span_v),
        offset: volts(leg.offset_v),
        coupling: leg.coupling.clone(),
        attenuation: leg.attenuation,
        probe: leg.probe.clone(),
    };
    api::CorrectionConditions {
        scope_identity: conditions.scope_identity.clone(),
        positive: leg(&conditions.positive),
        negative: leg(&conditions.negative),
        skew_reference: conditions.skew_reference.clone(),
        gain_reference: conditions.gain_reference.clone(),
        carried: conditions.carried.map(|carried| api::Carried {
            from_span: volts(carried.from_span_v),
            added: Quantity::exact(carried.u_s, "s"),
        }),
    }
}

fn from_api(conditions: &api::CorrectionConditions) -> Conditions {
    let leg = |leg: &api::LegConditions| LegConditions {
        channel: leg.channel,
        span_v: leg.span.value,
        offset_v: leg.offset.value,
        coupling: leg.coupling.clone(),
        attenuation: leg.attenuation,
        probe: leg.probe.clone(),
        scope_skew_s: None,
    };
    Conditions {
        scope_identity: conditions.scope_identity.clone(),
        positive: leg(&conditions.positive),
        negative: leg(&conditions.negative),
        skew_reference: conditions.skew_reference.clone(),
        gain_reference: conditions.gain_reference.clone(),
        carried: conditions
            .carried
            .as_ref()
            .map(|carried| Carried { from_span_v: carried.from_span.value, u_s: carried.added.value }),
    }
}

/// The newest of the pair's corrections that was made under the conditions of `now`, or else the newest of all.
pub(crate) async fn newest_for(
    workshop: &Workshop,
    pair: &PairSpec,
    now: &Conditions,
) -> Result<api::Correction, Trouble> {
    let mut all = workshop.store.newest_corrections(&pair.name).await?;
    let fits = |one: &api::Correction| conditions::differences(&from_api(&one.conditions), now).is_empty();
    let place = all.iter().position(fits).unwrap_or(0);
    if all.is_empty() {
        return Err(Trouble::NoCorrection { pair: pair.name.clone() });
    }
    Ok(all.swap_remove(place))
}

/// The newest of the pair's corrections that holds on the range of its bench file, or else the newest of all, judged.
pub(crate) async fn newest_by_bench(
    workshop: &Workshop,
    pair: &PairSpec,
) -> Result<Option<api::Correction>, StoreError> {
    let mut all = workshop.store.newest_corrections(&pair.name).await?;
    all.iter_mut().for_each(|one| judge_by_bench(workshop, one, pair));
    let place = all.iter().position(|one| one.state != CorrectionState::Void).unwrap_or(0);
    Ok((!all.is_empty()).then(|| all.swap_remove(place)))
}

/// When what a correction says was measured: a transferred one is as old as the one it came from, unless all of it was
/// measured anew.
pub(crate) fn since(correction: &api::Correction) -> jiff::Timestamp {
    match &correction.transferred_from {
        Some(from) if [from.skew_by, from.levels_by] != [TransferWay::Common; 2] => from.made_at,
        _ => correction.made_at,
    }
}

/// Whether a correction holds under `now`, and why not.
pub(crate) fn judge(
    correction: &api::Correction,
    pair: &PairSpec,
    now: &Conditions,
    at: jiff::Timestamp,
) -> (CorrectionState, Vec<String>) {
    let reasons = conditions::differences(&from_api(&correction.conditions), now);
    if !reasons.is_empty() {
        return (CorrectionState::Void, reasons);
    }
    let age_s = at.duration_since(since(correction)).as_secs_f64();
    match conditions::too_old(age_s, pair.max_age_s) {
        Some(reason) => (CorrectionState::Stale, vec![reason]),
        None => (CorrectionState::Fresh, Vec::new()),
    }
}

/// Judges a correction by what the bench file says a measurement will be set to, for when no capture is being made.
pub(crate) fn judge_by_bench(workshop: &Workshop, correction: &mut api::Correction, pair: &PairSpec) {
    let Acquisition { span_v, offset_v, .. } = pair.acquisition;
    judge_at(workshop, correction, pair, span_v, offset_v);
}

/// Judges a correction on the very range that it was made on.
pub(crate) fn judge_on_its_range(workshop: &Workshop, correction: &mut api::Correction, pair: &PairSpec) {
    let made = &correction.conditions.positive;
    let (span_v, offset_v) = (made.span.value, made.offset.value);
    judge_at(workshop, correction, pair, span_v, offset_v);
}

/// Judges a correction by what the scope is going to be set to.
fn judge_at(workshop: &Workshop, correction: &mut api::Correction, pair: &PairSpec, span_v: f64, offset_v: f64) {
    let conditions = &correction.conditions;
    let identity = match workshop.scope_identity(pair) {
        // Not connected yet: nobody has said that it is another scope.
        unknown if unknown.is_empty() => conditions.scope_identity.clone(),
        identity => identity,
    };
    let settings = |made: &api::LegConditions| {
        // The scope rounds a span up to its next step; what was read back then stands for what is asked for now.
        let same_request = span_v <= made.span.value * (1.0 + 1e-6) && span_v > made.span.value * 0.35;
        LegSettings {
            span_v: if same_request { made.span.value } else { span_v },
            offset_v: if (offset_v - made.offset.value).abs() < 0.01 * made.span.value {
                made.offset.value
            } else {
                offset_v
            },
            coupling: pair.coupling.name().to_owned(),
            delay_s: 0.0,
        }
    };
    let legs = [settings(&conditions.positive), settings(&conditions.negative)];
    let now = conditions_now(pair, identity, &legs);
    (correction.state, correction.reasons) = judge(correction, pair, &now, workshop.clock.now());
}
