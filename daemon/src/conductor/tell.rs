//! How a stage tells the run that it belongs to what it is doing and what it found.

use std::sync::Arc;

use evenpair_api::{Capture, Correction, EventKind};

use super::live::LiveRun;
use crate::store::StoreError;

/// The run's ear.
#[derive(Clone)]
pub(crate) struct Tell(Arc<LiveRun>);

impl Tell {
    /// Tells this run.
    pub(crate) fn new(run: Arc<LiveRun>) -> Self {
        Self(run)
    }

    /// What is being done now.
    pub(crate) async fn doing(&self, what: String) -> Result<(), StoreError> {
        self.0.change(|run| run.progress.doing = what, None).await
    }

    /// A correction that was made or verified; it is in the store already.
    pub(crate) async fn corrected(&self, correction: &Correction) -> Result<(), StoreError> {
        self.0.change(|_| {}, Some(EventKind::Corrected { correction: Box::new(correction.clone()) })).await
    }

    /// A capture; it is in the store already.
    pub(crate) async fn captured(&self, capture: &Capture) -> Result<(), StoreError> {
        let event = EventKind::Captured { capture: Box::new(capture.clone()) };
        self.0.change(|run| run.progress.captures = capture.number, Some(event)).await
    }
}
