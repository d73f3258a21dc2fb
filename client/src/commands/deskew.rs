//! `evenpair deskew` and `evenpair verify`

use evenpair_api::{Correction, DeskewRequest, Run, RunState, VerifyRequest};

use super::follow;
use crate::exit::Exit;
use crate::http::Daemon;
use crate::trouble::Trouble;
use crate::{output, render};

/// Deskews a pair and shows the correction that came of it.
pub(crate) async fn deskew(daemon: &Daemon, pair: &str, request: &DeskewRequest, json: bool) -> Result<Exit, Trouble> {
    let run = daemon.deskew(pair, request).await?;
    finish(daemon, run, json, async || daemon.correction(pair).await).await
}

/// Verifies a pair's correction and shows it.
pub(crate) async fn verify(daemon: &Daemon, pair: &str, json: bool) -> Result<Exit, Trouble> {
    let run = daemon.verify(pair, &VerifyRequest::default()).await?;
    finish(daemon, run, json, async || daemon.correction(pair).await).await
}

/// Follows a run to its end and shows the correction that came of it, which `found` asks for.
pub(super) async fn finish(
    daemon: &Daemon,
    run: Run,
    json: bool,
    found: impl AsyncFnOnce() -> Result<Correction, Trouble>,
) -> Result<Exit, Trouble> {
    let run = follow(daemon, &run.id.to_string(), json).await?;
    if run.state != RunState::Passed {
        if json {
            output::print_json(&run)?;
        } else {
            output::print(&render::run(&run))?;
        }
        return Ok(Exit::of_run(run.state));
    }
    let correction = found().await?;
    if json {
        output::print_json(&correction)?;
    } else {
        output::print(&format!(
            "\n{}\n\n{}",
            render::correction(&correction),
            render::rejection(&correction.rejection)
        ))?;
    }
    Ok(Exit::Passed)
}
