use proptest::prelude::*;

use super::*;

fn perform() -> StepPlan {
    StepPlan { perform: true, rest_s: 0.0, limit_ends: false }
}

fn wait(rest_s: f64) -> StepPlan {
    StepPlan { perform: false, rest_s, limit_ends: false }
}

fn done() -> Event {
    Event::StepEnded(Outcome::Done { text: None })
}

fn broken(reason: &str) -> Event {
    Event::StepEnded(Outcome::Broken { reason: reason.to_owned() })
}

/// The effects that are no `Persist`.
fn acts(effects: Vec<Effect>) -> Vec<Effect> {
    effects.into_iter().filter(|effect| !matches!(effect, Effect::Persist(_))).collect()
}

fn stage(i: usize) -> Vec<Effect> {
    vec![Effect::Perform(Place::Stage(i))]
}

fn always(i: usize) -> Vec<Effect> {
    vec![Effect::Perform(Place::Always(i))]
}

fn end(state: Verdict, reason: Option<&str>) -> Vec<Effect> {
    vec![Effect::End { state, reason: reason.map(str::to_owned) }]
}

#[test]
fn a_run_passes() {
    let mut machine = Machine::new(Plan { steps: vec![perform(), perform()], always: vec![perform()] });
    assert_eq!(acts(machine.handle(0.0, Event::Begin)), stage(0));
    assert_eq!(acts(machine.handle(1.0, done())), stage(1));
    assert_eq!(acts(machine.handle(2.0, done())), always(0));
    assert_eq!(acts(machine.handle(3.0, done())), [Effect::Settle]);
    assert_eq!(acts(machine.handle(4.0, Event::SettleEnded { ok: Ok(()) })), end(Verdict::Passed, None));
    assert!(machine.state().ended());
    assert_eq!(machine.handle(5.0, Event::StopAsked), []);
}

#[test]
fn a_step_is_in_the_journal_before_it_is_performed() {
    let mut machine = Machine::new(Plan { steps: vec![perform()], always: vec![] });
    let effects = machine.handle(0.0, Event::Begin);
    assert_eq!(
        effects,
        [
            Effect::Persist(Entry { at_s: 0.0, what: What::Begun }),
            Effect::Persist(Entry { at_s: 0.0, what: What::Started { place: Place::Stage(0), until_s: None } }),
            Effect::Perform(Place::Stage(0)),
        ]
    );
}

#[test]
fn waits_and_rests_end_at_their_deadline_and_not_before() {
    let rested = StepPlan { rest_s: 0.5, ..perform() };
    let mut machine = Machine::new(Plan { steps: vec![wait(2.0), rested, perform()], always: vec![] });
    assert_eq!(acts(machine.handle(1.0, Event::Begin)), []);
    assert_eq!(machine.next_deadline(), Some(3.0));
    assert_eq!(machine.handle(2.999, Event::Tick), []);
    assert_eq!(acts(machine.handle(3.0, Event::Tick)), stage(1));
    assert_eq!(machine.next_deadline(), None);
    assert_eq!(acts(machine.handle(4.0, done())), []);
    assert_eq!(machine.next_deadline(), Some(4.5));
    assert_eq!(machine.handle(4.499, Event::Tick), []);
    assert_eq!(acts(machine.handle(4.5, Event::Tick)), stage(2));
}

#[test]
fn a_clock_that_goes_back_stands_still() {
    let mut machine = Machine::new(Plan { steps: vec![wait(2.0), perform()], always: vec![] });
    machine.handle(10.0, Event::Begin);
    assert_eq!(machine.handle(-5.0, Event::Tick), []);
    assert_eq!(machine.handle(f64::NAN, Event::Tick), []);
    assert_eq!(acts(machine.handle(12.0, Event::Tick)), stage(1));
    assert_eq!(machine.state().at_s, 12.0);
}

#[test]
fn a_limit_goes_on_unless_the_stage_says_end() {
    let limit = || Event::StepEnded(Outcome::LimitExceeded { text: "high_level 14 V, at most 13 V".to_owned() });
    let mut machine = Machine::new(Plan { steps: vec![perform(), perform()], always: vec![] });
    machine.handle(0.0, Event::Begin);
    assert_eq!(acts(machine.handle(1.0, limit())), stage(1));
    assert_eq!(acts(machine.handle(2.0, limit())), [Effect::Settle]);
    assert_eq!(
        acts(machine.handle(3.0, Event::SettleEnded { ok: Ok(()) })),
        end(Verdict::Failed, Some("high_level 14 V, at most 13 V; 1 more steps exceeded a limit"))
    );
    let ends = StepPlan { limit_ends: true, ..perform() };
    let mut machine = Machine::new(Plan { steps: vec![ends, perform()], always: vec![perform()] });
    machine.handle(0.0, Event::Begin);
    assert_eq!(acts(machine.handle(1.0, limit())), always(0));
}

