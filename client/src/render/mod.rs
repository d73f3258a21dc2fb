//! The API's answers as text that fits 80 columns.

mod analysis;
mod bench;
mod budget;
mod captures;
mod correction;
mod quantity;
mod run;
mod table;
mod wrap;

pub(crate) use analysis::analysis;
pub(crate) use bench::bench;
pub(crate) use budget::budget;
pub(crate) use captures::{capture_summary, captures, figures};
pub(crate) use correction::{correction, rejection};
pub(crate) use quantity::with_uncertainty;
pub(crate) use run::{run, runs};
pub(crate) use wrap::wrap;

/// The widest line that is printed.
pub(crate) const WIDTH: usize = 80;
