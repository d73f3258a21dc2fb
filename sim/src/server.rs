//! Connections: bytes to a device and its replies back, as plain text or in HiSLIP messages.

mod hislip;

use std::io;
use std::sync::Arc;
use std::time::Duration;

use tokio::io::{AsyncRead, AsyncReadExt, AsyncWrite, AsyncWriteExt};
use tokio::net::TcpListener;
use tokio::sync::Semaphore;

use crate::instrument::Device;
use crate::message::{Arrival, Input};
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
        tracing::debug!(instrument = name, %peer, "connected");
        let (device, hislip, name) = (Arc::clone(&device), Arc::clone(&hislip), name.clone());
        tokio::spawn(async move {
            let outcome = match protocol {
                Protocol::Hislip => hislip.converse(stream).await,
                Protocol::Socket => converse(stream, &device).await,
            };
            match outcome {
                Ok(()) => tracing::debug!(instrument = name, %peer, "disconnected"),
                Err(error) => tracing::debug!(instrument = name, %peer, %error, "connection lost"),
            }
            drop(place);
        });
    }
}

/// Carries out the messages of one connection, one after the other, until the peer closes it. A message that the peer did
/// not finish is dropped. While `*OPC?` or `*WAI` waits nothing is read.
///
/// # Errors
/// When reading or writing fails.
pub(crate) async fn converse(mut stream: impl AsyncRead + AsyncWrite + Unpin, device: &Device) -> io::Result<()> {
    let mut input = Input::default();
    let mut buffer = vec![0; 16 * 1024];
    loop {
        let count = stream.read(&mut buffer).await?;
        if count == 0 {
            return Ok(());
        }
        for arrival in input.push(buffer.get(..count).unwrap_or_default()) {
            match arrival {
                Arrival::Message(message) => {
                    let reply = device.run(&message).await;
                    stream.write_all(&reply).await?;
                }
                Arrival::Overrun => device.overrun(),
            }
        }
    }
}

#[cfg(test)]
mod tests;
