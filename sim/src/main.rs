//! `evenpair-sim`: a simulated bench. Every instrument of a scenario is an IEEE 488.2 device on its own TCP port; behind
//! them stands one analog world.

#![cfg_attr(test, allow(clippy::unwrap_used))]

mod control;
mod faults;
mod instrument;
mod link;
mod message;
mod scenario;
mod server;
mod status;
mod world;

use std::collections::BTreeMap;
use std::io::{Read, Write};
use std::net::SocketAddr;
use std::path::{Path, PathBuf};
use std::process::ExitCode;
use std::sync::Arc;

use clap::Parser;
use tokio::net::TcpListener;
use tokio::signal::unix::{SignalKind, signal};
use tokio::sync::oneshot;
use tracing_subscriber::EnvFilter;

use crate::control::Control;
use crate::instrument::{Bench, Device, kind_name};
use crate::scenario::{CONTROL, Protocol, Scenario, ScenarioError};

/// Exit status when the bench could not be started.
const CANNOT_START: u8 = 2;

/// Starts the instruments of a scenario, prints where each one listens, then `ready`. Stops on SIGTERM or SIGINT.
#[derive(Debug, Parser)]
#[command(name = "evenpair-sim", version, max_term_width = 80)]
struct Arguments {
    /// Scenario file: instruments, legs and device
    #[arg(long, value_name = "FILE")]
    scenario: PathBuf,
    /// Address to listen on
    #[arg(long, value_name = "ADDRESS", default_value = "127.0.0.1")]
    host: String,
    /// Stop when standard input ends, so that nothing outlives a parent that was killed
    #[arg(long)]
    exit_with_stdin: bool,
    /// What to log to standard error, e.g. `debug`
    #[arg(long, value_name = "FILTER", default_value = "warn", env = "EVENPAIR_SIM_LOG")]
    log: String,
}

/// Why the bench could not be started.
#[derive(Debug, thiserror::Error)]
enum StartError {
    #[error("cannot read the scenario {}: {source}; check --scenario", path.display())]
    Read { path: PathBuf, source: std::io::Error },
    #[error("the scenario {} cannot be used: {source}", path.display())]
    Scenario { path: PathBuf, source: ScenarioError },
    #[error(
        "instrument {name}: cannot listen on {host} port {port}: {source}; choose another port, or 0 for any free one"
    )]
    Listen { name: String, host: String, port: u16, source: std::io::Error },
    #[error("cannot {doing}: {source}")]
    System { doing: &'static str, source: std::io::Error },
}

/// The line that tells where an instrument listens.
#[derive(Debug, serde::Serialize)]
struct Announcement<'a> {
    name: &'a str,
    kind: &'static str,
    /// VISA resource string (VPP-4.3).
    resource: String,
}

fn main() -> ExitCode {
    let arguments = Arguments::parse();
    let filter = EnvFilter::try_new(&arguments.log).unwrap_or_else(|_| EnvFilter::new("warn"));
    tracing_subscriber::fmt().with_env_filter(filter).with_writer(std::io::stderr).init();
    match start(&arguments) {
        Ok(()) => ExitCode::SUCCESS,
        Err(error) => {
            // Standard error may be closed; the exit status still tells.
            let _ = writeln!(std::io::stderr(), "evenpair-sim: {error}");
            ExitCode::from(CANNOT_START)
        }
    }
}

fn start(arguments: &Arguments) -> Result<(), StartError> {
    let scenario = read(&arguments.scenario)?;
    let runtime = tokio::runtime::Builder::new_multi_thread()
        .worker_threads(4)
        .enable_all()
        .build()
        .map_err(|source| StartError::System { doing: "start the runtime", source })?;
    let outcome = runtime.block_on(run(&scenario, arguments));
    // An acquisition that is being computed must not hold the end up.
    runtime.shutdown_background();
    outcome
}

