//! Instruments that behave badly: one that never answers, one that answers nonsense, one that writes everything down.

use std::sync::{Arc, Mutex};

use tokio::io::{AsyncBufReadExt, AsyncReadExt, AsyncWriteExt, BufReader};
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

    /// Answers every question by a word that may be its answer, and writes every line down.
    ///
    /// # Panics
    /// When there is no free port.
    pub async fn recording() -> (Self, Arc<Mutex<Vec<String>>>) {
        let listener = TcpListener::bind("127.0.0.1:0").await.expect("a free port");
        let port = listener.local_addr().expect("a bound port").port();
        let heard: Arc<Mutex<Vec<String>>> = Arc::default();
        let written = Arc::clone(&heard);
        let task = tokio::spawn(async move {
            while let Ok((stream, _)) = listener.accept().await {
                tokio::spawn(record(stream, Arc::clone(&written)));
            }
        });
        (Self { resource: format!("TCPIP::127.0.0.1::{port}::SOCKET"), task }, heard)
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

async fn record(stream: TcpStream, heard: Arc<Mutex<Vec<String>>>) {
    let mut stream = BufReader::new(stream);
    let mut line = Vec::new();
    while stream.read_until(b'\n', &mut line).await.is_ok_and(|count| count > 0) {
        let text = String::from_utf8_lossy(&line).trim_end_matches('\n').to_owned();
        let reply = match text.to_ascii_uppercase() {
            asked if asked.contains("ERR") => "0,\"No error\"\n",
            asked if asked.contains('?') => "1\n",
            _ => "",
        };
        heard.lock().unwrap_or_else(std::sync::PoisonError::into_inner).push(text);
        line.clear();
        if stream.get_mut().write_all(reply.as_bytes()).await.is_err() {
            return;
        }
    }
}
