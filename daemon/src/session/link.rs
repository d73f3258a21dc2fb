//! One connection: sends commands, awaits their replies, and does not forgive.
//!
//! A link knows nothing of reconnecting. Any [`Trouble`] means that it must be dropped, or cleared where its [`Wire`]
//! can be: after one, nobody can tell which reply belongs to which query.

use std::time::Duration;

use evenpair_core::dialect::{Call, Dialect, Exchange, Expect, Fields, IntentKind, Message};
use futures_util::FutureExt;
use tokio::time::{Instant, timeout_at};

use super::error::{Trouble, shown};
use super::spec::Caps;
use super::wire::Wire;

/// What to do in one go, planned already.
#[derive(Debug, Clone)]
pub(super) struct Work {
    /// In words, for errors.
    pub(super) what: String,
    /// The call behind it; raw text has none.
    pub(super) call: Option<Call>,
    /// What is sent and awaited, in this order.
    pub(super) exchanges: Vec<Exchange>,
    /// Whether the error queue is read afterwards.
    pub(super) check_errors: bool,
    /// The longest line and block that are taken.
    pub(super) caps: Caps,
    /// How long each reply may take.
    pub(super) timeout: Duration,
    /// Whether it may be done once more after a lost connection.
    pub(super) repeat: bool,
}

impl Work {
    /// All its commands as one line.
    pub(super) fn command(&self) -> String {
        let all: Vec<u8> = self.exchanges.iter().flat_map(|exchange| exchange.send.iter().copied()).collect();
        shown(String::from_utf8_lossy(&all).trim_end().replace('\n', "; ").as_bytes())
    }
}

/// What came of it.
#[derive(Debug, Clone, PartialEq, Default)]
pub(super) struct Reply {
    /// Every message, in the order of the exchanges.
    pub(super) messages: Vec<Message>,
    /// What the dialect reads in them.
    pub(super) fields: Fields,
}

/// One entry of an instrument's error queue.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Entry {
    /// Negative: a number of SCPI-99; positive: the maker's own.
    pub(super) number: i64,
    /// The instrument's words.
    pub(super) text: String,
}

impl Entry {
    /// Query errors (SCPI-99 volume 2, 21.8.12, from memory: −400 to −499) arise from the closing of a link itself.
    pub(super) fn is_query_error(&self) -> bool {
        (-499..=-400).contains(&self.number)
    }
}

/// How work can fail.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Failure {
    /// The link is no longer trusted. `command` is the one that was under way.
    Broken { command: String, trouble: Trouble },
    /// The instrument answered in order, but put entries (at least one) into its error queue.
    Refused { first: Entry, more: usize },
}

/// The most entries that are read from an error queue at once. SCPI-99 asks for at least two; instruments have ten to
/// a few dozen. One that never runs dry would keep the session for ever.
pub(super) const MOST_ENTRIES: usize = 64;

/// One connection to one instrument.
#[derive(Debug)]
pub(super) struct Link<W> {
    wire: W,
    /// A request was begun and did not come to an orderly end.
    in_flight: bool,
}

impl<W: Wire> Link<W> {
    pub(super) fn new(wire: W) -> Self {
        Self { wire, in_flight: false }
    }

    /// Whether a request was begun that did not come to an orderly end: its reply may still come.
    pub(super) fn in_flight(&self) -> bool {
        self.in_flight
    }

    /// Whether [`Link::clear`] may help after this trouble.
    pub(super) fn clears_after(&self, trouble: &Trouble) -> bool {
        self.wire.clears_after(trouble)
    }

    /// Has the instrument forget what is under way: afterwards nothing of it can come any more.
    ///
    /// # Cancel safety
    /// Not safe: when it is dropped, the link must be closed.
    pub(super) async fn clear(&mut self) -> Result<(), Trouble> {
        self.wire.clear().await?;
        self.in_flight = false;
        Ok(())
    }

    /// Waits until something happens that nobody asked for: the peer closes, or sends.
    ///
    /// # Cancel safety
    /// Safe: nothing that was read is lost.
    pub(super) async fn idle(&mut self) -> Trouble {
        self.wire.idle().await
    }

    /// Hangs up, and waits until the other end has done so too, at most so long.
    ///
    /// # Cancel safety
    /// Safe: dropping it closes the connection at once.
    pub(super) async fn leave(self, within: Duration) {
        // An instrument that does not hang up in time may still do so; the next attempt shows it.
        let _ = timeout_at(Instant::now() + within, self.wire.leave()).await;
    }

