//! Instruments that behave badly: one that never answers, one that answers nonsense.

use tokio::io::{AsyncReadExt, AsyncWriteExt};
use tokio::net::{TcpListener, TcpStream};
use tokio::task::JoinHandle;

/// An instrument that behaves badly, on a free port of its own; gone when dropped.
#[derive(Debug)]
pub struct Fake {
    /// Its VISA resource string.
    pub resource: String,
    task: JoinHandle<()>,
}

impl Fake {
    /// Takes connections and reads, but never says a word.
    pub async fn silent() -> Self {
        Self::serve(b"").await
    }

    /// Answers every message with `reply`.
    pub async fn saying(reply: &'static [u8]) -> Self {
        Self::serve(reply).await
    }

    async fn serve(reply: &'static [u8]) -> Self {
        let listener = TcpListener::bind("127.0.0.1:0").await.expect("a free port");
        let port = listener.local_addr().expect("a bound port").port();
        let task = tokio::spawn(async move {
            while let Ok((stream, _)) = listener.accept().await {
                tokio::spawn(converse(stream, reply));
            }
        });
        Self { resource: format!("TCPIP::127.0.0.1::{port}::SOCKET"), task }
    }

    /// The resource string of a port that nothing listens on.
    pub async fn nobody() -> String {
        let listener = TcpListener::bind("127.0.0.1:0").await.expect("a free port");
        let port = listener.local_addr().expect("a bound port").port();
        format!("TCPIP::127.0.0.1::{port}::SOCKET")
    }
}

impl Drop for Fake {
    fn drop(&mut self) {
        self.task.abort();
    }
}

async fn converse(mut stream: TcpStream, reply: &'static [u8]) {
    let mut buffer = [0; 4096];
    while let Ok(count) = stream.read(&mut buffer).await {
        if count == 0 || (!reply.is_empty() && stream.write_all(reply).await.is_err()) {
            return;
        }
    }
}
