//! Transfer: a signal that two vertical ranges can show is acquired on both in turn, and the correction of the one
//! becomes a correction of the other.

use evenpair_api::{self as api, CorrectionState, Quantity, TransferWay, TransferredFrom};
use evenpair_core::analysis::Record;
use evenpair_core::analysis::skew::Reference;
use evenpair_core::analysis::transfer::{self, Disagreement, Repeat, Transferred, compare, enough};
use evenpair_core::bench::conditions::{Carried, Conditions};
use evenpair_core::bench::{Acquisition, PairSpec, ReferenceSpec};
use evenpair_core::sequence::TransferPlan;
use evenpair_core::units::{Unit, show};
use tokio_util::sync::CancellationToken;
use uuid::Uuid;

use super::correction::{conditions_now, for_software, judge, newest_for, since, to_api};
use super::deskew::{LEAST_ACQUISITIONS, TARGET_U_GAIN, alike, shape_of};
use super::scope::Scope;
use super::tell::Tell;
use super::trouble::Trouble;
use super::verify;
use super::workshop::{Workshop, compute};

/// What a transfer is to do: its plan, with the reference that the plan names.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Wish<'b> {
    pub(crate) plan: &'b TransferPlan,
    pub(crate) reference: &'b ReferenceSpec,
    /// What the run had set before: a reference that sets something else gives it back.
    pub(crate) set: &'b [(String, f64)],
}

/// Transfers a pair's correction. Whatever comes of it, the scope gets its settings back.
pub(crate) async fn transfer(
    workshop: &Workshop,
    pair: &PairSpec,
    wish: &Wish<'_>,
    tell: &Tell,
    stop: &CancellationToken,
) -> Result<api::Correction, Trouble> {
    let scope = workshop.scope(pair)?;
    let remembered = scope.remember().await?;
    let outcome = make(workshop, &scope, wish, tell, stop).await;
    let returned = scope.give_back(remembered, false).await;
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
    let (pair, reference) = (scope.pair, wish.reference);
    // The correction's whole skew is meant, and both ranges are to be seen with the same setting.
    scope.write_skew(0.0, 0.0).await?;
    let ranges = wish.plan.acquisitions(pair, reference);
    let [old, new] = &ranges;
    scope.prepare(new).await?;
    let mut conditions = conditions_now(pair, workshop.scope_identity(pair), &scope.settings().await?);
    scope.prepare(old).await?;
    let on_old = conditions_now(pair, workshop.scope_identity(pair), &scope.settings().await?);
    let from = newest_for(workshop, pair, &on_old).await?;
    let (state, reasons) = judge(&from, pair, &on_old, workshop.clock.now());
    if state == CorrectionState::Void {
        return Err(Trouble::CorrectionVoid { pair: pair.name.clone(), reasons });
    }

    workshop.start_reference(reference, stop).await?;
    let outcome = acquire_until_enough(scope, wish, &ranges, &from, tell, stop).await;
    let ended = workshop.stop_reference(reference, wish.set, stop).await;
    let (found, both_on_one_node) = outcome?;
    ended?;

    let mut warnings: Vec<String> =
        reasons.iter().map(|reason| format!("it comes from a stale one: {reason}")).collect();
    warnings.extend(found.disagreements.iter().map(|one| in_words(one, reference)));
    warnings.extend(found.few_steps.map(|steps| of_few_steps(steps, found.level_way, reference)));
    warnings.extend(found.warnings.iter().map(ToString::to_string));
    let measured_anew = [found.skew_way, found.level_way].iter().all(|way| *way == transfer::Way::Common);
    if !measured_anew {
        warnings.extend(from.warnings.iter().cloned());
    }
    warnings.sort();
    warnings.dedup();
    describe(&mut conditions, &found, &from, reference, old.span_v);
    let Transferred { correction: values, .. } = &found;
    let mut correction = api::Correction {
        id: Uuid::now_v7(),
        pair: pair.name.clone(),
        made_at: workshop.clock.now(),
        skew: Quantity::new(values.skew_s.value, values.skew_s.u, "s"),
        gain: Quantity::new(values.gain.value, values.gain.u, "1"),
        offset: Quantity::new(values.offset_v.value, values.offset_v.u, "V"),
        gain_offset_correlation: Some(values.gain_offset),
        freedom: from.freedom,
        limited_by: None,
        // They belong to probes and legs more than to a range.
        compensation: from.compensation.clone(),
        response: from.response.clone(),
        limit: from.limit.clone(),
        scope_skew: Quantity::exact(0.0, "s"),
        state,
        reasons: Vec::new(),
        rejection: Vec::new(),
        conditions: to_api(&conditions),
        transferred_from: Some(TransferredFrom {
            correction: from.id,
            made_at: since(&from),
            span: from.conditions.positive.span.clone(),
            offset: from.conditions.positive.offset.clone(),
            reference: reference.name.clone(),
            skew_by: TransferWay::from(found.skew_way),
            levels_by: TransferWay::from(found.level_way),
        }),
        acquisitions: u32::try_from(2 * found.repeats).unwrap_or(u32::MAX),
        warnings,
    };
    (correction.state, correction.reasons) = judge(&correction, pair, &conditions, workshop.clock.now());
    // With the tips on two nodes there is no common mode to reject.
    if both_on_one_node {
        let shown = verify::on_range(workshop, scope, &correction, reference, new, wish.set, tell, stop).await?;
        correction.rejection = super::correction::rejection_points(&shown.bands);
        let seen = shown.limit.as_ref().map(api::RejectionLimit::from);
        correction.limit = seen.or(correction.limit);
    }
    workshop.store.put_correction(&correction).await?;
    tell.corrected(&correction).await?;
    Ok(correction)
}

