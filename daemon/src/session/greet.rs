//! What happens on a new or newly cleared connection before anything else: who is there, what went wrong, and setting again.

use evenpair_core::dialect::{Call, Intent};

use super::error::Trouble;
use super::link::{Entry, Failure, Link, Reply, Work};
use super::memory::Memory;
use super::spec::SessionSpec;
use super::wire::Wire;

/// What was learned by greeting.
#[derive(Debug, Default)]
pub(super) struct Greeting {
    /// Who answers; `None` when the dialect cannot ask.
    pub(super) identity: Option<String>,
    /// What was in the error queue, from before.
    pub(super) leftovers: Vec<Entry>,
}

/// Asks who is there and compares with `expected`, empties the error queue, makes every setting of `memory` again.
///
/// # Cancel safety
/// Not safe: the link must be closed when this is dropped.
pub(super) async fn greet<W: Wire>(
    link: &mut Link<W>,
    spec: &SessionSpec,
    expected: Option<&str>,
    memory: &Memory,
) -> Result<Greeting, Trouble> {
    let dialect = &spec.dialect;
    let mut greeting = Greeting::default();
    if dialect.greeting() {
        link.take_greeting(spec.caps, spec.timing.reply).await?;
    }
    if dialect.supports(Intent::Identify) {
        let reply = perform(link, spec, Call::new(Intent::Identify), false).await?;
        let found = reply.fields.text("identity").map_err(Trouble::Garbled)?.trim().to_owned();
        if let Some(expected) = expected.filter(|expected| *expected != found) {
            return Err(Trouble::Stranger { expected: expected.to_owned(), found });
        }
        greeting.identity = Some(found);
    }
    greeting.leftovers = link.drain_errors(dialect, spec.caps, spec.timing.reply).await?;
    if !greeting.leftovers.is_empty() {
        tracing::info!(instrument = %spec.instrument, entries = ?greeting.leftovers, "the error queue was not empty");
    }
    if dialect.supports(Intent::Clear) {
        perform(link, spec, Call::new(Intent::Clear), false).await?;
    }
    for call in memory.calls() {
        perform(link, spec, call, true).await?;
    }
    Ok(greeting)
}

async fn perform<W: Wire>(
    link: &mut Link<W>,
    spec: &SessionSpec,
    call: Call,
    check_errors: bool,
) -> Result<Reply, Trouble> {
    let work = Work {
        what: call.intent.to_string(),
        exchanges: spec.dialect.plan(&call).map_err(Trouble::Greeting)?,
        call: Some(call),
        check_errors,
        caps: spec.caps,
        timeout: spec.timing.reply,
        repeat: false,
    };
    match link.perform(&work, &spec.dialect).await {
        Ok(reply) => Ok(reply),
        Err(Failure::Broken { trouble, .. }) => Err(trouble),
        Err(Failure::Refused { first, .. }) => {
            Err(Trouble::NotRestored { command: work.command(), number: first.number, text: first.text })
        }
    }
}
