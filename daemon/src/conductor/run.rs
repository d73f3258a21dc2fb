//! A run, carried out: what the state machine asks for is done, what came of it is handed back.

use std::collections::VecDeque;
use std::pin::Pin;
use std::sync::Arc;
use std::time::Duration;

use evenpair_api::{EventKind, RunState, StageReport};
use evenpair_core::sequence::machine::{Effect, Entry, Event, Machine, Outcome, Place, Verdict, What};
use evenpair_core::sequence::{Sequence, Step};
use tokio_util::sync::CancellationToken;

use super::live::LiveRun;
use super::perform::perform;
use super::rest::RestKeeper;
use super::workshop::Workshop;
use crate::store::StoreError;

/// A step that is being carried out.
type Activity<'r> = Pin<Box<dyn Future<Output = Outcome> + Send + 'r>>;

/// Carries a run out to its end. `machine` is new, or replayed from the journal of an earlier life of the daemon; `first`
/// is the event that it begins with.
pub(crate) async fn carry_out(
    workshop: &Workshop,
    rest: &RestKeeper,
    live: &Arc<LiveRun>,
    sequence: &Sequence,
    mut machine: Machine,
    first: Event,
) {
    let began = workshop.clock.elapsed();
    let already_s = machine.state().at_s;
    let now_s = || already_s + workshop.clock.elapsed().saturating_sub(began).as_secs_f64();
    let book = Book { workshop, live, sequence };
    let mut waiting = VecDeque::from([first]);
    let mut stop_told = false;
    let mut activity: Option<(Activity<'_>, CancellationToken)> = None;
    loop {
        let event = match waiting.pop_front() {
            Some(event) => event,
            None => {
                let pause = machine.next_deadline().map(|at_s| Duration::from_secs_f64((at_s - now_s()).max(0.0)));
                tokio::select! {
                    outcome = async { match activity.as_mut() { Some((work, _)) => work.await, None => std::future::pending().await } } => {
                        activity = None;
                        Event::StepEnded(outcome)
                    }
                    () = live.stop.cancelled(), if !stop_told => {
                        stop_told = true;
                        Event::StopAsked
                    }
                    () = tokio::time::sleep(pause.unwrap_or_default()), if pause.is_some() => Event::Tick,
                }
            }
        };
        for effect in machine.handle(now_s(), event) {
            match effect {
                Effect::Persist(entry) => {
                    if let Err(error) = book.persist(&entry).await {
                        tracing::error!(run = %live.id(), %error, "writing the journal");
                        waiting.push_back(Event::PersistFailed { reason: error.to_string() });
                        break;
                    }
                }
                Effect::Perform(place) => {
                    let stop = CancellationToken::new();
                    let work = book.activity(place, stop.clone());
                    activity = Some((work, stop));
                }
                Effect::Cancel => {
                    if let Some((_, stop)) = &activity {
                        stop.cancel();
                    }
                }
                Effect::Settle => {
                    let ok = rest.settle(&workshop.bench, &workshop.instruments).await;
                    waiting.push_back(Event::SettleEnded { ok });
                }
                Effect::End { state, reason } => return book.close(state, reason).await,
            }
        }
    }
}

/// What a run's journal and public face are written by.
struct Book<'r> {
    workshop: &'r Workshop,
    live: &'r Arc<LiveRun>,
    sequence: &'r Sequence,
}

impl<'r> Book<'r> {
    fn step(&self, place: Place) -> Option<(u64, &'r Step)> {
        let (list, offset, at) = match place {
            Place::Stage(at) => (&self.sequence.steps, 0, at),
            Place::Always(at) => (&self.sequence.always, self.sequence.steps.len(), at),
        };
        list.get(at).map(|step| ((offset + at) as u64, step))
    }

