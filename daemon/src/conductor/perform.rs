//! One step of a sequence, carried out.

use std::time::Duration;

use evenpair_api as api;
use evenpair_core::sequence::machine::Outcome;
use evenpair_core::sequence::{Action, CapturePlan, DeskewPlan, Step, TransferPlan};
use evenpair_core::units::Unit;
use tokio_util::sync::CancellationToken;

use super::deskew::Wish;
use super::live::LiveRun;
use super::tell::Tell;
use super::trouble::Trouble;
use super::workshop::Workshop;
use super::{capture, deskew, limits, transfer, verify};
use evenpair_core::dialect::Message;

use std::sync::Arc;

/// The longest that a step which was told to stop may take to give the scope back and end.
const END_WITHIN: Duration = Duration::from_secs(10);

/// Carries out a step. `stop` abandons it; what it had set on the scope is given back if that works in time.
pub(crate) async fn perform(
    workshop: &Workshop,
    step: &Step,
    live: &Arc<LiveRun>,
    stop: &CancellationToken,
) -> Outcome {
    let overdue = async {
        stop.cancelled().await;
        tokio::time::sleep(END_WITHIN).await;
    };
    let outcome = tokio::select! {
        outcome = act(workshop, step, live, stop) => outcome,
        () = overdue => Err(Trouble::Stopped),
    };
    match outcome {
        Ok(outcome) => outcome,
        Err(Trouble::Stopped) => Outcome::Cut,
        Err(trouble) => Outcome::Broken { reason: format!("{}: {trouble}", step.text) },
    }
}

async fn act(
    workshop: &Workshop,
    step: &Step,
    live: &Arc<LiveRun>,
    stop: &CancellationToken,
) -> Result<Outcome, Trouble> {
    let tell = Tell::new(Arc::clone(live));
    match &step.action {
        Action::Ask { instrument, command } => {
            let reply = workshop.instruments.handle(instrument)?.exchange_raw(command, true).await?;
            Ok(Outcome::Done {
                text: reply.map(|reply| match reply {
                    Message::Line(line) => line,
                    Message::Block(bytes) => format!("a block of {} bytes", bytes.len()),
                }),
            })
        }
        Action::Capture(plan) => act_capture(workshop, step, plan, live, &tell, stop).await,
        Action::Deskew(plan) => {
            let correction = act_deskew(workshop, step, plan, &tell, stop).await?;
            Ok(Outcome::Done { text: Some(in_words(&correction)) })
        }
        Action::Prepare => {
            workshop.instruments.perform_all(&workshop.bench.prepare).await?;
            Ok(Outcome::Done { text: None })
        }
        Action::Route { route } => {
            workshop.route(route).await?;
            Ok(Outcome::Done { text: None })
        }
        Action::Send { instrument, command } => {
            workshop.instruments.handle(instrument)?.exchange_raw(command, false).await?;
            Ok(Outcome::Done { text: None })
        }
        Action::Set { setting, value } => {
            workshop.set(setting, *value).await?;
            Ok(Outcome::Done { text: None })
        }
        Action::Transfer(plan) => {
            let correction = act_transfer(workshop, step, plan, &tell, stop).await?;
            Ok(Outcome::Done { text: Some(in_words(&correction)) })
        }
        Action::Verify(plan) => {
            let Some((pair, reference)) =
                workshop.bench.pair(&plan.pair).zip(workshop.bench.reference(&plan.reference))
            else {
                return Err(Trouble::NoCorrection { pair: plan.pair.clone() });
            };
            let correction = verify::verify(workshop, pair, reference, &step.conditions, &tell, stop).await?;
            Ok(Outcome::Done { text: Some(rejection_in_words(&correction)) })
        }
        Action::Wait => Ok(Outcome::Done { text: None }),
    }
}

