//! Listening: connections to a device, each a task of its own, as plain text or in HiSLIP messages.

mod hislip;

use std::sync::Arc;
use std::time::Duration;

use tokio::net::TcpListener;
use tokio::sync::Semaphore;

use crate::instrument::Device;
use crate::link::converse;
use crate::scenario::Protocol;

pub(crate) use hislip::SUB_ADDRESS;

/// Connections that an instrument takes at once; more wait. Plenty for a bench, and a bound on what strangers can cost.
const MOST_CONNECTIONS: usize = 32;
/// Pause after a failed accept, which happens when the process is out of file descriptors.
const ACCEPT_PAUSE: Duration = Duration::from_millis(50);

/// Serves an instrument until the task is dropped.
pub(crate) async fn serve(listener: TcpListener, device: Arc<Device>, protocol: Protocol, name: String) {
    let hislip = Arc::new(hislip::Server::new(Arc::clone(&device)));
    let places = Arc::new(Semaphore::new(MOST_CONNECTIONS));
    loop {
        // Never closed, so a place always comes.
        let Ok(place) = Arc::clone(&places).acquire_owned().await else { return };
        let (stream, peer) = match listener.accept().await {
            Ok(accepted) => accepted,
            Err(error) => {
                tracing::warn!(instrument = name, %error, "no connection could be accepted");
                tokio::time::sleep(ACCEPT_PAUSE).await;
                continue;
            }
        };
        // Replies are whole messages: waiting for more to send only delays them.
        if let Err(error) = stream.set_nodelay(true) {
            tracing::debug!(instrument = name, %error, "replies may be delayed");
        }
        let Some(guest) = device.admit() else {
            tracing::debug!(instrument = name, %peer, "turned away");
            continue;
        };
        tracing::debug!(instrument = name, %peer, "connected");
        let (device, hislip, name) = (Arc::clone(&device), Arc::clone(&hislip), name.clone());
        tokio::spawn(async move {
            let mut life = device.life();
            let outcome = match protocol {
                Protocol::Hislip => tokio::select! {
                    done = hislip.converse(stream) => done,
                    _ = life.changed() => Ok(()),
                },
                Protocol::Socket => converse(stream, &device).await,
            };
            match outcome {
                Ok(()) => tracing::debug!(instrument = name, %peer, "disconnected"),
                Err(error) => tracing::debug!(instrument = name, %peer, %error, "connection lost"),
            }
            drop((guest, place));
        });
    }
}

#[cfg(test)]
mod tests;
