//! The pure state machine of a run: events in, effects out, time as an argument.
//!
//! ```text
//! waiting ─Begin→ stages ─all done, or left early→ always ─all done→ settling ─SettleEnded→ ended
//!    └─StopAsked / Resumed→ ended
//! ```
//!
//! Stages are left early when one is broken, when a person stops the run, when the journal cannot be written, and when
//! a limit is exceeded at a stage that says so. The `always` steps and then the safe state follow whatever happened,
//! unless nothing had begun. A broken `always` step makes the run broken, and the rest of them is still carried out.
//!
//! **The order of calls.** The conductor calls [`Machine::handle`] with each event and carries out the effects in their
//! order. A [`Effect::Persist`] is durable before what follows is begun; when it fails, the rest of that list is
//! dropped and [`Event::PersistFailed`] handed in. There is at most one effect that is no `Persist` in a list, and it
//! is the last. Each [`Effect::Perform`] is answered by one [`Event::StepEnded`], also after [`Effect::Cancel`];
//! [`Effect::Settle`] by one [`Event::SettleEnded`]. At [`Machine::next_deadline`] it hands in [`Event::Tick`].
//! `now_s` is the time since the run began, so that it can be kept and a replay needs no clock.
//!
//! **The journal.** Every change of [`State`] is an [`Entry`], folded by [`State::apply`] both live and by
//! [`Machine::replay`]. A replayed run that had not ended is handed [`Event::Resumed`]: whatever the bench was doing is
//! unknown, so it goes through `always` and the safe state and ends broken.

mod journal;

pub use journal::{Entry, Outcome, Phase, Place, State, Verdict, What};

/// What the machine knows of a sequence.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Plan {
    /// The stages.
    pub steps: Vec<StepPlan>,
    /// What is carried out afterwards, whatever happened.
    pub always: Vec<StepPlan>,
}

/// What the machine knows of a step.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct StepPlan {
    /// Whether there is something to perform; a plain wait has nothing.
    pub perform: bool,
    /// How long to wait afterwards, in seconds.
    pub rest_s: f64,
    /// Whether an exceeded limit ends the run.
    pub limit_ends: bool,
}

/// What happened.
#[derive(Debug, Clone, PartialEq)]
pub enum Event {
    /// The bench is the run's; begin.
    Begin,
    /// A `Persist` could not be made durable; it and what followed it in the same list was not carried out.
    PersistFailed {
        /// Why, in words.
        reason: String,
    },
    /// The machine was replayed from its journal in a new life of the program.
    Resumed,
    /// The safe state was applied, or could not be.
    SettleEnded {
        /// What went wrong, in words.
        ok: Result<(), String>,
    },
    /// What was performed has ended, whatever came of it.
    StepEnded(Outcome),
    /// A person asked to stop. Asked again, or once the stages are over, it changes nothing.
    StopAsked,
    /// Time has passed.
    Tick,
}

/// What is to be done.
#[derive(Debug, Clone, PartialEq)]
pub enum Effect {
    /// Abandon what is being performed; its `StepEnded` is still awaited.
    Cancel,
    /// The run has ended; nothing follows.
    End {
        /// As what.
        state: Verdict,
        /// Why, unless it passed.
        reason: Option<String>,
    },
    /// Carry out this step.
    Perform(Place),
    /// Make this entry durable before going on.
    Persist(Entry),
    /// Apply the safe state.
    Settle,
}

/// The state machine of one run.
#[derive(Debug, Clone)]
pub struct Machine {
    plan: Plan,
    state: State,
    /// Whether a `StepEnded` is still to come; not in the journal, for no activity outlives the program.
    in_flight: bool,
    /// The last effect of the last list, which was not carried out if a `Persist` before it failed.
    last: Option<Effect>,
    /// Whether entries are still made durable; once one failed, what keeps the bench safe goes on without them.
    journal_works: bool,
    /// Whether the run is of an earlier life of the program and [`Event::Resumed`] is still to come.
    replayed: bool,
}

impl Machine {
    /// A run that has not begun.
    #[must_use]
    pub fn new(plan: Plan) -> Self {
        Self { plan, state: State::default(), in_flight: false, last: None, journal_works: true, replayed: false }
    }

