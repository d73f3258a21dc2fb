//! What carries messages to an instrument and its replies back, whatever the protocol.

use std::future::Future;

use evenpair_core::dialect::{Exchange, Message};
use tokio::io::{AsyncRead, AsyncReadExt, AsyncWrite, AsyncWriteExt};

use super::error::Trouble;
use super::spec::Caps;

/// An open connection, or two that belong together.
pub(super) trait Wire: Send + 'static {
    /// Whether an instrument may say something by itself when the connection is new.
    const GREETS: bool;

    /// Says what the exchange says and awaits its reply, if it has one. `most_lead_bytes` is how much text may stand
    /// before a block.
    ///
    /// # Cancel safety
    /// When it is dropped, [`Wire::clear`] must come next, or the end of the connection.
    fn converse(
        &mut self,
        exchange: &Exchange,
        caps: Caps,
        most_lead_bytes: usize,
    ) -> impl Future<Output = Result<Option<Message>, Trouble>> + Send;

    /// Looks, without reading on, whether more came than the reply just taken, where that makes the reply doubtful.
    fn surplus(&self) -> Result<(), Trouble>;

    /// Waits until something happens that nobody asked for and that ends the trust in the connection.
    ///
    /// # Cancel safety
    /// Safe: nothing that was read is lost.
    fn idle(&mut self) -> impl Future<Output = Trouble> + Send;

    /// Whether [`Wire::clear`] may help after this trouble.
    fn clears_after(&self, trouble: &Trouble) -> bool;

    /// Has the instrument forget what is under way, and takes everything off the connection that was said before.
    ///
    /// # Cancel safety
    /// When it is dropped, the connection must be closed.
    fn clear(&mut self) -> impl Future<Output = Result<(), Trouble>> + Send;

    /// Hangs up, and waits until the other end has done so too.
    ///
    /// # Cancel safety
    /// Safe: dropping it closes the connection at once.
    fn leave(self) -> impl Future<Output = ()> + Send;
}

/// Closes a stream and waits until the other end has closed it too. Whatever still comes belongs to nobody.
pub(super) async fn part<S: AsyncRead + AsyncWrite + Unpin>(mut stream: S) {
    let mut scrap = [0; 4096];
    if stream.shutdown().await.is_ok() {
        // A connection that broke is gone already.
        while stream.read(&mut scrap).await.is_ok_and(|read| read > 0) {}
    }
}

/// Opens wires, one after another.
pub(super) trait Open: Send + 'static {
    /// What it opens.
    type Wire: Wire;

    /// Opens one; the session bounds how long that may take.
    ///
    /// # Cancel safety
    /// Dropping the future gives the attempt up and leaves nothing open.
    fn open(&mut self) -> impl Future<Output = Result<Self::Wire, Trouble>> + Send;

    /// Where to, for errors.
    fn place(&self) -> String;
}
