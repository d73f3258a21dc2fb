//! HiSLIP: the core's state machine ([`Client`]) between two connections.

mod pieces;
mod reply;

use std::future::poll_fn;
use std::task::Poll;

use evenpair_core::dialect::{Exchange, Expect, Message};
use evenpair_core::scpi::frame::{Limits, Want};
use evenpair_core::scpi::hislip::{Channel, Client, Event, Piece};
use futures_util::{SinkExt, StreamExt};
use tokio::io::{AsyncRead, AsyncWrite};
use tokio_util::codec::Framed;

use self::pieces::{Came, Pieces};
use super::codec::CodecError;
use super::connect::Connect;
use super::error::Trouble;
use super::plain::unconnected;
use super::spec::Caps;
use super::wire::{Open, Wire, part};

/// Opens HiSLIP connections to one sub-address.
#[derive(Debug)]
pub(super) struct OpenHislip<C> {
    connector: C,
    device: String,
}

impl<C: Connect> OpenHislip<C> {
    pub(super) fn new(connector: C, device: String) -> Self {
        Self { connector, device }
    }
}

impl<C: Connect> Open for OpenHislip<C> {
    type Wire = Hislip<C::Stream>;

    async fn open(&mut self) -> Result<Self::Wire, Trouble> {
        let stream = self.connector.connect().await.map_err(|error| unconnected(&self.connector, &error))?;
        let client = Client::new(&self.device);
        let mut wire = Hislip { client, sync: Framed::new(stream, Pieces::default()), r#async: None };
        loop {
            match wire.event().await? {
                Event::OpenAsync => {
                    let stream = self.connector.connect().await;
                    let stream = stream.map_err(|error| unconnected(&self.connector, &error))?;
                    wire.r#async = Some(Framed::new(stream, Pieces::default()));
                }
                Event::Ready => return Ok(wire),
                other => note(&other),
            }
        }
    }

    fn place(&self) -> String {
        format!("{} ({})", self.connector.place(), self.device)
    }
}

/// A HiSLIP connection.
#[derive(Debug)]
pub(super) struct Hislip<S> {
    client: Client,
    sync: Framed<S, Pieces>,
    /// Made second.
    r#async: Option<Framed<S, Pieces>>,
}

impl<S: AsyncRead + AsyncWrite + Send + Unpin + 'static> Hislip<S> {
    /// Waits for the next event on either connection, while what waits to be sent goes out.
    ///
    /// # Cancel safety
    /// Safe: what was read stays with the client, what was to be sent waits in the connections' buffers.
    async fn event(&mut self) -> Result<Event, Trouble> {
        loop {
            self.post();
            let (channel, came) = self.came().await?;
            let taken = match &came {
                Came::Head(header) => self.client.take(channel, Piece::Head(*header)),
                Came::Payload { bytes, last } => self.client.take(channel, Piece::Payload { bytes, last: *last }),
            };
            if let Some(event) = taken? {
                return Ok(event);
            }
        }
    }

    /// Moves what the client wants sent into the connections' buffers, whole messages at a time: one that were cut by a
    /// caller that goes away would leave nothing behind that could be cleared.
    fn post(&mut self) {
        while let Some((channel, bytes)) = self.client.next_output() {
            match (channel, &mut self.r#async) {
                (Channel::Sync, _) => self.sync.write_buffer_mut().extend_from_slice(&bytes),
                (Channel::Async, Some(framed)) => framed.write_buffer_mut().extend_from_slice(&bytes),
                // The client says nothing over it before it has asked for it, and then it is made before anything else.
                (Channel::Async, None) => {}
            }
        }
    }

    /// The next piece from either connection, the asynchronous one first: it is there to overtake.
    async fn came(&mut self) -> Result<(Channel, Came), Trouble> {
        let (sync, mut other) = (&mut self.sync, self.r#async.as_mut());
        let (channel, came) = poll_fn(|context| {
            if let Some(framed) = &mut other
                && let Poll::Ready(came) = framed.poll_next_unpin(context)
            {
                return Poll::Ready((Channel::Async, came.unwrap_or(Err(Trouble::PeerClosed))));
            }
            if let Poll::Ready(came) = sync.poll_next_unpin(context) {
                return Poll::Ready((Channel::Sync, came.unwrap_or(Err(Trouble::PeerClosed))));
            }
            // Both are written to while both are read: neither a full pipe nor a busy instrument stops the other.
            if let Poll::Ready(Err(error)) = sync.poll_flush_unpin(context) {
                return Poll::Ready((Channel::Sync, Err(error)));
            }
            if let Some(framed) = &mut other
                && let Poll::Ready(Err(error)) = framed.poll_flush_unpin(context)
            {
                return Poll::Ready((Channel::Async, Err(error)));
            }
            Poll::Pending
        })
        .await;
        Ok((channel, came?))
    }
}

impl<S: AsyncRead + AsyncWrite + Send + Unpin + 'static> Wire for Hislip<S> {
    /// Nothing comes on a HiSLIP connection without a request.
    const GREETS: bool = false;

    async fn converse(
        &mut self,
        exchange: &Exchange,
        caps: Caps,
        most_lead_bytes: usize,
    ) -> Result<Option<Message>, Trouble> {
        let limits = Limits { most_line_bytes: caps.line_bytes, most_lead_bytes };
        let want = match exchange.expect {
            Expect::Nothing => {
                self.client.request(&exchange.send, None)?;
                self.post();
                self.sync.flush().await?;
                return Ok(None);
            }
            Expect::Line => Want::Line,
            Expect::Block => Want::Block { most_bytes: caps.block_bytes },
        };
        self.client.request(&exchange.send, Some(reply::most_bytes(want, &limits)))?;
        loop {
            match self.event().await? {
                Event::Reply(bytes) => return Ok(Some(reply::read(bytes, want, &limits)?)),
                other => note(&other),
            }
        }
    }

    /// A reply carries the number of its request: what comes after it makes it no less certain.
    fn surplus(&self) -> Result<(), Trouble> {
        Ok(())
    }

    async fn idle(&mut self) -> Trouble {
        loop {
            match self.event().await {
                Ok(event) => note(&event),
                Err(trouble) => return trouble,
            }
        }
    }

    /// As long as messages can be told from each other.
    fn clears_after(&self, trouble: &Trouble) -> bool {
        let whole = match trouble {
            Trouble::Abandoned | Trouble::Garbled(_) | Trouble::Silent { .. } => true,
            Trouble::Codec(error) => !matches!(error, CodecError::Io { .. }),
            Trouble::Hislip(fault) => fault.curable(),
            Trouble::Connect { .. }
            | Trouble::Greeting(_)
            | Trouble::NotRestored { .. }
            | Trouble::PeerClosed
            | Trouble::Stranger { .. } => false,
        };
        whole && self.client.ready()
    }

    async fn clear(&mut self) -> Result<(), Trouble> {
        self.client.clear()?;
        loop {
            match self.event().await? {
                Event::Cleared => return Ok(()),
                other => note(&other),
            }
        }
    }

    async fn leave(self) {
        drop(self.r#async);
        part(self.sync.into_inner()).await;
    }
}

/// What happens beside the request under way: nothing here acts on it, and it changes nothing.
fn note(event: &Event) {
    match event {
        Event::ServiceRequest(status) => tracing::debug!(status, "the instrument asks for service"),
        Event::Stale { id } => tracing::info!("a late reply to message {id:#010x} was thrown away"),
        other => tracing::debug!(?other, "not awaited"),
    }
}
