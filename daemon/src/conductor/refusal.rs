//! Why the conductor does not do what it was asked, each with what to try.

use evenpair_api::MistakeReport;
use uuid::Uuid;

use crate::store::StoreError;

/// Why a request was not taken. Nothing has been changed by it.
#[derive(Debug, thiserror::Error)]
pub(crate) enum Refusal {
    /// The request contradicts the bench or itself.
    #[error("{what}; {help}")]
    BadRequest { what: String, help: String },
    /// The pair was never deskewed.
    #[error("the pair `{pair}` has no correction yet; deskew it first (POST /api/v1/pairs/{pair}/deskew)")]
    NoCorrection { pair: String },
    /// The sequence's text has mistakes.
    #[error("the sequence has {} mistake(s) and nothing was started; the first, at line {}: {}",
        mistakes.len(), mistakes.first().map_or(0, |m| m.line), mistakes.first().map_or("", |m| m.what.as_str()))]
    SequenceMistakes { mistakes: Vec<MistakeReport> },
    /// The daemon is going down.
    #[error("the daemon is shutting down and starts nothing; ask again once it is back")]
    ShuttingDown,
    /// The store did not read or write.
    #[error(transparent)]
    Store(#[from] StoreError),
    /// The run has no such capture.
    #[error("the run {run} has no capture {number}; GET /api/v1/runs/{run}/captures lists those it has")]
    UnknownCapture { run: Uuid, number: u32 },
    /// The bench has no such pair.
    #[error("the bench has no pair `{pair}`; it has: {}", known.join(", "))]
    UnknownPair { pair: String, known: Vec<String> },
    /// The store has no such run.
    #[error("there is no run `{id}`; GET /api/v1/runs lists those there are")]
    UnknownRun { id: String },
    /// The sequence folder has no such file.
    #[error("there is no sequence `{name}`; there are: {}", known.join(", "))]
    UnknownSequence { name: String, known: Vec<String> },
    /// The safe state is not known to have worked.
    #[error(
        "the bench is unsettled: {why}; look at the bench, mend it, then bring it to rest (`evenpair settle`, POST /api/v1/bench/settle)"
    )]
    Unsettled { why: String },
}
