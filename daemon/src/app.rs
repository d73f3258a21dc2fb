//! Start order, shutdown order, signals: once, everything ends in order; twice, at once.
//!
//! Up: bench file and dialects, store, sessions, conductor, HTTP. Down: no new requests, runs end and the bench goes to
//! its safe state, streams and requests drain, sessions end, the store closes. Each step has a deadline.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};
use std::sync::Arc;
use std::time::Duration;

use evenpair_core::bench::{self, Bench};
use evenpair_core::dialect::Dialect;
use tokio_util::sync::CancellationToken;
use tokio_util::task::TaskTracker;

use crate::arguments::Arguments;
use crate::clock::RealClock;
use crate::conductor::{Conductor, Instruments, Refusal, Workshop};
use crate::dialects::{self, DialectTrouble};
use crate::endings::Endings;
use crate::http;
use crate::mistakes;
use crate::session::{self, Caps, SessionSpec, Timing, place_of};
use crate::store::{Store, StoreError};

/// The longest that runs may take to end and the bench to come to rest.
const REST_WITHIN: Duration = Duration::from_secs(25);

/// The longest that requests which were accepted may take to be answered.
const DRAIN_WITHIN: Duration = Duration::from_secs(3);

/// Why the daemon does not start.
#[derive(Debug, thiserror::Error)]
pub(crate) enum StartError {
    #[error("{}: {count} mistake(s) in the bench file, shown above; nothing was started", path.display())]
    Bench { path: PathBuf, count: usize },
    #[error(transparent)]
    Conductor(#[from] Refusal),
    #[error(transparent)]
    Dialect(#[from] DialectTrouble),
    #[error("listening on {address}: {source}; is another daemon there? choose another address with --listen")]
    Listen { address: std::net::SocketAddr, source: std::io::Error },
    #[error(
        "{address} is not a loopback address; the daemon listens on loopback only, since whoever reaches it drives the bench"
    )]
    NotLoopback { address: std::net::SocketAddr },
    #[error("reading {}: {source}", path.display())]
    Read { path: PathBuf, source: std::io::Error },
    #[error(
        "the instrument `{instrument}` is at {resource}; this daemon speaks to `TCPIP::host::port::SOCKET` and \
         `TCPIP::host::hislip0::INSTR` only"
    )]
    Resource { instrument: String, resource: String },
    #[error("serving HTTP: {0}")]
    Serve(std::io::Error),
    #[error("waiting for signals: {0}")]
    Signals(std::io::Error),
    #[error(transparent)]
    Store(#[from] StoreError),
    #[error("the data folder {} does not keep its promises; see above", path.display())]
    Unsound { path: PathBuf },
}

