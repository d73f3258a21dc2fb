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
