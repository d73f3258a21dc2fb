//! A process of the demo: started, waited for until it is ready, and ended.

use std::path::{Path, PathBuf};
use std::process::Stdio;
use std::time::Duration;

use serde::Deserialize;
use tokio::io::{AsyncBufReadExt, BufReader, Lines};
use tokio::process::{ChildStdout, Command};

use super::files::{Address, BENCH_LOG, DAEMON_LOG, Place};
use crate::trouble::Trouble;

/// The longest that a process may take to become ready.
const READY_WITHIN: Duration = Duration::from_secs(20);

/// The longest that a process may take to end by itself: more than the daemon gives itself to bring the bench to rest.
const END_WITHIN: Duration = Duration::from_secs(35);

/// A process of the demo. It ends when its standard input closes.
pub(super) struct Child {
    process: tokio::process::Child,
    lines: Lines<BufReader<ChildStdout>>,
    name: &'static str,
}

/// What the simulated bench tells of an instrument.
#[derive(Deserialize)]
struct Told {
    name: String,
    resource: String,
}

impl Child {
    /// Starts the simulated bench and returns the addresses of its instruments.
    pub(super) async fn start_bench(place: &Place) -> Result<(Self, Vec<Address>), Trouble> {
        let mut child = Self::start("evenpair-sim", BENCH_LOG, place, |command| {
            command.arg("--scenario").arg(&place.scenario);
        })?;
        let mut addresses = Vec::new();
        loop {
            let line = child.line().await?;
            if line == "ready" {
                return Ok((child, addresses));
            }
            let told: Told = serde_json::from_str(&line).map_err(|error| {
                Trouble::Demo(format!("evenpair-sim said `{line}`, which is not understood: {error}"))
            })?;
            addresses.push((told.name, told.resource));
        }
    }

    /// Starts the daemon and returns its address.
    pub(super) async fn start_daemon(place: &Place) -> Result<(Self, String), Trouble> {
        let mut child = Self::start("evenpaird", DAEMON_LOG, place, |command| {
            command.arg("--bench").arg(&place.bench).arg("--data").arg(&place.data).args(["--listen", "127.0.0.1:0"]);
        })?;
        let line = child.line().await?;
        let url = line.strip_prefix("listening on ").map(str::to_owned);
        let url = url.ok_or_else(|| Trouble::Demo(format!("evenpaird said `{line}` instead of where it listens")))?;
        Ok((child, url))
    }

    fn start(
        name: &'static str,
        log: &str,
        place: &Place,
        arguments: impl FnOnce(&mut Command),
    ) -> Result<Self, Trouble> {
        let binary = beside_us(name)?;
        let path = place.folder.join(log);
        let log = std::fs::File::create(&path).map_err(|source| Trouble::File { doing: "writing", path, source })?;
        let mut command = Command::new(&binary);
        arguments(&mut command);
        command.arg("--exit-with-stdin").stdin(Stdio::piped()).stdout(Stdio::piped()).stderr(log).kill_on_drop(true);
        // Ctrl-C in a terminal goes to its whole process group. The simulated bench must not be gone before the daemon has
        // brought it to rest, so both end when we say so.
        command.process_group(0);
        let mut process =
            command.spawn().map_err(|source| Trouble::File { doing: "starting", path: binary.clone(), source })?;
        let stdout = process.stdout.take().ok_or_else(|| Trouble::Demo(format!("{name} has no standard output")))?;
        Ok(Self { process, lines: BufReader::new(stdout).lines(), name })
    }

    /// The next line that it prints.
    async fn line(&mut self) -> Result<String, Trouble> {
        let name = self.name;
        match tokio::time::timeout(READY_WITHIN, self.lines.next_line()).await {
            Ok(Ok(Some(line))) => Ok(line),
            Ok(Ok(None)) => Err(Trouble::Demo(format!("{name} ended before it was ready"))),
            Ok(Err(error)) => Err(Trouble::Demo(format!("reading what {name} says: {error}"))),
            Err(_) => Err(Trouble::Demo(format!("{name} was not ready within {} s", READY_WITHIN.as_secs()))),
        }
    }

    /// Asks it to end, and ends it if it does not.
    pub(super) async fn end(mut self) {
        drop(self.process.stdin.take());
        if tokio::time::timeout(END_WITHIN, self.process.wait()).await.is_err() {
            eprintln!("evenpair: {} did not end within {} s and is killed", self.name, END_WITHIN.as_secs());
            let _ = self.process.kill().await;
        }
    }
}

/// The path of a program that is installed beside this one.
fn beside_us(name: &str) -> Result<PathBuf, Trouble> {
    let us =
        std::env::current_exe().map_err(|error| Trouble::Demo(format!("finding this program's own place: {error}")))?;
    let path = us.parent().unwrap_or_else(|| Path::new(".")).join(name);
    if path.exists() {
        Ok(path)
    } else {
        let help = format!(
            "`{name}` is not beside this program ({}); build all of them: cargo build --release",
            path.display()
        );
        Err(Trouble::Demo(help))
    }
}
