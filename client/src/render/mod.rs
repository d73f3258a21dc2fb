//! The API's answers as text that fits 80 columns.

mod analysis;
mod bench;
mod captures;
mod correction;
mod quantity;
mod run;
mod table;

pub(crate) use analysis::analysis;
pub(crate) use bench::bench;
pub(crate) use captures::{capture_summary, captures, figures};
pub(crate) use correction::{correction, rejection};
pub(crate) use quantity::with_uncertainty;
pub(crate) use run::{run, runs};

/// The widest line that is printed.
#[cfg(test)]
pub(crate) const WIDTH: usize = 80;