    fn activity(&self, place: Place, stop: CancellationToken) -> Activity<'r> {
        let (workshop, live, step) = (self.workshop, self.live, self.step(place));
        Box::pin(async move {
            match step {
                Some((_, step)) => perform(workshop, step, live, &stop).await,
                None => Outcome::Broken { reason: format!("the sequence has no step {place:?}") },
            }
        })
    }

    /// Makes an entry durable, then tells what it means. That telling fails is no reason to end the run: what counts is in
    /// the journal.
    async fn persist(&self, entry: &Entry) -> Result<(), StoreError> {
        let value = serde_json::to_value(entry).unwrap_or_default();
        self.workshop.store.append(self.live.id(), &value).await?;
        if let Err(error) = self.tell(entry).await {
            tracing::error!(run = %self.live.id(), %error, "telling how a run goes on");
        }
        Ok(())
    }

    async fn tell(&self, entry: &Entry) -> Result<(), StoreError> {
        match &entry.what {
            What::Begun => self.begun().await,
            What::Started { place, .. } => self.started(*place, entry.at_s).await,
            What::Ended { place, outcome, .. } => self.ended(*place, outcome, entry.at_s).await,
            What::StopAsked => self.doing("stopping").await,
            What::Settling => self.doing("bringing the bench to rest").await,
            What::Closed { .. } | What::Interrupted { .. } | What::Settled { .. } => Ok(()),
        }
    }

    async fn begun(&self) -> Result<(), StoreError> {
        let now = self.workshop.clock.now();
        let event = EventKind::StateChanged { state: RunState::Running, reason: None };
        let begin = |run: &mut evenpair_api::Run| {
            run.state = RunState::Running;
            run.started_at = Some(now);
        };
        self.live.change(begin, Some(event)).await
    }

    async fn doing(&self, what: &str) -> Result<(), StoreError> {
        self.live.change(|run| run.progress.doing = what.to_owned(), None).await
    }

    async fn started(&self, place: Place, at_s: f64) -> Result<(), StoreError> {
        let Some((number, step)) = self.step(place) else { return Ok(()) };
        let stage =
            StageReport { step: number, text: step.text.clone(), started_s: at_s, ended_s: None, outcome: None };
        self.workshop.store.put_stage(self.live.id(), &stage).await?;
        let begin = |run: &mut evenpair_api::Run| {
            run.progress.doing.clone_from(&step.text);
            // Only the stage that is being done; the store has them all, and a night has thousands.
            run.stages = vec![stage];
        };
        self.live.change(begin, None).await
    }

    async fn ended(&self, place: Place, outcome: &Outcome, at_s: f64) -> Result<(), StoreError> {
        let Some((number, step)) = self.step(place) else { return Ok(()) };
        let words = match outcome {
            Outcome::Broken { reason } => Some(format!("broken: {reason}")),
            Outcome::Cut => Some("abandoned".to_owned()),
            Outcome::Done { text } => text.clone(),
            Outcome::LimitExceeded { text } => Some(text.clone()),
        };
        let mut known = self.live.run().stages.into_iter().rev().find(|stage| stage.step == number);
        let stage = known.get_or_insert_with(|| StageReport {
            step: number,
            text: step.text.clone(),
            started_s: at_s,
            ended_s: None,
            outcome: None,
        });
        stage.ended_s = Some(at_s);
        stage.outcome = words;
        self.workshop.store.put_stage(self.live.id(), stage).await?;
        let end = |run: &mut evenpair_api::Run| {
            run.progress.done += 1;
            run.progress.doing.clear();
            run.stages.clear();
        };
        self.live.change(end, None).await
    }

    /// Tells the end; where even that cannot be written, it stays in memory.
    async fn close(&self, verdict: Verdict, reason: Option<String>) {
        let state = state_of(verdict);
        let reason = if state == RunState::Stopped { Some(self.live.stopped_by()) } else { reason };
        close(self.live, state, reason, self.workshop.clock.now()).await;
    }
}

/// The state that a run has in the API after this verdict.
pub(crate) fn state_of(verdict: Verdict) -> RunState {
    match verdict {
        Verdict::Broken => RunState::Broken,
        Verdict::Failed => RunState::Failed,
        Verdict::Passed => RunState::Passed,
        Verdict::Stopped => RunState::Stopped,
    }
}

/// Gives a run its last state.
pub(crate) async fn close(live: &LiveRun, state: RunState, reason: Option<String>, now: jiff::Timestamp) {
    tracing::info!(run = %live.id(), ?state, reason, "a run ended");
    let event = EventKind::StateChanged { state, reason: reason.clone() };
    let end = |run: &mut evenpair_api::Run| {
        run.state = state;
        run.reason = reason;
        run.ended_at = Some(now);
        run.progress.doing.clear();
    };
    if let Err(error) = live.change(end, Some(event)).await {
        tracing::error!(run = %live.id(), %error, "the end of a run could not be written");
    }
}