/// Says in the new range's conditions where skew, gain and offset are from.
fn describe(
    conditions: &mut Conditions,
    found: &Transferred,
    from: &api::Correction,
    reference: &ReferenceSpec,
    old_span_v: f64,
) {
    let source = |way, old: &String| match way {
        transfer::Way::Common => reference.name.clone(),
        transfer::Way::Carried | transfer::Way::Legs => old.clone(),
    };
    conditions.skew_reference = source(found.skew_way, &from.conditions.skew_reference);
    conditions.gain_reference = source(found.level_way, &from.conditions.gain_reference);
    conditions.carried = match found.skew_way {
        transfer::Way::Carried => reference.carry_u_s.map(|u_s| Carried { from_span_v: old_span_v, u_s }),
        transfer::Way::Legs => from
            .conditions
            .carried
            .as_ref()
            .map(|carried| Carried { from_span_v: carried.from_span.value, u_s: carried.added.value }),
        transfer::Way::Common => None,
    };
}

/// Acquires the reference on both ranges until more would add little or the allowed number of acquisitions is spent;
/// also whether both legs saw one signal throughout.
async fn acquire_until_enough(
    scope: &Scope<'_>,
    wish: &Wish<'_>,
    ranges: &[Acquisition; 2],
    from: &api::Correction,
    tell: &Tell,
    stop: &CancellationToken,
) -> Result<(Transferred, bool), Trouble> {
    let (plan, reference) = (wish.plan, wish.reference);
    let known = Reference { shape: shape_of(reference.kind), period_s: Some(1.0 / reference.frequency_hz) };
    let alike_u_s = alike(reference, &ranges[1]);
    let correction = for_software(from, 0.0);
    let failed = |source| Trouble::Transfer {
        pair: scope.pair.name.clone(),
        reference: reference.name.clone(),
        source: Box::new(source),
    };
    let most = plan.most_acquisitions.max(LEAST_ACQUISITIONS);
    let mut repeats: Vec<Repeat> = Vec::new();
    // The old range is set already.
    let mut set = 0;
    loop {
        // Old, new, new, old, old, new, …: a slow drift moves as many pairs one way as the other.
        let first = repeats.len() % 2;
        let mut records: [Option<[Record; 2]>; 2] = [None, None];
        for range in [first, 1 - first] {
            if stop.is_cancelled() {
                return Err(Trouble::Stopped);
            }
            if set != range {
                scope.prepare(&ranges[range]).await?;
                set = range;
            }
            records[range] = Some(on_range(scope, &ranges[range], stop).await?);
        }
        let [Some(old), Some(new)] = records else { continue };
        let repeat = compute("comparing two ranges", move || compare(&old, &new, &known)).await?;
        repeats.push(repeat.map_err(failed)?);
        let found = transfer::transfer(&correction, &repeats, reference.carry_u_s, alike_u_s, plan.choice);
        let found = found.map_err(failed)?;
        let u_skew = show(found.correction.skew_s.u, Unit::Second, 2);
        tell.doing(format!(
            "reference `{}`: acquisition {} on both ranges, u(gain) {:.1e}, u(skew) {u_skew}",
            reference.name,
            repeats.len(),
            found.correction.gain.u
        ))
        .await?;
        let count = u32::try_from(repeats.len()).unwrap_or(u32::MAX);
        let satisfied = enough(&found, &correction, TARGET_U_GAIN, plan.target_u_skew_s);
        if count >= most || (count >= LEAST_ACQUISITIONS && satisfied) {
            let both_on_one_node = repeats.iter().all(|repeat| repeat.common.is_some());
            return Ok((found, both_on_one_node));
        }
    }
}

