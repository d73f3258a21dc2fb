//! Sessions against an instrument made by hand: in-memory pipes and a clock that stands still.
//!
//! The test plays the instrument: it says what it hears and what it answers, so that each byte and each moment is
//! under its control. No time passes unless every task waits; then the clock jumps to the next thing that is due.

#![allow(clippy::unwrap_used)]

mod hislip;
mod life;
mod mean;
mod one_client;
mod repair;
mod timing;
mod wire;

use std::io;
use std::sync::atomic::{AtomicBool, Ordering};
use std::sync::{Arc, Mutex};
use std::time::Duration;

use evenpair_core::dialect::{Call, Dialect, Fields, Intent, bundled};
use tokio::io::{AsyncBufReadExt, AsyncRead, AsyncReadExt, AsyncWrite, AsyncWriteExt, BufReader, DuplexStream, duplex};
use tokio::sync::mpsc;
use tokio::task::JoinHandle;
use tokio::time::Instant;
use tokio_util::sync::CancellationToken;
use tokio_util::task::TaskTracker;

use super::codec::CodecError;
use super::error::Trouble;
use super::*;

/// The time that a reply may take in these tests.
const REPLY: Duration = Duration::from_millis(1000);
const MS: Duration = Duration::from_millis(1);
const WHO: &str = "Greenhouse,Fan bench,7,1.0";

/// A session and the far ends of the connections that it makes.
struct Bench {
    handle: Handle,
    token: CancellationToken,
    tracker: TaskTracker,
    peers: mpsc::UnboundedReceiver<DuplexStream>,
    open: Arc<AtomicBool>,
    attempts: Arc<Mutex<Vec<Instant>>>,
}

struct Pipes {
    peers: mpsc::UnboundedSender<DuplexStream>,
    open: Arc<AtomicBool>,
    attempts: Arc<Mutex<Vec<Instant>>>,
}

impl Connect for Pipes {
    type Stream = DuplexStream;

    async fn connect(&mut self) -> io::Result<DuplexStream> {
        self.attempts.lock().unwrap().push(Instant::now());
        if !self.open.load(Ordering::SeqCst) {
            return Err(io::Error::new(io::ErrorKind::ConnectionRefused, "nobody listens"));
        }
        let (ours, theirs) = duplex(1 << 16);
        self.peers.send(theirs).map_err(|_| io::Error::other("the test is over"))?;
        Ok(ours)
    }

    fn place(&self) -> String {
        "fan:5025".to_owned()
    }
}

impl Bench {
    fn new() -> Self {
        Self::with(bundled("scpi-99").unwrap())
    }

    fn with(dialect: &str) -> Self {
        Self::speaking(Protocol::Socket, dialect)
    }

    fn speaking(protocol: Protocol, dialect: &str) -> Self {
        let (sender, peers) = mpsc::unbounded_channel();
        let (open, attempts) = (Arc::new(AtomicBool::new(true)), Arc::default());
        let (token, tracker) = (CancellationToken::new(), TaskTracker::new());
        let spec = SessionSpec {
            instrument: "supply".to_owned(),
            host: "fan".to_owned(),
            port: 5025,
            protocol,
            dialect: Arc::new(Dialect::read(dialect).unwrap()),
            timing: Timing { reply: REPLY, ..Timing::default() },
            caps: Caps::default(),
        };
        let pipes = Pipes { peers: sender, open: Arc::clone(&open), attempts: Arc::clone(&attempts) };
        let handle = spawn_with(spec, pipes, token.clone(), &tracker);
        tracker.close();
        Self { handle, token, tracker, peers, open, attempts }
    }

    /// A session that is up, and its instrument.
    async fn up() -> (Self, Peer) {
        let mut bench = Self::new();
        let peer = bench.greeted().await;
        (bench, peer)
    }

    /// The next connection that the session makes.
    async fn peer(&mut self) -> Peer {
        Peer { stream: BufReader::new(in_time(self.peers.recv()).await.unwrap()) }
    }

    /// The next connection, with everything that comes first on it, when nothing had been set.
    async fn greeted(&mut self) -> Peer {
        let mut peer = self.peer().await;
        peer.greet().await;
        self.is_up().await;
        peer
    }

    async fn is_up(&self) {
        self.handle.watch().wait_for(|report| report.up).await.unwrap();
    }

    /// Makes the call in a task of its own.
    fn call(&self, call: Call) -> JoinHandle<Result<Fields, SessionError>> {
        let handle = self.handle.clone();
        tokio::spawn(async move { handle.call(call).await })
    }
}

/// The instrument's end of a connection.
struct Peer<S = DuplexStream> {
    stream: BufReader<S>,
}

impl<S: AsyncRead + AsyncWrite + Unpin> Peer<S> {
    /// The next line that arrives must be this one.
    async fn hear(&mut self, line: &str) {
        let mut heard = String::new();
        in_time(self.stream.read_line(&mut heard)).await.unwrap();
        assert_eq!(heard, format!("{line}\n"));
    }

    async fn say(&mut self, bytes: impl AsRef<[u8]>) {
        self.stream.get_mut().write_all(bytes.as_ref()).await.unwrap();
    }

    async fn asked_for_errors(&mut self, answer: &str) {
        self.hear("SYSTem:ERRor?").await;
        self.say(format!("{answer}\n")).await;
    }

    async fn no_errors(&mut self) {
        self.asked_for_errors("0,\"No error\"").await;
    }

    async fn greet(&mut self) {
        self.hear("*IDN?").await;
        self.say(format!("{WHO}\n")).await;
        self.no_errors().await;
        self.hear("*CLS").await;
    }

    /// The session must close the connection without having sent anything more.
    async fn closed(&mut self) {
        let mut rest = String::new();
        in_time(self.stream.read_to_string(&mut rest)).await.unwrap();
        assert_eq!(rest, "");
    }
}

/// A test that waits for what never comes fails instead of standing still: no session is patient for a minute.
async fn in_time<F: Future>(awaited: F) -> F::Output {
    tokio::time::timeout(Duration::from_secs(60), awaited).await.unwrap()
}

fn measure() -> Call {
    Call::new(Intent::MeasureVoltage).with("channel", 1_i64)
}

const MEASURE: &str = "MEASure1:VOLTage?";

fn output(state: bool) -> Call {
    Call::new(Intent::OutputSet).with("channel", 1_i64).with("state", state)
}

fn value(fields: &Fields) -> i64 {
    fields.whole("value").unwrap()
}
