//! Corrections between the mathematics, the API and the store, and whether one holds now.

use evenpair_api::{self as api, CorrectionState, Quantity};
use evenpair_core::analysis::rejection::RejectionBand;
use evenpair_core::analysis::{Correction, Drift, Estimate, Freedom};
use evenpair_core::bench::conditions::{self, Carried, Conditions, LegConditions};
use evenpair_core::bench::{Acquisition, LegSpec, PairSpec};

use super::scope::LegSettings;
use super::workshop::Workshop;

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
    pair.drift.after(at.duration_since(correction.made_at).as_secs_f64(), pair.max_age_s)
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
    let age_s = at.duration_since(correction.made_at).as_secs_f64();
    match conditions::too_old(age_s, pair.max_age_s) {
        Some(reason) => (CorrectionState::Stale, vec![reason]),
        None => (CorrectionState::Fresh, Vec::new()),
    }
}

/// Judges a correction by what the bench file says a measurement will be set to, for when no capture is being made.
pub(crate) fn judge_by_bench(workshop: &Workshop, correction: &mut api::Correction, pair: &PairSpec) {
    let conditions = &correction.conditions;
    let identity = match workshop.scope_identity(pair) {
        // Not connected yet: nobody has said that it is another scope.
        unknown if unknown.is_empty() => conditions.scope_identity.clone(),
        identity => identity,
    };
    let settings = |made: &api::LegConditions| {
        let Acquisition { span_v, offset_v, .. } = pair.acquisition;
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
