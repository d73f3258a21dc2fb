//! What the rest of the daemon holds of a session: a cheap clone that asks and waits.

use std::sync::Arc;
use std::time::Duration;

use evenpair_core::dialect::{Call, Completion, Dialect, DialectError, Fields, Intent, IntentKind, Message};
use tokio::sync::{mpsc, oneshot, watch};
use tokio::time::{Instant, sleep_until};

use super::error::{SessionError, shown};
use super::link::{Reply, Work};
use super::spec::{Caps, Timing};
use super::task::Request;

/// How a session's connection is.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub(crate) struct LinkReport {
    /// Whether there is a connection that is trusted.
    pub(crate) up: bool,
    /// Who answered first at this address.
    pub(crate) identity: Option<String>,
    /// Why there is no connection, if there is none.
    pub(crate) trouble: Option<String>,
    /// How often the connection was made again. When it grows between the start of an acquisition and the reading of
    /// its records, the acquisition may be gone.
    pub(crate) reconnects: u64,
    /// How often a device clear saved the connection after a time-out or the like.
    pub(crate) clears: u64,
    /// Whether there ever was a connection.
    pub(crate) made_before: bool,
}

/// The way to one instrument. Every clone asks the same session; the session ends when the last is dropped.
///
/// # Cancel safety
/// Every method may be dropped at any time. A request that is still in the queue is then not sent. One that is under
/// way breaks the connection, because its reply may still come; the session repairs that by itself. Whether a command
/// that was dropped under way took effect is not known.
#[derive(Debug, Clone)]
pub(crate) struct Handle {
    shared: Arc<Shared>,
    queue: mpsc::Sender<Request>,
    report: watch::Receiver<LinkReport>,
}

#[derive(Debug)]
pub(super) struct Shared {
    pub(super) instrument: String,
    pub(super) dialect: Arc<Dialect>,
    pub(super) timing: Timing,
    pub(super) caps: Caps,
}

impl Handle {
    pub(super) fn new(shared: Shared, queue: mpsc::Sender<Request>, report: watch::Receiver<LinkReport>) -> Self {
        Self { shared: Arc::new(shared), queue, report }
    }

    /// The instrument's name in the bench file.
    #[must_use]
    #[cfg(test)]
    pub(crate) fn instrument(&self) -> &str {
        &self.shared.instrument
    }

    /// How the instrument is spoken to.
    #[must_use]
    pub(crate) fn dialect(&self) -> &Dialect {
        &self.shared.dialect
    }

    /// Follows the connection's state.
    #[must_use]
    pub(crate) fn watch(&self) -> watch::Receiver<LinkReport> {
        self.report.clone()
    }

    /// Carries out a call and reads its reply; each reply may take as long as the session's timing says.
    ///
    /// # Errors
    /// Every [`SessionError`] except [`SessionError::NotComplete`]. After `Lost` or `TimedOut` it is not known whether
    /// a command took effect; queries and settings were then tried twice already.
    pub(crate) async fn call(&self, call: Call) -> Result<Fields, SessionError> {
        self.call_within(call, self.shared.timing.reply).await
    }

    /// As [`Handle::call`]; each reply may take `within`.
    ///
    /// # Errors
    /// As [`Handle::call`].
    pub(crate) async fn call_within(&self, call: Call, within: Duration) -> Result<Fields, SessionError> {
        let work = self.plan(call, within)?;
        Ok(self.ask(work).await?.fields)
    }

    /// Asks for a record of so many `points` and gives it as it came; a block that claims to be longer is refused.
    ///
    /// # Errors
    /// As [`Handle::call`].
    pub(crate) async fn data(&self, call: Call, points: u64) -> Result<Message, SessionError> {
        let work = self.plan(call, self.shared.timing.reply)?;
        // Samples may be in a block or, as text, in a line.
        let most = self.shared.dialect.most_block_bytes(points).min(self.shared.caps.block_bytes);
        let caps = Caps { line_bytes: most, block_bytes: most };
        let what = work.what.clone();
        let reply = self.ask(Work { caps, ..work }).await?;
        // The dialect has planned this, so a record without a reply is the dialect's mistake.
        reply.messages.into_iter().next_back().ok_or_else(|| {
            let source = Box::new(DialectError::Missing { name: "block".to_owned() });
            SessionError::Dialect { instrument: self.shared.instrument.clone(), what, source }
        })
    }

