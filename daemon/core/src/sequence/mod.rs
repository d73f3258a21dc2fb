//! Sequences: the script of an unattended run, checked whole against the bench before anything is sent.
//!
//! [`read()`] turns the text into a flat list of [`Step`]s with every sweep unrolled, or into every mistake at once.
//! [`machine`] then says what to do next, whatever happens; it knows steps only by their number.

pub mod machine;
mod read;
pub mod step;
pub mod transfer;

pub use read::read;
pub use step::{
    Action, CapturePlan, DeskewPlan, Limit, OnLimit, OnVoid, PlanError, Sequence, Step, VerifyPlan, deskew_alone,
    verify_alone,
};
pub use transfer::{TransferPlan, transfer_alone};

#[cfg(test)]
mod tests;
