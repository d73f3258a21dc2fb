//! Following a run's events: first what the store holds, then what comes, until the run has ended.

use evenpair_api::{Event, EventKind};
use tokio::sync::{mpsc, watch};
use tokio_stream::wrappers::ReceiverStream;
use uuid::Uuid;

use crate::store::Store;

/// How many events are read from the store at once and kept for a slow reader; a capture's event has some kilobytes.
const BATCH: u32 = 32;

/// The run's events after generation `after`. `live` is the run's generation while it has not ended.
///
/// The store is the only source, so a reader that was away, one that is slow, and one that comes after a restart all see
/// the same events in the same order.
pub(crate) fn follow(store: Store, run: Uuid, after: u64, live: Option<watch::Receiver<u64>>) -> ReceiverStream<Event> {
    let (sender, receiver) = mpsc::channel(BATCH as usize);
    tokio::spawn(async move {
        tokio::select! {
            () = sender.closed() => {}
            () = pump(&store, run, after, live, &sender) => {}
        }
    });
    ReceiverStream::new(receiver)
}

async fn pump(
    store: &Store,
    run: Uuid,
    mut after: u64,
    mut live: Option<watch::Receiver<u64>>,
    sender: &mpsc::Sender<Event>,
) {
    loop {
        let seen = live.as_mut().map(|live| *live.borrow_and_update());
        let batch = match store.events(run, after, BATCH).await {
            Ok(batch) => batch,
            Err(error) => return tracing::error!(%run, %error, "reading the events of a run"),
        };
        let caught_up = batch.is_empty();
        for event in batch {
            after = event.generation;
            let last = matches!(&event.kind, EventKind::StateChanged { state, .. } if state.ended());
            if sender.send(event).await.is_err() || last {
                return;
            }
        }
        if caught_up {
            match &mut live {
                // Everything up to `seen` was read; wait for more. An error says that the run is gone.
                Some(receiver) if seen.is_some() => {
                    if receiver.changed().await.is_err() {
                        live = None;
                    }
                }
                _ => return,
            }
        }
    }
}
