//! Deskew: acquire the references on both legs, estimate, make a correction, verify it, give the scope back.

use std::sync::Arc;

use evenpair_api as api;
use evenpair_api::Quantity;
use evenpair_core::analysis::Correction;
use evenpair_core::analysis::deskew::{Combined, combine, enough, sampled_alike, whole_periods};
use evenpair_core::analysis::skew::{Reference, Shape, SkewError, SkewEstimate, Warning, estimate_records};
use evenpair_core::bench::conditions::Carried;
use evenpair_core::bench::{Acquisition, PairSpec, ReferenceKind, ReferenceSpec};
use evenpair_core::sequence::DeskewPlan;
use evenpair_core::units::{Unit, show};
use tokio_util::sync::CancellationToken;
use uuid::Uuid;

use super::beyond::{self, Kept, Seen};
use super::correction::{conditions_now, to_api};
use super::scope::Scope;
use super::tell::Tell;
use super::trouble::Trouble;
use super::verify;
use super::workshop::{Workshop, compute};

/// What a deskew is to do: its plan, with the references that the plan names.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Wish<'b> {
    pub(crate) plan: &'b DeskewPlan,
    pub(crate) skew_reference: &'b ReferenceSpec,
    pub(crate) gain_reference: &'b ReferenceSpec,
    /// What the run had set before: a reference that sets something else gives it back.
    pub(crate) set: &'b [(String, f64)],
}

/// The standard uncertainty of the gain at which its reference is content: 2·10⁻⁵ leaves the common mode 94 dB down,
/// beyond what a scope's converter lets through.
pub(crate) const TARGET_U_GAIN: f64 = 2e-5;

/// The fewest acquisitions of a reference: fewer have no scatter worth the name.
pub(crate) const LEAST_ACQUISITIONS: u32 = 4;

/// How often the span may be doubled when the skew reference clips.
const WIDENINGS: u32 = 3;

/// Deskews a pair. Whatever comes of it, the scope gets its settings back.
pub(crate) async fn deskew(
    workshop: &Workshop,
    pair: &PairSpec,
    wish: &Wish<'_>,
    tell: &Tell,
    stop: &CancellationToken,
) -> Result<api::Correction, Trouble> {
    let scope = workshop.scope(pair)?;
    let remembered = scope.remember().await?;
    let outcome = make(workshop, &scope, wish, tell, stop).await;
    let returned = scope.give_back(remembered, outcome.is_ok() && wish.plan.use_scope_skew).await;
    let correction = outcome?;
    returned?;
    Ok(correction)
}

