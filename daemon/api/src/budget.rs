//! The error budget of a measurement not yet made: `POST /budget` takes a plan and answers with the predicted errors and
//! a verdict.
//!
//! Plan and budget are the core's own documents ([`evenpair_core::planning`]), known here by names that say what they
//! belong to. Numbers carry their unit in their name: these are plans and predictions, not measured quantities with an
//! uncertainty. Errors in volts are expanded uncertainties, k = 2, at the probes' tips. What may be left out is absent
//! or `null` alike.

pub use evenpair_core::planning::{
    Agreement as BudgetAgreement, Budget, Derating as BudgetDerating, Differential as BudgetDifferential,
    Loading as BudgetLoading, Needed as BudgetNeeded, Plan as BudgetRequest, Probe as BudgetProbe,
    RangeChoice as BudgetRange, Rejection as BudgetRejection, Scope as BudgetScope, Signal as BudgetSignal,
    Source as BudgetSource, Term as BudgetTerm, TipVoltage as BudgetTip, Totals as BudgetTotals,
    Verdict as BudgetVerdict, When as BudgetWhen,
};
