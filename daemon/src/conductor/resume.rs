//! Runs that an earlier life of the daemon left open: brought to rest and ended `broken`, with what they measured kept.

use std::sync::Arc;

use evenpair_api::RunState;
use evenpair_core::sequence::Sequence;
use evenpair_core::sequence::machine::{Entry, Event, Machine};

use super::live::LiveRun;
use super::plan;
use super::rest::RestKeeper;
use super::run;
use super::workshop::Workshop;
use crate::store::StoreError;

/// Ends a run that was left open: its `always` part and the safe state are carried out.
pub(super) async fn end(workshop: &Workshop, rest: &RestKeeper, open: &Arc<LiveRun>) {
    if let Err(error) = end_one(workshop, rest, open).await {
        tracing::error!(run = %open.id(), %error, "ending a run that was left open");
    }
}

async fn end_one(workshop: &Workshop, rest: &RestKeeper, live: &Arc<LiveRun>) -> Result<(), StoreError> {
    let id = live.id();
    let source = workshop.store.source(id).await?.unwrap_or_default();
    let entries = workshop.store.journal(id).await?;
    let entries: Result<Vec<Entry>, _> = entries.into_iter().map(serde_json::from_value).collect();
    // A deskew by itself has no text; and a bench file that was changed meanwhile may no longer take the sequence. Then
    // there is no `always` part to carry out, and only the safe state is left.
    let sequence = plan::read(&workshop.bench, &source).unwrap_or_else(|_| Sequence {
        title: String::new(),
        steps: Vec::new(),
        always: Vec::new(),
    });
    match entries {
        Ok(entries) if !sequence.steps.is_empty() => {
            let machine = Machine::replay(sequence.plan(), &entries);
            if let Some((state, reason)) = end_in(&machine) {
                run::close(live, state, reason, workshop.clock.now()).await;
                return Ok(());
            }
            run::carry_out(workshop, rest, live, &sequence, machine, Event::Resumed).await;
        }
        _ => {
            let settled = rest.settle(&workshop.bench, &workshop.instruments).await;
            let rest = if settled.is_ok() { "the bench was brought to rest" } else { "the bench is UNSETTLED" };
            let reason = format!("the daemon was stopped while the run was going on; {rest}; start the run again");
            run::close(live, RunState::Broken, Some(reason), workshop.clock.now()).await;
        }
    }
    Ok(())
}

/// How a run ended whose journal has its end: the daemon was killed between writing that and telling it.
fn end_in(machine: &Machine) -> Option<(RunState, Option<String>)> {
    machine.state().ended().then(|| {
        let (verdict, reason) = machine.state().verdict();
        (run::state_of(verdict), reason)
    })
}

#[cfg(test)]
mod tests {
    use evenpair_core::sequence::machine::{Plan, Verdict, What};

    use super::*;

    /// A run without steps: every entry of its journal.
    fn journal() -> Vec<Entry> {
        let closed = What::Closed { verdict: Verdict::Passed, reason: None };
        let what = [What::Begun, What::Settling, What::Settled { trouble: None }, closed];
        what.into_iter().zip(0u8..).map(|(what, at_s)| Entry { at_s: at_s.into(), what }).collect()
    }

    #[test]
    fn a_run_is_over_only_once_its_journal_says_so() {
        let entries = journal();
        for count in 0..entries.len() {
            assert_eq!(end_in(&Machine::replay(Plan::default(), &entries[..count])), None, "after {count} entries");
        }
        assert_eq!(end_in(&Machine::replay(Plan::default(), &entries)), Some((RunState::Passed, None)));
        // Handed to the machine it would say nothing, and the run would be waited for without end.
        let effects = Machine::replay(Plan::default(), &entries).handle(9.0, Event::Resumed);
        assert!(effects.is_empty());
    }
}