    /// Waits until everything that was started is complete, by the one question or by asking again and again, as the
    /// dialect says.
    ///
    /// # Errors
    /// [`SessionError::NotComplete`] when it takes longer than `within`. `Lost` when the connection broke: what was
    /// started may be gone, so it is not asked again by itself. Otherwise as [`Handle::call`].
    pub(crate) async fn complete(&self, within: Duration) -> Result<(), SessionError> {
        let late = || SessionError::NotComplete { instrument: self.shared.instrument.clone(), after: within };
        let deadline = Instant::now() + within;
        match self.shared.dialect.completion() {
            // Its commands are complete as soon as they are taken.
            None => Ok(()),
            Some(Completion::Answer) => {
                let work = Work { repeat: false, ..self.plan(Call::new(Intent::Complete), within)? };
                match self.ask(work).await {
                    Err(SessionError::TimedOut { .. }) => Err(late()),
                    Err(error) => Err(error),
                    Ok(_) => Ok(()),
                }
            }
            Some(&Completion::Poll { every_s }) => loop {
                let work = Work { repeat: false, ..self.plan(Call::new(Intent::Complete), self.shared.timing.reply)? };
                let what = work.what.clone();
                let done = self.ask(work).await?.fields.flag("done");
                let instrument = || self.shared.instrument.clone();
                if done.map_err(|error| SessionError::Unreadable {
                    instrument: instrument(),
                    what,
                    source: Box::new(error),
                })? {
                    return Ok(());
                }
                let next = Instant::now() + Duration::try_from_secs_f64(every_s).unwrap_or_default().max(LEAST_POLL);
                if next >= deadline {
                    sleep_until(deadline).await;
                    return Err(late());
                }
                sleep_until(next).await;
            },
        }
    }

    /// Carries out a call as [`Handle::call`] does, reads the error queue after queries too, and gives what came back
    /// both as it came and as it was read: for a look at an instrument that nobody has spoken to yet. A reply's line or
    /// block may have `most_bytes`.
    ///
    /// # Errors
    /// As [`Handle::call`].
    pub(crate) async fn look(&self, call: Call, most_bytes: usize) -> Result<(Vec<Message>, Fields), SessionError> {
        let work = self.plan(call, self.shared.timing.reply)?;
        let caps = Caps { line_bytes: most_bytes, block_bytes: most_bytes };
        let reply = self.ask(Work { check_errors: true, caps, ..work }).await?;
        Ok((reply.messages, reply.fields))
    }

    /// Sends one line as it is. It is not remembered, and never sent again by itself.
    ///
    /// # Errors
    /// When the text is not one line, or as [`Handle::call`].
    pub(crate) async fn exchange_raw(&self, text: &str, expects_reply: bool) -> Result<Option<Message>, SessionError> {
        let what = format!("`{}`", shown(text.as_bytes()));
        let exchange = match self.shared.dialect.raw(text, expects_reply) {
            Ok(exchange) => exchange,
            Err(error) => {
                let (instrument, source) = (self.shared.instrument.clone(), Box::new(error));
                return Err(SessionError::Dialect { instrument, what, source });
            }
        };
        let work = Work {
            what,
            call: None,
            exchanges: vec![exchange],
            check_errors: true,
            caps: self.shared.caps,
            timeout: self.shared.timing.reply,
            repeat: false,
        };
        Ok(self.ask(work).await?.messages.pop())
    }

    fn plan(&self, call: Call, timeout: Duration) -> Result<Work, SessionError> {
        let kind = call.intent.spec().kind;
        let what = format!("`{}`", call.intent);
        let exchanges = match self.shared.dialect.plan(&call) {
            Ok(exchanges) => exchanges,
            Err(error) => {
                let (instrument, source) = (self.shared.instrument.clone(), Box::new(error));
                return Err(SessionError::Dialect { instrument, what, source });
            }
        };
        Ok(Work {
            what,
            call: Some(call),
            exchanges,
            // A query that was refused shows by its silence; reading the queue after each would double its time.
            check_errors: !matches!(kind, IntentKind::Query | IntentKind::Data),
            caps: self.shared.caps,
            timeout,
            repeat: kind.idempotent(),
        })
    }

    async fn ask(&self, work: Work) -> Result<Reply, SessionError> {
        let what = work.what.clone();
        let instrument = || self.shared.instrument.clone();
        let (answer, answered) = oneshot::channel();
        self.queue.try_send(Request { work, queued_at: Instant::now(), answer }).map_err(|error| match error {
            mpsc::error::TrySendError::Full(_) => {
                let waiting = self.queue.max_capacity();
                SessionError::Busy { instrument: instrument(), what: what.clone(), waiting }
            }
            mpsc::error::TrySendError::Closed(_) => {
                SessionError::Closed { instrument: instrument(), what: what.clone() }
            }
        })?;
        // The task drops the answer only when it ends.
        answered.await.unwrap_or_else(|_| Err(SessionError::Closed { instrument: instrument(), what }))
    }
}

/// Polling faster than this only keeps the instrument from its work.
const LEAST_POLL: Duration = Duration::from_millis(1);
