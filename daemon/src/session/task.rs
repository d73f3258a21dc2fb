//! The task that owns an instrument's connection: takes requests one after another, repairs the link, sets again.
//!
//! ```text
//!            spawn                         request: perform it
//!              │                            ┌────┐
//!              ▼      connected, same       │    ▼
//!   ┌──────► down ──── instrument, ───────► up ──┘
//!   │          │       settings made         │
//!   │  failed: │ wait longer                 │ any trouble: close
//!   └──────────┘ ◄──────────────────────────-┘
//! ```
//!
//! Over HiSLIP a trouble that leaves messages apart is met with a device clear first; only when that does not help is the
//! link closed.

use std::time::Duration;

use tokio::select;
use tokio::sync::{mpsc, oneshot, watch};
use tokio::time::{Instant, sleep_until, timeout, timeout_at};
use tokio_util::sync::CancellationToken;

use super::LinkReport;
use super::error::{SessionError, Trouble};
use super::greet::greet;
use super::link::{Entry, Failure, Link, Reply, Work};
use super::memory::Memory;
use super::spec::SessionSpec;
use super::wire::Open;

/// Work, and who waits for it.
#[derive(Debug)]
pub(super) struct Request {
    pub(super) work: Work,
    pub(super) queued_at: Instant,
    pub(super) answer: oneshot::Sender<Result<Reply, SessionError>>,
}

/// The owner of a connection.
pub(super) struct Task<O: Open> {
    spec: SessionSpec,
    opener: O,
    queue: mpsc::Receiver<Request>,
    report: watch::Sender<LinkReport>,
    link: Option<Link<O::Wire>>,
    /// A link that is no longer trusted, but may be after a device clear.
    ailing: Option<Link<O::Wire>>,
    /// The link before, where the instrument serves one connection at a time: it has to be gone first.
    leaving: Option<Link<O::Wire>>,
    /// Who answered first.
    identity: Option<String>,
    memory: Memory,
    /// What was in the error queue when the present link was made.
    leftovers: Vec<Entry>,
    /// Why there is no link.
    trouble: Option<Trouble>,
    /// Attempts to connect since the link last proved good.
    attempts: u32,
    next_attempt: Instant,
    up_since: Instant,
}

impl<O: Open> Task<O> {
    pub(super) fn new(
        spec: SessionSpec,
        opener: O,
        queue: mpsc::Receiver<Request>,
        report: watch::Sender<LinkReport>,
    ) -> Self {
        Self {
            spec,
            opener,
            queue,
            report,
            link: None,
            ailing: None,
            leaving: None,
            identity: None,
            memory: Memory::default(),
            leftovers: Vec::new(),
            trouble: None,
            attempts: 0,
            next_attempt: Instant::now(),
            up_since: Instant::now(),
        }
    }

    /// Works until `token` is cancelled or every handle is dropped. Whoever waits then is told that it is closed.
    ///
    /// # Cancel safety
    /// Dropping it closes the connection; a command that was under way may or may not have taken effect.
    pub(super) async fn run(mut self, token: CancellationToken) {
        select! {
            biased;
            () = token.cancelled() => {}
            () = self.work() => {}
        }
        self.report.send_modify(|report| {
            report.up = false;
            report.trouble = Some("the session has ended".to_owned());
        });
    }

    async fn work(&mut self) {
        loop {
            match &mut self.link {
                Some(link) => select! {
                    // What came unasked is looked at first: it must not meet the next query.
                    biased;
                    trouble = link.idle() => self.poison(trouble),
                    request = self.queue.recv() => match request {
                        Some(request) => self.serve(request).await,
                        None => return,
                    },
                },
                None => select! {
                    request = self.queue.recv() => match request {
                        Some(request) => self.serve(request).await,
                        None => return,
                    },
                    () = sleep_until(self.next_attempt) => self.attempt().await,
                },
            }
        }
    }

    async fn serve(&mut self, mut request: Request) {
        // Whoever went away while waiting in the queue gets nothing sent in their name.
        if request.answer.is_closed() {
            return;
        }
        let outcome = select! {
            biased;
            outcome = self.carry_out(&request.work, request.queued_at) => Some(outcome),
            () = request.answer.closed() => None,
        };
        match outcome {
            // The caller may have gone away at this very moment; what was done is done and remembered.
            Some(outcome) => drop(request.answer.send(outcome)),
            None if self.link.as_ref().is_some_and(Link::in_flight) => self.poison(Trouble::Abandoned),
            None => {}
        }
    }

