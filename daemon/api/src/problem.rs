//! Errors as RFC 9457 problem documents.

use serde::{Deserialize, Serialize};
use utoipa::ToSchema;

use crate::MistakeReport;

/// A problem document (RFC 9457, media type `application/problem+json`).
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize, ToSchema)]
pub struct Problem {
    /// `urn:evenpair:problem:` and the code.
    #[serde(rename = "type")]
    pub kind: String,
    /// The kind of problem in a few words; the same for every occurrence.
    pub title: String,
    /// The HTTP status.
    pub status: u16,
    /// What was being done, to what, and what to try.
    pub detail: String,
    /// The code that programs branch on.
    pub code: ProblemCode,
    /// Mistakes in a sequence's text, where that is the problem.
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    pub mistakes: Vec<MistakeReport>,
}

/// The closed list of problems.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, Serialize, Deserialize, ToSchema)]
#[serde(rename_all = "kebab-case")]
pub enum ProblemCode {
    /// The bench is unsettled: nothing starts until a person has looked.
    BenchUnsettled,
    /// The body is larger than the daemon takes.
    BodyTooLarge,
    /// The request's body or query is not what the route takes.
    InvalidRequest,
    /// A fault of the daemon itself.
    Internal,
    /// The method is not one of the path's.
    MethodNotAllowed,
    /// The pair has no correction yet.
    NoCorrection,
    /// None of the offered media types is known for this resource.
    NotAcceptable,
    /// The sequence's text has mistakes.
    SequenceRefused,
    /// The daemon is shutting down.
    ShuttingDown,
    /// The store could not be read or written.
    StoreFailed,
    /// No such capture.
    UnknownCapture,
    /// No such pair.
    UnknownPair,
    /// No such path.
    UnknownPath,
    /// No such run.
    UnknownRun,
    /// No such sequence.
    UnknownSequence,
    /// The body's media type is not the one that the route takes.
    UnsupportedMediaType,
}
