//! `evenpair run`, `evenpair watch` and `evenpair stop`

use std::path::Path;

use evenpair_api::{Run, RunRequest};

use super::follow;
use crate::exit::Exit;
use crate::http::Daemon;
use crate::trouble::Trouble;
use crate::{output, render};

/// Starts a sequence; with `wait` stays until it has ended, and the exit status tells how.
pub(crate) async fn run(daemon: &Daemon, sequence: &str, wait: bool, json: bool) -> Result<Exit, Trouble> {
    let request = if Path::new(sequence).extension().is_some_and(|ending| ending == "toml") {
        let text = std::fs::read_to_string(sequence).map_err(|source| Trouble::File {
            doing: "reading the sequence",
            path: sequence.into(),
            source,
        })?;
        RunRequest { sequence: None, text: Some(text) }
    } else {
        RunRequest { sequence: Some(sequence.to_owned()), text: None }
    };
    let run = daemon.start(&request).await?;
    if wait {
        return end(daemon, &run, json).await;
    }
    tell(&run, json)?;
    Ok(Exit::Passed)
}

/// Follows a run until it has ended.
pub(crate) async fn watch(daemon: &Daemon, id: &str, json: bool) -> Result<Exit, Trouble> {
    let run = daemon.run(id).await?;
    end(daemon, &run, json).await
}

/// Stops a run and waits until the bench is at rest.
pub(crate) async fn stop(daemon: &Daemon, id: &str, json: bool) -> Result<Exit, Trouble> {
    let run = daemon.run(id).await?;
    daemon.stop(&run.id.to_string()).await?;
    let run = follow(daemon, &run.id.to_string(), json).await?;
    tell(&run, json)?;
    // The run did what this command asked for, however it ended.
    Ok(Exit::Passed)
}

async fn end(daemon: &Daemon, run: &Run, json: bool) -> Result<Exit, Trouble> {
    let run = follow(daemon, &run.id.to_string(), json).await?;
    let mut shown = run.clone();
    shown.stages.clear();
    tell(if json { &run } else { &shown }, json)?;
    Ok(Exit::of_run(run.state))
}

fn tell(run: &Run, json: bool) -> Result<(), Trouble> {
    if json { output::print_json(run) } else { output::print(&render::run(run)) }
}