#[test]
fn a_broken_step_still_brings_everything_to_rest() {
    let mut machine = Machine::new(Plan { steps: vec![perform(), perform()], always: vec![perform(), perform()] });
    machine.handle(0.0, Event::Begin);
    assert_eq!(acts(machine.handle(1.0, broken("scope: no reply"))), always(0));
    assert_eq!(acts(machine.handle(2.0, broken("supply: no reply"))), always(1), "the rest of it is still done");
    assert_eq!(acts(machine.handle(3.0, done())), [Effect::Settle]);
    assert_eq!(
        acts(machine.handle(4.0, Event::SettleEnded { ok: Err("supply: no reply".to_owned()) })),
        end(
            Verdict::Broken,
            Some("scope: no reply; supply: no reply; the safe state could not be applied: supply: no reply")
        )
    );
}

#[test]
fn a_stop_cancels_waits_for_the_end_and_comes_to_rest() {
    let mut machine = Machine::new(Plan { steps: vec![perform(), perform()], always: vec![perform()] });
    machine.handle(0.0, Event::Begin);
    assert_eq!(acts(machine.handle(1.0, Event::StopAsked)), [Effect::Cancel]);
    assert_eq!(machine.handle(1.5, Event::StopAsked), [], "asked again");
    assert_eq!(acts(machine.handle(2.0, broken("abandoned"))), always(0));
    assert_eq!(machine.handle(2.5, Event::StopAsked), [], "too late");
    machine.handle(3.0, done());
    assert_eq!(
        acts(machine.handle(4.0, Event::SettleEnded { ok: Ok(()) })),
        end(Verdict::Stopped, Some("a person stopped it"))
    );
}

#[test]
fn a_stop_in_a_wait_acts_at_once_and_the_rests_of_always_are_kept() {
    let rested = StepPlan { rest_s: 5.0, ..perform() };
    let mut machine = Machine::new(Plan { steps: vec![wait(3600.0)], always: vec![rested, perform()] });
    machine.handle(0.0, Event::Begin);
    assert_eq!(acts(machine.handle(1.0, Event::StopAsked)), always(0));
    assert_eq!(acts(machine.handle(2.0, done())), []);
    assert_eq!(machine.next_deadline(), Some(7.0));
    assert_eq!(acts(machine.handle(7.0, Event::Tick)), always(1));
}

#[test]
fn a_run_stopped_before_it_began_touches_nothing() {
    let mut machine = Machine::new(Plan { steps: vec![perform()], always: vec![perform()] });
    assert_eq!(acts(machine.handle(0.0, Event::StopAsked)), end(Verdict::Stopped, Some("a person stopped it")));
    assert_eq!(machine.handle(1.0, Event::Begin), []);
}

#[test]
fn an_abandonment_that_nobody_asked_for_is_no_success() {
    let mut machine = Machine::new(Plan { steps: vec![perform(), perform()], always: vec![] });
    machine.handle(0.0, Event::Begin);
    assert_eq!(acts(machine.handle(1.0, Event::StepEnded(Outcome::Cut))), [Effect::Settle]);
    assert_eq!(machine.state().verdict(), (Verdict::Broken, Some("it was abandoned half-way".to_owned())));
}

#[test]
fn a_journal_that_fails_brings_the_bench_to_rest_without_it() {
    let mut machine = Machine::new(Plan { steps: vec![perform(), perform()], always: vec![perform()] });
    machine.handle(0.0, Event::Begin);
    machine.handle(1.0, done());
    // The entry for stage 1 could not be written, so stage 1 was never begun and no `StepEnded` will come.
    let failed = Event::PersistFailed { reason: "the disk is full".to_owned() };
    assert_eq!(machine.handle(1.0, failed), always(0), "no entry any more");
    assert_eq!(machine.handle(2.0, done()), [Effect::Settle]);
    assert_eq!(
        machine.handle(3.0, Event::SettleEnded { ok: Ok(()) }),
        end(Verdict::Broken, Some("the run's journal could not be written: the disk is full"))
    );
}

