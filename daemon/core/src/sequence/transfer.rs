//! What a transfer to another vertical range is made of, and whether the bench allows it.

use super::step::{Action, PlanError, Sequence, alone, known_pair, known_reference};
use crate::analysis::transfer::Choice;
use crate::bench::{Acquisition, Bench, PairSpec, ReferenceSpec};

/// How a correction is transferred to another range.
#[derive(Debug, Clone, PartialEq)]
pub struct TransferPlan {
    /// The pair.
    pub pair: String,
    /// The signal that both ranges can show.
    pub reference: String,
    /// Full vertical span of the new range at the tip, in volts.
    pub span_v: f64,
    /// Voltage at the tip in the middle of the new span, in volts.
    pub offset_v: f64,
    /// Which ways may be taken.
    pub choice: Choice,
    /// The standard uncertainty of skew at which the transfer is content, in seconds.
    pub target_u_skew_s: f64,
    /// The most acquisitions to spend on each range.
    pub most_acquisitions: u32,
}

impl TransferPlan {
    /// The transfer of `pair`'s correction from the range that it measures on to the range of `span_v` around
    /// `offset_v`, or around where `reference` itself is acquired.
    ///
    /// # Errors
    /// When a name is unknown or the reference does not suit both ranges.
    pub fn of(
        bench: &Bench,
        pair: &str,
        reference: &str,
        span_v: f64,
        offset_v: Option<f64>,
    ) -> Result<Self, PlanError> {
        let spec = known_pair(bench, pair)?;
        let found = known_reference(bench, reference)?;
        let offset_v = offset_v.unwrap_or_else(|| bench.reference_acquisition(spec, found).offset_v);
        let plan = Self {
            pair: pair.to_owned(),
            reference: reference.to_owned(),
            span_v,
            offset_v,
            choice: Choice::default(),
            target_u_skew_s: spec.target_u_skew_s,
            most_acquisitions: spec.most_acquisitions,
        };
        let why = bench.misfits_between(spec, found, &plan.new_range(spec.acquisition));
        if why.is_empty() { Ok(plan) } else { Err(PlanError::Misfit { why }) }
    }

    /// How `reference` is acquired on the old range of `pair` and on the new one.
    #[must_use]
    pub fn acquisitions(&self, pair: &PairSpec, reference: &ReferenceSpec) -> [Acquisition; 2] {
        let both = pair.acquisition.with(&reference.overrides);
        let old = Acquisition { span_v: pair.acquisition.span_v, offset_v: pair.acquisition.offset_v, ..both };
        [old, self.new_range(both)]
    }

    /// Whether `acquisition` is on the new range.
    #[must_use]
    pub fn leads_to(&self, acquisition: &Acquisition) -> bool {
        acquisition.same_range(&self.new_range(*acquisition))
    }

    fn new_range(&self, acquisition: Acquisition) -> Acquisition {
        Acquisition { span_v: self.span_v, offset_v: self.offset_v, ..acquisition }
    }

    /// What it does, in words.
    #[must_use]
    pub fn in_words(&self) -> String {
        use crate::bench::field::plain;
        use crate::units::Unit;
        let (span, offset) = (plain(self.span_v, Unit::Volt), plain(self.offset_v, Unit::Volt));
        format!("transfer {} to a span of {span} around {offset} by {}", self.pair, self.reference)
    }
}

/// The sequence of a transfer asked for by itself.
#[must_use]
pub fn transfer_alone(bench: &Bench, plan: TransferPlan) -> Sequence {
    alone(bench, plan.in_words(), Action::Transfer(plan))
}