async fn act_deskew(
    workshop: &Workshop,
    step: &Step,
    plan: &DeskewPlan,
    tell: &Tell,
    stop: &CancellationToken,
) -> Result<api::Correction, Trouble> {
    let bench = &workshop.bench;
    let references = bench.reference(&plan.skew_reference).zip(bench.reference(&plan.gain_reference));
    // A checked plan names only what there is.
    let Some((pair, (skew_reference, gain_reference))) = bench.pair(&plan.pair).zip(references) else {
        return Err(Trouble::NoCorrection { pair: plan.pair.clone() });
    };
    deskew::deskew(workshop, pair, &Wish { plan, skew_reference, gain_reference, set: &step.conditions }, tell, stop)
        .await
}

async fn act_transfer(
    workshop: &Workshop,
    step: &Step,
    plan: &TransferPlan,
    tell: &Tell,
    stop: &CancellationToken,
) -> Result<api::Correction, Trouble> {
    let bench = &workshop.bench;
    // A checked plan names only what there is.
    let Some((pair, reference)) = bench.pair(&plan.pair).zip(bench.reference(&plan.reference)) else {
        return Err(Trouble::NoCorrection { pair: plan.pair.clone() });
    };
    transfer::transfer(workshop, pair, &transfer::Wish { plan, reference, set: &step.conditions }, tell, stop).await
}

async fn act_capture(
    workshop: &Workshop,
    step: &Step,
    plan: &CapturePlan,
    live: &Arc<LiveRun>,
    tell: &Tell,
    stop: &CancellationToken,
) -> Result<Outcome, Trouble> {
    let Some(pair) = workshop.bench.pair(&plan.pair) else {
        return Err(Trouble::NoCorrection { pair: plan.pair.clone() });
    };
    let unit = |name: &str| workshop.bench.setting(name).map_or(Unit::One, |setting| setting.unit);
    let condition = |(setting, value): &(String, f64)| api::Condition {
        setting: setting.clone(),
        value: api::Quantity::exact(*value, unit(setting).symbol()),
    };
    let place = capture::Place {
        run: live.id(),
        number: live.run().progress.captures + 1,
        conditions: step.conditions.iter().map(condition).collect(),
    };
    let capture = capture::capture(workshop, pair, plan, place, tell, stop).await?;
    let exceeded: Vec<String> = capture
        .limits
        .iter()
        .filter(|verdict| !verdict.passed)
        .map(|verdict| limits::in_words(verdict, &capture.figures))
        .collect();
    if exceeded.is_empty() {
        return Ok(Outcome::Done { text: Some(format!("capture {}", capture.number)) });
    }
    let failures = capture.limits.iter().filter(|verdict| !verdict.passed).zip(&exceeded);
    let failures: Vec<api::LimitFailure> = failures
        .map(|(verdict, text)| api::LimitFailure {
            capture: capture.number,
            figure: verdict.figure.clone(),
            text: text.clone(),
        })
        .collect();
    live.change(|run| run.failures.extend(failures), None).await?;
    Ok(Outcome::LimitExceeded { text: format!("capture {}: {}", capture.number, exceeded.join("; ")) })
}

fn in_words(correction: &api::Correction) -> String {
    let seconds = |value| evenpair_core::units::show(value, Unit::Second, 4);
    format!(
        "skew {}, gain {:.5}; {}",
        seconds(correction.skew.value),
        correction.gain.value,
        rejection_in_words(correction)
    )
}

/// The rejection at the frequency nearest to 1 MHz.
fn rejection_in_words(correction: &api::Correction) -> String {
    let distance = |point: &&api::RejectionPoint| (point.frequency_hz / 1e6).ln().abs();
    let nearest = correction.rejection.iter().min_by(|a, b| distance(a).total_cmp(&distance(b)));
    nearest.map_or_else(String::new, |point| {
        let frequency = evenpair_core::units::show(point.frequency_hz, Unit::Hertz, 1);
        let least = if point.at_least { "at least " } else { "" };
        format!("rejection {least}{:.1} dB at {frequency}, {:.1} dB before", point.after_db, point.before_db)
    })
}
