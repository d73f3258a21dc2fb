//! Capture: acquire the pair, correct, compute the figures with their uncertainty, check limits, store.

use std::collections::BTreeMap;

use evenpair_api::{self as api, CorrectionState, Quantity};
use evenpair_core::analysis::measured::{Known, measure_with};
use evenpair_core::bench::PairSpec;
use evenpair_core::sequence::{CapturePlan, OnVoid};
use tokio_util::sync::CancellationToken;
use uuid::Uuid;

use super::correction::{conditions_now, drift, for_software, freedom, judge, newest_for, rejection_bands};
use super::limits;
use super::tell::Tell;
use super::trouble::Trouble;
use super::workshop::{Workshop, compute};
use crate::store::Waveform;

/// Where a capture belongs.
#[derive(Debug, Clone)]
pub(crate) struct Place {
    pub(crate) run: Uuid,
    pub(crate) number: u32,
    pub(crate) conditions: Vec<api::Condition>,
}

/// Makes a capture; when this returns it is on the disk.
pub(crate) async fn capture(
    workshop: &Workshop,
    pair: &PairSpec,
    plan: &CapturePlan,
    place: Place,
    tell: &Tell,
    stop: &CancellationToken,
) -> Result<api::Capture, Trouble> {
    if workshop.store.latest_correction(&pair.name).await?.is_none() {
        return Err(Trouble::NoCorrection { pair: pair.name.clone() });
    }
    let scope = workshop.scope(pair)?;
    let prepared = scope.prepare(&plan.acquisition).await?;
    let settings = prepared.settings;
    let now = conditions_now(pair, workshop.scope_identity(pair), &settings);
    let correction = newest_for(workshop, pair, &now).await?;
    let (state, reasons) = judge(&correction, pair, &now, workshop.clock.now());
    if state == CorrectionState::Void && plan.on_void == OnVoid::Refuse {
        return Err(Trouble::CorrectionVoid { pair: pair.name.clone(), reasons });
    }
    let (positive, negative) = scope.acquire(&prepared.acquisition, stop).await?;
    let made_at = workshop.clock.now();
    let [settings_p, settings_n] = &settings;
    let software = for_software(&correction, settings_n.delay_s - settings_p.delay_s);
    let bands = rejection_bands(&correction.rejection);
    let beyond = correction.beyond();
    let scale_spec = workshop.bench.instrument(&pair.scope).and_then(|scope| scope.scale_spec);
    let (drift, freedom, asked) = (drift(&correction, pair, made_at), freedom(&correction), plan.asked);
    let work = move || {
        let known = Known { beyond: Some(&beyond), rejection: &bands, scale_spec, drift, freedom, asked };
        let measured = measure_with(&positive, &negative, &software, &known);
        measured.map(|measured| (positive, negative, measured))
    };
    let (positive, negative, mut measured) = compute("correcting a capture", work)
        .await?
        .map_err(|source| Trouble::Apply { pair: pair.name.clone(), source })?;
    let state_name = if state == CorrectionState::Void { "void" } else { "stale" };
    measured.warnings.extend(prepared.told);
    measured.warnings.extend(reasons.iter().map(|reason| format!("the correction is {state_name}: {reason}")));

    let figures: Vec<api::Figure> = measured.figures.iter().map(api::Figure::from).collect();
    let capture = api::Capture {
        run: place.run,
        number: place.number,
        pair: pair.name.clone(),
        made_at,
        conditions: place.conditions,
        correction: Some(correction.id),
        correction_state: Some(state),
        limits: limits::judge(&plan.limits, &figures),
        figures,
        leak: api::LeakBound::from(&measured.leak),
        warnings: measured.warnings,
        points: positive.samples.len() as u64,
        sample_interval: Quantity::exact(positive.interval_s, "s"),
        file: String::new(),
    };
    let waveform = Waveform {
        // Single precision holds a converter's codes and a hundred times more.
        difference_v: measured.difference_v,
        first_valid: measured.first,
        positive,
        negative,
        metadata: BTreeMap::new(),
    };
    let capture = workshop.store.put_capture(&capture, waveform).await?;
    tell.captured(&capture).await?;
    Ok(capture)
}