    async fn carry_out(&mut self, work: &Work, queued_at: Instant) -> Result<Reply, SessionError> {
        self.ensure_up(work, queued_at).await?;
        let (command, trouble) = match self.perform(work).await? {
            Ok(reply) => return Ok(reply),
            Err(broken) => broken,
        };
        if !work.repeat {
            return Err(self.lost(work, command, trouble));
        }
        self.ensure_up(work, Instant::now()).await?;
        // Most instruments answer a query that they do not understand by silence and an entry in their error queue,
        // which was read when the link was made anew: the reason is better than the silence.
        if let (Trouble::Silent { .. }, Some(at)) = (&trouble, self.leftovers.iter().position(|e| !e.is_query_error()))
        {
            let more = self.leftovers.len() - at - 1;
            return Err(self.refused(work, self.leftovers[at].clone(), more));
        }
        match self.perform(work).await? {
            Ok(reply) => Ok(reply),
            Err((command, trouble)) => Err(self.lost(work, command, trouble)),
        }
    }

    /// Performs on the link that there is. The inner error is a link that broke, with the command it broke at.
    async fn perform(&mut self, work: &Work) -> Result<Result<Reply, (String, Trouble)>, SessionError> {
        // `ensure_up` came before; without a link this is the trouble that it ended with.
        let Some(link) = &mut self.link else { return Ok(Err((work.command(), Trouble::PeerClosed))) };
        match link.perform(work, &self.spec.dialect).await {
            Ok(reply) => {
                self.attempts = 0;
                if let Some(call) = &work.call {
                    self.memory.note(call);
                }
                Ok(Ok(reply))
            }
            Err(Failure::Refused { first, more }) => {
                self.attempts = 0;
                Err(self.refused(work, first, more))
            }
            Err(Failure::Broken { command, trouble }) => {
                self.poison(trouble.clone());
                Ok(Err((command, trouble)))
            }
        }
    }

    /// Waits for a link that is up and quiet, as long as the session's patience since `since` lasts.
    async fn ensure_up(&mut self, work: &Work, since: Instant) -> Result<(), SessionError> {
        let deadline = since + self.spec.timing.patience;
        loop {
            if let Some(link) = &mut self.link {
                match link.quiet() {
                    Ok(()) => return Ok(()),
                    Err(trouble) => self.poison(trouble),
                }
            }
            // Waiting brings nobody back who was replaced.
            if let Some(Trouble::Stranger { expected, found }) = self.trouble.clone() {
                let (instrument, what) = (self.spec.instrument.clone(), work.what.clone());
                return Err(SessionError::Stranger { instrument, what, place: self.opener.place(), expected, found });
            }
            sleep_until(self.next_attempt.min(deadline)).await;
            let in_time = Instant::now() < deadline && timeout_at(deadline, self.attempt()).await.is_ok();
            if !in_time && self.link.is_none() {
                return Err(self.unreachable(work));
            }
        }
    }

    /// Tries once to clear the link that there was, or else to make one. What stood in the way is noted.
    ///
    /// # Cancel safety
    /// Safe: the half-made link is closed, and the wait before the next attempt holds.
    async fn attempt(&mut self) {
        self.attempts = self.attempts.saturating_add(1);
        self.next_attempt = Instant::now() + self.spec.timing.pause(self.attempts);
        if let Some(link) = self.ailing.take() {
            match self.clear(link).await {
                Ok(link) => return self.is_up(link, true),
                Err(trouble) => {
                    tracing::info!(instrument = %self.spec.instrument, %trouble, "a device clear did not help");
                }
            }
        }
        if let Some(link) = self.leaving.take() {
            link.leave(self.spec.timing.connect).await;
        }
        match self.make_link().await {
            Ok(link) => self.is_up(link, false),
            Err(trouble) => {
                // The pause counts from the end of an attempt: one that took long was not a short wait.
                self.next_attempt = Instant::now() + self.spec.timing.pause(self.attempts);
                self.note_trouble(trouble);
            }
        }
    }

