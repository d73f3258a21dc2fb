//! What a checked sequence is made of.

use super::machine::{Plan, StepPlan};
use super::transfer::TransferPlan;
use crate::analysis::figures::Asked;
use crate::bench::{Acquisition, Bench, PairSpec, ReferenceSpec, Role};
use crate::units::Unit;

/// A checked sequence, its sweeps unrolled.
#[derive(Debug, Clone, PartialEq)]
pub struct Sequence {
    /// Its title.
    pub title: String,
    /// The stages, in the order in which they are carried out.
    pub steps: Vec<Step>,
    /// What is carried out afterwards, whatever happened.
    pub always: Vec<Step>,
}

impl Sequence {
    /// How many captures it makes.
    #[must_use]
    pub fn captures(&self) -> usize {
        self.steps.iter().filter(|step| matches!(step.action, Action::Capture(_))).count()
    }

    /// What the machine needs to know of it.
    #[must_use]
    pub fn plan(&self) -> Plan {
        let plans = |steps: &[Step]| steps.iter().map(Step::plan).collect();
        Plan { steps: plans(&self.steps), always: plans(&self.always) }
    }
}

/// One thing to do.
#[derive(Debug, Clone, PartialEq)]
pub struct Step {
    /// What is done.
    pub action: Action,
    /// What the sequence has set before it, in the order in which it was first set: a setting's name and its value.
    pub conditions: Vec<(String, f64)>,
    /// What it does, in words: `set bus_voltage to 48 V`.
    pub text: String,
    /// How long to wait once it is done, in seconds; the whole of a [`Action::Wait`].
    pub rest_s: f64,
}

impl Step {
    fn plan(&self) -> StepPlan {
        StepPlan {
            perform: !matches!(self.action, Action::Wait),
            rest_s: self.rest_s,
            limit_ends: matches!(&self.action, Action::Capture(plan) if plan.on_limit == OnLimit::End),
        }
    }
}

/// What a step does.
#[derive(Debug, Clone, PartialEq)]
pub enum Action {
    /// Sends a query that the dialect does not know, and keeps the reply.
    Ask {
        /// The instrument.
        instrument: String,
        /// The query: one line of printable ASCII.
        command: String,
    },
    /// Acquires a pair, corrects it and computes its figures.
    Capture(CapturePlan),
    /// Makes a correction.
    Deskew(DeskewPlan),
    /// Sends the bench's `prepare` calls.
    Prepare,
    /// Closes a route.
    Route {
        /// The route.
        route: String,
    },
    /// Sends a command that the dialect does not know.
    Send {
        /// The instrument.
        instrument: String,
        /// The command: one line of printable ASCII.
        command: String,
    },
    /// Sets a setting.
    Set {
        /// The setting.
        setting: String,
        /// The value in the setting's unit.
        value: f64,
    },
    /// Transfers a correction to another vertical range.
    Transfer(TransferPlan),
    /// Shows the rejection that a correction reaches.
    Verify(VerifyPlan),
    /// Waits for [`Step::rest_s`].
    Wait,
}

/// How a pair is captured.
#[derive(Debug, Clone, PartialEq)]
pub struct CapturePlan {
    /// The pair.
    pub pair: String,
    /// How both legs are acquired.
    pub acquisition: Acquisition,
    /// What is asked of its figures: thresholds, the band of settling.
    pub asked: Asked,
    /// What to do where the pair's correction does not hold.
    pub on_void: OnVoid,
    /// What the figures must keep to.
    pub limits: Vec<Limit>,
    /// What to do where one does not.
    pub on_limit: OnLimit,
}

/// What to do where a correction does not hold.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum OnVoid {
    /// Capture all the same, and mark it.
    Mark,
    /// Refuse: the run is broken.
    Refuse,
}

/// What to do where a limit is exceeded.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum OnLimit {
    /// Measure the rest; the run is failed in the end.
    Continue,
    /// End the run.
    End,
}

/// A limit on a figure.
#[derive(Debug, Clone, PartialEq)]
pub struct Limit {
    /// The figure's name.
    pub figure: String,
    /// The figure's unit.
    pub unit: Unit,
    /// The lowest value that is kept.
    pub min: Option<f64>,
    /// The highest value that is kept.
    pub max: Option<f64>,
}

impl Limit {
    /// Whether `value` is kept. A value that is no number is not.
    #[must_use]
    pub fn holds(&self, value: f64) -> bool {
        !value.is_nan() && self.min.is_none_or(|min| value >= min) && self.max.is_none_or(|max| value <= max)
    }
}

/// How a correction is made.
#[derive(Debug, Clone, PartialEq)]
pub struct DeskewPlan {
    /// The pair.
    pub pair: String,
    /// The reference that skew is taken from.
    pub skew_reference: String,
    /// The reference that gain and offset are taken from.
    pub gain_reference: String,
    /// The standard uncertainty of skew to reach, in seconds.
    pub target_u_skew_s: f64,
    /// The most acquisitions to spend on each reference.
    pub most_acquisitions: u32,
    /// Whether to write the rounded skew into the scope's own skew setting.
    pub use_scope_skew: bool,
    /// Whether to fit the response that is left between the legs.
    pub response: bool,
}