#[test]
fn a_run_of_an_earlier_life_comes_to_rest() {
    let plan = Plan { steps: vec![perform(), perform()], always: vec![perform(), perform()] };
    let mut first = Machine::new(plan.clone());
    let mut entries = persisted(&first.handle(0.0, Event::Begin));
    let mut second = Machine::replay(plan.clone(), &entries);
    assert_eq!(second.handle(1.0, Event::Tick), [], "nothing before it is told");
    assert_eq!(acts(second.handle(9.0, Event::Resumed)), always(0));
    assert_eq!(second.handle(9.0, Event::Resumed), [], "told once");

    // Killed in the second `always` step: that one is done again.
    entries.extend(persisted(&first.handle(1.0, broken("x"))));
    entries.extend(persisted(&first.handle(2.0, done())));
    let mut third = Machine::replay(plan, &entries);
    assert_eq!(acts(third.handle(9.0, Event::Resumed)), always(1));
    assert_eq!(acts(third.handle(10.0, done())), [Effect::Settle]);
    let last = acts(third.handle(11.0, Event::SettleEnded { ok: Ok(()) }));
    assert_eq!(
        last,
        end(Verdict::Broken, Some("x; the daemon was stopped while the run was going on; start the run again"))
    );
}

#[test]
fn entries_survive_json() {
    let entry = Entry {
        at_s: 12.5,
        what: What::Ended {
            place: Place::Always(3),
            outcome: Outcome::LimitExceeded { text: "x".to_owned() },
            leaves: false,
            until_s: 13.0,
        },
    };
    let text = serde_json::to_string(&entry).unwrap();
    assert_eq!(serde_json::from_str::<Entry>(&text).unwrap(), entry);
}

fn persisted(effects: &[Effect]) -> Vec<Entry> {
    effects.iter().filter_map(|e| if let Effect::Persist(entry) = e { Some(entry.clone()) } else { None }).collect()
}

/// A conductor that carries out effects and watches that the rules are kept.
struct Conductor {
    machine: Machine,
    journal: Vec<Entry>,
    /// The state after each list that was written whole.
    states: Vec<(usize, State)>,
    /// How many entries can be written before the disk is full.
    room: usize,
    /// Whether an entry did not fit.
    full: bool,
    now_s: f64,
    in_flight: Option<Place>,
    settling: bool,
    performed: Vec<Place>,
    settles: usize,
    end: Option<(Verdict, Option<String>)>,
}

impl Conductor {
    fn new(machine: Machine, room: usize) -> Self {
        Self {
            machine,
            journal: Vec::new(),
            states: Vec::new(),
            room,
            full: false,
            now_s: 0.0,
            in_flight: None,
            settling: false,
            performed: Vec::new(),
            settles: 0,
            end: None,
        }
    }

    fn hand(&mut self, event: Event) {
        let effects = self.machine.handle(self.now_s, event);
        for (i, effect) in effects.iter().enumerate() {
            assert!(self.end.is_none(), "nothing follows the end");
            assert!(
                matches!(effect, Effect::Persist(_)) || i + 1 == effects.len(),
                "one act, and the last: {effects:?}"
            );
            match effect {
                Effect::Persist(_) if self.journal.len() >= self.room => {
                    assert!(!self.full, "nothing is written any more once it failed");
                    self.full = true;
                    self.hand(Event::PersistFailed { reason: "full".to_owned() });
                    return;
                }
                Effect::Persist(entry) => {
                    assert!(self.journal.last().is_none_or(|last| last.at_s <= entry.at_s), "time goes on");
                    self.journal.push(entry.clone());
                }
                Effect::Perform(place) => {
                    assert_eq!((self.in_flight, self.settling), (None, false), "one thing at a time");
                    let started = What::Started { place: *place, until_s: None };
                    assert!(
                        self.full || self.journal.last().is_some_and(|entry| entry.what == started),
                        "written first"
                    );
                    self.in_flight = Some(*place);
                    self.performed.push(*place);
                }
                Effect::Cancel => assert!(matches!(self.in_flight, Some(Place::Stage(_))), "only a stage is cancelled"),
                Effect::Settle => {
                    assert_eq!((self.in_flight, self.settling), (None, false), "one thing at a time");
                    self.settling = true;
                    self.settles += 1;
                }
                Effect::End { state, reason } => self.end = Some((*state, reason.clone())),
            }
        }
        self.states.push((self.journal.len(), self.machine.state().clone()));
    }

