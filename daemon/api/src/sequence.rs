//! Sequences that the daemon knows, and the check of one.

use serde::{Deserialize, Serialize};
use utoipa::ToSchema;

/// The sequences in the bench's sequence folder.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize, ToSchema)]
pub struct Sequences {
    /// By name.
    pub items: Vec<SequenceInfo>,
}

/// A sequence and whether it may run on this bench.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize, ToSchema)]
pub struct SequenceInfo {
    /// The name to start it by: its file's, without the ending.
    pub name: String,
    /// Its title.
    pub title: String,
    /// What the check found.
    pub check: CheckReport,
}

/// What the check of a sequence against the bench found.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize, ToSchema)]
pub struct CheckReport {
    /// Steps with the sweeps unrolled; 0 when it has mistakes.
    pub steps: u64,
    /// Captures that it will make.
    pub captures: u64,
    /// Every mistake.
    pub mistakes: Vec<MistakeReport>,
}

/// A mistake in a TOML text.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize, ToSchema)]
pub struct MistakeReport {
    /// Line, from 1.
    pub line: u32,
    /// Column, from 1.
    pub column: u32,
    /// What is wrong.
    pub what: String,
    /// What to try.
    pub help: String,
}