/// How the rejection is shown.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct VerifyPlan {
    /// The pair.
    pub pair: String,
    /// The reference to show it on.
    pub reference: String,
}

/// Why a deskew or a verification cannot be planned on this bench.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum PlanError {
    /// The bench has no such pair.
    #[error("the bench has no pair `{name}`; known: {known}")]
    UnknownPair {
        /// The name.
        name: String,
        /// The pairs that there are.
        known: String,
    },
    /// The bench has no such reference.
    #[error("the bench has no reference `{name}`; known: {known}")]
    UnknownReference {
        /// The name.
        name: String,
        /// The references that there are.
        known: String,
    },
    /// The reference does not suit the pair.
    #[error("{}", why.join("; "))]
    Misfit {
        /// Each reason in words.
        why: Vec<String>,
    },
}

impl DeskewPlan {
    /// The deskew of `pair` as the bench has it, with other references where they are given.
    ///
    /// # Errors
    /// When a name is unknown or a reference does not suit the pair.
    pub fn of(
        bench: &Bench,
        pair: &str,
        skew_reference: Option<&str>,
        gain_reference: Option<&str>,
    ) -> Result<Self, PlanError> {
        let spec = known_pair(bench, pair)?;
        let skew_reference = skew_reference.unwrap_or(&spec.skew_reference);
        let gain_reference = gain_reference.unwrap_or(&spec.gain_reference);
        suits(bench, pair, skew_reference, Role::Skew)?;
        suits(bench, pair, gain_reference, Role::Gain)?;
        Ok(Self {
            pair: pair.to_owned(),
            skew_reference: skew_reference.to_owned(),
            gain_reference: gain_reference.to_owned(),
            target_u_skew_s: spec.target_u_skew_s,
            most_acquisitions: spec.most_acquisitions,
            use_scope_skew: spec.use_scope_skew,
            response: spec.response,
        })
    }
}

impl VerifyPlan {
    /// The verification of `pair` on `reference`, or on the one that its gain is taken from.
    ///
    /// # Errors
    /// When a name is unknown or the reference does not suit the pair.
    pub fn of(bench: &Bench, pair: &str, reference: Option<&str>) -> Result<Self, PlanError> {
        let spec = known_pair(bench, pair)?;
        let reference = reference.unwrap_or(&spec.gain_reference);
        suits(bench, pair, reference, Role::Verify)?;
        Ok(Self { pair: pair.to_owned(), reference: reference.to_owned() })
    }
}

/// The sequence of a deskew asked for by itself.
#[must_use]
pub fn deskew_alone(bench: &Bench, plan: DeskewPlan) -> Sequence {
    let text = format!("deskew {}", plan.pair);
    alone(bench, text, Action::Deskew(plan))
}

/// The sequence of a verification asked for by itself.
#[must_use]
pub fn verify_alone(bench: &Bench, plan: VerifyPlan) -> Sequence {
    let text = format!("verify {} on {}", plan.pair, plan.reference);
    alone(bench, text, Action::Verify(plan))
}

/// A sequence of one step, after the bench is prepared.
pub(super) fn alone(bench: &Bench, text: String, action: Action) -> Sequence {
    let mut steps: Vec<Step> = prepare(bench).into_iter().collect();
    steps.push(Step { action, conditions: Vec::new(), text: text.clone(), rest_s: 0.0 });
    Sequence { title: text, steps, always: Vec::new() }
}

/// The step that every run on this bench begins with, if it has one.
pub(super) fn prepare(bench: &Bench) -> Option<Step> {
    (!bench.prepare.is_empty()).then(|| Step {
        action: Action::Prepare,
        conditions: Vec::new(),
        text: "prepare the bench".to_owned(),
        rest_s: 0.0,
    })
}

pub(super) fn known_pair<'b>(bench: &'b Bench, name: &str) -> Result<&'b PairSpec, PlanError> {
    bench.pair(name).ok_or_else(|| PlanError::UnknownPair {
        name: name.to_owned(),
        known: bench.pairs.iter().map(|pair| pair.name.as_str()).collect::<Vec<_>>().join(", "),
    })
}

pub(super) fn known_reference<'b>(bench: &'b Bench, name: &str) -> Result<&'b ReferenceSpec, PlanError> {
    bench.reference(name).ok_or_else(|| PlanError::UnknownReference {
        name: name.to_owned(),
        known: bench.references.iter().map(|spec| spec.name.as_str()).collect::<Vec<_>>().join(", "),
    })
}

fn suits(bench: &Bench, pair: &str, reference: &str, role: Role) -> Result<(), PlanError> {
    let pair = known_pair(bench, pair)?;
    let spec = known_reference(bench, reference)?;
    let why = bench.misfits(pair, spec, role);
    if why.is_empty() { Ok(()) } else { Err(PlanError::Misfit { why }) }
}