    /// Whether nothing unasked-for has come, without waiting.
    pub(super) fn quiet(&mut self) -> Result<(), Trouble> {
        // Unconstrained: a task that has used up its share of time would be told "nothing yet" although there is.
        match tokio::task::unconstrained(self.wire.idle()).now_or_never() {
            None => Ok(()),
            Some(trouble) => Err(trouble),
        }
    }

    /// Sends, awaits and reads everything that `work` says, and the error queue if it says so.
    ///
    /// # Cancel safety
    /// Not safe: when it is dropped, [`Link::in_flight`] stays true and the link must be closed.
    pub(super) async fn perform(&mut self, work: &Work, dialect: &Dialect) -> Result<Reply, Failure> {
        let broken = |trouble| Failure::Broken { command: work.command(), trouble };
        self.quiet().map_err(broken)?;
        let mut reply = Reply::default();
        for exchange in &work.exchanges {
            let got = self.exchange(exchange, work.caps, dialect.most_lead_bytes(), work.timeout).await;
            let got = got.map_err(|trouble| Failure::Broken { command: shown(&exchange.send), trouble })?;
            reply.messages.extend(got);
        }
        if let Some(call) = work.call.as_ref().filter(|call| has_fields(call)) {
            // A reply that cannot be read may be the reply to something else.
            reply.fields = dialect.parse(call, &reply.messages).map_err(|error| broken(Trouble::Garbled(error)))?;
        }
        if work.check_errors {
            let mut entries = self.drain_errors(dialect, work.caps, work.timeout).await.map_err(broken)?.into_iter();
            if let Some(first) = entries.next() {
                return Err(Failure::Refused { first, more: entries.len() });
            }
        }
        Ok(reply)
    }

    /// Takes the line that some instruments send by themselves on a new connection, where the protocol allows that.
    ///
    /// # Cancel safety
    /// Not safe, as [`Link::perform`].
    pub(super) async fn take_greeting(&mut self, caps: Caps, timeout: Duration) -> Result<(), Trouble> {
        if !W::GREETS {
            return Ok(());
        }
        let greeting = Exchange { send: Vec::new(), expect: Expect::Line, pause_after_s: 0.0 };
        self.exchange(&greeting, caps, 0, timeout).await.map(drop)
    }

    /// Reads the error queue until it is empty, at most [`MOST_ENTRIES`]. A dialect without one has none.
    ///
    /// # Cancel safety
    /// Not safe, as [`Link::perform`]; entries that were read are lost.
    pub(super) async fn drain_errors(
        &mut self,
        dialect: &Dialect,
        caps: Caps,
        timeout: Duration,
    ) -> Result<Vec<Entry>, Trouble> {
        let mut entries = Vec::new();
        let Some(query) = dialect.error_query() else { return Ok(entries) };
        while entries.len() < MOST_ENTRIES {
            let message = self.exchange(&query, caps, 0, timeout).await?;
            let Some(Message::Line(line)) = message else { break };
            match dialect.parse_error(&line).map_err(Trouble::Garbled)? {
                Some((number, text)) => entries.push(Entry { number, text }),
                None => break,
            }
        }
        Ok(entries)
    }

    /// One command and its reply, if it has one. The time counts from before the command is sent.
    async fn exchange(
        &mut self,
        exchange: &Exchange,
        caps: Caps,
        most_lead_bytes: usize,
        timeout: Duration,
    ) -> Result<Option<Message>, Trouble> {
        self.in_flight = true;
        let deadline = Instant::now() + timeout;
        let message = timeout_at(deadline, self.wire.converse(exchange, caps, most_lead_bytes))
            .await
            .map_err(|_elapsed| Trouble::Silent { command: shown(&exchange.send), after: timeout })??;
        if exchange.pause_after_s > 0.0 {
            // Some instruments lose what comes too soon after certain commands.
            let pause = Duration::try_from_secs_f64(exchange.pause_after_s).unwrap_or_default();
            tokio::time::sleep(pause).await;
        }
        self.wire.surplus()?;
        self.in_flight = false;
        Ok(message)
    }
}

/// Whether the dialect reads fields in the reply; samples are read later, with their preamble.
fn has_fields(call: &Call) -> bool {
    let spec = call.intent.spec();
    !spec.reply.is_empty() && spec.kind != IntentKind::Data
}