async fn make(
    workshop: &Workshop,
    scope: &Scope<'_>,
    wish: &Wish<'_>,
    tell: &Tell,
    stop: &CancellationToken,
) -> Result<api::Correction, Trouble> {
    let pair = scope.pair;
    // The whole skew is to be seen, not what an earlier deskew left of it.
    scope.write_skew(0.0, 0.0).await?;
    let one_for_all = wish.skew_reference.name == wish.gain_reference.name;
    let mut warnings = Vec::new();

    let on_skew = on_reference(workshop, scope, wish, wish.skew_reference, tell, stop).await?;
    let other = match one_for_all {
        true => None,
        false => Some(on_reference(workshop, scope, wish, wish.gain_reference, tell, stop).await?),
    };
    let on_gain = other.as_ref().unwrap_or(&on_skew);
    // The gain reference was the last on the scope, on the measuring range: these are the conditions that hold.
    let mut conditions = conditions_now(pair, workshop.scope_identity(pair), &scope.settings().await?);
    conditions.skew_reference.clone_from(&wish.skew_reference.name);
    conditions.gain_reference.clone_from(&wish.gain_reference.name);

    let mut skew = on_skew.combined.skew_s.estimate;
    let turns = if one_for_all { None } else { told_by(&on_gain.combined, &on_skew.combined, wish.skew_reference) };
    skew.value += turns.unwrap_or(0.0) / wish.skew_reference.frequency_hz;
    let mut carried_u_s = 0.0;
    if !on_skew.acquisition.same_range(&on_gain.acquisition) {
        let carry_u_s = wish.skew_reference.carry_u_s.unwrap_or(0.0);
        skew.u = skew.u.hypot(carry_u_s);
        carried_u_s = carry_u_s;
        conditions.carried = Some(Carried { from_span_v: on_skew.acquisition.span_v, u_s: carry_u_s });
        if carry_u_s == 0.0 {
            warnings.push(format!(
                "skew was taken on a span of {} and is used on one of {}; its reference's `carry` adds nothing for that",
                show(on_skew.acquisition.span_v, Unit::Volt, 3),
                show(on_gain.acquisition.span_v, Unit::Volt, 3)
            ));
        }
    }
    warnings.extend(disagreement(skew, &on_gain.combined, wish));
    let resolved = |warning: &&Warning| !(turns.is_some() && matches!(warning, Warning::Ambiguous { .. }));
    warnings.extend(on_skew.combined.warnings.iter().filter(resolved).map(ToString::to_string));
    warnings.extend(on_gain.combined.warnings.iter().map(ToString::to_string));
    let (gain, offset) = (on_gain.combined.gain.estimate, on_gain.combined.offset_v.estimate);
    let whole = Correction { skew_s: skew, gain, offset_v: offset, gain_offset: on_gain.combined.gain_offset };
    let on_other = (!one_for_all).then(|| on_skew.seen(on_skew.combined.correction()));
    let found = beyond::find(on_gain.seen(whole), on_other, pair.time_constant_s(), wish.plan.response).await?;
    warnings.extend(found.warnings.iter().cloned());
    warnings.sort();
    warnings.dedup();

    let scope_skew_s = if wish.plan.use_scope_skew { hand_to_scope(scope, skew.value).await? } else { 0.0 };
    let acquisitions = on_skew.combined.repeats + if one_for_all { 0 } else { on_gain.combined.repeats };
    let mut correction = api::Correction {
        id: Uuid::now_v7(),
        pair: pair.name.clone(),
        made_at: workshop.clock.now(),
        skew: Quantity::new(skew.value, skew.u, "s"),
        gain: Quantity::new(gain.value, gain.u, "1"),
        offset: Quantity::new(offset.value, offset.u, "V"),
        gain_offset_correlation: Some(on_gain.combined.gain_offset),
        compensation: found.compensation.as_ref().map(api::Compensation::from),
        response: found.response.as_ref().map(api::Response::from),
        limit: None,
        freedom: api::CorrectionFreedom {
            skew: on_skew.combined.skew_s.freedom_beside(carried_u_s),
            gain: on_gain.combined.gain.freedom,
            offset: on_gain.combined.offset_v.freedom,
        },
        limited_by: Some(on_skew.combined.limited_by(carried_u_s).to_string()),
        scope_skew: Quantity::exact(scope_skew_s, "s"),
        state: api::CorrectionState::Fresh,
        reasons: Vec::new(),
        rejection: Vec::new(),
        conditions: to_api(&conditions),
        transferred_from: None,
        acquisitions: u32::try_from(acquisitions).unwrap_or(u32::MAX),
        warnings,
    };
    let shown = verify::on_reference(workshop, scope, &correction, wish.gain_reference, wish.set, tell, stop).await?;
    correction.rejection = super::correction::rejection_points(&shown.bands);
    correction.limit = shown.limit.as_ref().map(api::RejectionLimit::from);
    workshop.store.put_correction(&correction).await?;
    tell.corrected(&correction).await?;
    Ok(correction)
}

/// What one reference gave.
#[derive(Debug)]
struct OnReference {
    combined: Combined,
    /// How it was acquired in the end.
    acquisition: Acquisition,
    kept: Arc<Kept>,
    known: Reference,
}

impl OnReference {
    /// Its acquisitions, with the correction that holds for them.
    fn seen(&self, correction: Correction) -> Seen {
        Seen { kept: Arc::clone(&self.kept), reference: self.known, correction }
    }
}

/// Acquires a reference until the wanted uncertainty is reached or the allowed number of acquisitions is spent.
async fn on_reference(
    workshop: &Workshop,
    scope: &Scope<'_>,
    wish: &Wish<'_>,
    reference: &ReferenceSpec,
    tell: &Tell,
    stop: &CancellationToken,
) -> Result<OnReference, Trouble> {
    let acquisition = workshop.bench.reference_acquisition(scope.pair, reference);
    scope.prepare(&acquisition).await?;
    workshop.start_reference(reference, stop).await?;
    let outcome = acquire_until_enough(scope, wish, reference, acquisition, tell, stop).await;
    let ended = workshop.stop_reference(reference, wish.set, stop).await;
    let found = outcome?;
    ended?;
    Ok(found)
}

