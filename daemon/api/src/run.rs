//! Runs: one execution of a sequence, or a deskew or verification by itself.

use jiff::Timestamp;
use serde::{Deserialize, Serialize};
use utoipa::ToSchema;
use uuid::Uuid;

/// One execution.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct Run {
    /// Its identity; later runs sort later (UUID version 7).
    pub id: Uuid,
    /// What it executes.
    pub kind: RunKind,
    /// The sequence's title, or `deskew gate`.
    pub title: String,
    /// Where it stands.
    pub state: RunState,
    /// When it was accepted.
    #[schema(value_type = String, format = DateTime)]
    pub created_at: Timestamp,
    /// When its first stage began.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schema(value_type = Option<String>, format = DateTime)]
    pub started_at: Option<Timestamp>,
    /// When it ended.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schema(value_type = Option<String>, format = DateTime)]
    pub ended_at: Option<Timestamp>,
    /// How far it has come.
    pub progress: RunProgress,
    /// Why it is `failed`, `stopped` or `broken`, in words that say what was being done, to what, and what to try.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub reason: Option<String>,
    /// The limits that were exceeded.
    pub failures: Vec<LimitFailure>,
    /// The stages that were carried out, in order.
    pub stages: Vec<StageReport>,
    /// Grows by one at each change of this run; the events carry the same number.
    pub generation: u64,
}

/// What a run executes.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, ToSchema)]
#[serde(rename_all = "lowercase")]
pub enum RunKind {
    /// A deskew asked for by itself.
    Deskew,
    /// A sequence.
    Sequence,
    /// A transfer to another range asked for by itself.
    Transfer,
    /// A verification asked for by itself.
    Verify,
}

/// Where a run stands.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, ToSchema)]
#[serde(rename_all = "lowercase")]
pub enum RunState {
    /// Accepted; the bench is in use by another run.
    Waiting,
    /// Being carried out.
    Running,
    /// Ended; every limit was kept.
    Passed,
    /// Ended; a limit was exceeded.
    Failed,
    /// Ended by a person.
    Stopped,
    /// It could not be completed.
    Broken,
}

impl RunState {
    /// Whether nothing more will happen to the run.
    #[must_use]
    pub fn ended(self) -> bool {
        !matches!(self, Self::Waiting | Self::Running)
    }
}

/// How far a run has come.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize, ToSchema)]
pub struct RunProgress {
    /// Steps ended.
    pub done: u64,
    /// Steps in all: the sequence with its sweeps unrolled.
    pub total: u64,
    /// What is being done now, in words; empty once ended.
    pub doing: String,
    /// Captures stored.
    pub captures: u32,
}

/// A limit that a capture exceeded.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct LimitFailure {
    /// The capture's number.
    pub capture: u32,
    /// The figure's name.
    pub figure: String,
    /// What was found and what was allowed, in words.
    pub text: String,
}

/// A stage that was carried out.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct StageReport {
    /// Its place in the unrolled sequence, from 0.
    pub step: u64,
    /// What it did, in words: `set bus_voltage to 48 V`.
    pub text: String,
    /// Seconds from the run's start to the stage's.
    pub started_s: f64,
    /// Seconds from the run's start to the stage's end; absent while it runs.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub ended_s: Option<f64>,
    /// What came of it, in words; the reply of an `ask`, say.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub outcome: Option<String>,
}

/// Body of `POST /runs`: exactly one of the two.
#[derive(Debug, Clone, Default, PartialEq, Eq, Serialize, Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub struct RunRequest {
    /// The name of a sequence that `GET /sequences` lists.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub sequence: Option<String>,
    /// A sequence as TOML text.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub text: Option<String>,
}

/// All runs, the latest first.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, ToSchema)]
pub struct Runs {
    /// The runs, without their stages.
    pub items: Vec<Run>,
}