    /// The link is good: takes note and tells everyone who watches.
    fn is_up(&mut self, link: Link<O::Wire>, cleared: bool) {
        self.link = Some(link);
        self.trouble = None;
        self.up_since = Instant::now();
        let identity = self.identity.clone();
        self.report.send_modify(|report| {
            report.clears += u64::from(cleared);
            report.reconnects += u64::from(report.made_before && !cleared);
            report.made_before = true;
            report.up = true;
            report.identity = identity;
            report.trouble = None;
        });
        let how = if cleared { "cleared" } else { "connected" };
        tracing::info!(instrument = %self.spec.instrument, place = %self.opener.place(), "{how}");
    }

    /// Clears a link, and asks who is there and what went wrong. The settings are not made again: a device clear leaves
    /// them alone (488.2, 5.8, from memory), and an instrument that lost them has lost its connection too.
    async fn clear(&mut self, mut link: Link<O::Wire>) -> Result<Link<O::Wire>, Trouble> {
        let limit = self.spec.timing.clear;
        let silent = |_| Trouble::Silent { command: "device clear".to_owned(), after: limit };
        timeout(limit, link.clear()).await.map_err(silent)??;
        let greeting = greet(&mut link, &self.spec, self.identity.as_deref(), &Memory::default()).await?;
        self.leftovers = greeting.leftovers;
        Ok(link)
    }

    async fn make_link(&mut self) -> Result<Link<O::Wire>, Trouble> {
        let limit = self.spec.timing.connect;
        let wire = match timeout(limit, self.opener.open()).await {
            Ok(opened) => opened?,
            Err(_elapsed) => {
                let reason = format!("no answer within {limit:?}");
                return Err(Trouble::Connect { place: self.opener.place(), reason });
            }
        };
        let mut link = Link::new(wire);
        let greeting = greet(&mut link, &self.spec, self.identity.as_deref(), &self.memory).await?;
        self.identity = self.identity.take().or(greeting.identity);
        self.leftovers = greeting.leftovers;
        Ok(link)
    }

    /// Closes the link, or puts it aside when a device clear may save it. The next attempt to do so or to make a new one
    /// comes at once, unless the links of late did not last.
    fn poison(&mut self, trouble: Trouble) {
        match self.link.take() {
            Some(link) if link.clears_after(&trouble) => self.ailing = Some(link),
            link => self.leaving = link.filter(|_| self.spec.dialect.one_client()),
        }
        let now = Instant::now();
        if now.duration_since(self.up_since) >= self.spec.timing.backoff_most {
            self.attempts = 0;
        }
        self.next_attempt = now + self.spec.timing.pause(self.attempts.saturating_sub(1));
        self.note_trouble(trouble);
    }

    /// Tells everyone who watches why the link is down, and the log when it is something new.
    fn note_trouble(&mut self, trouble: Trouble) {
        if self.trouble.as_ref() != Some(&trouble) {
            tracing::warn!(instrument = %self.spec.instrument, %trouble, "not connected");
        }
        self.report.send_modify(|report| {
            report.up = false;
            report.trouble = Some(trouble.to_string());
        });
        self.trouble = Some(trouble);
    }

    fn refused(&self, work: &Work, entry: Entry, more: usize) -> SessionError {
        SessionError::Refused {
            instrument: self.spec.instrument.clone(),
            what: work.what.clone(),
            command: work.command(),
            number: entry.number,
            text: entry.text,
            more,
        }
    }

    fn lost(&self, work: &Work, command: String, trouble: Trouble) -> SessionError {
        let (instrument, what) = (self.spec.instrument.clone(), work.what.clone());
        match trouble {
            Trouble::Silent { command, after } => SessionError::TimedOut { instrument, what, command, after },
            Trouble::Garbled(source) => SessionError::Unreadable { instrument, what, source: Box::new(source) },
            reason => SessionError::Lost { instrument, what, command, reason: Box::new(reason) },
        }
    }

    fn unreachable(&self, work: &Work) -> SessionError {
        let waited: Duration = self.spec.timing.patience;
        SessionError::Unreachable {
            instrument: self.spec.instrument.clone(),
            what: work.what.clone(),
            waited,
            reason: match &self.trouble {
                Some(trouble) => trouble.to_string(),
                None => format!("the first attempt to reach {} is still under way", self.opener.place()),
            },
        }
    }
}
