//! Capture: acquire the pair, correct, compute the figures with their uncertainty, check limits, store.

use std::collections::BTreeMap;

use evenpair_api::{self as api, CorrectionState, Quantity};
use evenpair_core::analysis::figures::{Figure, FigureInput, compute as compute_figures};
use evenpair_core::analysis::grade::Grade;
use evenpair_core::analysis::leak::LeakBound;
use evenpair_core::analysis::rejection::RejectionBand;
use evenpair_core::analysis::{Correction, Record, apply, budget, leak, noise};
use evenpair_core::bench::PairSpec;
use evenpair_core::sequence::{CapturePlan, OnVoid};
use tokio_util::sync::CancellationToken;
use uuid::Uuid;

use super::correction::{conditions_now, for_software, judge, rejection_bands};
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

/// What the mathematics makes of two records.
struct Worked {
    positive: Record,
    negative: Record,
    difference_v: Vec<f32>,
    first_valid: usize,
    figures: Vec<Figure>,
    leak: LeakBound,
    warnings: Vec<String>,
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
    let latest = workshop.store.latest_correction(&pair.name).await?;
    let correction = latest.ok_or_else(|| Trouble::NoCorrection { pair: pair.name.clone() })?;
    let scope = workshop.scope(pair)?;
    scope.prepare(&plan.acquisition).await?;
    let settings = scope.settings().await?;
    let now = conditions_now(pair, workshop.scope_identity(pair), &settings);
    let (state, reasons) = judge(&correction, pair, &now, workshop.clock.now());
    if state == CorrectionState::Void && plan.on_void == OnVoid::Refuse {
        return Err(Trouble::CorrectionVoid { pair: pair.name.clone(), reasons });
    }
    let (positive, negative) = scope.acquire(&plan.acquisition, stop).await?;
    let made_at = workshop.clock.now();
    let [settings_p, settings_n] = &settings;
    let software = for_software(&correction, settings_n.delay_s - settings_p.delay_s);
    let bands = rejection_bands(&correction.rejection);
    let scale_spec = workshop.bench.instrument(&pair.scope).and_then(|scope| scope.scale_spec);
    let work = move || work(positive, negative, &software, &bands, scale_spec);
    let mut worked = compute("correcting a capture", work)
        .await?
        .map_err(|source| Trouble::Apply { pair: pair.name.clone(), source })?;
    let state_name = if state == CorrectionState::Void { "void" } else { "stale" };
    worked.warnings.extend(reasons.iter().map(|reason| format!("the correction is {state_name}: {reason}")));

    let figures: Vec<api::Figure> = worked.figures.iter().map(figure_to_api).collect();
    let volts = |value| Quantity::exact(value, "V");
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
        leak: api::LeakBound {
            rms: volts(worked.leak.rms_v),
            peak: volts(worked.leak.peak_v),
            common_rms: volts(worked.leak.common_rms_v),
            common_swing: volts(worked.leak.common_swing_v),
        },
        warnings: worked.warnings,
        points: worked.positive.samples.len() as u64,
        sample_interval: Quantity::exact(worked.positive.interval_s, "s"),
        file: String::new(),
    };
    let waveform = Waveform {
        positive: worked.positive,
        negative: worked.negative,
        difference_v: worked.difference_v,
        first_valid: worked.first_valid,
        metadata: BTreeMap::new(),
    };
    let capture = workshop.store.put_capture(&capture, waveform).await?;
    tell.captured(&capture).await?;
    Ok(capture)
}

/// Records → corrected difference → leak bound → figures.
fn work(
    positive: Record,
    negative: Record,
    correction: &Correction,
    bands: &[RejectionBand],
    scale_spec: Option<f64>,
) -> Result<Worked, apply::ApplyError> {
    let mut warnings = Vec::new();
    let clipped = (positive.clipped(), negative.clipped());
    for (leg, count) in [("positive", clipped.0), ("negative", clipped.1)] {
        if count > 0 {
            warnings.push(format!("the {leg} leg is clipped at {count} samples"));
        }
    }
    if scale_spec.is_none() {
        warnings
            .push("the bench file states no `scale_spec`: the scope's own gain error is in no uncertainty".to_owned());
    }
    let corrected = apply::correct(&positive, &negative, correction)?;
    let plain_v = apply::plain(&positive, &negative)?;
    let (noise_p_v, noise_n_v) = measured_noise(&positive, &negative, correction.gain.value, &mut warnings);
    let leak = leak::bound(&corrected.common(), corrected.interval_s, correction, bands);
    let figures = compute_figures(&FigureInput {
        corrected: &corrected,
        plain_v: Some(&plain_v),
        correction,
        leak: &leak,
        noise_p_v,
        noise_n_v,
        step_p_v: positive.step_v,
        step_n_v: negative.step_v,
        scale_spec: scale_spec.unwrap_or(0.0),
        clipped_p: clipped.0,
        clipped_n: clipped.1,
        averages: positive.averages,
    });
    Ok(Worked {
        difference_v: corrected.difference_v,
        first_valid: corrected.first,
        positive,
        negative,
        figures,
        leak,
        warnings,
    })
}

/// The noise of each leg in volts rms per sample, from the part of the spectrum that holds nothing else; where there is
/// none, the converter's own.
fn measured_noise(positive: &Record, negative: &Record, gain: f64, warnings: &mut Vec<String>) -> (f64, f64) {
    if let Ok(Some(noise)) = noise::out_of_band(&positive.volts(), &negative.volts(), gain) {
        return (noise.p_v, noise.n_v);
    }
    warnings.push(
        "noise could not be measured: the record's whole spectrum holds signal; the converter's own is taken"
            .to_owned(),
    );
    let own = |record: &Record| record.step_v / (12.0 * f64::from(record.averages.max(1))).sqrt();
    (own(positive), own(negative))
}

fn figure_to_api(figure: &Figure) -> api::Figure {
    let shares = budget::shares(&figure.budget);
    let term = |(term, share): (&budget::Term, f64)| api::UncertaintyTerm {
        name: term.name.to_owned(),
        u: term.u,
        kind: term.kind.name().to_owned(),
        share,
    };
    api::Figure {
        name: figure.kind.name().to_owned(),
        quantity: Quantity::new(figure.value, figure.u, figure.kind.unit().symbol()),
        plain: figure.plain,
        grade: match figure.grade {
            Grade::Clean => api::Grade::Clean,
            Grade::Shaded => api::Grade::Shaded,
            Grade::Swamped => api::Grade::Swamped,
        },
        valid: figure.valid,
        why: figure.why.clone(),
        budget: figure.budget.iter().zip(shares).map(term).collect(),
    }
}