fn read(path: &Path) -> Result<Scenario, StartError> {
    let text = std::fs::read_to_string(path).map_err(|source| StartError::Read { path: path.to_owned(), source })?;
    Scenario::read(&text).map_err(|source| StartError::Scenario { path: path.to_owned(), source })
}

/// Serves until told to stop. The handlers for signals stand before anything is announced.
async fn run(scenario: &Scenario, arguments: &Arguments) -> Result<(), StartError> {
    let system = |doing| move |source| StartError::System { doing, source };
    let mut terminate = signal(SignalKind::terminate()).map_err(system("listen for SIGTERM"))?;
    let mut interrupt = signal(SignalKind::interrupt()).map_err(system("listen for SIGINT"))?;
    let bench = Arc::new(Bench::new(scenario));
    let mut devices = BTreeMap::new();
    let mut lines = String::new();
    for spec in &scenario.instruments {
        let place = (spec.protocol, spec.port);
        let listener = listen(arguments, &spec.name, kind_name(spec.kind), place, &mut lines).await?;
        let device = Arc::new(Device::new(spec, &bench));
        devices.insert(spec.name.clone(), Arc::clone(&device));
        tokio::spawn(server::serve(listener, device, spec.protocol, spec.name.clone()));
    }
    if let Some(spec) = &scenario.control {
        let listener = listen(arguments, CONTROL, CONTROL, (Protocol::Socket, spec.port), &mut lines).await?;
        tokio::spawn(control::serve(listener, Control::new(scenario, bench, devices)));
    }
    lines.push_str("ready\n");
    announce(&lines).map_err(system("tell where the instruments listen"))?;
    tokio::select! {
        _ = terminate.recv() => {}
        _ = interrupt.recv() => {}
        () = stdin_end(arguments.exit_with_stdin) => {}
    }
    Ok(())
}

/// The VISA resource string (VPP-4.3) of an instrument that listens there.
fn resource(protocol: Protocol, address: SocketAddr) -> String {
    let (ip, port) = (address.ip(), address.port());
    let host = if ip.is_ipv6() { format!("[{ip}]") } else { ip.to_string() };
    match protocol {
        Protocol::Hislip => format!("TCPIP::{host}::{},{port}::INSTR", server::SUB_ADDRESS),
        Protocol::Socket => format!("TCPIP::{host}::{port}::SOCKET"),
    }
}

/// Listens on a port and adds the line that tells where.
async fn listen(
    arguments: &Arguments,
    name: &str,
    kind: &'static str,
    (protocol, port): (Protocol, u16),
    lines: &mut String,
) -> Result<TcpListener, StartError> {
    let failed = |source| StartError::Listen { name: name.to_owned(), host: arguments.host.clone(), port, source };
    let listener = TcpListener::bind((arguments.host.as_str(), port)).await.map_err(failed)?;
    let address = listener.local_addr().map_err(failed)?;
    let line = Announcement { name, kind, resource: resource(protocol, address) };
    lines.push_str(&serde_json::to_string(&line).map_err(|error| failed(error.into()))?);
    lines.push('\n');
    Ok(listener)
}

fn announce(lines: &str) -> std::io::Result<()> {
    let mut out = std::io::stdout().lock();
    out.write_all(lines.as_bytes())?;
    out.flush()
}

/// Ends when standard input does; never, unless it is asked for.
async fn stdin_end(wanted: bool) {
    if !wanted {
        return std::future::pending().await;
    }
    let (ended, end) = oneshot::channel::<()>();
    // A thread of our own: the runtime could not be stopped while one of its threads reads.
    std::thread::spawn(move || {
        let mut buffer = [0; 256];
        let mut stdin = std::io::stdin().lock();
        loop {
            match stdin.read(&mut buffer) {
                Err(error) if error.kind() == std::io::ErrorKind::Interrupted => {}
                Ok(count) if count > 0 => {}
                _ => break,
            }
        }
        drop(ended);
    });
    let _ = end.await;
}
