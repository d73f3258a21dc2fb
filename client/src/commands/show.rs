//! `evenpair runs` and `evenpair show`

use evenpair_api::{Capture, Run};
use serde::Serialize;

use crate::exit::Exit;
use crate::http::Daemon;
use crate::trouble::Trouble;
use crate::{output, render};

/// Lists the runs.
pub(crate) async fn runs(daemon: &Daemon, json: bool) -> Result<Exit, Trouble> {
    let runs = daemon.runs().await?;
    if json {
        output::print_json(&runs)?;
    } else {
        output::print(&render::runs(&runs))?;
    }
    Ok(Exit::Passed)
}

#[derive(Serialize)]
struct Shown {
    run: Run,
    captures: Vec<Capture>,
}

/// Shows one run with everything that it measured.
pub(crate) async fn show(daemon: &Daemon, id: &str, json: bool) -> Result<Exit, Trouble> {
    let run = daemon.run(id).await?;
    let captures = daemon.captures(&run.id.to_string()).await?;
    if json {
        output::print_json(&Shown { run, captures })?;
        return Ok(Exit::Passed);
    }
    output::print(&render::run(&run))?;
    for capture in &captures {
        output::print(&format!("\n{}\n{}", render::capture_summary(capture), render::figures(capture)))?;
        for warning in &capture.warnings {
            output::print(&format!("note: {warning}"))?;
        }
    }
    Ok(Exit::Passed)
}
