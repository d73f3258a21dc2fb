//! What the whole-program tests share: starting the real binaries and talking to them as a user would.
//!
//! Nothing here knows the inside of a program. A [`Lab`] is a simulated bench and a daemon, each a process of its own on
//! free loopback ports, with a data folder that goes when the test ends.

mod api;
mod control;
mod fake;
mod lab;
mod numbers;
mod process;
mod rewrite;
mod truth;
mod wire;

pub use api::{Answer, Api};
pub use control::{Control, Strike};
pub use fake::Fake;
pub use lab::{Lab, LabPlan};
pub use numbers::{Estimate, figure, quantity};
pub use process::{Program, binary, processes_naming, run_to_end};
pub use rewrite::{set_in_nth, set_in_table, set_resource};
pub use truth::Truth;
pub use wire::ask;

/// The folder of the project, where `configs` lies.
#[must_use]
pub fn project() -> std::path::PathBuf {
    std::path::Path::new(env!("CARGO_MANIFEST_DIR"))
        .parent()
        .map_or_else(Default::default, std::path::Path::to_path_buf)
}
