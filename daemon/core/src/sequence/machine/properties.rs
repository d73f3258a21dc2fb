//! Whatever happens, in whatever order: the machine keeps its rules, and its journal tells what was lived.

#![allow(clippy::unwrap_used)]

use proptest::prelude::*;

use super::*;

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
            self.hand(Event::SettleEnded {
                ok: if choice.is_multiple_of(8) { Err("stuck".to_owned()) } else { Ok(()) },
            });
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
                3 if conductor.in_flight.is_none() => conductor.hand(Event::StepEnded(Outcome::Done { text: None })),
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
