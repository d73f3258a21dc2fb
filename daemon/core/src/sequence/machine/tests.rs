//! What the machine does in each situation, one by one.

#![allow(clippy::unwrap_used, clippy::float_cmp)]

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
