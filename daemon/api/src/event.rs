//! What `GET /runs/{id}/events` streams, one server-sent event each.

use serde::{Deserialize, Serialize};
use utoipa::ToSchema;

use crate::{Capture, Correction, RunProgress, RunState};

/// Something that happened to a run. The stream's event id is `generation`, so `Last-Event-ID` resumes after it.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct Event {
    /// The run's generation after it, from 1.
    pub generation: u64,
    /// Seconds since the run was accepted.
    pub at_s: f64,
    /// What happened.
    #[serde(flatten)]
    pub kind: EventKind,
}

/// What happened to a run.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
#[serde(tag = "kind", rename_all = "snake_case")]
pub enum EventKind {
    /// A capture was stored.
    Captured {
        /// The capture.
        capture: Box<Capture>,
    },
    /// A correction was made or verified.
    Corrected {
        /// The correction.
        correction: Box<Correction>,
    },
    /// A step began or ended, or a step's inner progress moved.
    Progressed {
        /// How far the run is.
        progress: RunProgress,
    },
    /// The run's state changed; after an ended state the stream closes.
    StateChanged {
        /// The new state.
        state: RunState,
        /// Why, in words.
        #[serde(default, skip_serializing_if = "Option::is_none")]
        reason: Option<String>,
    },
}
