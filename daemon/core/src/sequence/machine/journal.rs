//! The journal of a run and the state that it folds to.

use serde::{Deserialize, Serialize};

/// Which step.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Place {
    /// The step of this number in the `always` part, from 0.
    Always(usize),
    /// The stage of this number, from 0.
    Stage(usize),
}

/// What came of a step.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum Outcome {
    /// It could not be completed.
    Broken {
        /// Why, in words.
        reason: String,
    },
    /// It was abandoned, because the run is being left.
    Cut,
    /// It was completed.
    Done {
        /// What is worth telling, such as the reply of a query.
        #[serde(default, skip_serializing_if = "Option::is_none")]
        text: Option<String>,
    },
    /// It was completed and a limit was exceeded.
    LimitExceeded {
        /// What was found and what was allowed.
        text: String,
    },
}

/// How a run ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Verdict {
    /// It could not be completed.
    Broken,
    /// A limit was exceeded.
    Failed,
    /// Every limit was kept.
    Passed,
    /// A person ended it.
    Stopped,
}

/// One entry of the journal.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Entry {
    /// Seconds since the run began.
    pub at_s: f64,
    /// What happened.
    pub what: What,
}

/// What an entry records.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum What {
    /// The run began.
    Begun,
    /// The run ended.
    Closed {
        /// As what.
        verdict: Verdict,
        /// Why, unless it passed.
        reason: Option<String>,
    },
    /// A step ended.
    Ended {
        /// Which.
        place: Place,
        /// What came of it.
        outcome: Outcome,
        /// Whether no further stage is begun because of it.
        leaves: bool,
        /// When the next step may begin, in seconds since the run began.
        until_s: f64,
    },
    /// The run cannot be completed for a reason outside its steps.
    Interrupted {
        /// Why, in words.
        reason: String,
    },
    /// The safe state was applied, or could not be.
    Settled {
        /// What went wrong, in words.
        trouble: Option<String>,
    },
    /// The safe state is about to be applied.
    Settling,
    /// A step is about to begin.
    Started {
        /// Which.
        place: Place,
        /// For a plain wait, when it ends, in seconds since the run began.
        until_s: Option<f64>,
    },
    /// A person asked to stop.
    StopAsked,
}

/// What a run is doing.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Phase {
    /// No step is being done; the next may begin at this time.
    Between {
        /// Seconds since the run began.
        until_s: f64,
    },
    /// All is done but the last entry.
    Closing,
    /// A step is being done.
    Doing {
        /// Which.
        place: Place,
        /// For a plain wait, when it ends.
        until_s: Option<f64>,
    },
    /// Nothing more will happen.
    Ended,
    /// The safe state is being applied.
    Settling,
    /// It has not begun.
    Waiting,
}

/// Where a run stands: the fold of its journal.
#[derive(Debug, Clone, PartialEq)]
pub struct State {
    /// What it is doing.
    pub phase: Phase,
    /// The time of the last entry, in seconds since the run began.
    pub at_s: f64,
    /// How many stages have ended.
    pub stages_ended: usize,
    /// How many steps of the `always` part have ended.
    pub always_ended: usize,
    /// Whether no further stage is begun.
    pub leaving: bool,
    /// Whether a person asked to stop.
    pub stopped: bool,
    /// How many steps exceeded a limit.
    pub failures: usize,
    /// What the first of them found.
    pub first_failure: Option<String>,
    /// Why the run could not be completed; empty if it could.
    pub broken: Vec<String>,
}

impl Default for State {
    fn default() -> Self {
        Self {
            phase: Phase::Waiting,
            at_s: 0.0,
            stages_ended: 0,
            always_ended: 0,
            leaving: false,
            stopped: false,
            failures: 0,
            first_failure: None,
            broken: Vec::new(),
        }
    }
}

impl State {
    /// Takes one entry; the only way in which a state changes.
    pub fn apply(&mut self, entry: &Entry) {
        self.at_s = entry.at_s;
        match &entry.what {
            What::Begun => self.phase = Phase::Between { until_s: entry.at_s },
            What::Closed { .. } => self.phase = Phase::Ended,
            What::Ended { place, outcome, leaves, until_s } => self.ended_step(*place, outcome, *leaves, *until_s),
            What::Interrupted { reason } => {
                self.broken.push(reason.clone());
                self.leaving = true;
                // Where nothing had begun there is nothing to bring to rest.
                if self.phase == Phase::Waiting {
                    self.phase = Phase::Closing;
                }
            }
            What::Settled { trouble } => {
                if let Some(trouble) = trouble {
                    self.broken.push(format!("the safe state could not be applied: {trouble}"));
                }
                self.phase = Phase::Closing;
            }
            What::Settling => self.phase = Phase::Settling,
            What::Started { place, until_s } => self.phase = Phase::Doing { place: *place, until_s: *until_s },
            What::StopAsked => {
                self.stopped = true;
                self.leaving = true;
                if self.phase == Phase::Waiting {
                    self.phase = Phase::Closing;
                }
            }
        }
    }

    /// Whether nothing more will happen.
    #[must_use]
    pub fn ended(&self) -> bool {
        self.phase == Phase::Ended
    }

    /// How the run ended, or would end now, and why. What could not be completed outranks what a person stopped, and
    /// that outranks a limit.
    #[must_use]
    pub fn verdict(&self) -> (Verdict, Option<String>) {
        if !self.broken.is_empty() {
            return (Verdict::Broken, Some(self.broken.join("; ")));
        }
        if self.stopped {
            return (Verdict::Stopped, Some("a person stopped it".to_owned()));
        }
        match (&self.first_failure, self.failures) {
            (None, _) => (Verdict::Passed, None),
            (Some(text), 0 | 1) => (Verdict::Failed, Some(text.clone())),
            (Some(text), more) => (Verdict::Failed, Some(format!("{text}; {} more steps exceeded a limit", more - 1))),
        }
    }

    /// The step that comes next in a sequence of so many, if one does.
    pub(super) fn next(&self, stages: usize, always: usize) -> Option<Place> {
        if !self.leaving && self.stages_ended < stages && self.always_ended == 0 {
            Some(Place::Stage(self.stages_ended))
        } else {
            (self.always_ended < always).then_some(Place::Always(self.always_ended))
        }
    }

    /// Whether a wish to stop still changes anything.
    pub(super) fn may_stop(&self) -> bool {
        let stages = match self.phase {
            Phase::Waiting => true,
            Phase::Between { .. } => self.always_ended == 0,
            Phase::Doing { place, .. } => matches!(place, Place::Stage(_)),
            Phase::Closing | Phase::Ended | Phase::Settling => false,
        };
        stages && !self.leaving
    }

    fn ended_step(&mut self, place: Place, outcome: &Outcome, leaves: bool, until_s: f64) {
        match outcome {
            Outcome::Broken { reason } => self.broken.push(reason.clone()),
            Outcome::LimitExceeded { text } => {
                self.failures += 1;
                self.first_failure.get_or_insert_with(|| text.clone());
            }
            Outcome::Cut | Outcome::Done { .. } => {}
        }
        match place {
            Place::Always(i) => self.always_ended = i + 1,
            Place::Stage(i) => {
                self.stages_ended = i + 1;
                self.leaving |= leaves;
            }
        }
        self.phase = Phase::Between { until_s };
    }
}
