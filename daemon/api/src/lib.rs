//! The data types of the API under `/api/v1`: one vocabulary for the daemon that answers and the client that asks.
//!
//! Only data, serde and the way from the mathematics' results to documents ([`convert`]) live here. Every physical quantity is a [`Quantity`], `{"value": …, "u": …, "unit": "…"}`,
//! with `u` the *standard* uncertainty (JCGM 100, 2.3.1); people see the expanded one, `2 u`.
//! Sign conventions: with both tips on the node `s(t)`, `P(t) = s(t)` and `N(t) = g·s(t − τ) + o`, so a
//! positive skew τ says that the negative leg arrives late, the gain g is N relative to P, and the offset o is in
//! volts at the probe tips.

mod analysis;
mod bench;
mod budget;
mod capture;
pub mod convert;
mod correction;
mod event;
mod problem;
mod quantity;
mod response;
mod run;
mod sequence;
mod spectrum;
mod transfer;

pub use analysis::{Analysis, AnalysisRequest, Guess, Reading, ReferenceShape, SavedRecords, SavedText, VerifiedOn};
pub use bench::{Bench, Instrument, Leg, LinkState, Pair, Probe, Reference, Rest, Route, Setting};
pub use budget::{
    Budget, BudgetAgreement, BudgetDerating, BudgetDifferential, BudgetLoading, BudgetNeeded, BudgetProbe, BudgetRange,
    BudgetRejection, BudgetRequest, BudgetScope, BudgetSignal, BudgetSource, BudgetTerm, BudgetTip, BudgetTotals,
    BudgetVerdict, BudgetWhen,
};
pub use capture::{
    Capture, Captures, Condition, CorrelatedTerm, Coverage, CoverageBasis, Figure, Grade, LeakBound, LimitVerdict,
    UncertaintyTerm,
};
pub use correction::{
    Carried, Correction, CorrectionConditions, CorrectionFreedom, CorrectionState, DeskewRequest, LegConditions,
    RejectionPoint, VerifyRequest,
};
pub use event::{Event, EventKind};
pub use problem::{Problem, ProblemCode};
pub use quantity::Quantity;
pub use response::{Compensation, PoleZero, RejectionLimit, Response, ResponseBand};
pub use run::{LimitFailure, Run, RunKind, RunProgress, RunRequest, RunState, Runs, StageReport};
pub use sequence::{CheckReport, MistakeReport, SequenceInfo, Sequences};
pub use spectrum::{Spectrum, SpectrumLine};
pub use transfer::{Corrections, TransferChoice, TransferRequest, TransferWay, TransferredFrom};

/// Where every path of this API begins.
pub const PREFIX: &str = "/api/v1";

/// The address that the daemon listens on unless told otherwise; loopback only.
pub const DEFAULT_LISTEN: &str = "127.0.0.1:7488";
