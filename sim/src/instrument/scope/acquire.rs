//! Acquisitions as overlapped operations: started by `INITiate`, finished in the background, dropped by `ABORt`.

use std::sync::{Arc, Mutex};

use tokio::sync::watch;
use tokio::task::{JoinHandle, spawn_blocking};

use super::super::bench::{Bench, lock};
use super::super::core::Core;
use super::settings::Settings;
use crate::faults::Struck;
use crate::status::{Fault, operation};
use crate::world::{Acquisition, Controls, Disturbance, NoTrigger, ScopeSettings};

/// Condition while samples are taken.
const TAKING: u16 = operation::SWEEPING | operation::MEASURING;

/// A finished acquisition with the settings it was made with.
#[derive(Debug)]
pub(crate) struct Record {
    /// The samples.
    pub(crate) acquisition: Acquisition,
    /// The settings at its start.
    pub(crate) settings: ScopeSettings,
}

/// Takes acquisitions, one at a time. Lock order: `run`, then the core's status.
pub(crate) struct Acquirer {
    bench: Arc<Bench>,
    core: Arc<Core>,
    settings: Arc<Mutex<Settings>>,
    run: Mutex<Run>,
}

#[derive(Default)]
struct Run {
    /// Counts starts and aborts: background work that finds another number has been dropped.
    turn: u64,
    busy: bool,
    record: Option<Arc<Record>>,
    worker: Option<JoinHandle<()>>,
}

/// What an acquisition is made of, taken at one moment.
struct Snapshot {
    controls: Controls,
    settings: ScopeSettings,
}

impl Acquirer {
    /// An idle acquirer.
    pub(crate) fn new(bench: Arc<Bench>, core: Arc<Core>, settings: Arc<Mutex<Settings>>) -> Self {
        Self { bench, core, settings, run: Mutex::default() }
    }

    /// `INITiate`: forgets the last record and starts an acquisition with the settings of this moment. Must be called
    /// inside a runtime.
    ///
    /// # Errors
    /// -213 if one is under way.
    pub(crate) fn start(self: &Arc<Self>) -> Result<(), Fault> {
        let mut run = lock(&self.run);
        if run.busy {
            return Err(Fault::InitIgnored);
        }
        run.turn += 1;
        run.busy = true;
        run.record = None;
        self.core.begin(TAKING);
        let (disturbance, struck) = self.core.faults.acquisition();
        // Subscribed before the snapshot, so that no change can fall between the two.
        let changes = self.bench.changes();
        let work = Arc::clone(self).work(run.turn, self.snapshot(), (disturbance, struck), changes, run.worker.take());
        run.worker = Some(tokio::spawn(work));
        Ok(())
    }

    /// `ABORt`: drops the acquisition under way. Its operation counts as finished.
    pub(crate) fn abort(&self) {
        let mut run = lock(&self.run);
        if std::mem::take(&mut run.busy) {
            run.turn += 1;
            self.core.finish();
            self.bench.touch();
        }
    }

    /// Forgets the last record.
    pub(crate) fn forget(&self) {
        lock(&self.run).record = None;
    }

    /// The last record.
    ///
    /// # Errors
    /// -230 if there is none since the last `INITiate` or `*RST`.
    pub(crate) fn record(&self) -> Result<Arc<Record>, Fault> {
        lock(&self.run).record.clone().ok_or(Fault::Stale)
    }

    fn snapshot(&self) -> Snapshot {
        Snapshot { controls: lock(&self.bench.controls).clone(), settings: lock(&self.settings).for_world() }
    }

    /// Tries until a trigger comes or the turn is over. A dropped predecessor is waited for, so that the world sees
    /// acquisitions in the order they were started: the same commands give the same samples.
    async fn work(
        self: Arc<Self>,
        turn: u64,
        first: Snapshot,
        (disturbance, struck): (Disturbance, Vec<Struck>),
        mut changes: watch::Receiver<u64>,
        predecessor: Option<JoinHandle<()>>,
    ) {
        if let Some(predecessor) = predecessor {
            // Its failure, if any, was reported where it happened.
            let _ = predecessor.await;
        }
        let mut snapshot = first;
        let disturbance = Arc::new(disturbance);
        let mut struck = Some(struck);
        loop {
            let Snapshot { controls, settings } = snapshot;
            let (bench, disturbance) = (Arc::clone(&self.bench), Arc::clone(&disturbance));
            let task = spawn_blocking(move || {
                let outcome = lock(&bench.world).acquire_disturbed(&controls, &settings, &disturbance);
                outcome.map(|acquisition| Record { acquisition, settings })
            });
            let outcome = task.await;
            // Written down at the first try: without a trigger there may never be a number.
            if let (Ok(outcome), Some(struck)) = (&outcome, struck.take()) {
                self.core.faults.confirm(&struck, outcome.as_ref().map_or(0, |record| record.acquisition.number));
            }
            if !self.settle(turn, outcome) {
                return;
            }
            // Cannot fail while the bench lives.
            let _ = changes.changed().await;
            if !self.again(turn) {
                return;
            }
            snapshot = self.snapshot();
        }
    }

    /// Takes in what came of a try; true if it is to be tried again.
    fn settle(&self, turn: u64, outcome: Result<Result<Record, NoTrigger>, tokio::task::JoinError>) -> bool {
        let mut run = lock(&self.run);
        if run.turn != turn {
            return false;
        }
        match outcome {
            Ok(Ok(record)) => run.record = Some(Arc::new(record)),
            Ok(Err(NoTrigger)) => {
                self.core.begin(operation::WAITING_FOR_TRIGGER);
                return true;
            }
            Err(error) => {
                tracing::error!(%error, "the acquisition failed");
                self.core.report(Fault::System);
            }
        }
        run.busy = false;
        self.core.finish();
        false
    }

    fn again(&self, turn: u64) -> bool {
        let run = lock(&self.run);
        let current = run.turn == turn;
        if current {
            self.core.begin(TAKING);
        }
        current
    }
}
