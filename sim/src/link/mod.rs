//! One connection: bytes to a device and its replies back, with whatever faults strike them.

mod pace;
#[cfg(test)]
mod tests;

use std::io;

use tokio::io::{AsyncRead, AsyncWrite, AsyncWriteExt};

use self::pace::Pace;
use crate::faults::wire::{self, Piece};
use crate::instrument::Device;
use crate::message::{Arrival, Input};

/// Carries out the messages of one connection, one after the other, until the peer closes it or the device is switched
/// off. A message that the peer did not finish is dropped. While a reply waits for an acquisition nothing is read.
///
/// # Errors
/// When reading or writing fails.
pub(crate) async fn converse(stream: impl AsyncRead + AsyncWrite + Unpin, device: &Device) -> io::Result<()> {
    let mut life = device.life();
    tokio::select! {
        done = talk(stream, device) => done,
        _ = life.changed() => Ok(()),
    }
}

async fn talk(mut stream: impl AsyncRead + AsyncWrite + Unpin, device: &Device) -> io::Result<()> {
    let mut input = Input::default();
    let mut pace = Pace::new(device.deafness());
    let mut buffer = vec![0; 16 * 1024];
    let mut late = Vec::new();
    stream.write_all(&device.greeting()).await?;
    loop {
        let count = pace.read(&mut stream, &mut buffer).await?;
        if count == 0 {
            return Ok(());
        }
        for arrival in input.push(buffer.get(..count).unwrap_or_default()) {
            match arrival {
                Arrival::Message(message) if !pace.hears() => {
                    tracing::debug!(message = %String::from_utf8_lossy(&message), "lost, it came too soon");
                }
                Arrival::Message(message) => {
                    let reply = device.run(&message).await;
                    if reply.is_empty() {
                        continue;
                    }
                    late.append(&mut device.faults().take_late());
                    stream.write_all(&std::mem::take(&mut late)).await?;
                    let struck = device.faults().reply(&message, &reply);
                    for piece in wire::pieces(&struck, reply) {
                        match piece {
                            Piece::Bytes(bytes) => stream.write_all(&bytes).await?,
                            Piece::Close => return Ok(()),
                            Piece::Keep { bytes, across: true } => device.faults().keep(&bytes),
                            Piece::Keep { bytes, across: false } => late = bytes,
                            Piece::Overflow => device.overflow(),
                            Piece::Pause(pause) => tokio::time::sleep(pause).await,
                            Piece::Reboot => {
                                device.reboot();
                                return Ok(());
                            }
                            // Whoever sent it keeps the reply.
                            Piece::Run(message) => drop(device.run(&message).await),
                        }
                    }
                }
                Arrival::Overrun => device.overrun(),
            }
        }
    }
}
