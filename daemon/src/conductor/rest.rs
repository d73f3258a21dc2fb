//! Whether the bench is known to be at rest.

use evenpair_core::bench::Bench;
use tokio::sync::watch;

use super::instruments::Instruments;
use super::settle;

/// Whether the bench is known to be at rest.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) enum RestState {
    /// The safe state is being applied for the first time in this life of the daemon.
    Unknown,
    /// Every command of the safe state succeeded.
    Settled,
    /// A part of it did not: nothing starts until a person has looked.
    Unsettled(String),
}

/// Keeps the rest state and changes it by applying the safe state.
#[derive(Debug)]
pub(crate) struct RestKeeper(watch::Sender<RestState>);

impl RestKeeper {
    /// Nothing is known yet.
    pub(crate) fn new() -> Self {
        Self(watch::Sender::new(RestState::Unknown))
    }

    /// How it is now.
    pub(crate) fn now(&self) -> RestState {
        self.0.borrow().clone()
    }

    /// How it is once the safe state was applied at least once.
    pub(crate) async fn known(&self) -> RestState {
        let mut receiver = self.0.subscribe();
        match receiver.wait_for(|state| *state != RestState::Unknown).await {
            Ok(state) => state.clone(),
            // The sender lives as long as `self`.
            Err(_) => RestState::Unknown,
        }
    }

    /// Applies the safe state and keeps what came of it.
    ///
    /// # Errors
    /// What did not work, in words.
    pub(crate) async fn settle(&self, bench: &Bench, instruments: &Instruments) -> Result<(), String> {
        let outcome = settle::apply(bench, instruments).await;
        match &outcome {
            Ok(()) => self.0.send_replace(RestState::Settled),
            Err(why) => {
                tracing::error!(%why, "the bench is unsettled");
                self.0.send_replace(RestState::Unsettled(why.clone()))
            }
        };
        outcome
    }
}