/// Both legs' records on one of the ranges, neither of them clipped.
async fn on_range(
    scope: &Scope<'_>,
    acquisition: &Acquisition,
    stop: &CancellationToken,
) -> Result<[Record; 2], Trouble> {
    let (positive, negative) = scope.acquire(acquisition, stop).await?;
    for (leg, record) in [("positive", &positive), ("negative", &negative)] {
        if record.clipped() > 0 {
            return Err(scope.clipped(leg, record, acquisition.span_v));
        }
    }
    Ok([positive, negative])
}

/// What a person should know of a signal that does not confirm the correction.
fn in_words(disagreement: &Disagreement, reference: &ReferenceSpec) -> String {
    let Disagreement { quantity, apart } = disagreement;
    let (what, found) = match quantity {
        transfer::Quantity::Gain => ("gain", format!("{:+.2e} ± {:.1e}", apart.value, 2.0 * apart.u)),
        transfer::Quantity::Offset => ("offset", volts(apart.value, 2.0 * apart.u)),
        transfer::Quantity::Skew => ("skew", seconds(apart.value, 2.0 * apart.u)),
    };
    format!(
        "on the old range the reference `{}` gives another {what} than the correction ({found}, k = 2): the pair has \
         drifted since, or its legs respond differently to that signal; deskew again to tell which",
        reference.name
    )
}

/// What a person should know of a signal that is small on one of the ranges.
fn of_few_steps(steps: f64, way: transfer::Way, reference: &ReferenceSpec) -> String {
    let where_it_counts = match way {
        transfer::Way::Common => "a comparison of the old range with the new",
        transfer::Way::Carried | transfer::Way::Legs => "gain and offset on the new range",
    };
    format!(
        "the reference `{}` moves over only {steps:.0} converter steps of the wider range: the converter's own \
         non-linearity counts in {where_it_counts} and is in no uncertainty; a larger signal that both ranges still \
         show is better",
        reference.name
    )
}

fn volts(value: f64, expanded: f64) -> String {
    format!("{} ± {}", show(value, Unit::Volt, 3), show(expanded, Unit::Volt, 2))
}

fn seconds(value: f64, expanded: f64) -> String {
    format!("{} ± {}", show(value, Unit::Second, 3), show(expanded, Unit::Second, 2))
}
