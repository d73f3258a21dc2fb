//! `evenpair bench` and `evenpair settle`

use evenpair_api::Bench;

use crate::exit::Exit;
use crate::http::Daemon;
use crate::trouble::Trouble;
use crate::{output, render};

/// Shows the bench.
pub(crate) async fn bench(daemon: &Daemon, json: bool) -> Result<Exit, Trouble> {
    tell(&daemon.bench().await?, json)
}

/// Brings the bench to rest, once a person has looked at it.
pub(crate) async fn settle(daemon: &Daemon, json: bool) -> Result<Exit, Trouble> {
    tell(&daemon.settle().await?, json)
}

fn tell(bench: &Bench, json: bool) -> Result<Exit, Trouble> {
    if json {
        output::print_json(bench)?;
    } else {
        output::print(&render::bench(bench))?;
    }
    Ok(Exit::Passed)
}