    /// A run as its journal says, in a new life of the program; hand it [`Event::Resumed`] unless it has ended.
    #[must_use]
    pub fn replay(plan: Plan, entries: &[Entry]) -> Self {
        let mut machine = Self::new(plan);
        entries.iter().for_each(|entry| machine.state.apply(entry));
        // A run that had not begun may still begin.
        machine.replayed = machine.state.phase != Phase::Waiting;
        machine
    }

    /// Where the run stands.
    #[must_use]
    pub fn state(&self) -> &State {
        &self.state
    }

    /// When the next [`Event::Tick`] is due, in seconds since the run began; `None` while only other events matter.
    #[must_use]
    pub fn next_deadline(&self) -> Option<f64> {
        match self.state.phase {
            Phase::Doing { until_s, .. } => until_s,
            Phase::Between { until_s } => Some(until_s),
            _ => None,
        }
    }

    /// Takes an event at `now_s` seconds since the run began and says what to do. An event that does not fit the state
    /// changes nothing. A clock that went back counts as one that stood still.
    pub fn handle(&mut self, now_s: f64, event: Event) -> Vec<Effect> {
        let now_s = if now_s > self.state.at_s { now_s } else { self.state.at_s };
        let mut effects = Vec::new();
        let known = self.take(now_s, event, &mut effects);
        if known {
            self.advance(now_s, &mut effects);
            self.last = effects.last().filter(|effect| !matches!(effect, Effect::Persist(_))).cloned();
        }
        effects
    }

    /// Takes the event itself; false when it does not fit.
    fn take(&mut self, now_s: f64, event: Event, effects: &mut Vec<Effect>) -> bool {
        if self.replayed && event != Event::Resumed {
            return false;
        }
        match event {
            Event::Begin if self.state.phase == Phase::Waiting => self.log(now_s, What::Begun, effects),
            Event::PersistFailed { reason } if self.journal_works => self.journal_failed(now_s, reason, effects),
            Event::Resumed if (self.replayed || self.state.phase == Phase::Waiting) && !self.state.ended() => {
                self.replayed = false;
                self.resume(now_s, effects);
            }
            Event::SettleEnded { ok } if self.state.phase == Phase::Settling => {
                self.log(now_s, What::Settled { trouble: ok.err() }, effects);
            }
            Event::StepEnded(outcome) if self.in_flight => {
                self.in_flight = false;
                self.step_ended(now_s, outcome, effects);
            }
            Event::StopAsked if self.state.may_stop() => self.stop(now_s, effects),
            Event::Tick => {}
            _ => return false,
        }
        true
    }

    fn step_ended(&mut self, now_s: f64, outcome: Outcome, effects: &mut Vec<Effect>) {
        let Phase::Doing { place, .. } = self.state.phase else { return };
        // What was abandoned on purpose is no failure of its own.
        let abandoned = matches!(place, Place::Stage(_)) && self.state.leaving;
        let outcome = match outcome {
            Outcome::Broken { .. } if abandoned => Outcome::Cut,
            // Nobody asked for it, so it must not look as if all were well.
            Outcome::Cut if !abandoned => Outcome::Broken { reason: "it was abandoned half-way".to_owned() },
            other => other,
        };
        let step = self.step(place);
        let leaves = match outcome {
            Outcome::Broken { .. } | Outcome::Cut => true,
            Outcome::LimitExceeded { .. } => step.limit_ends,
            Outcome::Done { .. } => false,
        };
        let rest_s = if leaves { 0.0 } else { step.rest_s };
        self.log(now_s, What::Ended { place, outcome, leaves, until_s: now_s + rest_s }, effects);
    }

    fn stop(&mut self, now_s: f64, effects: &mut Vec<Effect>) {
        self.log(now_s, What::StopAsked, effects);
        if self.in_flight {
            effects.push(Effect::Cancel);
        } else {
            self.cut(now_s, effects);
        }
    }

    /// Ends the step that the state is in, where nothing is in flight that would end it.
    fn cut(&mut self, now_s: f64, effects: &mut Vec<Effect>) {
        if let Phase::Doing { place, .. } = self.state.phase {
            self.log(now_s, What::Ended { place, outcome: Outcome::Cut, leaves: true, until_s: now_s }, effects);
        }
    }