    /// Does what is due, with the outcome that `choice` picks.
    fn go_on(&mut self, choice: u8) {
        if self.in_flight.take().is_some() {
            let outcome = match choice % 8 {
                0 => Outcome::Broken { reason: "broken".to_owned() },
                1 | 2 => Outcome::LimitExceeded { text: "limit".to_owned() },
                3 => Outcome::Cut,
                _ => Outcome::Done { text: None },
            };
            self.hand(Event::StepEnded(outcome));
        } else if self.settling {
            self.settling = false;
            self.hand(Event::SettleEnded { ok: if choice % 8 == 0 { Err("stuck".to_owned()) } else { Ok(()) } });
        } else if let Some(deadline) = self.machine.next_deadline() {
            self.now_s = deadline;
            self.hand(Event::Tick);
        }
    }

    fn finish(&mut self) {
        for _ in 0..1000 {
            if self.end.is_some() {
                return;
            }
            self.go_on(7);
        }
        panic!("it does not end: {:?}", self.machine);
    }
}

fn steps() -> impl Strategy<Value = Vec<StepPlan>> {
    let step = (any::<bool>(), 0u8..3, any::<bool>()).prop_map(|(perform, rest, limit_ends)| StepPlan {
        perform,
        rest_s: f64::from(rest),
        limit_ends,
    });
    proptest::collection::vec(step, 0..6)
}

proptest! {
    #[test]
    fn every_run_keeps_the_rules_and_its_journal_tells_it(
        plan in (steps(), steps()).prop_map(|(steps, always)| Plan { steps, always }),
        choices in proptest::collection::vec((0u8..12, any::<u8>()), 0..60),
        room in prop_oneof![Just(usize::MAX), 0usize..20],
        cut in any::<prop::sample::Index>(),
    ) {
        let mut conductor = Conductor::new(Machine::new(plan.clone()), room);
        conductor.hand(Event::Begin);
        for (what, choice) in choices {
            conductor.now_s += 0.25;
            match what {
                0 => conductor.hand(Event::StopAsked),
                1 => conductor.hand(Event::Tick),
                2 => conductor.hand(Event::Begin),
                3 if conductor.in_flight.is_none() => conductor.hand(done()),
                _ => conductor.go_on(choice),
            }
        }
        conductor.finish();

        // Whatever happened, once begun: each `always` step once and in order, the safe state once, then the end.
        let wanted: Vec<Place> =
            (0..plan.always.len()).filter(|&i| plan.always[i].perform).map(Place::Always).collect();
        let found: Vec<Place> =
            conductor.performed.iter().copied().filter(|place| matches!(place, Place::Always(_))).collect();
        prop_assert_eq!(found, wanted);
        prop_assert_eq!(conductor.settles, 1);
        let stages: Vec<Place> =
            conductor.performed.iter().copied().filter(|place| matches!(place, Place::Stage(_))).collect();
        let sorted = { let mut s = stages.clone(); s.sort_by_key(|p| match p { Place::Stage(i) | Place::Always(i) => *i }); s.dedup(); s };
        prop_assert_eq!(&stages, &sorted, "stages in order, none twice");
        let (verdict, reason) = conductor.end.clone().unwrap();
        prop_assert_eq!(verdict == Verdict::Passed, reason.is_none());
        if conductor.full {
            prop_assert_eq!(verdict, Verdict::Broken);
        }

        // The fold of the journal is what was lived, at every point where both can be seen.
        if !conductor.full {
            for (length, lived) in &conductor.states {
                let told = Machine::replay(plan.clone(), &conductor.journal[..*length]);
                prop_assert_eq!(told.state(), lived);
            }
        }

        // Killed after any entry and started again, it comes to rest and ends broken, or had ended.
        let length = cut.index(conductor.journal.len() + 1);
        let mut again = Conductor::new(Machine::replay(plan, &conductor.journal[..length]), usize::MAX);
        again.now_s = conductor.now_s;
        if again.machine.state().ended() {
            again.hand(Event::Resumed);
            prop_assert_eq!(again.end, None);
        } else {
            let settled = matches!(again.machine.state().phase, Phase::Closing | Phase::Waiting);
            let left = wanted_always(&again.machine);
            again.hand(Event::Resumed);
            again.finish();
            prop_assert_eq!(again.end.unwrap().0, Verdict::Broken);
            prop_assert_eq!(again.settles, usize::from(!settled));
            prop_assert!(again.performed.iter().all(|place| matches!(place, Place::Always(_))), "no stage is taken up");
            if !settled {
                prop_assert_eq!(again.performed.len(), left);
            }
        }
    }
}

/// How many `always` steps are still to be performed, one that was begun among them.
fn wanted_always(machine: &Machine) -> usize {
    if machine.state().phase == Phase::Settling {
        return 0;
    }
    machine.plan.always[machine.state().always_ended..].iter().filter(|step| step.perform).count()
}
