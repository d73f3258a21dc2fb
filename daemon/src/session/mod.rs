//! Sessions: one task per instrument that owns its connection.
//!
//! SCPI replies carry no mark of the query they belong to. So one request is in flight at a time, and a link on which
//! anything went wrong (a reply not in time, a malformed one, bytes that nobody asked for, a caller that went away in
//! the middle) is *poisoned*: it is closed, made anew, the instrument is asked who it is, its error queue is emptied,
//! and the settings that had been made are made again. A late reply can so never be taken for the next query's.
//!
//! Queries and settings are then tried once more by themselves; what has an effect of its own is not, for nobody
//! knows whether it took effect.
//!
//! Over HiSLIP replies do carry a mark, and a *device clear* empties the connection in both directions. There a poisoned
//! link is cleared, the instrument asked who it is and its error queue emptied; only if that fails is it closed too.
//!
//! The floors of it, from below: [`plain`] and [`hislip`] are the two kinds of [`wire`], [`link`] is one connection,
//! [`greet`] is what happens first on a new one, [`memory`] holds what was set, [`task`] repairs and repeats,
//! [`Handle`] asks.

mod codec;
mod connect;
mod error;
mod greet;
mod handle;
mod hislip;
mod link;
mod memory;
mod plain;
mod spec;
mod task;
mod wire;

pub(crate) use error::SessionError;
pub(crate) use handle::{Handle, LinkReport};
pub(crate) use spec::{Caps, Protocol, SessionSpec, Timing, place_of};

use connect::{Connect, Tcp};
use handle::Shared;
use hislip::OpenHislip;
use plain::OpenPlain;
use tokio::sync::{mpsc, watch};
use tokio_util::sync::CancellationToken;
use tokio_util::task::TaskTracker;

/// How many requests may wait for one instrument. One run, a person's look and a check of health are three; that many
/// more mean that something asks without waiting for answers, and an early error is better than a late reply.
pub(crate) const QUEUE: usize = 8;

/// Starts a session over TCP, in whichever protocol. It connects by itself, at once and whenever the connection is lost, until `token` is
/// cancelled or the last handle is dropped; `tracker` waits for its end.
pub(crate) fn spawn(spec: SessionSpec, token: CancellationToken, tracker: &TaskTracker) -> Handle {
    let connector = Tcp { host: spec.host.clone(), port: spec.port };
    spawn_with(spec, connector, token, tracker)
}

/// As [`spawn`], with connections from elsewhere.
pub(crate) fn spawn_with<C: Connect>(
    spec: SessionSpec,
    connector: C,
    token: CancellationToken,
    tracker: &TaskTracker,
) -> Handle {
    let (sender, queue) = mpsc::channel(QUEUE);
    let (report, watch) = watch::channel(LinkReport::default());
    let shared = Shared {
        instrument: spec.instrument.clone(),
        dialect: spec.dialect.clone(),
        timing: spec.timing,
        caps: spec.caps,
    };
    match spec.protocol.clone() {
        Protocol::Hislip { device } => {
            let opener = OpenHislip::new(connector, device);
            tracker.spawn(task::Task::new(spec, opener, queue, report).run(token));
        }
        Protocol::Socket => {
            tracker.spawn(task::Task::new(spec, OpenPlain(connector), queue, report).run(token));
        }
    }
    Handle::new(shared, sender, watch)
}

#[cfg(test)]
mod tests;