    fn resume(&mut self, now_s: f64, effects: &mut Vec<Effect>) {
        let begun = self.state.phase != Phase::Waiting;
        let reason = if begun {
            "the daemon was stopped while the run was going on; start the run again"
        } else {
            "the daemon was stopped before the run began; start the run again"
        };
        self.log(now_s, What::Interrupted { reason: reason.to_owned() }, effects);
        match self.state.phase {
            Phase::Doing { place: Place::Stage(_), .. } => self.cut(now_s, effects),
            // A step of the `always` part is carried out again rather than left half done.
            Phase::Doing { place, .. } => self.begin_step(now_s, place, effects),
            Phase::Settling => effects.push(Effect::Settle),
            _ => {}
        }
    }

    /// The entry that failed is not repeated: from now on nothing is written, and only what makes the bench safe is done.
    fn journal_failed(&mut self, now_s: f64, reason: String, effects: &mut Vec<Effect>) {
        self.journal_works = false;
        let reason = format!("the run's journal could not be written: {reason}");
        self.log(now_s, What::Interrupted { reason }, effects);
        match self.last.take() {
            // It was never begun.
            Some(Effect::Perform(Place::Stage(_))) => {
                self.in_flight = false;
                self.cut(now_s, effects);
            }
            Some(Effect::End { .. }) => self.end(effects),
            Some(effect @ (Effect::Perform(_) | Effect::Settle | Effect::Cancel)) => effects.push(effect),
            // A plain wait, or a rest.
            _ if !self.in_flight && matches!(self.state.phase, Phase::Doing { place: Place::Stage(_), .. }) => {
                self.cut(now_s, effects);
            }
            _ if self.in_flight && !matches!(self.state.phase, Phase::Doing { place: Place::Always(_), .. }) => {
                effects.push(Effect::Cancel);
            }
            _ => {}
        }
    }

    /// Goes on until something has to happen outside.
    fn advance(&mut self, now_s: f64, effects: &mut Vec<Effect>) {
        loop {
            match self.state.phase {
                // What is being left needs no rest any more; the steps of the `always` part do.
                Phase::Between { until_s }
                    if now_s >= until_s || (self.state.leaving && self.state.always_ended == 0) =>
                {
                    match self.state.next(self.plan.steps.len(), self.plan.always.len()) {
                        Some(place) => self.begin_step(now_s, place, effects),
                        None => {
                            self.log(now_s, What::Settling, effects);
                            effects.push(Effect::Settle);
                        }
                    }
                }
                Phase::Doing { place, until_s: Some(until_s) } if now_s >= until_s => {
                    let outcome = Outcome::Done { text: None };
                    self.log(now_s, What::Ended { place, outcome, leaves: false, until_s: now_s }, effects);
                }
                Phase::Closing => {
                    let (verdict, reason) = self.state.verdict();
                    self.log(now_s, What::Closed { verdict, reason }, effects);
                    self.end(effects);
                }
                _ => return,
            }
        }
    }

    fn begin_step(&mut self, now_s: f64, place: Place, effects: &mut Vec<Effect>) {
        let step = self.step(place);
        let until_s = (!step.perform).then_some(now_s + step.rest_s);
        self.log(now_s, What::Started { place, until_s }, effects);
        if step.perform {
            self.in_flight = true;
            effects.push(Effect::Perform(place));
        }
    }

    fn end(&self, effects: &mut Vec<Effect>) {
        let (state, reason) = self.state.verdict();
        effects.push(Effect::End { state, reason });
    }

    /// A step that the plan lacks is one that does nothing; the journal of another sequence could name one.
    fn step(&self, place: Place) -> StepPlan {
        let nothing = StepPlan { perform: false, rest_s: 0.0, limit_ends: false };
        match place {
            Place::Always(i) => self.plan.always.get(i),
            Place::Stage(i) => self.plan.steps.get(i),
        }
        .copied()
        .unwrap_or(nothing)
    }

    fn log(&mut self, now_s: f64, what: What, effects: &mut Vec<Effect>) {
        let entry = Entry { at_s: now_s, what };
        self.state.apply(&entry);
        if self.journal_works {
            effects.push(Effect::Persist(entry));
        }
    }
}

#[cfg(test)]
mod properties;
#[cfg(test)]
mod tests;
