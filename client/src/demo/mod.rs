//! `evenpair demo`: the whole job on a simulated bench, through a real daemon and its API.
//!
//! The simulated bench and the daemon are processes of their own on free loopback ports. Both end when their standard
//! input closes, so that not even a killed demo leaves one behind.

mod child;
mod files;
mod report;

use std::path::{Path, PathBuf};

use evenpair_api::{DeskewRequest, Run, RunRequest, RunState, VerifyRequest};

use crate::commands::follow;
use crate::exit::Exit;
use crate::http::Daemon;
use crate::trouble::Trouble;
use crate::{output, render};
use child::Child;
use report::Report;

/// The pair that the demo deskews.
const PAIR: &str = "gate";

/// The sequence that the demo runs.
const SEQUENCE: &str = "gate-night";

/// The figure of the table that is printed at the end.
const FIGURE: &str = "high_level";

/// Shows the whole job. The data stays in `data`, if that is given.
pub(crate) async fn demo(data: Option<PathBuf>, seed: Option<u64>, json: bool) -> Result<Exit, Trouble> {
    let temporary = match &data {
        Some(_) => None,
        None => Some(tempfile::tempdir().map_err(|source| Trouble::File {
            doing: "making a folder in",
            path: std::env::temp_dir(),
            source,
        })?),
    };
    let folder = data.clone().or_else(|| temporary.as_ref().map(|folder| folder.path().to_owned())).unwrap_or_default();
    let mut children = Children::default();
    let outcome = tokio::select! {
        outcome = show(&folder, data.is_some(), seed, json, &mut children) => outcome,
        () = interrupted() => Err(Trouble::Interrupted),
    };
    let outcome = outcome.map_err(|trouble| children.with_logs(trouble, &folder));
    children.end().await;
    outcome
}

/// The two processes, in the order in which they end: the daemon first, so that it can bring the bench to rest.
#[derive(Default)]
struct Children {
    daemon: Option<Child>,
    bench: Option<Child>,
}

impl Children {
    async fn end(self) {
        for child in [self.daemon, self.bench].into_iter().flatten() {
            child.end().await;
        }
    }

    /// Adds the ends of the logs to a trouble that was not the person's own doing.
    fn with_logs(&self, trouble: Trouble, folder: &Path) -> Trouble {
        if matches!(trouble, Trouble::Interrupted | Trouble::NoReader | Trouble::Usage(_)) {
            return trouble;
        }
        let mut text = trouble.to_string();
        for name in [files::DAEMON_LOG, files::BENCH_LOG] {
            let log = std::fs::read_to_string(folder.join(name)).unwrap_or_default();
            let lines: Vec<&str> = log.lines().collect();
            let last = &lines[lines.len().saturating_sub(8)..];
            if !last.is_empty() {
                text.push_str(&format!("\nthe end of {name}:\n  {}", last.join("\n  ")));
            }
        }
        Trouble::Demo(text)
    }
}

async fn show(
    folder: &Path,
    kept: bool,
    seed: Option<u64>,
    json: bool,
    children: &mut Children,
) -> Result<Exit, Trouble> {
    let say = |text: &str| if json { Ok(()) } else { output::print(text) };
    let place = files::lay_out(folder, seed)?;
    say("Evenpair demo: the high-side gate of a half bridge that drives a greenhouse fan.")?;
    say("All of it is simulated; on a real bench the cautions below are for you.\n")?;

    let (bench, addresses) = Child::start_bench(&place).await?;
    children.bench = Some(bench);
    files::write_bench(&place, &addresses)?;
    let (daemon, url) = Child::start_daemon(&place).await?;
    children.daemon = Some(daemon);
    let daemon = Daemon::new(&url)?;
    let bench = daemon.bench().await?;
    say(&render::bench(&bench))?;

    say(&format!("\n1. Deskew the pair `{PAIR}` (POST /pairs/{PAIR}/deskew)\n"))?;
    let run = daemon.deskew(PAIR, &DeskewRequest::default()).await?;
    completed(&follow(&daemon, &run.id.to_string(), json).await?)?;
    say(&format!("\n{}", render::correction(&daemon.correction(PAIR).await?)))?;

    say(&format!("\n2. Verify it on fresh acquisitions (POST /pairs/{PAIR}/verify)\n"))?;
    let run = daemon.verify(PAIR, &VerifyRequest::default()).await?;
    completed(&follow(&daemon, &run.id.to_string(), json).await?)?;
    let correction = daemon.correction(PAIR).await?;
    say(&format!("\n{}", render::rejection(&correction.rejection)))?;

    say(&format!("\n3. Run the sequence `{SEQUENCE}` (POST /runs)\n"))?;
    let request = RunRequest { sequence: Some(SEQUENCE.to_owned()), text: None };
    let run = daemon.start(&request).await?;
    let run = follow(&daemon, &run.id.to_string(), json).await?;
    let captures = daemon.captures(&run.id.to_string()).await?;
    let correction = daemon.correction(PAIR).await?;
    say(&format!("\nThe gate's {FIGURE}, corrected, beside what plain subtraction gives:\n"))?;
    say(&render::captures(&captures, FIGURE))?;
    if let Some(last) = captures.last() {
        say(&format!("\nEvery figure of capture {}:\n\n{}", last.number, render::figures(last)))?;
    }
    completed(&run)?;

    let report = Report::new(folder, kept, correction, run, captures);
    if json {
        output::print_json(&report)?;
    } else {
        output::print(&format!("\n{}", report.where_the_data_lies()))?;
    }
    Ok(Exit::of_run(report.run.state))
}

/// A run that was not completed ends the demo.
fn completed(run: &Run) -> Result<(), Trouble> {
    match run.state {
        RunState::Passed | RunState::Failed => Ok(()),
        _ => Err(Trouble::Demo(format!(
            "{} did not come to its end: {}",
            run.title,
            run.reason.as_deref().unwrap_or("")
        ))),
    }
}

/// Ctrl-C, or being asked to end.
async fn interrupted() {
    use tokio::signal::unix::{SignalKind, signal};
    match signal(SignalKind::terminate()) {
        Ok(mut terminate) => {
            tokio::select! {
                _ = tokio::signal::ctrl_c() => {}
                _ = terminate.recv() => {}
            }
        }
        Err(_) => {
            let _ = tokio::signal::ctrl_c().await;
        }
    }
}
