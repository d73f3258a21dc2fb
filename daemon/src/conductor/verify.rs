//! Verification: both tips on one node, fresh acquisitions, and what of the common mode is left in the difference.

use evenpair_api as api;
use evenpair_core::analysis::apply::ApplyError;
use evenpair_core::analysis::rejection::{RejectionBand, measure_with};
use evenpair_core::analysis::response::{Nonlinearity, nonlinearity};
use evenpair_core::analysis::{Beyond, Correction, Record};
use evenpair_core::bench::{Acquisition, PairSpec, ReferenceKind, ReferenceSpec};
use tokio_util::sync::CancellationToken;

use super::correction::{for_software, newest_by_bench, rejection_points};
use super::scope::Scope;
use super::tell::Tell;
use super::trouble::Trouble;
use super::workshop::{Workshop, compute};

/// Fresh acquisitions of one verification: enough that noise falls by half, few enough for a moment.
const ACQUISITIONS: u32 = 4;

/// The frequencies at which rejection is told, in hertz: 1–3–10 from audio to the top of a passive probe. Those at
/// which the reference holds nothing are left out.
const BANDS_HZ: [f64; 11] = [1e3, 3e3, 1e4, 3e4, 1e5, 3e5, 1e6, 3e6, 1e7, 3e7, 1e8];

/// Verifies a pair's correction on a reference and stores what was found with it.
pub(crate) async fn verify(
    workshop: &Workshop,
    pair: &PairSpec,
    reference: &ReferenceSpec,
    set: &[(String, f64)],
    tell: &Tell,
    stop: &CancellationToken,
) -> Result<api::Correction, Trouble> {
    let newest = newest_by_bench(workshop, pair).await?;
    let mut correction = newest.ok_or_else(|| Trouble::NoCorrection { pair: pair.name.clone() })?;
    let scope = workshop.scope(pair)?;
    let remembered = scope.remember().await?;
    let outcome = on_reference(workshop, &scope, &correction, reference, set, tell, stop).await;
    let returned = scope.give_back(remembered, false).await;
    let shown = outcome?;
    correction.rejection = rejection_points(&shown.bands);
    let limit = shown.limit.as_ref().map(api::RejectionLimit::from);
    returned?;
    workshop.store.set_rejection(correction.id, &correction.rejection, limit.as_ref()).await?;
    correction.limit = limit.or(correction.limit);
    super::correction::judge_by_bench(workshop, &mut correction, pair);
    tell.corrected(&correction).await?;
    Ok(correction)
}

/// What a verification showed.
#[derive(Debug, Clone)]
pub(crate) struct Shown {
    /// Rejection, by frequency.
    pub(crate) bands: Vec<RejectionBand>,
    /// The converters' non-linearity, where the reference sweeps through the levels.
    pub(crate) limit: Option<Nonlinearity>,
}

/// Measures rejection on a reference. A checked plan has it on the measuring range, where the correction is to hold.
pub(crate) async fn on_reference(
    workshop: &Workshop,
    scope: &Scope<'_>,
    correction: &api::Correction,
    reference: &ReferenceSpec,
    set: &[(String, f64)],
    tell: &Tell,
    stop: &CancellationToken,
) -> Result<Shown, Trouble> {
    let acquisition = workshop.bench.reference_acquisition(scope.pair, reference);
    on_range(workshop, scope, correction, reference, &acquisition, set, tell, stop).await
}

/// Measures rejection on a reference, on the range of `acquisition`.
#[expect(clippy::too_many_arguments, reason = "each is another thing, and there are two callers")]
pub(crate) async fn on_range(
    workshop: &Workshop,
    scope: &Scope<'_>,
    correction: &api::Correction,
    reference: &ReferenceSpec,
    acquisition: &Acquisition,
    set: &[(String, f64)],
    tell: &Tell,
    stop: &CancellationToken,
) -> Result<Shown, Trouble> {
    scope.prepare(acquisition).await?;
    workshop.start_reference(reference, stop).await?;
    let bands = bands_of(reference);
    let outcome = acquire_and_measure(scope, correction, *acquisition, bands, tell, stop).await;
    let ended = workshop.stop_reference(reference, set, stop).await;
    let shown = outcome?;
    ended?;
    if shown.bands.is_empty() {
        return Err(Trouble::NothingToVerify { pair: scope.pair.name.clone(), reference: reference.name.clone() });
    }
    Ok(shown)
}

/// Where rejection is told on a reference: a sine holds its own frequency only, which may lie between all others.
fn bands_of(reference: &ReferenceSpec) -> Vec<f64> {
    match reference.kind {
        ReferenceKind::Sine => vec![reference.frequency_hz],
        _ => BANDS_HZ.to_vec(),
    }
}

async fn acquire_and_measure(
    scope: &Scope<'_>,
    correction: &api::Correction,
    acquisition: Acquisition,
    bands_hz: Vec<f64>,
    tell: &Tell,
    stop: &CancellationToken,
) -> Result<Shown, Trouble> {
    let [positive, negative] = scope.settings().await?;
    let software = for_software(correction, negative.delay_s - positive.delay_s);
    let (mut all_p, mut all_n) = (Vec::new(), Vec::new());
    for number in 1..=ACQUISITIONS {
        if stop.is_cancelled() {
            return Err(Trouble::Stopped);
        }
        tell.doing(format!("verifying: acquisition {number} of {ACQUISITIONS}")).await?;
        let (p, n) = scope.acquire(&acquisition, stop).await?;
        for (leg, record) in [("positive", &p), ("negative", &n)] {
            if record.clipped() > 0 {
                return Err(scope.clipped(leg, record, acquisition.span_v));
            }
        }
        all_p.push(p);
        all_n.push(n);
    }
    let beyond = correction.beyond();
    let work = move || show(&all_p, &all_n, &software, &beyond, &bands_hz);
    let measured = compute("measuring the rejection", work).await?;
    measured.map_err(|source| Trouble::Apply { pair: scope.pair.name.clone(), source })
}

/// Rejection with all that is applied, a response that does not hold for these records left out as in a capture. No band
/// claims more than the converters let through.
fn show(
    p: &[Record],
    n: &[Record],
    software: &Correction,
    beyond: &Beyond,
    bands_hz: &[f64],
) -> Result<Shown, ApplyError> {
    let mut response = beyond.response.as_ref();
    let mut bands = measure_with(p, n, software, response, bands_hz);
    if let Err(ApplyError::Response(error)) = &bands {
        tracing::warn!(%error, "the response is not applied to a verification");
        response = None;
        bands = measure_with(p, n, software, None, bands_hz);
    }
    let mut bands = bands?;
    let limit = nonlinearity(p, n, software, response)?;
    let most_db = limit.filter(|limit| !limit.at_least).map_or(f64::INFINITY, |limit| limit.cap_db);
    bands.iter_mut().for_each(|band| band.after_db = band.after_db.min(most_db));
    Ok(Shown { bands, limit })
}