/// Runs the daemon until it is told to end.
pub(crate) async fn serve(arguments: Arguments) -> Result<(), StartError> {
    if !arguments.listen.ip().is_loopback() {
        return Err(StartError::NotLoopback { address: arguments.listen });
    }
    // The command line asks for it.
    let data = arguments.data.clone().unwrap_or_default();
    let Some(bench_file) = &arguments.bench else { return check(&data).await };
    let mut endings = Endings::listen(arguments.exit_with_stdin).map_err(StartError::Signals)?;
    let bench = read_bench(bench_file)?;
    let dialects = dialects::read(&bench, bench_file)?;
    let sequences = bench.sequences.as_ref().map(|folder| beside(bench_file, folder));
    let store = open(&data).await?;
    let swept = store.swept();
    if swept.parts + swept.orphans > 0 {
        tracing::warn!(parts = swept.parts, orphans = swept.orphans, "swept up what a crash left in the data folder");
    }
    let listener = tokio::net::TcpListener::bind(arguments.listen)
        .await
        .map_err(|source| StartError::Listen { address: arguments.listen, source })?;
    let address = listener.local_addr().map_err(StartError::Serve)?;

    let sessions = TaskTracker::new();
    let hang_up = CancellationToken::new();
    let instruments = connect(&bench, &dialects, &hang_up, &sessions)?;
    let workshop =
        Workshop { bench: Arc::new(bench), instruments, store: store.clone(), clock: Arc::new(RealClock::new()) };
    let conductor = Conductor::begin(workshop, sequences).await?;

    let stop_serving = CancellationToken::new();
    let router = http::router(conductor.clone(), stop_serving.clone());
    let server = axum::serve(listener, router).with_graceful_shutdown(stop_serving.clone().cancelled_owned());
    let mut server = tokio::spawn(server.into_future());
    println!("listening on http://{address}");
    tracing::info!(%address, "listening");

    let why = tokio::select! {
        why = endings.first() => why,
        ended = &mut server => return Err(StartError::Serve(ended.map_or_else(std::io::Error::other, |ended| {
            ended.err().unwrap_or_else(|| std::io::Error::other("the server ended by itself"))
        }))),
    };
    tracing::info!(why, "shutting down; a second signal ends at once");
    let down = async {
        if tokio::time::timeout(REST_WITHIN, conductor.end("the daemon was shut down")).await.is_err() {
            tracing::error!("the bench did not come to rest in time; look at it");
        }
        stop_serving.cancel();
        if tokio::time::timeout(DRAIN_WITHIN, &mut server).await.is_err() {
            tracing::warn!("requests were cut off");
            server.abort();
        }
        hang_up.cancel();
        sessions.close();
        sessions.wait().await;
        drop(conductor);
        store.close().await
    };
    tokio::select! {
        closed = down => Ok(closed?),
        why = endings.at_once() => {
            tracing::warn!(why, "ending at once; the bench may not be at rest");
            std::process::exit(1)
        }
    }
}

/// Opens the data folder where it does not keep the runtime from its work.
async fn open(data: &Path) -> Result<Store, StartError> {
    let data = data.to_owned();
    let opened = tokio::task::spawn_blocking(move || Store::open(&data)).await;
    Ok(opened.map_err(|error| StartError::Serve(std::io::Error::other(error)))??)
}

/// Checks the data folder and says what was found.
async fn check(data: &Path) -> Result<(), StartError> {
    if !data.is_dir() {
        let source = std::io::Error::new(std::io::ErrorKind::NotFound, "there is no such folder");
        return Err(StartError::Read { path: data.to_owned(), source });
    }
    let store = open(data).await?;
    let report = store.check().await?;
    store.close().await?;
    for broken in &report.broken {
        eprintln!("{broken}");
    }
    println!("{} runs, {} captures: {} broken promise(s)", report.runs, report.captures, report.broken.len());
    if report.broken.is_empty() { Ok(()) } else { Err(StartError::Unsound { path: data.to_owned() }) }
}

fn read_bench(path: &Path) -> Result<Bench, StartError> {
    let text = std::fs::read_to_string(path).map_err(|source| StartError::Read { path: path.to_owned(), source })?;
    bench::read(&text).map_err(|found| {
        mistakes::show(path, &text, &found);
        StartError::Bench { path: path.to_owned(), count: found.len() }
    })
}

/// A path in the bench file is relative to the bench file.
fn beside(bench: &Path, path: &str) -> PathBuf {
    bench.parent().unwrap_or_else(|| Path::new(".")).join(path)
}

fn connect(
    bench: &Bench,
    dialects: &BTreeMap<String, Arc<Dialect>>,
    hang_up: &CancellationToken,
    sessions: &TaskTracker,
) -> Result<Instruments, StartError> {
    let mut handles = BTreeMap::new();
    for instrument in &bench.instruments {
        let Some((host, port, protocol)) = place_of(&instrument.resource) else {
            let resource = instrument.resource.to_string();
            return Err(StartError::Resource { instrument: instrument.name.clone(), resource });
        };
        let Some(dialect) = dialects.get(&instrument.dialect) else { continue };
        let spec = SessionSpec {
            instrument: instrument.name.clone(),
            host,
            port,
            protocol,
            dialect: Arc::clone(dialect),
            timing: Timing { reply: Duration::from_secs_f64(instrument.timeout_s), ..Timing::default() },
            caps: Caps::default(),
        };
        handles.insert(instrument.name.clone(), session::spawn(spec, hang_up.clone(), sessions));
    }
    Ok(Instruments::new(handles))
}
