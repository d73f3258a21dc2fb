//! `evenpair bench`

use crate::exit::Exit;
use crate::http::Daemon;
use crate::trouble::Trouble;
use crate::{output, render};

/// Shows the bench.
pub(crate) async fn bench(daemon: &Daemon, json: bool) -> Result<Exit, Trouble> {
    let bench = daemon.bench().await?;
    if json {
        output::print_json(&bench)?;
    } else {
        output::print(&render::bench(&bench))?;
    }
    Ok(Exit::Passed)
}
