//! A run that has not ended: its public face, changed in one place, each change durable before it is told.

use std::sync::{Mutex, PoisonError};

use evenpair_api::{Event, EventKind, Run, RunState};
use jiff::Timestamp;
use tokio::sync::watch;
use tokio_util::sync::CancellationToken;
use uuid::Uuid;

use crate::store::{Store, StoreError};

/// A run that is waiting or running.
pub(crate) struct LiveRun {
    id: Uuid,
    face: Mutex<Run>,
    /// The generation that the store holds; grows after the event is durable.
    told: watch::Sender<u64>,
    /// Cancelled when a person stops the run or the daemon shuts down.
    pub(crate) stop: CancellationToken,
    /// Who asked for the stop, in words.
    stopped_by: Mutex<Option<String>>,
    store: Store,
}

impl LiveRun {
    /// Puts a new run into the store.
    pub(crate) async fn create(run: Run, source_text: &str, store: Store) -> Result<Self, StoreError> {
        store.create_run(&run, source_text).await?;
        let live = Self::again(run, store);
        live.change(|_| {}, Some(EventKind::StateChanged { state: RunState::Waiting, reason: None })).await?;
        Ok(live)
    }

    /// A run that the store has already, from an earlier life of the daemon.
    pub(crate) fn again(run: Run, store: Store) -> Self {
        Self {
            id: run.id,
            told: watch::Sender::new(run.generation),
            face: Mutex::new(Run { stages: Vec::new(), ..run }),
            stop: CancellationToken::new(),
            stopped_by: Mutex::default(),
            store,
        }
    }

    /// The run's identity.
    pub(crate) fn id(&self) -> Uuid {
        self.id
    }

    /// The run as it is now.
    pub(crate) fn run(&self) -> Run {
        self.face.lock().unwrap_or_else(PoisonError::into_inner).clone()
    }

    /// Grows with each durable event.
    pub(crate) fn generations(&self) -> watch::Receiver<u64> {
        self.told.subscribe()
    }

    /// Asks the run to stop; the first reason given stays.
    pub(crate) fn ask_to_stop(&self, by: &str) {
        self.stopped_by.lock().unwrap_or_else(PoisonError::into_inner).get_or_insert_with(|| by.to_owned());
        self.stop.cancel();
    }

    /// Who asked for the stop.
    pub(crate) fn stopped_by(&self) -> String {
        let by = self.stopped_by.lock().unwrap_or_else(PoisonError::into_inner);
        by.clone().unwrap_or_else(|| "stopped".to_owned())
    }

    /// Changes the run and tells it. With no event given, the run's progress is told.
    pub(crate) async fn change(
        &self,
        change: impl FnOnce(&mut Run),
        event: Option<EventKind>,
    ) -> Result<(), StoreError> {
        let (run, event) = {
            let mut face = self.face.lock().unwrap_or_else(PoisonError::into_inner);
            change(&mut face);
            face.generation += 1;
            let kind = event.unwrap_or_else(|| EventKind::Progressed { progress: face.progress.clone() });
            let at_s = seconds_between(face.created_at, Timestamp::now());
            (face.clone(), Event { generation: face.generation, at_s, kind })
        };
        self.store.publish(&run, &event).await?;
        self.told.send_replace(event.generation);
        Ok(())
    }
}

/// Seconds from `from` to `to`.
pub(crate) fn seconds_between(from: Timestamp, to: Timestamp) -> f64 {
    to.duration_since(from).as_secs_f64()
}
