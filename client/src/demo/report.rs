//! What the demo found, as one document.

use std::path::Path;

use evenpair_api::{Capture, Correction, Run};
use serde::Serialize;

/// What the demo found.
#[derive(Debug, Serialize)]
pub(super) struct Report {
    /// The pair's correction with its rejection before and after.
    pub(super) correction: Correction,
    /// The run of the sequence.
    pub(super) run: Run,
    /// Its captures with their figures.
    pub(super) captures: Vec<Capture>,
    /// Where the data lies; none when it was not kept.
    pub(super) data: Option<String>,
}

impl Report {
    pub(super) fn new(folder: &Path, kept: bool, correction: Correction, run: Run, captures: Vec<Capture>) -> Self {
        let data =
            kept.then(|| std::path::absolute(folder).unwrap_or_else(|_| folder.to_owned()).display().to_string());
        Self { correction, run, captures, data }
    }

    /// Where the data lies and how to open it.
    pub(super) fn where_the_data_lies(&self) -> String {
        let Some(folder) = &self.data else {
            return "The data was in a temporary folder and is gone;\n`evenpair demo --data DIR` keeps it.".to_owned();
        };
        let first = self.captures.first().map_or("waveforms", |capture| capture.file.as_str());
        format!(
            "The data lies in {folder}:\n  \
             bench.toml, sequences/   what was run, to begin your own from\n  \
             data/evenpair.sqlite     runs, captures, figures, corrections\n  \
             data/{first}\n  \
             Each capture's records (raw codes with their scale) and corrected difference\n  \
             are a Parquet file: any reader opens it, such as pyarrow\n  \
             (`pyarrow.parquet.read_table(FILE)`) or duckdb (`select * from 'FILE'`).\n  \
             To see it again:\n  \
             evenpaird --bench {folder}/bench.toml --data {folder}/data, then evenpair runs."
        )
    }
}
