//! The control port: text lines by which faults are armed and what has struck is told.
//!
//! Each line that is sent is answered by any number of lines and then one that begins with `ok` or `error`.

mod command;
#[cfg(test)]
mod tests;

use std::collections::BTreeMap;
use std::sync::Arc;

use tokio::io::{AsyncBufReadExt, AsyncRead, AsyncReadExt, AsyncWrite, AsyncWriteExt, BufReader};
use tokio::net::TcpListener;

use crate::instrument::{Bench, Device};
use crate::scenario::Scenario;

/// Longest line taken, in bytes: far more than a fault takes.
const LONGEST_LINE: u64 = 16 * 1024;

/// What the control port acts on.
pub(crate) struct Control {
    scenario: Scenario,
    bench: Arc<Bench>,
    devices: BTreeMap<String, Arc<Device>>,
}

impl Control {
    /// A control port for the instruments of a bench.
    pub(crate) fn new(scenario: &Scenario, bench: Arc<Bench>, devices: BTreeMap<String, Arc<Device>>) -> Self {
        Self { scenario: scenario.clone(), bench, devices }
    }
}

/// Serves the control port until the task is dropped.
pub(crate) async fn serve(listener: TcpListener, control: Control) {
    let control = Arc::new(control);
    while let Ok((stream, peer)) = listener.accept().await {
        let control = Arc::clone(&control);
        tokio::spawn(async move {
            if let Err(error) = talk(stream, &control).await {
                tracing::debug!(%peer, %error, "the control connection is lost");
            }
        });
    }
}

async fn talk(stream: impl AsyncRead + AsyncWrite + Unpin, control: &Control) -> std::io::Result<()> {
    let mut stream = BufReader::new(stream);
    loop {
        let mut line = Vec::new();
        (&mut stream).take(LONGEST_LINE).read_until(b'\n', &mut line).await?;
        if !line.ends_with(b"\n") {
            // The end, or a line that is no line.
            return Ok(());
        }
        let answer = control.answer(String::from_utf8_lossy(&line).trim());
        stream.write_all(answer.as_bytes()).await?;
        stream.flush().await?;
    }
}