async fn acquire_until_enough(
    scope: &Scope<'_>,
    wish: &Wish<'_>,
    reference: &ReferenceSpec,
    mut acquisition: Acquisition,
    tell: &Tell,
    stop: &CancellationToken,
) -> Result<OnReference, Trouble> {
    let is_gain_reference = reference.name == wish.gain_reference.name;
    let known = Reference { shape: shape_of(reference.kind), period_s: Some(1.0 / reference.frequency_hz) };
    let mut repeats: Vec<SkewEstimate> = Vec::new();
    let mut kept = Kept::default();
    let mut widenings = 0;
    let most = wish.plan.most_acquisitions.max(LEAST_ACQUISITIONS);
    loop {
        if stop.is_cancelled() {
            return Err(Trouble::Stopped);
        }
        let (positive, negative) = scope.acquire(&acquisition, stop).await?;
        let work = move || (estimate_records(&positive, &negative, &known), positive, negative);
        let (estimate, positive, negative) = compute("estimating skew and gain", work).await?;
        match estimate {
            Ok(estimate) => {
                repeats.push(estimate);
                kept.add(positive, negative);
            }
            // The gain reference has to be seen on the measuring range, which is not ours to widen.
            Err(SkewError::Clipped { .. }) if !is_gain_reference && widenings < WIDENINGS => {
                widenings += 1;
                acquisition.span_v *= 2.0;
                repeats.clear();
                kept.clear();
                scope.prepare(&acquisition).await?;
                continue;
            }
            Err(source) => {
                return Err(Trouble::Estimate {
                    pair: scope.pair.name.clone(),
                    reference: reference.name.clone(),
                    source,
                });
            }
        }
        let Some(combined) = combine(&repeats) else { continue };
        let u_skew = show(combined.skew_s.estimate.u, Unit::Second, 2);
        let text = format!("reference `{}`: acquisition {}, u(skew) {u_skew}", reference.name, repeats.len());
        tell.doing(text).await?;
        let skew_enough = reference.name != wish.skew_reference.name || enough(&combined, wish.plan.target_u_skew_s);
        let gain_enough = !is_gain_reference || combined.gain.estimate.u <= TARGET_U_GAIN;
        let count = u32::try_from(repeats.len()).unwrap_or(u32::MAX);
        if count >= most || (count >= LEAST_ACQUISITIONS && skew_enough && gain_enough) {
            let mut combined = combined;
            combined.skew_s.estimate.u = combined.skew_s.estimate.u.hypot(alike(reference, &acquisition));
            return Ok(OnReference { combined, acquisition, kept: Arc::new(kept), known });
        }
    }
}

/// What no scatter shows: edges that all meet the sampler at the same phase, standard uncertainty in seconds.
pub(crate) fn alike(reference: &ReferenceSpec, acquisition: &Acquisition) -> f64 {
    match reference.kind {
        ReferenceKind::Square | ReferenceKind::Pulse => {
            let Acquisition { interval_s, points, .. } = *acquisition;
            sampled_alike(1.0 / reference.frequency_hz, reference.edge_s, interval_s, points)
        }
        // Sines hold nothing that folds back, and the node of a device runs on a clock of its own.
        ReferenceKind::InSitu | ReferenceKind::Multitone | ReferenceKind::Sine => 0.0,
    }
}

/// What the estimator is told of a reference of this kind.
pub(crate) fn shape_of(kind: ReferenceKind) -> Shape {
    match kind {
        ReferenceKind::Square | ReferenceKind::Pulse => Shape::Edges,
        ReferenceKind::Sine => Shape::Sine,
        ReferenceKind::Multitone => Shape::Multitone,
        ReferenceKind::InSitu => Shape::Unknown,
    }
}

/// The whole periods by which an ambiguous skew is off, as the gain reference tells them; `None` where it is not
/// ambiguous, or the gain reference cannot tell.
fn told_by(on_gain: &Combined, on_skew: &Combined, reference: &ReferenceSpec) -> Option<f64> {
    let ambiguous = |combined: &Combined| combined.warnings.iter().any(|one| matches!(one, Warning::Ambiguous { .. }));
    if !ambiguous(on_skew) || ambiguous(on_gain) {
        return None;
    }
    whole_periods(on_skew.skew_s.estimate.value, on_gain.skew_s.estimate, 1.0 / reference.frequency_hz)
}

/// A warning when the gain reference, on the measuring range, sees a skew that the other cannot explain.
fn disagreement(skew: evenpair_core::analysis::Estimate, on_gain: &Combined, wish: &Wish<'_>) -> Option<String> {
    let other = on_gain.skew_s.estimate;
    let apart = other.value - skew.value;
    (apart.abs() > 3.0 * skew.u.hypot(other.u)).then(|| {
        format!(
            "on the measuring range the reference `{}` sees {} more skew than `{}` did; the legs' bandwidths or the \
             delays of the two ranges differ by more than `carry` says",
            wish.gain_reference.name,
            show(apart, Unit::Second, 3),
            wish.skew_reference.name
        )
    })
}

/// Writes the skew into the scope's own setting: it can only shift a record earlier, so the late leg is shifted. What
/// the scope made of it, negative leg's less positive leg's.
async fn hand_to_scope(scope: &Scope<'_>, skew_s: f64) -> Result<f64, Trouble> {
    let (positive, negative) = scope.write_skew((-skew_s).max(0.0), skew_s.max(0.0)).await?;
    Ok(negative - positive)
}
