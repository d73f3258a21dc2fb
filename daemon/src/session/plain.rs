//! Text on one connection: replies end with a line and carry no mark of the query that they belong to.

use evenpair_core::dialect::{Exchange, Expect, Message};
use evenpair_core::scpi::frame::{Limits, Want};
use futures_util::{SinkExt, StreamExt};
use tokio::io::{AsyncRead, AsyncWrite};
use tokio_util::codec::Framed;

use super::codec::{Codec, CodecError};
use super::connect::Connect;
use super::error::{Trouble, shown};
use super::spec::Caps;
use super::wire::{Open, Wire, part};

/// A raw socket.
#[derive(Debug)]
pub(super) struct Plain<S>(Framed<S, Codec>);

/// Opens raw sockets.
#[derive(Debug)]
pub(super) struct OpenPlain<C>(pub(super) C);

impl<C: Connect> Open for OpenPlain<C> {
    type Wire = Plain<C::Stream>;

    async fn open(&mut self) -> Result<Self::Wire, Trouble> {
        let stream = self.0.connect().await.map_err(|error| unconnected(&self.0, &error))?;
        Ok(Plain(Framed::new(stream, Codec::new())))
    }

    fn place(&self) -> String {
        self.0.place()
    }
}

/// The system would not connect.
pub(super) fn unconnected(connector: &impl Connect, error: &std::io::Error) -> Trouble {
    Trouble::Connect { place: connector.place(), reason: error.to_string() }
}

impl<S: AsyncRead + AsyncWrite + Send + Unpin + 'static> Wire for Plain<S> {
    const GREETS: bool = true;

    async fn converse(
        &mut self,
        exchange: &Exchange,
        caps: Caps,
        most_lead_bytes: usize,
    ) -> Result<Option<Message>, Trouble> {
        let limits = Limits { most_line_bytes: caps.line_bytes, most_lead_bytes };
        match exchange.expect {
            Expect::Nothing => {}
            Expect::Line => self.0.codec_mut().await_one(Want::Line, limits),
            Expect::Block => self.0.codec_mut().await_one(Want::Block { most_bytes: caps.block_bytes }, limits),
        }
        self.0.send(exchange.send.as_slice()).await?;
        match exchange.expect {
            Expect::Nothing => Ok(None),
            Expect::Line | Expect::Block => match self.0.next().await {
                Some(Ok(message)) => Ok(Some(message)),
                other => Err(trouble_of(other)),
            },
        }
    }

    /// More than was asked for means that the reply just taken may be an older one.
    fn surplus(&self) -> Result<(), Trouble> {
        match self.0.read_buffer() {
            rest if rest.is_empty() => Ok(()),
            rest => Err(CodecError::Unsolicited { shown: shown(rest) }.into()),
        }
    }

    async fn idle(&mut self) -> Trouble {
        trouble_of(self.0.next().await)
    }

    /// A raw socket has nothing of the kind.
    fn clears_after(&self, _trouble: &Trouble) -> bool {
        false
    }

    async fn clear(&mut self) -> Result<(), Trouble> {
        Err(Trouble::Abandoned)
    }

    async fn leave(self) {
        part(self.0.into_inner()).await;
    }
}

/// What an event on a link means while nothing is awaited.
fn trouble_of(event: Option<Result<Message, CodecError>>) -> Trouble {
    match event {
        None => Trouble::PeerClosed,
        Some(Err(error)) => error.into(),
        // The codec gives no message that was not awaited; if it did, that would be this.
        Some(Ok(Message::Line(line))) => CodecError::Unsolicited { shown: shown(line.as_bytes()) }.into(),
        Some(Ok(Message::Block(block))) => CodecError::Unsolicited { shown: shown(&block) }.into(),
    }
}
