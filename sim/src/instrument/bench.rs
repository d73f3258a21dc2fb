//! What the instruments of one bench share: the controls they write and the world that answers.

use std::sync::{Arc, Mutex, MutexGuard, PoisonError};

use tokio::sync::watch;

use crate::faults::{Faults, Ledger};
use crate::scenario::{FaultSpec, Scenario};
use crate::world::{Controls, World};

/// Locks a mutex. A holder that panicked leaves plain data behind, which is still usable.
pub(crate) fn lock<T>(mutex: &Mutex<T>) -> MutexGuard<'_, T> {
    mutex.lock().unwrap_or_else(PoisonError::into_inner)
}

/// The cables of the bench. Lock order where both are held: controls, then world.
pub(crate) struct Bench {
    /// What the generator, the supply and the switch have been told.
    pub(crate) controls: Mutex<Controls>,
    /// The analog world. An acquisition holds it for as long as it computes.
    pub(crate) world: Mutex<World>,
    /// What has gone wrong.
    pub(crate) ledger: Arc<Ledger>,
    seed: u64,
    faults: Vec<FaultSpec>,
    changes: watch::Sender<u64>,
}

impl Bench {
    /// A bench at rest.
    pub(crate) fn new(scenario: &Scenario) -> Self {
        Self {
            controls: Mutex::new(Controls::default()),
            world: Mutex::new(World::new(scenario)),
            ledger: Arc::default(),
            seed: scenario.seed,
            faults: scenario.faults.clone(),
            changes: watch::Sender::new(0),
        }
    }

    /// The faults of an instrument, those of the scenario armed.
    pub(crate) fn faults(&self, instrument: &str) -> Faults {
        let faults = Faults::new(instrument, self.seed, Arc::clone(&self.ledger));
        for spec in self.faults.iter().filter(|spec| spec.instrument == instrument) {
            faults.arm(spec.clone());
        }
        faults
    }

    /// Tells those who wait for a trigger that it may come now.
    pub(crate) fn touch(&self) {
        self.changes.send_modify(|count| *count = count.wrapping_add(1));
    }

    /// Notices every [`touch`](Self::touch) from now on.
    pub(crate) fn changes(&self) -> watch::Receiver<u64> {
        self.changes.subscribe()
    }
}
